"""The queue: accepts throws and routes, decides which pulse is next, and what stands in the way.

One pulse a bank at a time; banks are independent. On a bank the oldest throw goes first; one that waits for anything
but the voltage lets others pass.
"""

from device.control import recharge
from device.control.firing import Firing
from device.control.memory import RequestMemory
from device.control.outbox import Outbox
from device.control.plant import Plant
from device.control.throws import RouteRun, Throw, Throws, passed_ms
from device.control.ticks import elapsed
from shared_protocol import messages
from shared_protocol.settings_table import AS_LISTED, FULLEST
from shared_protocol.words import (
    CANCELLED,
    DONE,
    EXPIRED,
    FAILED,
    FROM_HOST,
    REFUSED,
    SEEN,
    THROW_PULSE,
    THROW_WAITING,
    WHY_ALREADY,
    WHY_BANK_OUT,
    WHY_BELOW_READY,
    WHY_FORBIDDEN,
    WHY_GAP,
    WHY_JUNCTION_OUT,
    WHY_LONGEST_WAIT,
    WHY_NO_SUCH_JUNCTION,
    WHY_NO_SUCH_LIE,
    WHY_NO_SUCH_ROUTE,
    WHY_NOT_WHILE,
    WHY_OK,
    WHY_PULSE_RUNNING,
    WHY_QUEUE_FULL,
    WHY_QUEUED_AHEAD,
    WHY_RESTING,
    WHY_ROUTE_FAILED,
    WHY_STALE,
    WHY_STOP,
)

# A throw asked for now may miss the tick that follows its acceptance by noise; after this it is refused.
NOW_GRACE_MS = 20
# A route's deadline grows by its wait for each throw; limits stay far below a quarter period of ticks.
LONGEST_LIMIT_MS = 4_000_000


class Queue:
    """Throws and routes of one plant."""

    def __init__(self, plant: Plant, outbox: Outbox, memory: RequestMemory, firing: Firing, throws: Throws) -> None:
        self._plant = plant
        self._outbox = outbox
        self._memory = memory
        self._firing = firing
        self.throws = throws
        # What `_blocked` and `estimate_ms` found; several results without a tuple.
        self._why = WHY_OK
        self._which = -1
        self._banks = list(range(len(plant.banks)))
        # True while settings are being written to flash: nothing fires until that is over.
        self.held = False

    # ---- requests

    def throw(self, number: int, origin: int, junction: int, lie: int, wait_ms: int, now_ms: int) -> None:
        """Ask for one throw; `number` 0 if it is not the host's. `wait_ms` 0: now or not at all."""
        if number and self._memory.repeated(number):
            return
        if number:
            self._memory.begin(number, False)
        why = self._not_possible(junction, lie)
        if why == WHY_OK and self.throws.free() < 1:
            why = WHY_QUEUE_FULL
        if why != WHY_OK:
            self.throws.refuse(number, 0, junction, lie, REFUSED, why, -1, self._which, -1)
            return
        pulses = self._firing.plan.count(junction, lie)
        throw = self.throws.add(number, 0, origin, junction, lie, wait_ms, pulses, now_ms)
        self._firing.aim(throw)
        if wait_ms == 0:
            throw.now = True
            throw.limit_ms = NOW_GRACE_MS
            self._blocked(throw, now_ms)
            if self._why != WHY_OK:
                self._refuse_now(throw, now_ms)
                return
        self._tell_taken(throw, now_ms)

    def route(self, number: int, origin: int, route: int, wait_ms: int, now_ms: int) -> None:
        """Ask for a route; `wait_ms` is for each throw, 0: the first throw now, the others as the settings say."""
        if number and self._memory.repeated(number):
            return
        if number:
            self._memory.begin(number, True)
        settings = self._plant.settings
        if route < 0 or route >= len(settings.routes):
            self.throws.tell_route(number, route, REFUSED, WHY_NO_SUCH_ROUTE, 0, 0)
            return
        listed = settings.routes[route].throws
        of = len(listed) // 2
        why = WHY_OK
        run = self.throws.free_run()
        if run is None or self.throws.free() < of:
            why = WHY_QUEUE_FULL
        for step in range(of):
            if why == WHY_OK:
                why = self._not_possible(listed[2 * step], listed[2 * step + 1])
        if why != WHY_OK or run is None:
            self.throws.tell_route(number, route, REFUSED, why, 0, of)
            return
        self._begin_route(run, number, origin, route, wait_ms, now_ms)

    def _begin_route(self, run: RouteRun, number: int, origin: int, route: int, wait_ms: int, now_ms: int) -> None:
        listed = self._plant.settings.routes[route].throws
        of = len(listed) // 2
        run.used = True
        run.id = number
        run.number = route
        run.origin = origin
        run.left = of
        run.of = of
        run.done = 0
        run.outcome = DONE
        run.why = WHY_OK
        run.paused = False
        each_ms = wait_ms if wait_ms else self._plant.timing.wait_ms
        for step in range(of):
            limit_ms = (each_ms + self._plant.timing.pause_ms) * (step + 1)
            junction = listed[2 * step]
            lie = listed[2 * step + 1]
            throw = self.throws.add(
                number, step + 1, origin, junction, lie, min(limit_ms, LONGEST_LIMIT_MS),
                self._firing.plan.count(junction, lie), now_ms,
            )  # fmt: skip
            throw.route = run
            self._firing.aim(throw)
            self._tell_taken(throw, now_ms)
        first = self.throws.order[self.throws.count - of]
        if wait_ms == 0:
            self._blocked(first, now_ms)
            if self._why != WHY_OK and not self._seen_already(first):
                run.outcome = REFUSED
                run.why = self._why
                self._refuse_now(first, now_ms)
                self.throws.cancel_route(run, WHY_ROUTE_FAILED, now_ms)

    def cancel(self, number: int, why: int, now_ms: int) -> bool:
        """Cancel what waits under that number; False if nothing does."""
        found = False
        place = 0
        while place < self.throws.count:
            throw = self.throws.order[place]
            if throw.id == number and throw.state == THROW_WAITING:
                found = True
                self.throws.finish(throw, CANCELLED, why, -1, passed_ms(throw, now_ms))
            else:
                place += 1
        return found

    def cancel_waiting(self, why: int, of_host_only: bool, now_ms: int) -> None:
        """Cancel all that waits, or all of the host's."""
        place = 0
        while place < self.throws.count:
            throw = self.throws.order[place]
            if throw.state == THROW_WAITING and (not of_host_only or throw.origin == FROM_HOST):
                self.throws.finish(throw, CANCELLED, why, -1, passed_ms(throw, now_ms))
            else:
                place += 1

    def stop(self, now_ms: int) -> None:
        """The operator's stop: nothing further fires; a pulse that runs ends by itself."""
        self._plant.stopped = True
        self.cancel_waiting(WHY_STOP, False, now_ms)

    def _not_possible(self, junction: int, lie: int) -> int:
        """Why no such throw can be accepted, WHY_OK if it can; `_which` names what is concerned."""
        self._which = -1
        plant = self._plant
        if junction < 0 or junction >= len(plant.junctions):
            return WHY_NO_SUCH_JUNCTION
        state = plant.junctions[junction]
        if lie < 0 or lie >= len(state.settings.lies):
            return WHY_NO_SUCH_LIE
        if self._plant.stopped:
            return WHY_STOP
        if plant.faults.junction_out(junction):
            self._which = junction
            return WHY_JUNCTION_OUT
        for motor in state.motors:
            if plant.faults.bank_out(motor.settings.bank):
                self._which = motor.settings.bank
                return WHY_BANK_OUT
        if plant.motors.closed(state.settings.bar):
            self._which = state.settings.bar
            return WHY_NOT_WHILE
        return WHY_OK

    def _refuse_now(self, throw: Throw, now_ms: int) -> None:
        why = self._why
        which = self._which
        ms = self.estimate_ms(throw, now_ms)
        throw.mv = self._plant.banks[throw.bank].mean_mv
        self.throws.finish(throw, REFUSED, why, which, ms)

    def _tell_taken(self, throw: Throw, now_ms: int) -> None:
        values = self._outbox.plain(messages.TAKEN)
        values[0] = throw.id
        values[1] = throw.step
        values[2] = throw.junction
        values[3] = throw.lie
        values[4] = throw.origin
        values[5] = self.estimate_ms(throw, now_ms)

    def _seen_already(self, throw: Throw) -> bool:
        """True if a throw of a route has nothing to do: its lie is seen (never on the strength of a pulse sent)."""
        junction = self._plant.junctions[throw.junction]
        return throw.route is not None and not throw.fired and junction.source == SEEN and junction.lie == throw.lie

    # ---- what stands in the way

    def _blocked(self, throw: Throw, now_ms: int) -> None:
        """Set `_why` to what keeps the next pulse of `throw` from starting now (WHY_OK: nothing) and `_which`."""
        plant = self._plant
        plan = self._firing.plan
        plan.make(throw.junction, throw.lie, throw.place, throw.raise_mv)
        throw.bank = plan.bank
        self._why = self._not_possible(throw.junction, throw.lie)
        if self._why != WHY_OK:
            return
        gate = plant.banks[plan.bank]
        self._which = plan.bank
        if gate.running:
            self._why = WHY_GAP if self._firing.in_gap(plan.bank, now_ms) else WHY_PULSE_RUNNING
        elif self.throws.earlier_of_junction(throw):
            self._which = throw.junction
            self._why = WHY_QUEUED_AHEAD
        elif not self._may_make(throw):
            self._which = throw.junction
            self._why = WHY_FORBIDDEN
        elif throw.now and self._ahead(throw):
            self._why = WHY_QUEUED_AHEAD
        elif self._firing.rest_left_ms(throw, now_ms) > 0:
            self._why = WHY_RESTING
        elif not gate.fresh or not gate.plausible:
            self._why = WHY_STALE
        elif not gate.allows(plan.ready_mv):
            self._why = WHY_BELOW_READY
        else:
            self._which = -1

    def _ahead(self, throw: Throw) -> bool:
        """True if an earlier throw waits for the same bank."""
        for place in range(self.throws.count):
            other = self.throws.order[place]
            if other is throw:
                return False
            if other.state == THROW_WAITING and other.bank == throw.bank:
                return True
        return False

    def _may_make(self, throw: Throw) -> bool:
        plan = self._firing.plan
        junction = self._plant.junctions[throw.junction]
        if plan.place < 0:
            return True
        position = (junction.settings.lies[throw.lie].at >> plan.place) & 1
        return junction.may_make(plan.place, position)

    def estimate_ms(self, throw: Throw, now_ms: int) -> int:
        """Expected time until the next pulse of `throw`, after those ahead of it on its bank; -1 if unknown."""
        plan = self._firing.plan
        plan.make(throw.junction, throw.lie, throw.place, throw.raise_mv)
        bank = plan.bank
        gate = self._plant.banks[bank]
        mv = gate.mean_mv
        if mv < 0 or self._plant.faults.bank_out(bank):
            return recharge.NEVER
        time_ms = 0
        if gate.running:
            time_ms = self._firing.running_left_ms(bank, now_ms)
            mv = self._firing.after_running_mv(bank)
        for place in range(self.throws.count):
            other = self.throws.order[place]
            if other.state != THROW_WAITING:
                continue
            plan.make(other.junction, other.lie, other.place, other.raise_mv)
            if plan.bank != bank:
                if other is throw:
                    break
                continue
            wait_ms = recharge.ms_until(gate.settings, mv, plan.ready_mv)
            if wait_ms < 0:
                return recharge.NEVER
            rest_ms = self._firing.rest_left_ms(other, now_ms) - time_ms
            if rest_ms > wait_ms:
                mv = recharge.charged_mv(gate.settings, mv, rest_ms)
                wait_ms = rest_ms
            elif mv < plan.ready_mv:
                mv = plan.ready_mv
            time_ms += wait_ms
            if other is throw:
                break
            width_us = plan.width_us(mv)
            mv -= recharge.drop_mv(gate.settings, plan.cohm, mv, width_us)
            time_ms += width_us // 1000 + gate.settings.gap_ms
        return time_ms

    # ---- each tick

    def tick(self, now_ms: int) -> None:
        """Move every throw on; start what may start."""
        self._firing.judge(now_ms)
        if self.throws.count == 0:
            return
        self._end_impossible(now_ms)
        run = self.throws.failed_run()
        if run is not None:
            self.throws.cancel_route(run, WHY_ROUTE_FAILED, now_ms)
        if not self._plant.stopped and not self.held:
            self._arrange_banks()
            for bank in self._banks:
                if not self._plant.banks[bank].running:
                    self._start_one(bank, now_ms)

    def _end_impossible(self, now_ms: int) -> None:
        """Waiting throws: out of time, out of use, or nothing to do."""
        place = 0
        while place < self.throws.count:
            throw = self.throws.order[place]
            if throw.state != THROW_WAITING or not self._ended(throw, now_ms):
                place += 1

    def _ended(self, throw: Throw, now_ms: int) -> bool:
        if self._seen_already(throw) and self._its_turn(throw, now_ms) and not self.throws.earlier_of_junction(throw):
            self.throws.finish(throw, DONE, WHY_ALREADY, -1, passed_ms(throw, now_ms))
            return True
        why = self._not_possible(throw.junction, throw.lie)
        if why == WHY_BANK_OUT or why == WHY_JUNCTION_OUT:
            self.throws.finish(throw, FAILED, why, self._which, passed_ms(throw, now_ms))
            return True
        if elapsed(now_ms, throw.begun_ms) <= throw.limit_ms:
            return False
        self._blocked(throw, now_ms)
        if throw.now and not throw.fired:
            self._refuse_now(throw, now_ms)
            return True
        throw.mv = self._plant.banks[throw.bank].mean_mv
        # The reason why it waited so long tells more than the clock.
        why = self._why
        if why == WHY_OK or why == WHY_BELOW_READY or why == WHY_QUEUED_AHEAD:
            why = WHY_LONGEST_WAIT
        self.throws.finish(throw, FAILED if throw.fired else EXPIRED, why, self._which, passed_ms(throw, now_ms))
        return True

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
        """Start the first throw of a bank that may start."""
        for place in range(self.throws.count):
            throw = self.throws.order[place]
            if throw.state != THROW_WAITING:
                continue
            plan = self._firing.plan
            plan.make(throw.junction, throw.lie, throw.place, throw.raise_mv)
            if plan.bank != bank or not self._its_turn(throw, now_ms):
                continue
            self._blocked(throw, now_ms)
            if self._why == WHY_OK:
                self._firing.start(throw, now_ms)
                if throw.state == THROW_PULSE:
                    return
            elif self._why == WHY_BELOW_READY or self._why == WHY_STALE:
                return

    def _its_turn(self, throw: Throw, now_ms: int) -> bool:
        """A route's pause, and its order where the settings keep it."""
        run = throw.route
        if run is None or throw.fired:
            return True
        if run.outcome != DONE:
            return False
        if run.paused and elapsed(now_ms, run.pulse_ms) < self._plant.timing.pause_ms:
            return False
        if self._plant.route_order != AS_LISTED:
            return True
        for place in range(self.throws.count):
            other = self.throws.order[place]
            if other is throw:
                return True
            if other.route is run and other.state == THROW_WAITING:
                return False
        return True
