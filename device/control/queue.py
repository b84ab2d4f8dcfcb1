"""The queue: accepts throws and routes, cancels, stops. What is started when: see dispatch.

One pulse a bank at a time; banks are independent. On a bank the oldest throw goes first; one that waits for anything
but the voltage lets others pass.
"""

from device.control.dispatch import Dispatch
from device.control.firing import Firing
from device.control.forecast import Forecast
from device.control.memory import RequestMemory
from device.control.obstacles import Obstacles
from device.control.outbox import Outbox
from device.control.plant import Plant
from device.control.throws import RouteRun, Throw, Throws, passed_ms
from shared_protocol import messages
from shared_protocol.words import (
    CANCELLED,
    DONE,
    FROM_HOST,
    REFUSED,
    THROW_WAITING,
    WHY_NO_SUCH_ROUTE,
    WHY_OK,
    WHY_QUEUE_FULL,
    WHY_ROUTE_FAILED,
    WHY_STOP,
)

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board

# A throw asked for now may miss the tick that follows its acceptance by noise; after this it is refused.
NOW_GRACE_MS = 20
# A route's deadline grows by its wait for each throw; limits stay far below a quarter period of ticks.
LONGEST_LIMIT_MS = 4_000_000


class Queue:
    """Throws and routes of one plant."""

    def __init__(
        self,
        plant: Plant,
        board: "Board",
        outbox: Outbox,
        memory: RequestMemory,
        firing: Firing,
        throws: Throws,
    ) -> None:
        self._plant = plant
        self._outbox = outbox
        self._memory = memory
        self._firing = firing
        self.throws = throws
        self._obstacles = Obstacles(plant, firing, throws)
        self.forecast = Forecast(plant, firing, throws)
        self.dispatch = Dispatch(plant, board, firing, throws, self._obstacles, self.forecast)

    # ---- requests

    def throw(self, number: int, origin: int, junction: int, lie: int, wait_ms: int, now_ms: int) -> None:
        """Ask for one throw; `number` 0 if it is not the host's. `wait_ms` 0: now or not at all."""
        if number and self._memory.repeated(number):
            return
        if number:
            self._memory.begin(number, False)
        why = self._obstacles.not_possible(junction, lie)
        if why == WHY_OK and self.throws.free() < 1:
            why = WHY_QUEUE_FULL
        if why != WHY_OK:
            self.throws.refuse(number, 0, junction, lie, REFUSED, why, -1, self._obstacles.which, -1)
            return
        pulses = self._firing.plan.count(junction, lie)
        throw = self.throws.add(number, 0, origin, junction, lie, wait_ms, pulses, now_ms)
        self._firing.aim(throw)
        if wait_ms == 0:
            throw.now = True
            throw.limit_ms = NOW_GRACE_MS
            if self.dispatch.see(throw, now_ms) != WHY_OK:
                self.dispatch.refuse(throw, now_ms)
                return
        self._tell_taken(throw, self.forecast.of(throw, now_ms))

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
                why = self._obstacles.not_possible(listed[2 * step], listed[2 * step + 1])
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
        self._foresee(now_ms)
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
            self._tell_taken(throw, self.forecast.add(throw, now_ms))
        first = self.throws.order[self.throws.count - of]
        if wait_ms == 0:
            if self.dispatch.see(first, now_ms) != WHY_OK and not self._obstacles.seen_already(first):
                run.outcome = REFUSED
                run.why = self._obstacles.why
                self.dispatch.refuse(first, now_ms)
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

    def _foresee(self, now_ms: int) -> None:
        """Begin a forecast with all that waits."""
        self.forecast.begin(now_ms)
        for place in range(self.throws.count):
            throw = self.throws.order[place]
            if throw.state == THROW_WAITING:
                self.forecast.add(throw, now_ms)

    def _tell_taken(self, throw: Throw, due_ms: int) -> None:
        values = self._outbox.plain(messages.TAKEN)
        values[0] = throw.id
        values[1] = throw.step
        values[2] = throw.junction
        values[3] = throw.lie
        values[4] = throw.origin
        values[5] = due_ms

    # ---- each tick

    def tick(self, now_ms: int) -> None:
        """Judge what was fired; start what may start."""
        self._firing.judge(now_ms)
        self.dispatch.tick(now_ms)
