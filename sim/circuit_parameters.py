"""Parameters and faults of the simulated circuit; each may be changed while the circuit runs."""

import math
from collections.abc import Callable
from dataclasses import dataclass

LEAST_CHARGE_OHM = 0.1
LEAST_SHORT_OHM = 0.02


class CircuitError(ValueError):
    """The simulated circuit was given something it cannot work with."""


class Watched:
    """Something whose change the circuit must take notice of."""

    def watch(self, on_change: Callable[[], None]) -> None:
        """Call ``on_change`` after every later change of an attribute."""
        object.__setattr__(self, "_on_change", on_change)

    def __setattr__(self, name: str, value: object) -> None:
        object.__setattr__(self, name, value)
        on_change = self.__dict__.get("_on_change")
        if on_change is not None:
            on_change()


@dataclass
class SupplyParameters(Watched):
    """The one supply of the layout: ``voltage_v`` unloaded, volt, behind ``source_ohm``, ohm."""

    voltage_v: float
    source_ohm: float = 0.0

    def check(self) -> None:
        """Raise CircuitError for a supply that cannot be."""
        if not (self.voltage_v >= 0.0 and self.source_ohm >= 0.0):
            raise CircuitError("supply voltage_v and source_ohm must not be below zero")


@dataclass
class BankParameters(Watched):
    """One capacitor store with its charge path and drivers.

    capacitance_f: farad. esr_ohm: series resistance of the capacitors, ohm.
    leak_ohm: leakage and bleed in parallel, ohm; ``math.inf`` for none.
    charge_ohm: charge resistor, ohm (0.1 at least). charge_limit_a: ampere, of a current-limited source; None for
    a resistor alone. charge_diode_v: forward drop of the diode in the charge path, volt.
    driver_ohm: on-resistance of each driver, ohm. diode_v: drop of the flyback diode, volt; None when there is
    none (a held current may then reverse, and an opened one ends in an arc). diode_ohm: its slope, ohm.
    common_ohm: wire that all motors of the bank share, ohm.
    """

    capacitance_f: float
    esr_ohm: float = 0.05
    leak_ohm: float = 4700.0
    charge_ohm: float = 47.0
    charge_limit_a: float | None = None
    driver_ohm: float = 0.05
    diode_v: float | None = 0.8
    diode_ohm: float = 0.05
    charge_diode_v: float = 0.0
    common_ohm: float = 0.0

    def check(self) -> None:
        """Raise CircuitError for a bank that cannot be."""
        if not self.capacitance_f > 0.0:
            raise CircuitError(f"capacitance_f must be above zero, not {self.capacitance_f}")
        if not self.charge_ohm >= LEAST_CHARGE_OHM:
            raise CircuitError(f"charge_ohm must be at least {LEAST_CHARGE_OHM}, not {self.charge_ohm}")
        if not self.leak_ohm > 0.0:
            raise CircuitError(f"leak_ohm must be above zero, not {self.leak_ohm}")
        if self.charge_limit_a is not None and not self.charge_limit_a > 0.0:
            raise CircuitError(f"charge_limit_a must be above zero, not {self.charge_limit_a}")
        for name in ("esr_ohm", "driver_ohm", "diode_ohm", "charge_diode_v", "common_ohm"):
            if not getattr(self, name) >= 0.0:
                raise CircuitError(f"{name} must not be below zero, not {getattr(self, name)}")
        if self.diode_v is not None and not (self.diode_v >= 0.0 and self.driver_ohm + self.diode_ohm > 0.0):
            raise CircuitError("a flyback diode needs diode_v of zero or more, and driver_ohm or diode_ohm")


@dataclass
class CoilFaults(Watched):
    """What is wrong with one coil and its driver.

    open: no current can flow. short_ohm: resistance, ohm, of a short across the coil, 0.02 at least (None when
    sound); the plunger feels nothing then. joint_ohm: extra series resistance of wire and joints, ohm.
    driver_stuck: always on.
    """

    open: bool = False
    short_ohm: float | None = None
    joint_ohm: float = 0.0
    driver_stuck: bool = False

    def check(self) -> None:
        """Raise CircuitError for faults that cannot be."""
        if self.short_ohm is not None and not self.short_ohm >= LEAST_SHORT_OHM:
            raise CircuitError(f"short_ohm must be at least {LEAST_SHORT_OHM}, not {self.short_ohm}")
        if not self.joint_ohm >= 0.0:
            raise CircuitError(f"joint_ohm must not be below zero, not {self.joint_ohm}")


@dataclass
class BankFaults(Watched):
    """What is wrong with one bank: ``capacitance_factor`` left of the nominal, ``extra_leak_ohm`` in parallel."""

    capacitance_factor: float = 1.0
    extra_leak_ohm: float = math.inf

    def check(self) -> None:
        """Raise CircuitError for faults that cannot be."""
        if not 0.001 <= self.capacitance_factor <= 100.0:
            raise CircuitError(f"capacitance_factor must lie between 0.001 and 100, not {self.capacitance_factor}")
        if not self.extra_leak_ohm > 0.0:
            raise CircuitError(f"extra_leak_ohm must be above zero, not {self.extra_leak_ohm}")


@dataclass(frozen=True)
class Energy:
    """Where the energy of a circuit is and went since it was made, joule.

    ``supplied_j + outside_j == sum of all the others`` always holds but for rounding.
    """

    supplied_j: float
    outside_j: float  # hands, changed capacitance, set voltages; and the stored energy at the start
    capacitors_j: float
    magnetic_j: float
    mechanical_j: float
    coil_heat_j: float
    circuit_heat_j: float
    friction_heat_j: float
    interrupted_j: float

    def imbalance_j(self) -> float:
        """Return what the balance fails to account for, joule."""
        return (self.supplied_j + self.outside_j - self.capacitors_j - self.magnetic_j - self.mechanical_j
                - self.coil_heat_j - self.circuit_heat_j - self.friction_heat_j - self.interrupted_j)
