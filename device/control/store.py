"""Settings in their two slots: staged into the older one, checked whole, committed by the last line.

A slot is its record bodies, a line each, and a trailer `slot SEQUENCE COUNT CRC`. A slot without a right trailer does
not count, so power lost at any moment leaves the newest whole set.
"""

from shared_protocol.crc import Crc32, CrcTables
from shared_protocol.line import GOOD, LineDecoder
from shared_protocol.settings import Problem, Settings
from shared_protocol.settings_check import check

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board

LIES_SLOT = 2


class Slot:
    """What was found in one slot: `sequence` 0 if it is not whole."""

    def __init__(self) -> None:
        self.sequence = 0
        self.crc = b""
        self.settings: "Settings | None" = None
        self.problem: "Problem | None" = None


class SettingsStore:
    """Reads and writes the settings slots of a board. Allocates: not for the steady loop."""

    def __init__(self, board: "Board", tables: CrcTables, decoder: LineDecoder) -> None:
        self._board = board
        self._crc = Crc32(tables)
        # The link's decoder knows the records too: a second one would only cost memory.
        self._decoder = decoder
        self.slot = 1
        self.sequence = 0
        self.crc = b""
        self.staging = False
        # Set by the tick when the host is lost in mid-transfer; the transfer is dropped where that may allocate.
        self.staging_lost = False
        self._announced = 0
        self._staged = 0
        self._staged_crc = Crc32(tables)

    def load(self) -> "Settings | None":
        """The newest whole and right set, None if there is none."""
        best: "Settings | None" = None
        for number in range(2):
            slot = self._read(number)
            if slot.settings is not None and slot.sequence > self.sequence:
                best = slot.settings
                self.slot = number
                self.sequence = slot.sequence
                self.crc = slot.crc
        return best

    def lines(self) -> "list[bytes]":
        """The record bodies of the set in force."""
        if self.sequence == 0:
            return []
        return self._board.slot_lines(self.slot)[:-1]

    def begin(self, count: int) -> bool:
        """Begin to stage `count` records into the older slot."""
        self._announced = count
        self._staged = 0
        self._staged_crc.reset()
        self.staging = self._board.slot_begin(1 - self.slot)
        return self.staging

    def stage(self, body: bytes) -> bool:
        """Take one record's body."""
        self._staged += 1
        for byte in body:
            self._staged_crc.add(byte)
        self._staged_crc.add(10)
        return self._board.slot_write(body)

    def abandon(self) -> None:
        """Drop what is staged: without a trailer the slot does not count."""
        self.staging_lost = False
        if self.staging:
            self.staging = False
            self._board.slot_end()

    def commit(self, crc: bytes) -> "Slot":
        """Check what is staged and make it the set in force. The answer has settings, or a problem."""
        found = Slot()
        self.staging = False
        if not self._board.slot_end():
            found.problem = Problem(-1, "", "flash")
        elif self._staged != self._announced:
            found.problem = Problem(-1, "", "wrong_count")
        elif self._staged_crc.text() != crc:
            found.problem = Problem(-1, "", "wrong_crc")
        if found.problem is not None:
            return found
        other = 1 - self.slot
        self._parse(self._board.slot_lines(other), found)
        if found.problem is not None:
            return found
        sequence = self.sequence + 1
        trailer = b"slot " + str(sequence).encode() + b" " + str(self._staged).encode() + b" " + crc
        # The one step that counts: before it the slot is not whole, after it it is the newest.
        if not self._board.slot_append(other, trailer):
            found.settings = None
            found.problem = Problem(-1, "", "flash")
            return found
        self.slot = other
        self.sequence = sequence
        self.crc = crc
        found.sequence = sequence
        found.crc = crc
        return found

    def _read(self, number: int) -> Slot:
        found = Slot()
        lines = self._board.slot_lines(number)
        if len(lines) < 2:
            return found
        parts = lines[-1].split(b" ")
        if len(parts) != 4 or parts[0] != b"slot" or not _is_number(parts[1]) or not _is_number(parts[2]):
            return found
        lines = lines[:-1]
        self._crc.reset()
        for line in lines:
            for byte in line:
                self._crc.add(byte)
            self._crc.add(10)
        if self._crc.text() != parts[3] or int(parts[2]) != len(lines):
            return found
        self._parse(lines, found)
        if found.settings is not None:
            found.sequence = int(parts[1])
            found.crc = parts[3]
        return found

    def _parse(self, lines: "list[bytes]", found: Slot) -> None:
        settings = Settings()
        number = 0
        for line in lines:
            decoded = self._decoder.decode(line)
            if decoded.fault != GOOD or decoded.message is None:
                found.problem = Problem(number, "", "out_of_range")
                return
            found.problem = settings.add(decoded.message, decoded.values)
            if found.problem is not None:
                return
            number += 1
        found.problem = check(settings)
        if found.problem is None:
            # Where each record came from was for naming a problem.
            settings.record_of = {}
            found.settings = settings


def _is_number(text: bytes) -> bool:
    if not text or len(text) > 9:
        return False
    for byte in text:
        if not 48 <= byte <= 57:
            return False
    return True
