"""Settings in their two slots: staged into the older one, checked whole, committed by the last line.

A slot is its record bodies, a line each, and a trailer `slot SEQUENCE COUNT CRC`. A slot without a right trailer does
not count, so power lost at any moment leaves the newest whole set. Slots are read a line at a time: a board has not the
memory for all of them at once.
"""

from shared_protocol.crc import crc_of, crc_text
from shared_protocol.line import GOOD, LineDecoder
from shared_protocol.settings import Problem, Settings
from shared_protocol.settings_check import check

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board

LIES_SLOT = 2
# Records of one set; more is not a slot of ours.
MOST_RECORDS = 400


class Slot:
    """What was found in one slot: `sequence` 0 if it is not whole."""

    def __init__(self) -> None:
        self.sequence = 0
        self.count = 0
        self.crc = b""
        self.settings: "Settings | None" = None
        self.problem: "Problem | None" = None


class SettingsStore:
    """Reads and writes the settings slots of a board. Allocates: not for the steady loop."""

    def __init__(self, board: "Board", decoder: LineDecoder) -> None:
        self._board = board
        # The link's decoder knows the records too: a second one would only cost memory.
        self._decoder = decoder
        self.slot = 1
        self.sequence = 0
        self.count = 0
        self.crc = b""
        self.staging = False
        # Set by the tick when the host is lost in mid-transfer; the transfer is dropped where that may allocate.
        self.staging_lost = False
        self._announced = 0
        self._staged = 0
        self._staged_crc = 0
        self._left_to_tell = 0

    def load(self) -> "Settings | None":
        """The newest whole and right set, None if there is none."""
        first = self._look(0)
        second = self._look(1)
        newer, older = (0, 1) if first.sequence >= second.sequence else (1, 0)
        for number in (newer, older):
            found = first if number == 0 else second
            if found.sequence:
                self._parse(number, found)
                if found.settings is not None:
                    self._take(number, found)
                    return found.settings
        return None

    def _take(self, number: int, found: "Slot") -> None:
        self.slot = number
        self.sequence = found.sequence
        self.count = found.count
        self.crc = found.crc

    def begin_telling(self) -> None:
        """From now on `next_record` gives the records of the set in force."""
        self._left_to_tell = self.count
        if not self._board.slot_rewind(self.slot):
            self._left_to_tell = 0

    def next_record(self) -> bytes:
        """The next record's body, empty when all were given (or the flash can't be read)."""
        if self._left_to_tell == 0:
            return b""
        self._left_to_tell -= 1
        return self._board.slot_line()

    def begin(self, count: int) -> bool:
        """Begin to stage `count` records into the older slot."""
        self._announced = count
        self._staged = 0
        self._staged_crc = 0
        self.staging = self._board.slot_begin(1 - self.slot)
        return self.staging

    def stage(self, body: bytes) -> bool:
        """Take one record's body."""
        self._staged += 1
        self._staged_crc = crc_of(body + b"\n", self._staged_crc)
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
        elif crc_text(self._staged_crc) != crc:
            found.problem = Problem(-1, "", "wrong_crc")
        if found.problem is not None:
            return found
        other = 1 - self.slot
        found.count = self._staged
        self._parse(other, found)
        if found.problem is not None:
            return found
        sequence = self.sequence + 1
        trailer = b"slot " + str(sequence).encode() + b" " + str(self._staged).encode() + b" " + crc
        # The one step that counts: before it the slot is not whole, after it it is the newest.
        if not self._board.slot_append(other, trailer):
            found.settings = None
            found.problem = Problem(-1, "", "flash")
            return found
        found.sequence = sequence
        found.crc = crc
        self._take(other, found)
        return found

    def _look(self, number: int) -> Slot:
        """See whether a slot is whole; not yet what is in it."""
        found = Slot()
        board = self._board
        crc = 0
        count = 0
        last = b""
        if not board.slot_rewind(number):
            return found
        while count <= MOST_RECORDS:
            line = board.slot_line()
            if not line:
                break
            if last:
                crc = crc_of(last + b"\n", crc)
                count += 1
            last = line
        parts = last.split(b" ")
        if len(parts) != 4 or parts[0] != b"slot" or not _is_number(parts[1]) or not _is_number(parts[2]):
            return found
        if count == 0 or int(parts[2]) != count or parts[3] != crc_text(crc):
            return found
        found.sequence = int(parts[1])
        found.count = count
        found.crc = parts[3]
        return found

    def _parse(self, number: int, found: Slot) -> None:
        """Read the records of a slot: `found` gets settings, or a problem."""
        settings = Settings()
        board = self._board
        if not board.slot_rewind(number):
            found.problem = Problem(-1, "", "flash")
            return
        for record in range(found.count):
            # A large set takes longer than the watchdog waits.
            board.feed_watchdog()
            decoded = self._decoder.decode(board.slot_line())
            if decoded.fault != GOOD or decoded.message is None:
                found.problem = Problem(record, "", "out_of_range")
                return
            found.problem = settings.add(decoded.message, decoded.values)
            if found.problem is not None:
                return
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
