"""Properties that hold for any circuit and any sequence of commands and faults (hypothesis)."""

import math
import random

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sim.circuit import BankParameters, Circuit, SupplyParameters
from sim.motor import Motor, motor_kinds

KINDS = sorted(motor_kinds())

banks = st.builds(
    BankParameters, capacitance_f=st.floats(500e-6, 20000e-6), esr_ohm=st.floats(0.0, 0.5),
    leak_ohm=st.floats(200.0, 1e5), charge_ohm=st.floats(5.0, 200.0),
    charge_limit_a=st.none() | st.floats(0.05, 2.0), driver_ohm=st.floats(0.01, 0.3),
    charge_diode_v=st.floats(0.0, 0.8), common_ohm=st.floats(0.0, 1.0))
supplies = st.builds(SupplyParameters, st.floats(9.0, 30.0), st.floats(0.0, 8.0))
faults = st.sampled_from(["none", "none", "none", "supply", "cut off", "open", "short", "joint", "stuck", "jam",
                          "hand", "faded", "leak"])
actions = st.lists(
    st.tuples(st.integers(0, 2), st.integers(0, 1), st.floats(0.002, 0.05), st.floats(0.0, 0.4), faults),
    min_size=1, max_size=5)


def inflict(circuit: Circuit, fault: str, motor: int, coil: int) -> None:
    """Bring a fault about, or take it away when it is there."""
    faults = circuit.coil_faults[motor, coil]
    bank = circuit.bank_of[motor]
    if fault == "supply":
        circuit.supply_on = not circuit.supply_on
    elif fault == "cut off":
        circuit.charge_on[bank] = not circuit.charge_on[bank]
    elif fault == "open":
        faults.open = not faults.open
    elif fault == "short":
        faults.short_ohm = None if faults.short_ohm else 0.4
    elif fault == "joint":
        faults.joint_ohm = 0.0 if faults.joint_ohm else 7.0
    elif fault == "stuck":
        faults.driver_stuck = not faults.driver_stuck
    elif fault == "jam":
        circuit.motors[motor].jammed = not circuit.motors[motor].jammed
    elif fault == "hand":
        circuit.motors[motor].set_by_hand("normal" if coil else "reverse")
    elif fault == "faded":
        circuit.bank_faults[bank].capacitance_factor = 0.6
    elif fault == "leak":
        circuit.bank_faults[bank].extra_leak_ohm = 500.0


def play(supply: SupplyParameters, parameters: list[BankParameters], kinds: list[str],
         script: list[tuple[int, int, float, float, str]], look_every_s: float | None) -> Circuit:
    """Run a script; check at every look that voltages and balance are in order."""
    supply = SupplyParameters(supply.voltage_v, supply.source_ohm)
    parameters = [BankParameters(**{k: v for k, v in vars(p).items() if not k.startswith("_")}) for p in parameters]
    motors = [(k % len(parameters), Motor(motor_kinds()[kind])) for k, kind in enumerate(kinds)]
    circuit = Circuit(supply, parameters, motors, random.Random(11))

    def go(until_s: float) -> None:
        while look_every_s is not None and circuit.time_s + look_every_s < until_s:
            circuit.advance(circuit.time_s + look_every_s)
            check(circuit)
        circuit.advance(until_s)
        check(circuit)

    go(0.7)
    for motor, coil, pulse_s, pause_s, fault in script:
        start = circuit.time_s
        inflict(circuit, fault, motor, coil)
        bank = circuit.bank_of[motor]
        circuit.set_drivers(bank, {(motor, coil)})
        go(start + pulse_s)
        circuit.set_drivers(bank, set())
        go(start + pulse_s + pause_s)
    return circuit


def check(circuit: Circuit) -> None:
    """Assert what must always hold."""
    energy = circuit.energy()
    into = energy.supplied_j + max(0.0, energy.outside_j) + 1e-3
    assert abs(energy.imbalance_j()) < 1e-5 * into
    assert min(energy.coil_heat_j, energy.circuit_heat_j, energy.magnetic_j, energy.capacitors_j,
               energy.interrupted_j) >= -1e-12
    assert energy.friction_heat_j >= -1e-9
    for bank, parameters in enumerate(circuit.banks):
        lowest = -(parameters.diode_v or 0.0) - 2.0
        assert lowest < circuit.bank_v(bank) <= circuit.supply.voltage_v + 1e-6
        assert math.isfinite(circuit.capacitor_v(bank))
    for motor in circuit.motors:
        assert -1e-3 < motor.position_m < motor.parameters.stroke_m + 1e-3


@settings(max_examples=60, deadline=None, derandomize=True)
@given(supplies, st.lists(banks, min_size=1, max_size=3), st.lists(st.sampled_from(KINDS), min_size=3, max_size=3),
       actions)
def test_energy_never_appears_and_voltages_stay_within_bounds(
        supply: SupplyParameters, parameters: list[BankParameters], kinds: list[str],
        script: list[tuple[int, int, float, float, str]]) -> None:
    play(supply, parameters, kinds, script, 7e-3)


@settings(max_examples=25, deadline=None, derandomize=True)
@given(supplies, st.lists(banks, min_size=1, max_size=3), st.lists(st.sampled_from(KINDS), min_size=3, max_size=3),
       actions, st.floats(3e-4, 2e-2))
def test_looking_changes_nothing(
        supply: SupplyParameters, parameters: list[BankParameters], kinds: list[str],
        script: list[tuple[int, int, float, float, str]], look_every_s: float) -> None:
    often = play(supply, parameters, kinds, script, look_every_s)
    never = play(supply, parameters, kinds, script, None)
    assert often.time_s == never.time_s
    for bank in range(len(parameters)):
        assert often.bank_v(bank) == pytest.approx(never.bank_v(bank), abs=1e-9)
    assert [m.position() for m in often.motors] == [m.position() for m in never.motors]
    assert [m.position_m for m in often.motors] == [m.position_m for m in never.motors]
