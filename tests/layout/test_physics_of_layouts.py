"""The simulator's half of a layout: what the owner wrote, and motors in parallel."""

import random
from dataclasses import replace
from pathlib import Path

import pytest

from sim.circuit import Circuit
from sim.circuit_parameters import BankParameters, SupplyParameters
from sim.layout.physics import in_parallel
from sim.motor import REVERSE_COIL, Motor, MotorParameters, motor_kinds
from tests.layout.files import GOOD, load_text
from tests.layout.test_every_setting import REACH


def test_supply_banks_and_motors_are_those_of_the_file(tmp_path: Path) -> None:
    text = GOOD.replace("volts = 16.0", "volts = 16.0\nsource_ohm = 1.5").replace(
        "adc = 1",
        "adc = 1\ncapacitance_uf = 6800\nesr_ohm = 0.1\nbleed_ohm = 2200\ndriver_ohm = 0.02\ndiode_v = 0.5\n"
        "common_ohm = 0.1",
    )
    text = text.replace("{ coils = [2, 3] }", '{ coils = [2, 3], simulated = "stiff", starts = "reverse", ohm = 5 }')
    physics = load_text(tmp_path, text).physics
    assert physics.supply == SupplyParameters(16.0, 1.5)
    assert physics.banks[1] == BankParameters(
        capacitance_f=6800e-6, esr_ohm=0.1, leak_ohm=2200.0, charge_ohm=47.0, driver_ohm=0.02, diode_v=0.5,
        common_ohm=0.1,
    )  # fmt: skip
    assert physics.motors[2].parameters == replace(motor_kinds()["stiff"], resistance_ohm=5.0)
    assert [motor.position() for motor in physics.make_motors()] == ["normal", "normal", "reverse", "normal", "normal"]


def test_a_limited_source_and_a_motor_that_ends_its_own_pulse(tmp_path: Path) -> None:
    layout = load_text(tmp_path, REACH)
    assert layout.physics.banks[0].charge_limit_a == 0.27 and layout.physics.banks[1].charge_limit_a is None
    assert layout.physics.motors[0].parameters.ends_own_pulse
    assert layout.physics.supply.voltage_v == 17.5  # what the owner says the fullest bank is charged to


def after_a_pulse(parameters: MotorParameters, count: int) -> tuple[float, list[float]]:
    """The bank's voltage and where the plungers are, 15 ms into a pulse that fires some motors at once."""
    motors = [Motor(parameters) for _ in range(count)]
    bank = BankParameters(4700e-6, driver_ohm=0.0, diode_v=None)
    circuit = Circuit(SupplyParameters(16.0, 0.5), [bank], [(0, motor) for motor in motors], random.Random(1))
    circuit.set_bank_v(0, 15.0)
    circuit.set_drivers(0, [(number, REVERSE_COIL) for number in range(count)])
    circuit.advance(0.015)
    return circuit.bank_v(0), [motor.position_m for motor in motors]


def test_motors_in_parallel_move_as_one_and_draw_the_current_of_all() -> None:
    """Two on one output do what two on two outputs of ideal drivers do when pulsed at once (Kirchhoff's laws)."""
    one = replace(motor_kinds()["usual"], friction_scatter=0.0)
    volts, places = after_a_pulse(one, 2)
    volts_in_parallel, (place,) = after_a_pulse(in_parallel(one, 2), 1)
    assert 0.0 < place < one.stroke_m * 1.1
    assert volts_in_parallel == pytest.approx(volts, rel=1e-6)
    assert [place, place] == pytest.approx(places, rel=1e-5)
    assert in_parallel(one, 1) == one
