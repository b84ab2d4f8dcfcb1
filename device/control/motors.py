"""Motors and their contacts: where each motor is, and how that is known."""

from device.control.ticks import Marks
from shared_protocol.settings import MotorSettings, Settings
from shared_protocol.settings_table import CONTACT_NONE, CONTACT_ONE, CONTACT_TWO
from shared_protocol.words import SEEN, SENT, SOURCE_NONE

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board

NORMAL, REVERSE, UNKNOWN = 0, 1, 2
# What contacts can say besides: nothing yet, or something impossible.
_NOT_YET, DISAGREE = 4, 3

# Contacts may disagree while the motor moves; a fault is only what lasts.
DISAGREE_MS = 500


class MotorState:
    """One motor."""

    def __init__(self, settings: MotorSettings) -> None:
        self.settings = settings
        self.junction = -1
        self.position = UNKNOWN
        self.source = SOURCE_NONE
        # What its contacts steadily say: NORMAL, REVERSE, UNKNOWN (between), DISAGREE or _NOT_YET.
        self.contact = _NOT_YET
        self._candidate = _NOT_YET
        self._count = 0
        self.disagree_ms = 0
        # Which of its coils read open at the last try (bit 0 normal, bit 1 reverse); for motors that end their pulse.
        self.open_coils = 0

    @property
    def has_contact(self) -> bool:
        """True if something sees it."""
        return self.settings.contact != CONTACT_NONE

    def pulse_begins(self) -> None:
        """It is being moved: nothing is known until the pulse is judged; contacts count from anew."""
        self.position = UNKNOWN
        self.source = SOURCE_NONE
        self.contact = _NOT_YET
        self._candidate = _NOT_YET
        self._count = 0
        self.disagree_ms = 0

    def was_sent(self, position: int) -> None:
        """A pulse was given and nothing was seen."""
        self.position = position
        self.source = SENT

    def lost(self) -> None:
        """Nothing is known of it until its contact changes, or the next throw."""
        self.position = UNKNOWN
        self.source = SOURCE_NONE

    def sample(self, closed_1: bool, closed_2: bool, equal: int) -> bool:
        """Take one sample of its contacts; True if what they steadily say has changed."""
        says = self._says(closed_1, closed_2)
        if says != self._candidate:
            self._candidate = says
            self._count = 0
        if says == DISAGREE:
            self.disagree_ms += 1
        else:
            self.disagree_ms = 0
        self._count += 1
        if self._count < equal or says == self.contact:
            return False
        self.contact = says
        return True

    @property
    def settled(self) -> bool:
        """True if more samples could not change anything, as long as its inputs stay."""
        return self.contact == self._candidate and (self._candidate != DISAGREE or self.disagree_ms > DISAGREE_MS)

    def believe_contact(self) -> None:
        """Take the contact's word for where it is."""
        if self.contact == NORMAL or self.contact == REVERSE:
            self.position = self.contact
            self.source = SEEN
        else:
            self.position = UNKNOWN
            self.source = SOURCE_NONE

    def _says(self, closed_1: bool, closed_2: bool) -> int:
        kind = self.settings.contact
        if kind == CONTACT_ONE:
            return REVERSE if closed_1 else NORMAL
        if closed_1 == closed_2:
            if kind == CONTACT_TWO and not closed_1:
                return UNKNOWN
            return DISAGREE
        return REVERSE if closed_1 else NORMAL


class Motors:
    """All motors, the rest of their coils, and the sampling of their contacts once a millisecond."""

    def __init__(self, settings: Settings, board: "Board") -> None:
        self._board = board
        self._equal = settings.timing.equal if settings.timing else 1
        self.all = [MotorState(motor) for motor in settings.motors]
        self._seen_by_contact = [motor for motor in self.all if motor.has_contact]
        # What was pulsed before a restart is not known: every coil rests from the start.
        self.rest = Marks(2 * len(self.all))
        for coil in range(2 * len(self.all)):
            self.rest.set(coil, board.ticks_ms())
        self._sampled = Marks(1)
        self._in_1 = -1
        self._in_2 = -1
        self.sampling = True

    def sweep(self, now_ms: int) -> None:
        """Keep marks right; once a tick."""
        self.rest.sweep(now_ms)

    def pulsed(self, motor: int, position: int, now_ms: int) -> None:
        """A coil of `motor` has just been pulsed."""
        self.rest.set(2 * motor + position, now_ms)

    def rest_left_ms(self, motor: int, position: int, now_ms: int) -> int:
        """How long that coil must still rest."""
        left = self.all[motor].settings.rest_ms - self.rest.since(2 * motor + position, now_ms)
        return left if left > 0 else 0

    def inputs_changed(self) -> bool:
        """True if any input differs from the last look."""
        in_1 = self._board.inputs(0)
        in_2 = self._board.inputs(1)
        changed = in_1 != self._in_1 or in_2 != self._in_2
        self._in_1 = in_1
        self._in_2 = in_2
        return changed

    def closed(self, number: int) -> bool:
        """True if that input is closed (as of the last look)."""
        if number < 0:
            return False
        if number < 24:
            return (self._in_1 >> number) & 1 == 1
        return (self._in_2 >> (number - 24)) & 1 == 1

    def due(self, now_ms: int) -> bool:
        """True if it is time for a sample of the contacts."""
        if self._sampled.since(0, now_ms) < 1:
            return False
        self._sampled.set(0, now_ms)
        return True

    def sample(self, motor: MotorState) -> bool:
        """One sample of one motor's contacts; True if what they steadily say has changed."""
        settings = motor.settings
        return motor.sample(self.closed(settings.c1), self.closed(settings.c2), self._equal)

    @property
    def with_contacts(self) -> "list[MotorState]":
        """The motors that something sees."""
        return self._seen_by_contact
