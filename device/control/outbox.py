"""What the board has to say: kept messages until acknowledged, others once, a few bytes a tick.

Nothing here waits and nothing allocates: records are lists made at the start and filled in place.
"""

from device.control.ticks import Marks
from shared_protocol.crc import Crc32, CrcTables
from shared_protocol.fields import Message
from shared_protocol.line import LineWriter
from shared_protocol.messages import ALIVE

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board

KEPT = 32
PLAIN = 28
FOR_ANSWERS = 16
_WIDEST = 11

AGAIN_MS = 1000
_STAR, _NEWLINE = 42, 10


class _Line:
    """One record of the outbox."""

    def __init__(self) -> None:
        self.message = ALIVE
        self.values: "list[object]" = [0] * _WIDEST
        self.serial = 0
        self.used = False
        self.sent = False


class Outbox:
    """Lines to the host. `to_send` tells the loop that there is something to do."""

    def __init__(self, tables: CrcTables) -> None:
        self._kept = [_Line() for _ in range(KEPT)]
        self._plain = [_Line() for _ in range(PLAIN)]
        self._kept_next = 0
        self._plain_first = 0
        self._plain_count = 0
        self._number = 0
        self._serial = 0
        self._writer = LineWriter()
        self._crc = Crc32(tables)
        self._raw = b""
        self._body: "bytes | bytearray" = self._writer.buffer
        self._length = 0
        self._place = 0
        self._unsent = 0
        self._waiting = 0
        self._again = Marks(1)
        # Something was added since the last look: its time to be sent again begins then.
        self._new = False
        self.dropped = 0
        self.open = False

    # ---- filling

    def kept(self, message: Message) -> "list[object]":
        """The values to fill of a message that is kept until acknowledged. Values[0] is set here."""
        line = self._kept[self._kept_next]
        self._kept_next = (self._kept_next + 1) % KEPT
        if line.used:
            self.dropped += 1
            self._waiting -= 1
            if not line.sent:
                self._unsent -= 1
        self._new = True
        self._number += 1
        self._serial += 1
        line.serial = self._serial
        line.message = message
        line.values[0] = self._number
        line.used = True
        line.sent = False
        self._unsent += 1
        self._waiting += 1
        return line.values

    def has_room(self) -> bool:
        """True if telemetry fits; some room is left for answers."""
        return self._plain_count < PLAIN - FOR_ANSWERS

    def plain(self, message: Message) -> "list[object]":
        """The values to fill of a message that is sent once. When there is no room the newest one is lost."""
        if not self.open:
            self._plain_count = 0
        if self._plain_count >= PLAIN:
            self.dropped += 1
            self._plain_count -= 1
        line = self._plain[(self._plain_first + self._plain_count) % PLAIN]
        self._plain_count += 1
        self._serial += 1
        line.serial = self._serial
        line.message = message
        return line.values

    def acknowledge(self, number: int) -> None:
        """The host has message `number`."""
        for line in self._kept:
            if line.used and line.values[0] == number:
                line.used = False
                self._waiting -= 1
                if not line.sent:
                    self._unsent -= 1

    def again(self) -> None:
        """Send all that is not acknowledged once more."""
        self._unsent = 0
        for line in self._kept:
            if line.used:
                line.sent = False
                self._unsent += 1

    def raw(self, body: bytes) -> bool:
        """Send a body that is written already; False if the line before is not out yet."""
        if self._length or self._raw:
            return False
        self._raw = body
        return True

    # ---- sending

    @property
    def to_send(self) -> bool:
        """True if there is something to send now."""
        return self.open and (self._length > 0 or self._unsent > 0 or self._plain_count > 0 or len(self._raw) > 0)

    @property
    def quiet(self) -> bool:
        """True if the line is idle: nothing half sent, no raw body waiting."""
        return self._length == 0 and len(self._raw) == 0

    def send(self, board: "Board", most: int) -> bool:
        """Give at most `most` bytes to the board. True if no more can go now: a line ended, or it takes no more."""
        if self._length == 0:
            if not self.open or not self._next_line():
                return True
            self._place = 0
            self._crc.reset()
        place = self._place
        length = self._length
        while most > 0:
            if place < length:
                byte = self._body[place]
            elif place == length:
                byte = _STAR
            elif place <= length + 8:
                byte = self._crc.digit(place - length - 1)
            else:
                byte = _NEWLINE
            if not board.write_byte(byte):
                self._place = place
                return True
            if place < length:
                self._crc.add(byte)
            place += 1
            most -= 1
            if byte == _NEWLINE:
                self._length = 0
                return True
        self._place = place
        return False

    def tick(self, now_ms: int) -> None:
        """Ask again for acknowledgement when it is due."""
        if self._new or self._unsent:
            self._new = False
            self._again.set(0, now_ms)
        elif self._waiting and self._again.since(0, now_ms) >= AGAIN_MS:
            self._again.set(0, now_ms)
            self.again()

    def _next_line(self) -> bool:
        """Write the next record into the buffer, in the order in which they were filled; False if there is none."""
        kept = self._first_unsent()
        if self._raw and kept is None:
            self._body = self._raw
            self._length = len(self._raw)
            self._raw = b""
            return True
        plain = self._plain[self._plain_first] if self._plain_count else None
        if kept is not None and (plain is None or kept.serial < plain.serial):
            kept.sent = True
            self._unsent -= 1
            return self._write(kept)
        if plain is not None:
            self._plain_first = (self._plain_first + 1) % PLAIN
            self._plain_count -= 1
            return self._write(plain)
        return False

    def _first_unsent(self) -> "_Line | None":
        if self._unsent:
            for step in range(KEPT):
                line = self._kept[(self._kept_next + step) % KEPT]
                if line.used and not line.sent:
                    return line
            self._unsent = 0
        return None

    def _write(self, line: _Line) -> bool:
        self._body = self._writer.buffer
        self._length = self._writer.write(line.message, line.values)
        if self._length == 0:
            self.dropped += 1
        return self._length > 0
