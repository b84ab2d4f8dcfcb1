"""The bank gate: what a bank holds now, and whether a pulse may start on it.

The decision uses the lowest of the newest fresh samples: noise can only make a pulse later, never earlier. The state
shown to people has hysteresis, so that noise at the threshold does not make it flicker.
"""

from device.control import recharge
from device.control.ticks import Changes, Marks
from shared_protocol.settings import BankSettings, Settings
from shared_protocol.words import (
    BANK_CHARGING,
    BANK_CUT_OFF,
    BANK_OUT,
    BANK_PULSE,
    BANK_READY,
    BANK_SETTLING,
    BANK_STALE,
)

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board

_SINCE_FRESH = 0


class BankGate:
    """One bank. `look` before anything asks; `update` once a millisecond."""

    def __init__(self, number: int, settings: Settings, board: "Board", changes: Changes) -> None:
        self.number = number
        self.settings: "BankSettings" = settings.banks[number]
        self._board = board
        self._changes = changes
        self._hysteresis_mv = settings.timing.hysteresis_mv if settings.timing else 0
        self._marks = Marks(1)
        self.top_ready_mv = top_ready_mv(settings, number)
        self.low_mv = -1
        self.mean_mv = -1
        self.fresh = False
        # More than the supply can give is no reading to fire by (the watch makes a fault of it when it lasts).
        self.plausible = True
        self.most_mv = most_plausible_mv(self.settings)
        self.running = False
        self.charge_on = True
        self._shown_ready = False
        # The pulse that runs, or the last one.
        self.before_mv = -1
        self.lowest_mv = -1
        self.last_junction = -1

    def look(self) -> None:
        """Read the board: what a decision needs, and no more. Called in every tick in which the bank matters."""
        board = self._board
        number = self.number
        if self.running and not board.pulse_running(number):
            self.running = False
            self._changes.happened = True
        low_mv = board.bank_low_mv(number)
        self.low_mv = low_mv
        self.fresh = low_mv >= 0 and not self.running
        self.plausible = low_mv <= self.most_mv
        if self.before_mv >= 0:
            last_mv = board.bank_last_mv(number)
            if 0 <= last_mv < self.lowest_mv:
                self.lowest_mv = last_mv

    def update(self, now_ms: int) -> None:
        """Look, and keep what is shown to people."""
        self.look()
        if self.fresh:
            self.mean_mv = self._board.bank_mean_mv(self.number)
            self._marks.set(_SINCE_FRESH, now_ms)
            if self.low_mv >= self.top_ready_mv:
                self._shown_ready = True
            elif self.low_mv < self.top_ready_mv - self._hysteresis_mv:
                self._shown_ready = False
        self._marks.sweep(now_ms)

    def pulse_begins(self, junction: int, mean_mv: int) -> None:
        """A pulse has just been started on a bank that held `mean_mv`."""
        self.running = True
        self.fresh = False
        self.mean_mv = mean_mv
        self.before_mv = mean_mv
        self.lowest_mv = mean_mv
        self.last_junction = junction
        self._shown_ready = False

    def pulse_judged(self) -> None:
        """The last pulse's readings are used up."""
        self.before_mv = -1

    def allows(self, ready_mv: int) -> bool:
        """True if fresh samples are at or above `ready_mv` and no pulse or gap runs."""
        return self.fresh and self.plausible and not self.running and self.low_mv >= ready_mv

    def ms_until(self, ready_mv: int) -> int:
        """Expected time until `allows`, from the last mean; recharge.NEVER if it can't be told."""
        if self.mean_mv < 0:
            return recharge.NEVER
        from_mv = self.mean_mv
        if self.running:
            from_mv = self.lowest_mv
        return recharge.ms_until(self.settings, from_mv, ready_mv)

    def age_ms(self, now_ms: int) -> int:
        """Age of the last fresh reading."""
        return self._marks.since(_SINCE_FRESH, now_ms)

    def state(self, now_ms: int, out: bool) -> int:
        """The word of words.BANK_STATES."""
        if out:
            return BANK_OUT
        if self.running:
            return BANK_PULSE
        if not self.charge_on:
            return BANK_CUT_OFF
        if not self.fresh:
            return BANK_SETTLING if self.age_ms(now_ms) < 200 else BANK_STALE
        return BANK_READY if self._shown_ready else BANK_CHARGING


def most_plausible_mv(bank: BankSettings) -> int:
    """The highest reading that the supply could make, with 5 % and 0.3 V for divider and noise."""
    return bank.peak_mv + bank.peak_mv // 20 + 300


def top_ready_mv(settings: Settings, bank: int) -> int:
    """The highest ready voltage of any lie that fires this bank, a retry's raise included."""
    top_mv = 0
    for junction in settings.junctions:
        uses = False
        for motor in junction.motors:
            uses = uses or settings.motors[motor].bank == bank
        if not uses:
            continue
        for lie in junction.lies:
            if lie.ready_mv + junction.retry_mv > top_mv:
                top_mv = lie.ready_mv + junction.retry_mv
    return top_mv
