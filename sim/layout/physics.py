"""The simulator's half of a layout file: supply, banks and motors as the circuit wants them."""

from dataclasses import dataclass, replace
from typing import Any

from sim.circuit_parameters import BankParameters, SupplyParameters
from sim.layout.banks import BankBuilder
from sim.motor import End, Motor, MotorParameters, motor_kinds

LEAST_CHARGE_OHM = 0.1


@dataclass(frozen=True)
class MotorPhysics:
    """What the simulator puts in a motor's place, and where it is at first."""

    parameters: MotorParameters
    start: End


@dataclass(frozen=True)
class PhysicsLayout:
    """The simulator's half of a layout: one entry a motor of the settings."""

    supply: SupplyParameters
    banks: list[BankParameters]
    motors: list[MotorPhysics]

    def make_motors(self) -> list[Motor]:
        """Fresh motors, each where it starts."""
        return [Motor(motor.parameters, motor.start) for motor in self.motors]


def physics_of(banks: BankBuilder, motors: list[dict[str, Any]]) -> PhysicsLayout:
    """Build it from banks and motors that were found right."""
    supply = SupplyParameters(banks.simulated_supply_v(), banks.supply["source_ohm"])
    return PhysicsLayout(supply, [_bank(bank) for bank in banks.tables], [_motor(motor) for motor in motors])


def _bank(bank: dict[str, Any]) -> BankParameters:
    return BankParameters(
        capacitance_f=bank["capacitance_uf"] * 1e-6,
        esr_ohm=bank["esr_ohm"],
        leak_ohm=bank["bleed_ohm"],
        charge_ohm=max(LEAST_CHARGE_OHM, bank["charge_ohm"]),
        charge_limit_a=bank["limit_ma"] / 1000 if bank["limit_ma"] else None,
        driver_ohm=bank["driver_ohm"],
        diode_v=bank["diode_v"],
        common_ohm=bank["common_ohm"],
    )


def _motor(motor: dict[str, Any]) -> MotorPhysics:
    kind = motor_kinds()[motor["simulated"]]
    one = replace(kind, resistance_ohm=motor["ohm"], ends_own_pulse=motor["ends_own_pulse"])
    return MotorPhysics(in_parallel(one, motor["parallel"]), motor["starts"])


def in_parallel(one: MotorParameters, count: int) -> MotorParameters:
    """Several motors in parallel that move alike, as one: they share the current, and add up their forces."""
    return replace(
        one,
        resistance_ohm=one.resistance_ohm / count,
        inductance_out_h=one.inductance_out_h / count,
        inductance_in_h=one.inductance_in_h / count,
        mass_kg=one.mass_kg * count,
        detent_force_n=one.detent_force_n * count,
        static_friction_n=one.static_friction_n * count,
        moving_friction_n=one.moving_friction_n * count,
        stop_stiffness_n_per_m=one.stop_stiffness_n_per_m * count,
        stop_damping_n_s_per_m=one.stop_damping_n_s_per_m * count,
        spring_n_per_m=one.spring_n_per_m * count,
        preload_n=one.preload_n * count,
        viscous_n_s_per_m=one.viscous_n_s_per_m * count,
    )
