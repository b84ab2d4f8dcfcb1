"""A pulse as a chain of fixed steps that end early where a switch, a stop or the friction changes.

The chain depends only on the state at its start and on its switches, never on when the caller looks at it:
what lies within a step is read off a cubic through both its ends. Hence the answers do not depend on how a
caller slices the time.
"""

import math

from sim.motor import Motor
from sim.network import Network
from sim.pulse import (
    FREE,
    HIGH,
    LOW,
    PLACE,
    SPEED,
    ActiveMotor,
    Equations,
    hermite,
    runge_kutta,
)

LONGEST_STEP_S = 1e-4
TIME_CONSTANT_SHARE = 0.15  # of the fastest time constant in the circuit, for one step
STOP_SHARE = 0.4  # an impact needs finer steps yet
EVENT_WINDOW_S = 1e-9
STILL_M_PER_S = 1e-5  # a plunger that creeps slower, with less force than breaks it away, rests
SETTLED_SHARE = 2.5e-4  # of the bank's voltage that a settled coil's inductance may still take
SETTLED_V = 2e-4
MOST_EVENTS_A_MOMENT = 1000


class PulseStuckError(RuntimeError):
    """The plunger changed its state endlessly without time passing; a fault of the simulator."""


Guard = tuple[str, ActiveMotor, int]


class PulseRun:
    """One pulse, from ``start_s``, second, and its ``state`` (as sim.pulse describes it)."""

    def __init__(self, network: Network, motors: list[ActiveMotor], start_s: float, state: list[float]) -> None:
        self.equations = Equations(network, motors)
        self.motors = motors
        self.start_s = start_s
        self.end_s = start_s
        self.interrupted_j = 0.0
        self._state = self._end_state = state
        self._slope: list[float] = []
        self._end_slope: list[float] | None = None
        self._events: list[Guard] = []
        self._events_here = 0
        self._prepare()
        self._step()

    def next_step(self) -> None:
        """Accept the step whose end has been reached and calculate the next."""
        events = self._events
        self._state = self._end_state
        self._slope = self._end_slope or []
        self._events_here = self._events_here + 1 if self.end_s == self.start_s else 0
        if self._events_here > MOST_EVENTS_A_MOMENT:
            raise PulseStuckError(f"no time passes at {self.start_s} s: {[e[0] for e in events]}")
        self.start_s = self.end_s
        if events:
            for event in events:
                self._apply(event)
        if self._bring_to_rest() or events:
            self._prepare()
        self._step()

    def view(self, time_s: float) -> list[float]:
        """Return the state at a time within the present step."""
        span = self.end_s - self.start_s
        if time_s >= self.end_s:
            return self._end_state
        if time_s <= self.start_s or span <= 0.0:
            return self._state
        if self._end_slope is None:
            self._end_slope = self.equations.slopes(self._end_state)
        return hermite(self._state, self._slope, self._end_state, self._end_slope, span,
                       (time_s - self.start_s) / span)

    def settled(self) -> bool:
        """Say whether, at the start of the present step, all is at rest and every current has settled."""
        state, slope, banks = self._state, self._slope, self.equations.network.banks
        for active in self.motors:
            if active.sign != 0:
                return False
            bank = banks[active.bank]
            allowed = SETTLED_SHARE * abs(state[active.bank]) + SETTLED_V
            for coil in (0, 1):
                if not active.fed[coil]:
                    if state[active.at + coil] != 0.0:
                        return False
                    continue
                lag_s = active.inductance(coil, state[active.at + PLACE]) / self._loop_ohm(active, coil)
                if abs(slope[active.at + coil]) > allowed or abs(slope[active.bank]) * lag_s > allowed:
                    return False
                if bank.diode_v is not None and state[active.bank] < -SETTLED_V:
                    return False
        return True

    def _loop_ohm(self, active: ActiveMotor, coil: int) -> float:
        return active.coil_ohm[coil] + active.joint_ohm[coil] + self.equations.network.banks[active.bank].driver_ohm

    def _prepare(self) -> None:
        """List what may end a step, and choose the step from the fastest time constant."""
        self._guards: list[Guard] = []
        self._step_s = LONGEST_STEP_S
        for b in self.equations.network.charging:
            bank = self.equations.network.banks[b]
            self._shorten(bank.capacitance_f / bank.charge_s)
        for active in self.motors:
            self._guard_plunger(active)
            for coil in (0, 1):
                flux = self._state[active.at + coil]
                if flux == 0.0 and not active.fed[coil]:
                    continue
                bank = self.equations.network.banks[active.bank]
                ohm = self._loop_ohm(active, coil) + bank.esr_ohm + bank.common_ohm
                self._shorten(active.inductance(coil, self._state[active.at + PLACE]) / ohm)
                self._shorten(bank.capacitance_f * ohm)
                if not active.fed[coil]:
                    self._guards.append(("current gone", active, coil))
        self._slope = self.equations.slopes(self._state)

    def _bring_to_rest(self) -> bool:
        """Stop plungers that only follow a fading current; without this they would creep for ever."""
        stopped = False
        for active in self.motors:
            speed = self._state[active.at + SPEED]
            if active.sign == 0 or abs(speed) >= STILL_M_PER_S:
                continue
            at = active.at
            if abs(active.push(self._state[at + PLACE], self._state[at], self._state[at + 1])) <= active.stick_n:
                self._state = list(self._state)
                self._state[at + SPEED] = 0.0
                active.sign = 0
                stopped = True
        return stopped

    def _shorten(self, time_constant_s: float) -> None:
        self._step_s = min(self._step_s, TIME_CONSTANT_SHARE * time_constant_s)

    def _guard_plunger(self, active: ActiveMotor) -> None:
        if active.sign == 0:
            if active.stick_n != math.inf:
                self._guards.append(("breaks away", active, 0))
            return
        p = active.motor.parameters
        drag = p.viscous_n_s_per_m
        if active.stop != FREE:
            self._shorten(STOP_SHARE * math.sqrt(p.mass_kg / p.stop_stiffness_n_per_m))
            drag += p.stop_damping_n_s_per_m
        if drag > 0.0:
            self._shorten(p.mass_kg / drag)
        self._guards.append(("turns", active, 0))
        if active.stop == FREE:
            self._guards += [("meets low", active, 0), ("meets high", active, 0)]
        else:
            self._guards.append(("leaves stop", active, 0))
        if p.ends_own_pulse:
            self._guards += [("contact", active, 0), ("contact", active, 1)]

    def _margin(self, guard: Guard, state: list[float]) -> float:
        """Return how far a guard is from acting; below zero it acts."""
        kind, active, coil = guard
        at = active.at
        x = state[at + PLACE]
        p = active.motor.parameters
        if kind == "turns":
            return active.sign * state[at + SPEED]
        if kind == "meets low":
            return x
        if kind == "meets high":
            return p.stroke_m - x
        if kind == "leaves stop":
            return -x if active.stop == LOW else x - p.stroke_m
        if kind == "contact":
            left = p.contact_travel * p.stroke_m - (x if coil else p.stroke_m - x)
            return left if active.closed[coil] else -left
        if kind == "current gone":
            return state[at + coil]
        return active.stick_n - abs(active.push(x, state[at], state[at + 1]))

    def _step(self) -> None:
        if not self._slope:
            self._slope = self.equations.slopes(self._state)
        step_s = self._step_s
        end = runge_kutta(self.equations, self._state, self._slope, step_s)
        self._events = [g for g in self._guards if self._margin(g, end) < 0.0]
        if self._events:
            step_s, end = self._locate(self._events[0], step_s, end)
            step_s, end = self._earliest(self._events[0], step_s, end)
        self._end_state = end
        self._end_slope = None
        self.end_s = self.start_s + step_s
        if not self._events:
            self._end_slope = self.equations.slopes(end)

    def _earliest(self, first: Guard, step_s: float, end: list[float]) -> tuple[float, list[float]]:
        """Shorten the step until nothing acts clearly before its end; keep all guards that act there."""
        while True:
            others = [g for g in self._guards if g is not first and self._margin(g, end) < 0.0]
            for other in others:
                earlier_s, earlier = self._locate(other, step_s, end)
                if step_s - earlier_s > 2.0 * EVENT_WINDOW_S:
                    first, step_s, end = other, earlier_s, earlier
                    break
            else:
                self._events = [first, *others]
                return step_s, end

    def _locate(self, guard: Guard, step_s: float, end: list[float]) -> tuple[float, list[float]]:
        """Return the shortest step after which the guard acts (false position, Illinois variant)."""
        low, high = 0.0, step_s
        at_low, at_high = self._margin(guard, self._state), self._margin(guard, end)
        while at_low <= 0.0:
            # It starts on its threshold: look for where it is clear of it, else it acts at once.
            if high - low < EVENT_WINDOW_S:
                return 0.0, list(self._state)
            middle = 0.5 * (low + high)
            state = runge_kutta(self.equations, self._state, self._slope, middle)
            margin = self._margin(guard, state)
            if margin < 0.0:
                high, at_high, end = middle, margin, state
            else:
                low, at_low = middle, margin
                if margin == 0.0:
                    break
        side = 0
        while high - low > EVENT_WINDOW_S:
            middle = (low * at_high - high * at_low) / (at_high - at_low)
            # Aim a little past the threshold, so that the far side closes in as well.
            middle = min(max(middle + 0.25 * EVENT_WINDOW_S, low + 0.5 * EVENT_WINDOW_S),
                         high - 0.25 * EVENT_WINDOW_S)
            state = runge_kutta(self.equations, self._state, self._slope, middle)
            margin = self._margin(guard, state)
            if margin < 0.0:
                high, at_high, end = middle, margin, state
                at_low = at_low * 0.5 if side == -1 else at_low
                side = -1
            else:
                low, at_low = middle, margin
                at_high = at_high * 0.5 if side == 1 else at_high
                side = 1
        return high, end

    def _apply(self, guard: Guard) -> None:
        kind, active, coil = guard
        state = self._state = list(self._state)
        at = active.at
        p = active.motor.parameters
        if kind in ("turns", "breaks away"):
            state[at + SPEED] = 0.0
            push = active.push(state[at + PLACE], state[at], state[at + 1])
            resting = kind == "turns" and abs(push) <= active.stick_n
            active.sign = 0 if resting else 1 if push > 0.0 else -1
        elif kind == "meets low":
            state[at + PLACE], active.stop = 0.0, LOW
        elif kind == "meets high":
            state[at + PLACE], active.stop = p.stroke_m, HIGH
        elif kind == "leaves stop":
            state[at + PLACE], active.stop = (0.0 if active.stop == LOW else p.stroke_m), FREE
        elif kind == "contact":
            active.closed[coil] = not active.closed[coil]
            active.fed[coil] = active.driven[coil] and active.closed[coil]
            if not active.closed[coil]:
                self.interrupted_j += 0.5 * state[at + coil] ** 2 / active.inductance(coil, state[at + PLACE])
                state[at + coil] = 0.0
        else:
            state[at + coil] = 0.0


def stop_touched(motor: Motor) -> int:
    """Return which end stop a motor's plunger is pressed into."""
    if motor.position_m < 0.0:
        return LOW
    return HIGH if motor.position_m > motor.parameters.stroke_m else FREE
