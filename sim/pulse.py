"""The equations of motion while a pulse runs, and one classical fourth-order Runge-Kutta step of them.

State: the capacitors' voltages; energy supplied, circuit heat and friction heat; then for each moving or
fed motor the flux linkages of its coils, plunger position and speed, and the heat in its coils. Flux linkage
is the state, not current, so the back-EMF of a moving plunger needs no term of its own:
``d(lambda)/dt = u - R i`` with ``i = lambda / L(x)``. Within a step every switch (driver, contact, stop, sign of
friction) stays as it is; the caller ends steps where one changes.
"""

import math
from dataclasses import dataclass, field

from sim.motor import Motor
from sim.network import Network

SUPPLIED, CIRCUIT_HEAT, FRICTION_HEAT = range(3)  # offsets behind the capacitors
FLUX_0, FLUX_1, PLACE, SPEED, HEAT_0, HEAT_1 = range(6)  # offsets within a motor's part
MOTOR_STATES = 6

SHORT_INDUCTANCE_SHARE = 0.01  # of the winding's, for a short across it and its leads

FREE, LOW, HIGH = range(3)  # which end stop the plunger touches


@dataclass
class ActiveMotor:
    """One motor with the switches that hold during a step.

    fed: per coil, driver on, winding whole, contact closed. closed: per coil, end-of-travel contact.
    coil_ohm, joint_ohm: per coil. shorted: per coil; the short carries all current, the plunger feels none of it.
    sign: direction in which friction is overcome (+1, -1), 0 at rest. stop: end stop touched.
    """

    index: int
    motor: Motor
    bank: int
    fed: list[bool]
    closed: list[bool]
    driven: list[bool]
    coil_ohm: list[float]
    joint_ohm: list[float]
    shorted: list[bool]
    sign: int = 0
    stop: int = FREE
    at: int = 0  # where its part of the state begins
    swing_h: float = field(init=False)
    moving_n: float = field(init=False)
    stick_n: float = field(init=False)

    def __post_init__(self) -> None:
        self.swing_h = self.motor.parameters.inductance_swing_h()
        self.moving_n = self.motor.parameters.moving_friction_n * self.motor.friction_factor
        self.stick_n = self.motor.stick_force()

    def inductance(self, coil: int, place_m: float) -> float:
        """Return a coil's inductance, henry, with the plunger at a place, metre."""
        if self.shorted[coil]:
            return self.motor.parameters.inductance_out_h * SHORT_INDUCTANCE_SHARE
        return self.motor.inductance_at(coil, place_m)

    def push(self, place_m: float, flux_0: float, flux_1: float) -> float:
        """Return all force on a resting plunger but friction, newton towards reverse."""
        p = self.motor.parameters
        force = self.motor.passive_force(place_m)
        for coil, flux in ((0, flux_0), (1, flux_1)):
            if flux != 0.0 and not self.shorted[coil]:
                travel = place_m if coil else p.stroke_m - place_m
                gradient = self.swing_h / p.inductance_length_m * math.exp(-travel / p.inductance_length_m)
                pull = 0.5 * (flux / self.inductance(coil, place_m)) ** 2 * gradient
                force += pull if coil else -pull
        if self.stop == LOW:
            force -= p.stop_stiffness_n_per_m * place_m
        elif self.stop == HIGH:
            force -= p.stop_stiffness_n_per_m * (place_m - p.stroke_m)
        return force


class Equations:
    """The right-hand side for one setting of the switches."""

    def __init__(self, network: Network, motors: list[ActiveMotor]) -> None:
        self.network = network
        self.motors = motors
        self.banks = len(network.banks)
        at = self.banks + 3
        for motor in motors:
            motor.at = at
            at += MOTOR_STATES
        self.size = at

    def slopes(self, state: list[float]) -> list[float]:
        """Return the time derivative of the state."""
        n = self.banks
        slope = [0.0] * self.size
        fed_a = [0.0] * n
        coils: list[tuple[ActiveMotor, int, float]] = []
        for active in self.motors:
            self._motion(active, state, slope, coils, fed_a)
        open_v, terminal_v, motor_v, driver_a = self._voltages(state, coils, fed_a)
        node_v, charge_a = self.network.charge(open_v)
        supply_a = 0.0
        heat = 0.0
        for b, bank in enumerate(self.network.banks):
            i = charge_a[b]
            terminal_v[b] += bank.drop_ohm * i
            motor_v[b] += bank.drop_ohm * i
            v = terminal_v[b]
            supply_a += i
            leak_a = bank.leak_s * v
            inward = i - leak_a - fed_a[b]
            slope[b] = inward / bank.capacitance_f
            heat += i * (node_v - v) + leak_a * v + bank.esr_ohm * inward * inward \
                + bank.common_ohm * fed_a[b] * fed_a[b]
        heat += self.network.source_ohm * supply_a * supply_a
        for k, (active, coil, i) in enumerate(coils):
            heat += self._coil(active, coil, i, driver_a[k], motor_v[active.bank], slope)
        slope[n] = self.network.voltage_v * supply_a if self.network.charging else 0.0
        slope[n + 1] = heat
        return slope

    def look(self, state: list[float]) -> tuple[list[float], float]:
        """Return the banks' terminal voltages, volt, and the supply's current, ampere, in a state."""
        fed_a = [0.0] * self.banks
        coils: list[tuple[ActiveMotor, int, float]] = []
        unused = [0.0] * self.size
        for active in self.motors:
            self._motion(active, state, unused, coils, fed_a)
        open_v, terminal_v, _, _ = self._voltages(state, coils, fed_a)
        _, charge_a = self.network.charge(open_v)
        lifted = [v + bank.drop_ohm * i
                  for v, bank, i in zip(terminal_v, self.network.banks, charge_a, strict=True)]
        return lifted, sum(charge_a)

    def _motion(self, active: ActiveMotor, state: list[float], slope: list[float],
                coils: list[tuple[ActiveMotor, int, float]], fed_a: list[float]) -> None:
        """Add the plunger's part of the slopes, and list the coils with their currents."""
        p = active.motor.parameters
        at = active.at
        x = state[at + 2]
        v = state[at + 3]
        length = p.inductance_length_m
        force = 0.0
        moving = active.sign != 0
        for coil in (0, 1):
            flux = state[at + coil]
            if flux != 0.0 or active.fed[coil]:
                if active.shorted[coil]:
                    near = 0.0
                    i = flux / (p.inductance_out_h * SHORT_INDUCTANCE_SHARE)
                else:
                    near = math.exp(-(x if coil else p.stroke_m - x) / length)
                    i = flux / (p.inductance_out_h + active.swing_h * (1.0 - near))
                coils.append((active, coil, i))
                if active.fed[coil]:
                    fed_a[active.bank] += i
                if moving:
                    pull = 0.5 * i * i * active.swing_h / length * near
                    force += pull if coil else -pull
        if not moving:
            return
        drag = p.viscous_n_s_per_m
        if active.stop == LOW:
            force -= p.stop_stiffness_n_per_m * x
            drag += p.stop_damping_n_s_per_m
        elif active.stop == HIGH:
            force -= p.stop_stiffness_n_per_m * (x - p.stroke_m)
            drag += p.stop_damping_n_s_per_m
        force -= (p.detent_force_n * math.cos(math.pi * x / p.stroke_m) + p.preload_n + p.spring_n_per_m * x)
        friction = active.sign * active.moving_n
        slope[at + 2] = v
        slope[at + 3] = (force - drag * v - friction) / p.mass_kg
        slope[self.banks + 2] += drag * v * v + friction * v

    def _voltages(self, state: list[float], coils: list[tuple[ActiveMotor, int, float]], fed_a: list[float],
                  ) -> tuple[list[float], list[float], list[float], list[float]]:
        """Return, before any charge current, each bank's open, terminal and motor-side voltage, and driver currents.

        A flyback diode also conducts while its driver is on, once the bank has swung below zero: the coil then
        keeps its current and the bank is spared. ``fed_a`` is corrected for that.
        """
        open_v, motor_v = [], []
        driver_a = [i if active.fed[coil] else 0.0 for active, coil, i in coils]
        for b, bank in enumerate(self.network.banks):
            v = bank.share * state[b] - bank.drop_ohm * fed_a[b]
            m = v - bank.common_ohm * fed_a[b]
            if bank.diode_v is not None and m < 0.2 and fed_a[b] != 0.0:
                source_ohm = bank.drop_ohm + bank.common_ohm
                path_ohm = bank.driver_ohm + bank.diode_ohm
                conductance, total = 0.0, 0.0
                held = []
                for k, (active, coil, i) in enumerate(coils):
                    if active.bank != b or not active.fed[coil]:
                        continue
                    if m - bank.driver_ohm * i < -bank.diode_v:
                        held.append(k)
                        conductance += 1.0 / path_ohm
                        total += (bank.diode_v + bank.diode_ohm * i) / path_ohm
                    else:
                        total += i
                if held:
                    m = (bank.share * state[b] - source_ohm * total) / (1.0 + source_ohm * conductance)
                    for k in held:
                        i = coils[k][2]
                        driver_a[k] = (m + bank.diode_v + bank.diode_ohm * i) / path_ohm
                    fed_a[b] = total + conductance * m
                    v = m + bank.common_ohm * fed_a[b]
            open_v.append(v)
            motor_v.append(m)
        return open_v, list(open_v), motor_v, driver_a

    def _coil(self, active: ActiveMotor, coil: int, i: float, driver_a: float, motor_v: float,
              slope: list[float]) -> float:
        """Add one coil's part of the slopes; return the heat outside its winding, watt."""
        bank = self.network.banks[active.bank]
        diode_a = i - driver_a
        heat = bank.driver_ohm * driver_a * driver_a
        if active.fed[coil] and diode_a == 0.0:
            across = motor_v - bank.driver_ohm * i
        else:
            across = -((bank.diode_v or 0.0) + bank.diode_ohm * diode_a)
            heat -= diode_a * across
            if active.fed[coil]:
                # The charge current lifts the motor side a little above what the diode holds: book the difference.
                heat += driver_a * (motor_v - bank.driver_ohm * driver_a - across)
        joint = active.joint_ohm[coil]
        winding = active.coil_ohm[coil]
        slope[active.at + coil] = across - (winding + joint) * i
        slope[active.at + 4 + coil] = winding * i * i
        return heat + joint * i * i


def runge_kutta(equations: Equations, state: list[float], slope: list[float], step_s: float) -> list[float]:
    """Return the state one step later; ``slope`` is its slope at the start (classical fourth order)."""
    half = 0.5 * step_s
    second = equations.slopes([y + half * k for y, k in zip(state, slope)])  # noqa: B905 (speed)
    third = equations.slopes([y + half * k for y, k in zip(state, second)])  # noqa: B905
    fourth = equations.slopes([y + step_s * k for y, k in zip(state, third)])  # noqa: B905
    sixth = step_s / 6.0
    return [y + sixth * (a + 2.0 * (b + c) + d)
            for y, a, b, c, d in zip(state, slope, second, third, fourth)]  # noqa: B905


def hermite(state: list[float], slope: list[float], end: list[float], end_slope: list[float],
            step_s: float, share: float) -> list[float]:
    """Return the state at a share of a step (cubic through both ends with both slopes)."""
    a = share * share * (3.0 - 2.0 * share)
    b = step_s * share * (1.0 - share) ** 2
    c = step_s * share * share * (share - 1.0)
    return [y + a * (z - y) + b * k + c * m
            for y, k, z, m in zip(state, slope, end, end_slope)]  # noqa: B905
