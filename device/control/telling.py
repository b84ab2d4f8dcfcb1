"""Telemetry, and answers of many lines (status, settings): in a tick no more than the outbox has room for."""

from device.control.outbox import Outbox
from device.control.plant import Plant
from device.control.queue import Queue
from device.control.throws import Throw
from device.control.ticks import LONG_AGO, Marks
from shared_protocol import messages
from shared_protocol.words import THROW_WAITING

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board

# As in device.board.seam.
LOOP_US, WORST_US, COLLECT_US, ADC_HZ, HEAP_FREE = 0, 1, 2, 3, 4
_BANKS, _EXPECT, _SECOND = 0, 1, 2
EXPECT_MS = 500
EXPECT_SOON_MS = 200
_NOT_TELLING = -1
_NOTHING = -1


class Teller:
    """Tells the host how things are."""

    def __init__(self, board: "Board", outbox: Outbox) -> None:
        self._board = board
        self._outbox = outbox
        self._marks = Marks(3)
        self._place = _NOT_TELLING
        self._sending = False
        # Of the telemetry that is being sent: the next bank, the next throw.
        self._next_bank = _NOTHING
        self._next_throw = _NOTHING
        self._trace_bank = _NOTHING
        self._trace_point = 0
        self._points = [0] * messages.POINTS_A_LINE
        self._loop_s = 0
        self.up_s = 0
        self.bad_lines = 0

    def sweep(self, now_ms: int) -> None:
        """Count the seconds since the boot; keep marks right. Once a tick."""
        passed = self._marks.since(_SECOND, now_ms)
        if passed >= 1000:
            self._marks.set(_SECOND, now_ms)
            if passed != LONG_AGO:
                self.up_s += passed // 1000
        self._marks.sweep(now_ms)

    # ---- traces

    def begin_trace(self, bank: int) -> None:
        """Send the discharge of a bank's last pulse, a line of points whenever the link is idle."""
        self._trace_bank = bank
        self._trace_point = 0

    def _tell_points(self) -> None:
        """The next points. There is one list for them: the line before must be out."""
        outbox = self._outbox
        if not outbox.quiet or outbox.to_send:
            return
        board = self._board
        bank = self._trace_bank
        first = self._trace_point
        left = board.trace_points(bank) - first
        if left <= 0:
            self._trace_bank = _NOTHING
            values = outbox.plain(messages.END)
            values[0] = messages.ASK_TRACE
            return
        points = self._points
        for place in range(messages.POINTS_A_LINE):
            # The last line is filled up: a list that shrinks would have to grow again, in the tick.
            mv = board.trace_mv(bank, first + place) if place < left else -1
            points[place] = mv if mv > 0 else 0
        self._trace_point = first + len(points)
        values = outbox.plain(messages.POINTS)
        values[0] = bank
        values[1] = first
        values[2] = board.trace_step_us()
        values[3] = points

    # ---- answers of many lines

    def begin_status(self) -> None:
        """Tell everything, from the next tick on."""
        self._place = 0

    def begin_settings(self) -> None:
        """Send the records one by one, as they are given, then the end."""
        self._sending = True

    @property
    def sending_settings(self) -> bool:
        """True while settings are on their way."""
        return self._sending

    @property
    def telling(self) -> bool:
        """True while a long answer is on its way."""
        return self._place != _NOT_TELLING or self._sending

    @property
    def telemetry(self) -> bool:
        """True while lines of telemetry are still to come."""
        return self._next_bank >= 0 or self._next_throw >= 0 or self._trace_bank >= 0

    @property
    def wants_record(self) -> bool:
        """True if the next record can be sent: reading it from flash allocates, so that is not the tick's."""
        return self._sending and self._outbox.quiet

    def give_record(self, body: bytes) -> None:
        """Send one record; an empty one ends them."""
        if body:
            self._outbox.raw(body)
            return
        self._sending = False
        values = self._outbox.plain(messages.END)
        values[0] = messages.ASK_SETTINGS

    def tick(self, plant: "Plant | None", queue: "Queue | None", now_ms: int) -> None:
        """Go on with a status; begin telemetry when it is due."""
        if self._place != _NOT_TELLING:
            if self._outbox.has_room():
                self._tell_next(plant, queue, now_ms)
            return
        if plant is None or queue is None or not self._outbox.open:
            return
        if self._marks.since(_BANKS, now_ms) >= plant.tell_ms:
            self._marks.set(_BANKS, now_ms)
            self._next_bank = 0
        if self._next_bank >= 0:
            self._tell_one_bank(plant, queue, now_ms)
        elif self._next_throw >= 0:
            self._tell_one_throw(queue, now_ms)
        elif self._trace_bank >= 0:
            self._tell_points()
        elif queue.throws.count:
            since_ms = self._marks.since(_EXPECT, now_ms)
            if since_ms >= EXPECT_MS or (queue.throws.changed and since_ms >= EXPECT_SOON_MS):
                queue.throws.changed = False
                self._marks.set(_EXPECT, now_ms)
                queue.forecast.begin(now_ms)
                self._next_throw = 0

    def _tell_one_bank(self, plant: Plant, queue: Queue, now_ms: int) -> None:
        """One line of telemetry: a bank's, after the last bank the board's."""
        number = self._next_bank
        self._next_bank = number + 1
        if not self._fits():
            self._next_bank = _NOTHING
            return
        if number < len(plant.banks):
            self._tell_bank(plant, number, now_ms)
            return
        self._next_bank = _NOTHING
        self._tell_state(plant, queue)
        if self.up_s != self._loop_s:
            self._loop_s = self.up_s
            self._tell_loop()

    def _tell_loop(self) -> None:
        """How the loop goes, from a board that knows."""
        board = self._board
        mean_us = board.figure(LOOP_US)
        if mean_us < 0:
            return
        values = self._outbox.plain(messages.LOOP)
        values[0] = mean_us
        values[1] = board.figure(WORST_US)
        values[2] = board.figure(COLLECT_US)
        values[3] = board.figure(ADC_HZ)
        values[4] = board.figure(HEAP_FREE)

    def _tell_one_throw(self, queue: Queue, now_ms: int) -> None:
        """One line of what the queue expects."""
        place = self._next_throw
        if place >= queue.throws.count:
            self._next_throw = _NOTHING
            return
        self._next_throw = place + 1
        throw = queue.throws.order[place]
        due_ms = queue.forecast.add(throw, now_ms) if throw.state == THROW_WAITING else 0
        if self._fits():
            self._tell_expect(throw, due_ms)

    def _fits(self) -> bool:
        """True if there is room for telemetry; counts what is dropped."""
        if self._outbox.has_room():
            return True
        self._outbox.dropped += 1
        return False

    def due_ms(self, plant: "Plant | None", now_ms: int) -> int:
        """How long until telemetry is due."""
        if plant is None or not self._outbox.open:
            return 1000
        left = plant.tell_ms - self._marks.since(_BANKS, now_ms)
        return left if left > 0 else 0

    def _tell_next(self, plant: "Plant | None", queue: "Queue | None", now_ms: int) -> None:
        """One line of the status: state, banks, junctions, queue, faults, end."""
        place = self._place
        self._place += 1
        if plant is not None and queue is not None:
            if place == 0:
                self._tell_state(plant, queue)
                return
            place -= 1
            if place < len(plant.banks):
                self._tell_bank(plant, place, now_ms)
                return
            place -= len(plant.banks)
            if place < len(plant.junctions):
                plant.junctions[place].tell()
                return
            place -= len(plant.junctions)
            if place < queue.throws.count:
                throw = queue.throws.order[place]
                self._tell_expect(throw, queue.forecast.of(throw, now_ms) if throw.state == THROW_WAITING else 0)
                return
            self._tell_faults(plant)
        self._place = _NOT_TELLING
        values = self._outbox.plain(messages.END)
        values[0] = messages.ASK_STATUS

    def _tell_faults(self, plant: Plant) -> None:
        for scope in range(3):
            codes = plant.faults.codes[scope]
            for number in range(len(codes)):
                if codes[number]:
                    plant.faults.tell(scope, number)

    def _tell_bank(self, plant: Plant, number: int, now_ms: int) -> None:
        gate = plant.banks[number]
        age_ms = gate.age_ms(now_ms)
        values = self._outbox.plain(messages.BANK)
        values[0] = number
        values[1] = gate.mean_mv
        values[2] = age_ms
        values[3] = gate.state(now_ms, plant.faults.bank_out(number))
        values[4] = gate.ms_until(gate.top_ready_mv)

    def _tell_state(self, plant: Plant, queue: Queue) -> None:
        values = self._outbox.plain(messages.STATE)
        values[0] = 1 if plant.stopped else 0
        values[1] = queue.throws.count
        values[2] = self.up_s
        values[3] = self._outbox.dropped
        values[4] = self.bad_lines
        values[5] = self._board.inputs(0)
        values[6] = self._board.inputs(1)

    def _tell_expect(self, throw: Throw, due_ms: int) -> None:
        values = self._outbox.plain(messages.EXPECT)
        values[0] = throw.id
        values[1] = throw.step
        values[2] = throw.junction
        values[3] = throw.lie
        values[4] = throw.origin
        values[5] = throw.state
        values[6] = due_ms
