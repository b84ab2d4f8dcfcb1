"""Small circuits that the physics tests share."""

import math
import random
from dataclasses import replace

from sim.circuit import BankParameters, Circuit, SupplyParameters
from sim.motor import Motor, MotorParameters, motor_kinds


def held_coil(resistance_ohm: float, inductance_h: float) -> Motor:
    """Return a motor whose plunger is held fast and whose inductance does not change."""
    motor = Motor(MotorParameters(
        resistance_ohm, inductance_h, inductance_h, 5e-3, 5e-3, 0.01, 0.0, 0.0, 0.0, 0.0, 1e5, 0.0))
    motor.jammed = True
    return motor


def bare_bank(capacitance_f: float, esr_ohm: float = 0.0) -> BankParameters:
    """Return a bank without leak, driver resistance or flyback diode."""
    return BankParameters(capacitance_f, esr_ohm=esr_ohm, leak_ohm=math.inf, driver_ohm=0.0, diode_v=None)


def charged(bank: BankParameters, motors: list[Motor], volts: float, seed: int = 1,
            supply: SupplyParameters | None = None) -> Circuit:
    """Return a circuit of one bank at a voltage; the supply is off unless one is given."""
    circuit = Circuit(supply or SupplyParameters(0.0), [bank], [(0, motor) for motor in motors],
                      random.Random(seed))
    circuit.supply_on = supply is not None
    circuit.set_bank_v(0, volts)
    return circuit


def two_bank_layout(seed: int) -> Circuit:
    """Return two coupled banks, one of them current-limited, with three motors of different kinds."""
    kinds = motor_kinds()
    motors = [(0, Motor(kinds["good"])), (0, Motor(kinds["light"])), (1, Motor(kinds["self_ending"]))]
    banks = [BankParameters(4700e-6), BankParameters(2200e-6, charge_limit_a=0.15, charge_ohm=20.0)]
    return Circuit(SupplyParameters(18.0, 4.0), banks, motors, random.Random(seed))


def without_scatter(kind: str) -> MotorParameters:
    """Return a named kind of motor whose friction is always the same."""
    return replace(motor_kinds()[kind], friction_scatter=0.0)
