"""What stands in the way of a throw: why it can't be accepted, or why its next pulse can't start now."""

from device.control.firing import Firing
from device.control.plant import Plant
from device.control.pulses import PulsePlan
from device.control.throws import Throw, Throws
from device.control.ticks import elapsed
from shared_protocol.settings_table import AS_LISTED
from shared_protocol.words import (
    DONE,
    SEEN,
    THROW_WAITING,
    WHY_BANK_OUT,
    WHY_BELOW_READY,
    WHY_FORBIDDEN,
    WHY_GAP,
    WHY_JUNCTION_OUT,
    WHY_NO_SUCH_JUNCTION,
    WHY_NO_SUCH_LIE,
    WHY_NOT_WHILE,
    WHY_OK,
    WHY_PULSE_RUNNING,
    WHY_QUEUED_AHEAD,
    WHY_RESTING,
    WHY_STALE,
    WHY_STOP,
)

# No obstacle that time alone removes.
NO_TIME = -1


class Obstacles:
    """Answers in `why` (WHY_OK: nothing), `which` (number concerned, -1 none) and `left_ms` (when time removes it)."""

    def __init__(self, plant: Plant, firing: Firing, throws: Throws) -> None:
        self._plant = plant
        self._firing = firing
        self._throws = throws
        self.why = WHY_OK
        self.which = -1
        self.left_ms = NO_TIME

    def not_possible(self, junction: int, lie: int) -> int:
        """Why no such throw can be accepted, WHY_OK if it can; `which` names what is concerned."""
        self.which = -1
        plant = self._plant
        if junction < 0 or junction >= len(plant.junctions):
            return WHY_NO_SUCH_JUNCTION
        state = plant.junctions[junction]
        settings = state.settings
        if lie < 0 or lie >= len(settings.lies):
            return WHY_NO_SUCH_LIE
        if plant.stopped:
            return WHY_STOP
        faults = plant.faults
        if faults.junction_out(junction):
            self.which = junction
            return WHY_JUNCTION_OUT
        for motor in state.motors:
            bank = motor.settings.bank
            if faults.bank_out(bank):
                self.which = bank
                return WHY_BANK_OUT
        if settings.bar >= 0 and plant.motors.closed(settings.bar):
            self.which = settings.bar
            return WHY_NOT_WHILE
        return WHY_OK

    def look(self, throw: Throw, plan: PulsePlan, now_ms: int) -> None:
        """See what keeps the pulse of `plan`, the next one of `throw`, from starting now."""
        self.left_ms = NO_TIME
        self.why = self.not_possible(throw.junction, throw.lie)
        if self.why != WHY_OK:
            return
        bank = plan.bank
        gate = self._plant.banks[bank]
        gate.look()
        self.which = bank
        if gate.running:
            self.why = WHY_GAP if self._firing.in_gap(bank, now_ms) else WHY_PULSE_RUNNING
        elif self._throws.earlier_of_junction(throw):
            self.which = throw.junction
            self.why = WHY_QUEUED_AHEAD
        elif not self._may_make(throw, plan):
            self.which = throw.junction
            self.why = WHY_FORBIDDEN
        elif throw.now and self._ahead(throw):
            self.why = WHY_QUEUED_AHEAD
        elif self._rests(throw, plan, now_ms):
            self.why = WHY_RESTING
        elif not gate.fresh or not gate.plausible:
            self.why = WHY_STALE
        elif gate.low_mv < plan.ready_mv:
            self.why = WHY_BELOW_READY
        else:
            self.which = -1

    def _rests(self, throw: Throw, plan: PulsePlan, now_ms: int) -> bool:
        left_ms = self._firing.rest_left_ms(throw, plan, now_ms)
        if left_ms > 0:
            self.left_ms = left_ms
        return left_ms > 0

    def _ahead(self, throw: Throw) -> bool:
        """True if an earlier throw waits for the same bank."""
        for place in range(self._throws.count):
            other = self._throws.order[place]
            if other is throw:
                return False
            if other.state == THROW_WAITING and other.bank == throw.bank:
                return True
        return False

    def _may_make(self, throw: Throw, plan: PulsePlan) -> bool:
        junction = self._plant.junctions[throw.junction]
        if plan.place < 0 or not junction.settings.forbid:
            return True
        position = (junction.settings.lies[throw.lie].at >> plan.place) & 1
        return junction.may_make(plan.place, position)

    def seen_already(self, throw: Throw) -> bool:
        """True if a throw of a route has nothing to do: its lie is seen (never on the strength of a pulse sent)."""
        if throw.route is None or throw.fired:
            return False
        junction = self._plant.junctions[throw.junction]
        return junction.source == SEEN and junction.lie == throw.lie

    def its_turn(self, throw: Throw, now_ms: int) -> bool:
        """A route's pause, and its order where the settings keep it. Sets `left_ms` while the pause lasts."""
        self.left_ms = NO_TIME
        run = throw.route
        if run is None or throw.fired:
            return True
        if run.outcome != DONE:
            return False
        if run.paused:
            left_ms = self._plant.timing.pause_ms - elapsed(now_ms, run.pulse_ms)
            if left_ms > 0:
                self.left_ms = left_ms
                return False
            run.paused = False
        if self._plant.route_order != AS_LISTED:
            return True
        for place in range(self._throws.count):
            other = self._throws.order[place]
            if other is throw:
                return True
            if other.route is run and other.state == THROW_WAITING:
                return False
        return True
