"""The board's end of the link: bytes in and out, a few a tick, and whether a host is there."""

from device.control.outbox import Outbox
from device.control.ticks import Marks, elapsed
from shared_protocol.crc import CrcTables
from shared_protocol.line import GOOD, Decoded, LineDecoder
from shared_protocol.reader import LINE, NOTHING, TEXT, LineReader
from shared_protocol.registry import board_reads

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board

# Bytes a tick. A throw that waits for its moment must not wait for a message or for telemetry: then this time at most.
BYTES_IN = 64
BYTES_OUT = 64
HURRY_US = 60
LEAVE_BYTE = 3

_HEARD = 0


class Endpoint:
    """Reads and writes the link. `line_waiting` is True when a whole line is to be handled."""

    def __init__(self, board: "Board", tables: CrcTables, outbox: Outbox) -> None:
        self._board = board
        self._outbox = outbox
        self._reader = LineReader(tables)
        self.decoder = LineDecoder(board_reads())
        self._marks = Marks(1)
        self.line_waiting = False
        self.reading = False
        self.told_to_leave = False
        self.bad_lines = 0

    def read(self, hurry: bool) -> None:
        """Take bytes until a line is whole, for a short time only in a hurry. `reading`: there may be more."""
        if self.line_waiting:
            return
        board = self._board
        reader = self._reader
        begun_us = board.ticks_us()
        self.reading = True
        for count in range(BYTES_IN):
            byte = board.read_byte()
            if byte < 0:
                self.reading = False
                return
            if byte == LEAVE_BYTE:
                self.told_to_leave = True
                continue
            result = reader.feed(byte)
            if result == LINE:
                self.line_waiting = True
                return
            if result != NOTHING and (reader.length or result != TEXT):
                self.bad_lines += 1
            if hurry and count & 3 == 3 and elapsed(board.ticks_us(), begun_us) >= HURRY_US:
                return

    def write(self, hurry: bool) -> None:
        """Give bytes to the board as long as it takes them, for a short time only in a hurry."""
        outbox = self._outbox
        if not outbox.to_send:
            return
        board = self._board
        begun_us = board.ticks_us()
        for _ in range(BYTES_OUT // 4):
            if outbox.send(board, 4) or (hurry and elapsed(board.ticks_us(), begun_us) >= HURRY_US):
                return

    def take_line(self, now_ms: int) -> "Decoded | None":
        """Decode the line that waits; None (and counted) if it is not a right message. Allocates."""
        self.line_waiting = False
        decoded = self.decoder.decode(bytes(self._reader.buffer[: self._reader.length]))
        if decoded.fault != GOOD:
            self.bad_lines += 1
            return None
        self._marks.set(_HEARD, now_ms)
        return decoded

    def body(self) -> bytes:
        """The body of the line that was taken last."""
        return bytes(self._reader.buffer[: self._reader.length])

    def silent_ms(self, now_ms: int) -> int:
        """How long the host has been silent."""
        return self._marks.since(_HEARD, now_ms)

    def sweep(self, now_ms: int) -> None:
        """Keep marks right; once a tick."""
        self._marks.sweep(now_ms)
