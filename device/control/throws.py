"""The slots of throws and routes, and how they end: every accepted throw ends in exactly one outcome."""

from device.control.memory import RequestMemory
from device.control.outbox import Outbox
from device.control.plant import Plant
from device.control.ticks import elapsed
from shared_protocol import messages
from shared_protocol.words import (
    CANCELLED,
    DONE,
    FROM_HOST,
    THROW_WAITING,
    WHY_OK,
)

THROWS = 32
ROUTES = 8

FREE = -1


class RouteRun:
    """A route that is being set."""

    def __init__(self) -> None:
        self.used = False
        self.id = 0
        self.number = 0
        self.origin = FROM_HOST
        self.left = 0
        self.done = 0
        self.of = 0
        self.outcome = DONE
        self.why = WHY_OK
        self.paused = False
        self.pulse_ms = 0


class Throw:
    """One throw. `state` is FREE or one of words.THROW_STATES."""

    def __init__(self) -> None:
        self.state = FREE
        self.id = 0
        self.step = 0
        self.origin = FROM_HOST
        self.junction = 0
        self.lie = 0
        self.now = False
        self.route: "RouteRun | None" = None
        # Times in millisecond ticks: accepted; begun to wait for its next pulse; its last pulse's begin.
        self.accepted_ms = 0
        self.begun_ms = 0
        self.limit_ms = 0
        self.pulse_ms = 0
        # Which pulse of its way is next, how many there are, and by how much its ready voltage is raised.
        self.place = 0
        self.pulses = 1
        self.raise_mv = 0
        self.fired = False
        # The pulse given last.
        self.bank = 0
        self.width_us = 0
        self.cohm = 1
        self.motor_place = 0
        self.mv = -1
        self.after_mv = -1
        # Where its motors were believed to be before the last pulse, two bits each.
        self.were = 0


class Throws:
    """All slots, in the order of acceptance."""

    def __init__(self, plant: Plant, outbox: Outbox, memory: RequestMemory) -> None:
        self._plant = plant
        self._outbox = outbox
        self._memory = memory
        self._slots = [Throw() for _ in range(THROWS)]
        # The first `count` of `order` are in use, oldest first; the rest are free.
        self.order = list(self._slots)
        self.count = 0
        self._runs = [RouteRun() for _ in range(ROUTES)]
        self.changed = False

    def stir(self) -> None:
        """Something has changed: tell the host, and look at all throws again."""
        self.changed = True
        self._plant.changes.happened = True

    def free(self) -> int:
        """How many slots are free."""
        return THROWS - self.count

    def free_run(self) -> "RouteRun | None":
        """A free route slot."""
        for run in self._runs:
            if not run.used:
                return run
        return None

    def add(
        self,
        number: int,
        step: int,
        origin: int,
        junction: int,
        lie: int,
        limit_ms: int,
        pulses: int,
        now_ms: int,
    ) -> Throw:
        """Take a slot; the caller has made sure that one is free."""
        throw = self.order[self.count]
        self.count += 1
        throw.state = THROW_WAITING
        throw.id = number
        throw.step = step
        throw.origin = origin
        throw.junction = junction
        throw.lie = lie
        throw.now = False
        throw.route = None
        throw.accepted_ms = now_ms
        throw.begun_ms = now_ms
        throw.limit_ms = limit_ms
        throw.place = 0
        throw.pulses = pulses
        throw.raise_mv = 0
        throw.fired = False
        throw.mv = -1
        throw.after_mv = -1
        state = self._plant.junctions[junction]
        state.waiting += 1
        state.wanted = lie
        self.stir()
        return throw

    def finish(self, throw: Throw, outcome: int, why: int, which: int, ms: int) -> None:
        """End a throw: tell the outcome, free the slot, count it in its route."""
        self.tell_outcome(
            throw.id, throw.step, throw.junction, throw.lie, outcome, why, ms, which, throw.mv, throw.after_mv
        )
        junction = self._plant.junctions[throw.junction]
        junction.waiting -= 1
        junction.troubled = outcome != DONE and throw.fired
        if throw.fired:
            junction.moving = False
            junction.refresh()
        self._free(throw)
        run = throw.route
        throw.route = None
        if run is not None:
            self._count_in(run, outcome, why)

    def refuse(
        self,
        number: int,
        step: int,
        junction: int,
        lie: int,
        outcome: int,
        why: int,
        ms: int,
        which: int,
        mv: int,
    ) -> None:
        """Tell the outcome of a throw that was never accepted."""
        self.tell_outcome(number, step, junction, lie, outcome, why, ms, which, mv, -1)

    def tell_outcome(
        self,
        number: int,
        step: int,
        junction: int,
        lie: int,
        outcome: int,
        why: int,
        ms: int,
        which: int,
        mv: int,
        after_mv: int,
    ) -> None:
        """Send one outcome message and remember it under its number."""
        values = self._outbox.kept(messages.OUTCOME)
        values[1] = number
        values[2] = step
        values[3] = junction
        values[4] = lie
        values[5] = outcome
        values[6] = why
        values[7] = ms
        values[8] = which
        values[9] = mv
        values[10] = after_mv
        if number and step == 0:
            self._memory.finish(number, values)

    def tell_route(self, number: int, route: int, outcome: int, why: int, done: int, of: int) -> None:
        """Send how a route ended and remember it under its number."""
        values = self._outbox.kept(messages.ROUTE_END)
        values[1] = number
        values[2] = route
        values[3] = outcome
        values[4] = why
        values[5] = done
        values[6] = of
        if number:
            self._memory.finish(number, values)

    def earlier_of_junction(self, throw: Throw) -> bool:
        """True if an earlier throw of the same junction is not finished."""
        for place in range(self.count):
            other = self.order[place]
            if other is throw:
                return False
            if other.junction == throw.junction:
                return True
        return False

    def cancel_route(self, run: RouteRun, why: int, now_ms: int) -> None:
        """End all throws of a route that wait."""
        place = 0
        while place < self.count:
            throw = self.order[place]
            if throw.route is run and throw.state == THROW_WAITING:
                throw.route = None
                run.left -= 1
                self.finish(throw, CANCELLED, why, -1, passed_ms(throw, now_ms))
            else:
                place += 1
        self._end_if_empty(run)

    def _count_in(self, run: RouteRun, outcome: int, why: int) -> None:
        run.left -= 1
        if outcome == DONE:
            run.done += 1
        elif run.outcome == DONE:
            run.outcome = outcome
            run.why = why
        self._end_if_empty(run)

    def _end_if_empty(self, run: RouteRun) -> None:
        if run.used and run.left == 0:
            run.used = False
            self.tell_route(run.id, run.number, run.outcome, run.why, run.done, run.of)

    def failed_run(self) -> "RouteRun | None":
        """A route whose throw ended badly and which still has throws waiting."""
        for place in range(self.count):
            throw = self.order[place]
            run = throw.route
            if run is not None and run.outcome != DONE and throw.state == THROW_WAITING:
                return run
        return None

    def _free(self, throw: Throw) -> None:
        throw.state = FREE
        self.stir()
        place = 0
        while self.order[place] is not throw:
            place += 1
        last = self.count - 1
        while place < last:
            self.order[place] = self.order[place + 1]
            place += 1
        self.order[last] = throw
        self.count = last


def passed_ms(throw: Throw, now_ms: int) -> int:
    """Milliseconds since the throw was accepted."""
    from_ticks = elapsed(now_ms, throw.accepted_ms)
    return from_ticks if from_ticks > 0 else 0
