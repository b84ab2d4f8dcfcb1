"""Gives pulses and judges them: by the bank's drop, then by the contacts of the motors.

The only place that starts a pulse. It checks every mask and width against what the settings allow.
"""

from device.control import recharge
from device.control.motors import DISAGREE, UNKNOWN, MotorState
from device.control.outbox import Outbox
from device.control.plant import Plant
from device.control.pulses import PulsePlan
from device.control.throws import Throw, Throws, passed_ms
from device.control.ticks import elapsed
from shared_protocol import messages
from shared_protocol.words import (
    CANCELLED,
    DONE,
    FAILED,
    HELD_DOWN,
    NO_DROP,
    SCOPE_JUNCTION,
    SEEN,
    THROW_ANSWER,
    THROW_PULSE,
    THROW_WAITING,
    WHY_ARRIVED,
    WHY_CONTACTS_DISAGREE,
    WHY_FORBIDDEN,
    WHY_HELD_DOWN,
    WHY_KEPT_ON,
    WHY_NO_CONTACT,
    WHY_NO_DROP,
    WHY_ONE_OF_TWO,
    WHY_SEEN,
    WHY_SENT,
    WHY_STOP,
)

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board

# If no fresh sample comes for so long after a pulse, it is judged by what was read while it ran.
JUDGE_ANYWAY_MS = 300
# Smaller drops are noise.
NOISE_MV = 120
# A drop below this share of the expected one, in percent: the coil is open.
NO_DROP_PERCENT = 40
# A motor that ends its own pulse and yet takes this share did not end it.
KEPT_ON_PERCENT = 85

# What the drop of a pulse tells.
_GOOD, _OPEN, _SHORTED, _KEPT_ON, _ONE_MISSING = 0, 1, 2, 3, 4


class Firing:
    """The pulses of one plant."""

    def __init__(self, plant: Plant, board: "Board", outbox: Outbox, throws: Throws) -> None:
        self._plant = plant
        self._board = board
        self._outbox = outbox
        self._throws = throws
        self.plan = PulsePlan(plant)
        self._on_bank: "list[Throw | None]" = [None] * len(plant.banks)
        # Pulses that run or are not judged yet; throws whose contacts are waited for; pulses so far.
        self.running = 0
        self.answering = 0
        self.fired = 0
        self._answers_ms = -1

    def aim(self, throw: Throw) -> None:
        """Note which bank the next pulse of `throw` needs."""
        self.plan.make(throw.junction, throw.lie, throw.place, throw.raise_mv)
        throw.bank = self.plan.bank

    # ---- facts for the queue

    def running_left_ms(self, bank: int, now_ms: int) -> int:
        """How long the pulse that runs on `bank`, and the gap after it, will still take."""
        throw = self._on_bank[bank]
        gap_ms = self._plant.settings.banks[bank].gap_ms
        if throw is None:
            return gap_ms
        left = throw.width_us // 1000 + gap_ms - elapsed(now_ms, throw.pulse_ms)
        return left if left > 0 else 1

    def in_gap(self, bank: int, now_ms: int) -> bool:
        """True if the pulse is over and only the gap runs."""
        throw = self._on_bank[bank]
        return throw is None or elapsed(now_ms, throw.pulse_ms) > throw.width_us // 1000

    def after_running_mv(self, bank: int) -> int:
        """What the bank should hold when the pulse that runs is over."""
        throw = self._on_bank[bank]
        gate = self._plant.banks[bank]
        if throw is None or gate.before_mv < 0:
            return gate.mean_mv
        return gate.before_mv - recharge.drop_mv(gate.settings, throw.cohm, gate.before_mv, throw.width_us)

    def rest_left_ms(self, throw: Throw, plan: PulsePlan, now_ms: int) -> int:
        """How long the coils of `plan`, the next pulse of `throw`, must still rest."""
        junction = self._plant.junctions[throw.junction]
        at = junction.settings.lies[throw.lie].at
        longest = 0
        place = 0
        for motor in junction.settings.motors:
            if plan.place < 0 or place == plan.place:
                left = self._plant.motors.rest_left_ms(motor, (at >> place) & 1, now_ms)
                if left > longest:
                    longest = left
            place += 1
        return longest

    def too_early(self, motor: MotorState, after_ms: int, now_ms: int) -> bool:
        """True if a pulse of that motor has begun less than `after_ms` ago: its contacts do not count yet."""
        for throw in self._on_bank:
            if throw is not None and throw.state == THROW_PULSE and throw.junction == motor.junction:
                return elapsed(now_ms, throw.pulse_ms) < after_ms
        return False

    @property
    def busy(self) -> bool:
        """True while a pulse runs or is not judged yet."""
        return self.running > 0

    # ---- starting

    def start(self, throw: Throw, plan: PulsePlan, now_ms: int) -> None:
        """Give the pulse that `plan` holds for `throw`. If the hardware refuses, the throw goes on waiting."""
        if self._on_bank[plan.bank] is not None:
            # The pulse before is over, but not judged yet: it must not be forgotten.
            return
        gate = self._plant.banks[plan.bank]
        mean_mv = self._board.bank_mean_mv(plan.bank)
        if mean_mv < 0 or mean_mv > gate.most_mv:
            # More than the supply can give is no reading to fire by.
            return
        width_us = plan.width_us(mean_mv)
        if not self._plant.allowed[plan.bank].allows(plan.group, plan.mask, width_us):
            self._throws.finish(throw, FAILED, WHY_FORBIDDEN, throw.junction, passed_ms(throw, now_ms))
            return
        if not self._board.start_pulse(plan.bank, plan.group, plan.mask, width_us):
            return
        self.fired += 1
        throw.mv = mean_mv
        gate.pulse_begins(throw.junction, mean_mv)
        self._plant.watches[plan.bank].begin(True)
        throw.state = THROW_PULSE
        throw.fired = True
        throw.bank = plan.bank
        throw.pulse_ms = now_ms
        throw.width_us = width_us
        throw.cohm = plan.cohm
        throw.motor_place = plan.place
        self._on_bank[plan.bank] = throw
        self.running += 1
        self._move_motors(throw, now_ms)
        run = throw.route
        if run is not None:
            run.paused = True
            run.pulse_ms = now_ms
        self._throws.stir()
        values = self._outbox.plain(messages.PULSE)
        values[0] = plan.bank
        values[1] = throw.junction
        values[2] = plan.group
        values[3] = plan.mask
        values[4] = width_us
        values[5] = throw.mv

    def _move_motors(self, throw: Throw, now_ms: int) -> None:
        junction = self._plant.junctions[throw.junction]
        at = junction.settings.lies[throw.lie].at
        throw.were = 0
        place = 0
        for motor in junction.motors:
            if throw.motor_place < 0 or place == throw.motor_place:
                throw.were |= motor.position << (2 * place)
                motor.pulse_begins()
                self._plant.motors.pulsed(motor.settings.i, (at >> place) & 1, now_ms)
            place += 1
        self._plant.motors.sampling = True
        junction.moving = True
        junction.refresh()

    # ---- judging

    def judge(self, now_ms: int) -> None:
        """Judge pulses that are over, and contacts that had time to answer."""
        if self.running:
            self._judge_pulses(now_ms)
        if self.answering and now_ms != self._answers_ms:
            self._answers_ms = now_ms
            place = 0
            while place < self._throws.count:
                throw = self._throws.order[place]
                if throw.state != THROW_ANSWER or not self._judge_answer(throw, now_ms):
                    place += 1

    def _judge_pulses(self, now_ms: int) -> None:
        for bank in range(len(self._on_bank)):
            throw = self._on_bank[bank]
            if throw is None:
                continue
            gate = self._plant.banks[bank]
            if gate.running:
                continue
            late_ms = elapsed(now_ms, throw.pulse_ms) - throw.width_us // 1000
            if gate.fresh or late_ms >= JUDGE_ANYWAY_MS:
                self._on_bank[bank] = None
                self.running -= 1
                self._judge_drop(throw, now_ms)

    def _judge_drop(self, throw: Throw, now_ms: int) -> None:
        gate = self._plant.banks[throw.bank]
        before_mv = gate.before_mv
        drop_mv = before_mv - gate.lowest_mv
        throw.after_mv = gate.lowest_mv if gate.lowest_mv > 0 else 0
        gate.pulse_judged()
        self._plant.watches[throw.bank].begin(True)
        expected_mv = recharge.drop_mv(gate.settings, throw.cohm, before_mv, throw.width_us)
        says = self._drop_says(throw, drop_mv, expected_mv, before_mv)
        if says == _SHORTED:
            self._out(throw, HELD_DOWN, throw.after_mv, before_mv - expected_mv, WHY_HELD_DOWN, now_ms)
        elif says == _KEPT_ON:
            self._lose(throw, WHY_KEPT_ON, throw.junction, now_ms)
        elif says == _OPEN and self._ends_own(throw):
            self._open_coil(throw, drop_mv, expected_mv, now_ms)
        elif says == _OPEN or says == _ONE_MISSING:
            self._out(throw, NO_DROP, drop_mv, expected_mv, WHY_NO_DROP, now_ms)
        else:
            self._note_open(throw, False)
            throw.state = THROW_ANSWER
            self.answering += 1
            self._judge_answer(throw, now_ms)

    def _drop_says(self, throw: Throw, drop_mv: int, expected_mv: int, before_mv: int) -> int:
        left_mv = before_mv - expected_mv
        if left_mv > 600 and throw.after_mv * 5 < left_mv:
            return _SHORTED
        if self._ends_own(throw):
            if drop_mv < max(expected_mv >> 3, NOISE_MV):
                return _OPEN
            if drop_mv * 100 > expected_mv * KEPT_ON_PERCENT and not self._has_contact(throw):
                return _KEPT_ON
            return _GOOD
        if drop_mv < max(expected_mv * NO_DROP_PERCENT // 100, NOISE_MV):
            return _OPEN
        coils = self._coils(throw)
        if coils > 1:
            gate = self._plant.banks[throw.bank]
            fewer_mv = recharge.drop_mv(gate.settings, throw.cohm * coils // (coils - 1), before_mv, throw.width_us)
            # Only where the pulse is short enough to tell: a long one empties the bank through one coil as well.
            if expected_mv - fewer_mv > expected_mv // 4 and drop_mv < (expected_mv + fewer_mv) >> 1:
                return _ONE_MISSING
        return _GOOD

    def _first_motor(self, throw: Throw) -> MotorState:
        return self._plant.junctions[throw.junction].motors[throw.motor_place if throw.motor_place > 0 else 0]

    def _ends_own(self, throw: Throw) -> bool:
        return throw.motor_place >= 0 and self._first_motor(throw).settings.ends == 1

    def _has_contact(self, throw: Throw) -> bool:
        return self._first_motor(throw).has_contact

    def _coils(self, throw: Throw) -> int:
        """How many coils the pulse went into, motors in parallel counted."""
        if throw.motor_place >= 0:
            return self._first_motor(throw).settings.parallel
        coils = 0
        for motor in self._plant.junctions[throw.junction].motors:
            coils += motor.settings.parallel
        return coils

    def _target(self, throw: Throw, place: int) -> int:
        return (self._plant.junctions[throw.junction].settings.lies[throw.lie].at >> place) & 1

    def _note_open(self, throw: Throw, is_open: bool) -> bool:
        """Remember whether the coil read open (one motor only); True if both coils do by now."""
        if throw.motor_place < 0:
            return False
        motor = self._first_motor(throw)
        if not is_open:
            motor.open_coils = 0
            return False
        motor.open_coils |= 1 << self._target(throw, throw.motor_place)
        return motor.open_coils == 3

    def _open_coil(self, throw: Throw, drop_mv: int, expected_mv: int, now_ms: int) -> None:
        """A motor that ends its own pulse took none: meant to be so on the side where it lies already."""
        both = self._note_open(throw, True)
        target = self._target(throw, throw.motor_place)
        was = (throw.were >> (2 * throw.motor_place)) & 3
        if both:
            self._out(throw, NO_DROP, drop_mv, expected_mv, WHY_NO_DROP, now_ms)
        elif self._has_contact(throw) or was == target or was == UNKNOWN:
            throw.state = THROW_ANSWER
            self.answering += 1
            self._judge_answer(throw, now_ms)
        else:
            # It was sent to the other side, but people move points by hand: only both coils open is a fault.
            self._lose(throw, WHY_NO_DROP, self._first_motor(throw).settings.i, now_ms)

    def _judge_answer(self, throw: Throw, now_ms: int) -> bool:
        """True if the throw is no longer answering (its place in the order may be another's now)."""
        junction = self._plant.junctions[throw.junction]
        waiting = False
        answer_ms = 0
        place = 0
        for motor in junction.motors:
            if (throw.motor_place < 0 or place == throw.motor_place) and motor.has_contact:
                if motor.contact != self._target(throw, place):
                    waiting = True
                if motor.settings.answer_ms > answer_ms:
                    answer_ms = motor.settings.answer_ms
            place += 1
        if waiting and elapsed(now_ms, throw.pulse_ms) < answer_ms + throw.width_us // 1000:
            return False
        self.answering -= 1
        if waiting:
            self._no_answer(throw, now_ms)
        else:
            self._arrived(throw, now_ms)
        return True

    def _settle_motors(self, throw: Throw) -> int:
        """Set each pulsed motor to what is known of it; returns how many contacts saw their motor arrive."""
        junction = self._plant.junctions[throw.junction]
        arrived = 0
        place = 0
        for motor in junction.motors:
            if throw.motor_place < 0 or place == throw.motor_place:
                target = self._target(throw, place)
                if not motor.has_contact:
                    motor.was_sent(target)
                elif motor.contact == target:
                    motor.believe_contact()
                    arrived += 1
                else:
                    motor.lost()
            place += 1
        return arrived

    def _arrived(self, throw: Throw, now_ms: int) -> None:
        self._settle_motors(throw)
        throw.place += 1
        throw.raise_mv = 0
        if throw.place < throw.pulses:
            self._wait_again(throw, now_ms)
            return
        junction = self._plant.junctions[throw.junction]
        for motor in junction.motors:
            if motor.has_contact:
                motor.believe_contact()
        junction.moving = False
        junction.refresh()
        why = WHY_SENT
        if junction.source == SEEN:
            why = WHY_SEEN
        elif self._ends_own(throw) and self._first_motor(throw).open_coils == 0:
            why = WHY_ARRIVED
        self._throws.finish(throw, DONE, why, -1, passed_ms(throw, now_ms))

    def _wait_again(self, throw: Throw, now_ms: int) -> None:
        """The next pulse of the same throw."""
        if self._plant.stopped:
            self._end(throw, CANCELLED, WHY_STOP, -1, now_ms)
            return
        throw.state = THROW_WAITING
        throw.begun_ms = now_ms
        throw.limit_ms = self._plant.timing.wait_ms
        self.aim(throw)
        self._throws.stir()

    def _no_answer(self, throw: Throw, now_ms: int) -> None:
        junction = self._plant.junctions[throw.junction]
        if junction.settings.retry_mv and throw.raise_mv == 0 and not self._plant.stopped:
            throw.raise_mv = junction.settings.retry_mv
            self._wait_again(throw, now_ms)
            return
        which = -1
        disagree = False
        place = 0
        for motor in junction.motors:
            pulsed = throw.motor_place < 0 or place == throw.motor_place
            if pulsed and motor.has_contact and motor.contact != self._target(throw, place):
                which = motor.settings.i
                disagree = disagree or motor.contact == DISAGREE
            place += 1
        arrived = self._settle_motors(throw)
        why = WHY_NO_CONTACT
        if disagree:
            why = WHY_CONTACTS_DISAGREE
        elif throw.motor_place < 0 and arrived:
            why = WHY_ONE_OF_TWO
        self._end(throw, FAILED, why, which, now_ms)

    def _lose(self, throw: Throw, why: int, which: int, now_ms: int) -> None:
        """The pulse did not do what it should: nothing is known of the motors."""
        place = 0
        for motor in self._plant.junctions[throw.junction].motors:
            if throw.motor_place < 0 or place == throw.motor_place:
                motor.lost()
            place += 1
        self._end(throw, FAILED, why, which, now_ms)

    def _out(self, throw: Throw, code: int, first: int, second: int, why: int, now_ms: int) -> None:
        near = self._first_motor(throw).settings.i
        self._plant.faults.report(SCOPE_JUNCTION, throw.junction, code, first, second, near)
        self._lose(throw, why, throw.junction, now_ms)

    def _end(self, throw: Throw, outcome: int, why: int, which: int, now_ms: int) -> None:
        self._throws.finish(throw, outcome, why, which, passed_ms(throw, now_ms))
