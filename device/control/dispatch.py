"""Which pulse is next: looks at the throws that wait, starts what may start, ends what can't be done any more.

Every throw is looked at when something has happened (plant.changes) or a time has come. In between only the voltages of
the banks that a throw waits for are compared: that is what makes the coil go on soon after the crossing.
"""

from device.control.firing import Firing
from device.control.obstacles import NO_TIME, Obstacles
from device.control.plant import Plant
from device.control.pulses import PulsePlan
from device.control.throws import Throw, Throws, passed_ms
from device.control.ticks import elapsed, later
from shared_protocol.settings_table import FULLEST
from shared_protocol.words import (
    DONE,
    EXPIRED,
    FAILED,
    REFUSED,
    THROW_PULSE,
    THROW_WAITING,
    WHY_ALREADY,
    WHY_BANK_OUT,
    WHY_BELOW_READY,
    WHY_JUNCTION_OUT,
    WHY_LONGEST_WAIT,
    WHY_OK,
    WHY_QUEUED_AHEAD,
    WHY_ROUTE_FAILED,
    WHY_STALE,
)

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board
    from device.control.forecast import Forecast

# All throws are looked at this often in any case.
LOOK_MS = 250
# A crossing is near from a 32nd of the full bank below it; then everything else waits, but only so long at a stretch.
NEAR_SHIFT = 5
HOLD_MS = 30


class Dispatch:
    """The pulses to come of one plant. `hot` is True while a throw waits for nothing but a voltage."""

    def __init__(
        self,
        plant: Plant,
        board: "Board",
        firing: Firing,
        throws: Throws,
        obstacles: Obstacles,
        forecast: "Forecast",
    ) -> None:
        self._board = board
        self._plant = plant
        self._firing = firing
        self._throws = throws
        self._obstacles = obstacles
        self._forecast = forecast
        self._banks = list(range(len(plant.banks)))
        self._plans = [PulsePlan(plant) for _ in self._banks]
        self._plan = PulsePlan(plant)
        # Of each bank: the throw whose only obstacle is the voltage.
        self._armed: "list[Throw | None]" = [None] * len(plant.banks)
        self.hot = False
        self.near = False
        self._near_ms = -1
        self._due_ms = 0
        self._left_ms = LOOK_MS
        # True while settings are being written to flash: nothing fires until that is over.
        self._held = False

    def hold(self, held: bool) -> None:
        """While `held` nothing is started."""
        if held != self._held:
            self._held = held
            self._plant.changes.happened = True

    def tick(self, now_ms: int) -> None:
        """Move every throw on; start what may start."""
        if self._throws.count == 0:
            self.hot = False
            self.near = False
            self._near_ms = -1
        elif self._plant.changes.happened or elapsed(now_ms, self._due_ms) >= 0:
            self._look_at_all(now_ms)
        elif self.hot:
            self._compare(now_ms)

    def _compare(self, now_ms: int) -> None:
        """Only the voltages can have changed since all throws were looked at: nothing else stands in the way."""
        board = self._board
        plans = self._plans
        for bank in self._banks:
            throw = self._armed[bank]
            if throw is None or not board.bank_reaches(bank, plans[bank].ready_mv):
                continue
            if self._plant.route_order == FULLEST:
                self._look_at_all(now_ms)
                return
            self._firing.start(throw, plans[bank], now_ms)
            self._plant.changes.happened = True

    def look_near(self, bank: int, now_ms: int) -> None:
        """See whether a crossing is near: then all that can wait should wait, for HOLD_MS at most."""
        throw = self._armed[bank]
        gate = self._plant.banks[bank]
        if throw is None or not gate.fresh:
            return
        if gate.mean_mv + (gate.settings.full_mv >> NEAR_SHIFT) >= self._plans[bank].ready_mv:
            if elapsed(now_ms, self._near_ms) >= 2 * HOLD_MS or self._near_ms < 0:
                self._near_ms = now_ms
                self.near = True

    def holds(self, now_ms: int) -> bool:
        """True while a crossing is so near that only it matters."""
        self.near = self.hot and self._near_ms >= 0 and 0 <= elapsed(now_ms, self._near_ms) < HOLD_MS
        return self.near

    def _look_at_all(self, now_ms: int) -> None:
        plant = self._plant
        # First: what happens from here on asks for another look.
        plant.changes.happened = False
        self._left_ms = LOOK_MS
        self._end_impossible(now_ms)
        run = self._throws.failed_run()
        if run is not None:
            self._throws.cancel_route(run, WHY_ROUTE_FAILED, now_ms)
        self.hot = False
        if not plant.stopped and not self._held:
            self._arrange_banks()
            for bank in self._banks:
                self._armed[bank] = None
                if not plant.banks[bank].running:
                    self._start_one(bank, now_ms)
        self._due_ms = later(now_ms, self._left_ms)

    def _look_again_in(self, ms: int) -> None:
        if 0 < ms < self._left_ms:
            self._left_ms = ms

    def _end_impossible(self, now_ms: int) -> None:
        """Waiting throws: out of time, out of use, or nothing to do."""
        place = 0
        while place < self._throws.count:
            throw = self._throws.order[place]
            if throw.state != THROW_WAITING or not self._ended(throw, now_ms):
                place += 1

    def _ended(self, throw: Throw, now_ms: int) -> bool:
        obstacles = self._obstacles
        if (
            obstacles.seen_already(throw)
            and obstacles.its_turn(throw, now_ms)
            and not self._throws.earlier_of_junction(throw)
        ):
            self._throws.finish(throw, DONE, WHY_ALREADY, -1, passed_ms(throw, now_ms))
            return True
        why = obstacles.not_possible(throw.junction, throw.lie)
        if why == WHY_BANK_OUT or why == WHY_JUNCTION_OUT:
            self._throws.finish(throw, FAILED, why, obstacles.which, passed_ms(throw, now_ms))
            return True
        left_ms = throw.limit_ms - elapsed(now_ms, throw.begun_ms)
        if left_ms >= 0:
            self._look_again_in(left_ms + 1)
            return False
        self._expire(throw, now_ms)
        return True

    def _expire(self, throw: Throw, now_ms: int) -> None:
        self.see(throw, now_ms)
        if throw.now and not throw.fired:
            self.refuse(throw, now_ms)
            return
        throw.mv = self._plant.banks[throw.bank].mean_mv
        # The reason why it waited so long tells more than the clock.
        why = self._obstacles.why
        if why == WHY_OK or why == WHY_BELOW_READY or why == WHY_QUEUED_AHEAD:
            why = WHY_LONGEST_WAIT
        outcome = FAILED if throw.fired else EXPIRED
        self._throws.finish(throw, outcome, why, self._obstacles.which, passed_ms(throw, now_ms))

    def see(self, throw: Throw, now_ms: int) -> int:
        """What keeps the next pulse of `throw` from starting now (also in the obstacles)."""
        plan = self._plan
        plan.make(throw.junction, throw.lie, throw.place, throw.raise_mv)
        throw.bank = plan.bank
        self._obstacles.look(throw, plan, now_ms)
        return self._obstacles.why

    def refuse(self, throw: Throw, now_ms: int) -> None:
        """End a throw that was asked for now and can't be done now: by what `see` has found."""
        why = self._obstacles.why
        which = self._obstacles.which
        ms = self._forecast.of(throw, now_ms)
        throw.mv = self._plant.banks[throw.bank].mean_mv
        self._throws.finish(throw, REFUSED, why, which, ms)

    def _arrange_banks(self) -> None:
        """Which bank is served first: matters where a route pauses between its pulses."""
        if self._plant.route_order != FULLEST:
            return
        banks = self._banks
        for place in range(1, len(banks)):
            here = place
            while here and self._plant.banks[banks[here]].low_mv > self._plant.banks[banks[here - 1]].low_mv:
                other = banks[here - 1]
                banks[here - 1] = banks[here]
                banks[here] = other
                here -= 1

    def _start_one(self, bank: int, now_ms: int) -> None:
        """Start the first throw of a bank that may start; or note the one that waits for the voltage."""
        obstacles = self._obstacles
        plan = self._plans[bank]
        for place in range(self._throws.count):
            throw = self._throws.order[place]
            if throw.state != THROW_WAITING or throw.bank != bank:
                continue
            if not obstacles.its_turn(throw, now_ms):
                self._look_again_in(obstacles.left_ms)
                continue
            plan.make(throw.junction, throw.lie, throw.place, throw.raise_mv)
            if self._try(throw, plan, now_ms):
                return
            if obstacles.why == WHY_BELOW_READY or obstacles.why == WHY_STALE:
                self._armed[bank] = throw
                self.hot = True
                return
            if obstacles.left_ms != NO_TIME:
                self._look_again_in(obstacles.left_ms)

    def _try(self, throw: Throw, plan: PulsePlan, now_ms: int) -> bool:
        """Start a pulse if nothing stands in its way; True if it runs."""
        self._obstacles.look(throw, plan, now_ms)
        if self._obstacles.why != WHY_OK:
            return False
        self._firing.start(throw, plan, now_ms)
        return throw.state == THROW_PULSE
