"""The twin-coil turnout motor: parameters, named kinds, and the plunger's state.

The laws: the inductance of a coil rises with the plunger's travel ``s`` towards it as
``L(s) = L_out + (L_in - L_out) (1 - exp(-s / X)) / (1 - exp(-stroke / X))``; the pull is
``1/2 i**2 dL/ds`` (co-energy of a linear magnetic circuit, textbook electromechanics);
the over-centre spring gives ``-F cos(pi x / stroke)``, largest at both ends and zero at mid-stroke;
friction is Coulomb friction with a higher value at rest; the end stops are a spring and a damper.
"""

import math
import random
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Literal

NORMAL_COIL = 0
REVERSE_COIL = 1
END_ZONE = 0.10  # share of the stroke within which the points count as lying at an end
STICK_FLOOR_N = 1e-4  # so that a plunger without friction can come to rest at all
LEAST_FRICTION_FACTOR = 0.2

End = Literal["normal", "reverse"]
Position = Literal["normal", "reverse", "between"]


class MotorParameterError(ValueError):
    """A motor parameter is out of its physical range."""


@dataclass(frozen=True)
class MotorParameters:
    """What one twin-coil motor is made of; both coils are alike.

    resistance_ohm: winding resistance of each coil, ohm.
    inductance_out_h: inductance with the plunger at the far end, henry.
    inductance_in_h: inductance with the plunger fully in, henry.
    inductance_length_m: length of the exponential rise between them, metre.
    stroke_m: plunger travel between the stops, metre.
    mass_kg: plunger with everything it moves, kilogram.
    detent_force_n: over-centre spring, force at either end, newton; zero at mid-stroke.
    static_friction_n, moving_friction_n: friction at rest and in motion, newton.
    friction_scatter: relative standard deviation of the friction from throw to throw.
    stop_stiffness_n_per_m, stop_damping_n_s_per_m: the end stops, N/m and N s/m.
    ends_own_pulse: end-of-travel contacts open the coil that has done its work.
    contact_travel: share of the stroke after which such a contact opens.
    spring_n_per_m, preload_n: return spring towards normal (rate, force at normal); usually none.
    viscous_n_s_per_m: viscous drag, N s/m.

    Raises MotorParameterError for a value that no motor can have.
    """

    resistance_ohm: float
    inductance_out_h: float
    inductance_in_h: float
    inductance_length_m: float
    stroke_m: float
    mass_kg: float
    detent_force_n: float
    static_friction_n: float
    moving_friction_n: float
    friction_scatter: float
    stop_stiffness_n_per_m: float
    stop_damping_n_s_per_m: float
    ends_own_pulse: bool = False
    contact_travel: float = 0.95
    spring_n_per_m: float = 0.0
    preload_n: float = 0.0
    viscous_n_s_per_m: float = 0.0

    def __post_init__(self) -> None:
        for name in ("resistance_ohm", "inductance_out_h", "inductance_length_m", "stroke_m", "mass_kg",
                     "stop_stiffness_n_per_m"):
            if not getattr(self, name) > 0.0:
                raise MotorParameterError(f"{name} must be above zero, not {getattr(self, name)}")
        for name in ("detent_force_n", "static_friction_n", "moving_friction_n", "friction_scatter",
                     "stop_damping_n_s_per_m", "spring_n_per_m", "viscous_n_s_per_m"):
            if not getattr(self, name) >= 0.0:
                raise MotorParameterError(f"{name} must not be below zero, not {getattr(self, name)}")
        if self.inductance_in_h < self.inductance_out_h:
            raise MotorParameterError("inductance_in_h must not be below inductance_out_h")
        if self.moving_friction_n > self.static_friction_n:
            raise MotorParameterError("moving_friction_n must not be above static_friction_n")
        if not 0.5 < self.contact_travel < 1.0:
            raise MotorParameterError(f"contact_travel must lie between 0.5 and 1, not {self.contact_travel}")

    def inductance_swing_h(self) -> float:
        """Return the amplitude of the exponential rise, henry (its value for an endless stroke)."""
        span = self.inductance_in_h - self.inductance_out_h
        return span / -math.expm1(-self.stroke_m / self.inductance_length_m)


class Motor:
    """One motor and where its plunger is.

    ``position_m`` runs from 0 (normal) to the stroke (reverse); coil 0 pulls towards 0, coil 1 towards the
    stroke. Setting ``position_m``, ``velocity`` (m/s), ``jammed`` or ``friction_factor`` at any time is allowed;
    the circuit that holds the motor takes notice.
    """

    def __init__(self, parameters: MotorParameters, at: End = "normal") -> None:
        self.parameters = parameters
        self.on_change: Callable[[], None] | None = None
        self._position_m = 0.0
        self._velocity = 0.0
        self._jammed = False
        self._friction_factor = 1.0
        self._swing_h = parameters.inductance_swing_h()
        self.set_by_hand(at)

    @property
    def position_m(self) -> float:
        """Plunger position, metre; a few micrometres beyond an end while pressed into the stop."""
        return self._position_m

    @position_m.setter
    def position_m(self, value: float) -> None:
        self._position_m = value
        self._changed()

    @property
    def velocity(self) -> float:
        """Plunger speed towards reverse, m/s."""
        return self._velocity

    @velocity.setter
    def velocity(self, value: float) -> None:
        self._velocity = value
        self._changed()

    @property
    def jammed(self) -> bool:
        """Whether the mechanism is stuck fast where it is."""
        return self._jammed

    @jammed.setter
    def jammed(self, value: bool) -> None:
        self._jammed = value
        self._changed()

    @property
    def friction_factor(self) -> float:
        """What this throw's friction is multiplied with."""
        return self._friction_factor

    @friction_factor.setter
    def friction_factor(self, value: float) -> None:
        self._friction_factor = value
        self._changed()

    def _changed(self) -> None:
        if self.on_change is not None:
            self.on_change()

    def record(self, position_m: float, velocity: float) -> None:
        """Store where the circuit's own calculation has brought the plunger (no change from outside)."""
        self._position_m = position_m
        self._velocity = velocity

    def draw_friction(self, rng: random.Random) -> float:
        """Draw this throw's friction factor (normal about 1, never below 0.2) and return it."""
        scatter = self.parameters.friction_scatter
        if scatter > 0.0:
            self.friction_factor = max(LEAST_FRICTION_FACTOR, rng.gauss(1.0, scatter))
        return self._friction_factor

    def set_by_hand(self, to: End) -> None:
        """Move the points by hand: the plunger rests against the stop of that end."""
        parameters = self.parameters
        if to not in ("normal", "reverse"):
            raise ValueError(f"points are moved to 'normal' or 'reverse', not {to!r}")
        at = 0.0 if to == "normal" else parameters.stroke_m
        push = self.passive_force(at)
        # Pressed into the stop just so far that the stop balances the detent.
        if (push < 0.0) == (to == "normal"):
            at += push / parameters.stop_stiffness_n_per_m
        self._position_m = at
        self._velocity = 0.0
        self._changed()

    def travel(self, coil: int) -> float:
        """Return the plunger's travel towards that coil, metre (stroke = fully in)."""
        return self._position_m if coil == REVERSE_COIL else self.parameters.stroke_m - self._position_m

    def inductance(self, coil: int) -> float:
        """Return the coil's inductance where the plunger is now, henry."""
        return self.inductance_at(coil, self._position_m)

    def inductance_at(self, coil: int, position_m: float) -> float:
        """Return the coil's inductance with the plunger at a place, henry."""
        parameters = self.parameters
        travel = position_m if coil == REVERSE_COIL else parameters.stroke_m - position_m
        return parameters.inductance_out_h - self._swing_h * math.expm1(-travel / parameters.inductance_length_m)

    def inductance_gradient(self, coil: int) -> float:
        """Return dL/ds for travel ``s`` towards that coil, henry per metre."""
        length = self.parameters.inductance_length_m
        return self._swing_h / length * math.exp(-self.travel(coil) / length)

    def passive_force(self, position_m: float) -> float:
        """Return detent and return spring together at a position, newton towards reverse."""
        parameters = self.parameters
        return (-parameters.detent_force_n * math.cos(math.pi * position_m / parameters.stroke_m)
                - parameters.preload_n - parameters.spring_n_per_m * position_m)

    def stored_energy(self, position_m: float, velocity: float) -> float:
        """Return kinetic energy and that of detent, return spring and stop at a place and speed, joule."""
        parameters = self.parameters
        x = position_m
        over = x if x < 0.0 else max(0.0, x - parameters.stroke_m)
        detent = parameters.detent_force_n * parameters.stroke_m / math.pi * math.sin(
            math.pi * x / parameters.stroke_m)
        return (0.5 * parameters.mass_kg * velocity ** 2 + detent + parameters.preload_n * x
                + 0.5 * parameters.spring_n_per_m * x * x
                + 0.5 * parameters.stop_stiffness_n_per_m * over * over)

    def stick_force(self) -> float:
        """Return the force below which a resting plunger stays, newton."""
        if self._jammed:
            return math.inf
        return max(STICK_FLOOR_N, self.parameters.static_friction_n * self._friction_factor)

    def coil_connected(self, coil: int) -> bool:
        """Say whether the end-of-travel contact (if there is one) lets current into that coil."""
        parameters = self.parameters
        if not parameters.ends_own_pulse:
            return True
        return self.travel(coil) < parameters.contact_travel * parameters.stroke_m

    def position(self) -> Position:
        """Say how the points lie: 'normal' or 'reverse' within 10 % of the stroke of that end."""
        stroke = self.parameters.stroke_m
        if self._position_m <= END_ZONE * stroke:
            return "normal"
        if self._position_m >= (1.0 - END_ZONE) * stroke:
            return "reverse"
        return "between"


def motor_kinds() -> dict[str, MotorParameters]:
    """Return the named kinds of motor for layouts and rehearsals (common practice, no source).

    good: a small twin-coil motor in order. usual: one with more to move, as on a larger layout. stiff: the
    small one with gummed-up or misaligned points. worn: its friction differs much from throw to throw.
    light: little mass and soft stops, bounces when fired too hard. self_ending: a motor of higher resistance
    with end-of-travel contacts.
    """
    good = MotorParameters(
        resistance_ohm=4.0, inductance_out_h=5.0e-3, inductance_in_h=15.0e-3, inductance_length_m=6.0e-3,
        stroke_m=5.0e-3, mass_kg=0.012, detent_force_n=0.37, static_friction_n=0.47, moving_friction_n=0.275,
        friction_scatter=0.10, stop_stiffness_n_per_m=1.0e5, stop_damping_n_s_per_m=35.0)
    return {
        "good": good,
        "usual": replace(good, resistance_ohm=4.5, stroke_m=6.0e-3, mass_kg=0.03, detent_force_n=1.5,
                         static_friction_n=1.6, moving_friction_n=1.1),
        "stiff": replace(good, static_friction_n=3.0, moving_friction_n=2.2),
        "worn": replace(good, static_friction_n=2.0, moving_friction_n=1.4, friction_scatter=0.30),
        "light": replace(good, mass_kg=0.004, detent_force_n=0.25, static_friction_n=0.15,
                         moving_friction_n=0.10, stop_damping_n_s_per_m=3.0),
        "self_ending": replace(good, resistance_ohm=15.0, inductance_out_h=20.0e-3, inductance_in_h=60.0e-3,
                               ends_own_pulse=True),
    }
