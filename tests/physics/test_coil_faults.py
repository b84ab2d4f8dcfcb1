"""Motors and their faults: held coils, open and shorted ones, joints, jams, contacts, hands, bouncing."""

import math
import time
from dataclasses import replace

import benches
import pytest

from sim.circuit import BankParameters, Circuit, CoilFaults, SupplyParameters
from sim.motor import Motor, MotorParameterError, motor_kinds

SUPPLY = SupplyParameters


def ready(kind: str = "good", volts: float = 16.0, **bank: float) -> tuple[Circuit, Motor]:
    """Return one charged bank of 4700 uF with one motor that lies normal."""
    motor = Motor(benches.without_scatter(kind))
    parameters = BankParameters(bank.pop("capacitance_f", 4700e-6), **bank)
    return benches.charged(parameters, [motor], volts, supply=SUPPLY(volts, 1.0)), motor


def pulse(circuit: Circuit, coil: int, seconds: float = 0.04) -> None:
    circuit.set_drivers(0, {(0, coil)})
    circuit.advance(circuit.time_s + seconds)
    circuit.set_drivers(0, set())
    circuit.advance(circuit.time_s + 0.2)


@pytest.mark.parametrize("kind", motor_kinds())
def test_every_kind_throws_both_ways(kind: str) -> None:
    circuit, motor = ready(kind)
    assert motor.position() == "normal"
    pulse(circuit, 1)
    assert motor.position() == "reverse"
    circuit.advance(2.0)
    pulse(circuit, 0)
    assert motor.position() == "normal"
    circuit.advance(4.0)
    pulse(circuit, 0)
    assert motor.position() == "normal"


def test_coil_current_dies_out_through_the_diode_and_not_into_the_bank() -> None:
    """Closed form: L di/dt = -(R + slope) i - diode, from the current at switch-off."""
    motor = benches.held_coil(4.0, 10e-3)
    circuit = benches.charged(BankParameters(4700e-6), [motor], 16.0)
    circuit.set_drivers(0, {(0, 1)})
    circuit.advance(5e-3)
    current, volts = circuit.coil_a(0, 1), circuit.capacitor_v(0)
    circuit.set_drivers(0, set())
    rate, settled = 4.05 / 10e-3, 0.8 / 4.05
    circuit.advance(6e-3)
    assert circuit.coil_a(0, 1) == pytest.approx((current + settled) * math.exp(-rate * 1e-3) - settled, rel=1e-6)
    zero = math.log((current + settled) / settled) / rate
    circuit.advance(5e-3 + zero + 1e-6)
    assert circuit.coil_a(0, 1) == 0.0
    assert volts * math.exp(-1.1 * (zero + 1e-6) / (4700 * 4700e-6)) < circuit.capacitor_v(0) <= volts


def test_stuck_driver_holds_the_bank_down_for_minutes_at_little_cost() -> None:
    """By definition: the divider of supply, source, charge resistor and coil; then recovery when it lets go."""
    circuit, motor = ready()
    circuit.coil_faults[0, 1].driver_stuck = True
    began = time.process_time()
    circuit.advance(300.0)
    assert time.process_time() - began < 2.0
    assert motor.position() == "reverse"
    coil = 4.05
    expected = 16.0 * coil / (1.0 + 47.0 + coil)
    assert circuit.bank_v(0) == pytest.approx(expected, rel=1e-3)
    amperes = expected / coil
    assert circuit.coil_a(0, 1) == pytest.approx(amperes, rel=1e-3)
    assert circuit.coil_heat_j(0, 1) == pytest.approx(300.0 * amperes ** 2 * 4.0, rel=0.02)
    energy = circuit.energy()
    assert abs(energy.imbalance_j()) < 2e-6 * energy.supplied_j
    circuit.coil_faults[0, 1].driver_stuck = False
    circuit.advance(305.0)
    assert circuit.bank_v(0) > 15.5


def test_open_coil_draws_nothing() -> None:
    circuit, motor = ready()
    circuit.coil_faults[0, 1].open = True
    before = circuit.bank_v(0)
    pulse(circuit, 1)
    assert circuit.bank_v(0) == pytest.approx(before, rel=1e-2)
    assert circuit.coil_heat_j(0, 1) == 0.0
    assert motor.position() == "normal"


def test_shorted_coil_empties_the_bank_at_once_and_moves_nothing() -> None:
    circuit, motor = ready()
    circuit.coil_faults[0, 1].short_ohm = 0.3
    circuit.set_drivers(0, {(0, 1)})
    circuit.advance(5e-3)
    assert circuit.bank_v(0) < 2.5
    circuit.set_drivers(0, set())
    circuit.advance(0.2)
    assert motor.position() == "normal"


def test_bad_joint_weakens_the_throw() -> None:
    circuit, motor = ready()
    circuit.coil_faults[0, 1].joint_ohm = 60.0
    pulse(circuit, 1)
    assert motor.position() != "reverse"
    circuit.coil_faults[0, 1].joint_ohm = 0.5
    circuit.advance(3.0)
    pulse(circuit, 1)
    assert motor.position() == "reverse"


def test_jammed_motor_stays_and_is_thrown_once_freed() -> None:
    circuit, motor = ready()
    motor.jammed = True
    pulse(circuit, 1)
    assert motor.position() == "normal"
    motor.jammed = False
    circuit.advance(3.0)
    pulse(circuit, 1)
    assert motor.position() == "reverse"


def test_points_moved_by_hand_between_throws() -> None:
    circuit, motor = ready()
    pulse(circuit, 1)
    motor.set_by_hand("normal")
    circuit.advance(1.0)
    assert motor.position() == "normal"
    with pytest.raises(ValueError, match="'normal' or 'reverse'"):
        motor.set_by_hand("left")  # type: ignore[arg-type]


def test_motor_that_ends_its_own_pulse() -> None:
    circuit, motor = ready("self_ending")
    assert not motor.coil_connected(0)
    assert motor.coil_connected(1)
    pulse(circuit, 0)
    assert circuit.coil_heat_j(0, 0) == 0.0
    circuit.set_drivers(0, {(0, 1)})
    circuit.advance(circuit.time_s + 0.025)
    arrived = circuit.coil_heat_j(0, 1)
    assert motor.position() == "reverse"
    assert circuit.coil_a(0, 1) == 0.0
    circuit.advance(circuit.time_s + 0.025)
    assert circuit.coil_heat_j(0, 1) == pytest.approx(arrived, rel=1e-3)
    assert not motor.coil_connected(1)
    assert motor.coil_connected(0)


def test_two_coils_of_one_motor_fight() -> None:
    motor = Motor(benches.without_scatter("good"))
    circuit = benches.charged(BankParameters(4700e-6), [motor], 16.0)
    circuit.coil_faults[0, 0].driver_stuck = True
    circuit.set_drivers(0, {(0, 1)})
    circuit.advance(0.05)
    assert motor.position() != "reverse"
    assert circuit.coil_heat_j(0, 0) > 0.01
    assert circuit.coil_heat_j(0, 1) > 0.01


def test_too_hard_bounces_back() -> None:
    """Common practice, no source: a light motor fired too hard and switched off early does not stay over."""
    lies = set()
    for milliseconds in (4, 5, 6, 8, 10):
        motor = Motor(benches.without_scatter("light"))
        circuit = benches.charged(BankParameters(2200e-6), [motor], 22.0)
        pulse(circuit, 1, milliseconds * 1e-3)
        lies.add(motor.position())
    assert lies - {"reverse"}
    stopped = Motor(replace(benches.without_scatter("light"), stop_damping_n_s_per_m=35.0))
    circuit = benches.charged(BankParameters(2200e-6), [stopped], 22.0)
    pulse(circuit, 1, 8e-3)
    assert stopped.position() == "reverse"


def test_pulse_is_calculated_fast_enough() -> None:
    """A 40 ms pulse of one motor, looked at every half millisecond: 25 ms of CPU aimed at, 4 times that allowed."""
    best = math.inf
    for _ in range(3):
        circuit, _ = ready("usual")
        circuit.advance(1.0)
        circuit.set_drivers(0, {(0, 1)})
        began = time.process_time()
        for k in range(1, 81):
            circuit.advance(1.0 + k * 5e-4)
            circuit.bank_v(0)
        best = min(best, time.process_time() - began)
    assert best < 0.1


def test_parameters_that_cannot_be_are_refused() -> None:
    good = motor_kinds()["good"]
    for change, word in (({"mass_kg": 0.0}, "mass_kg"), ({"moving_friction_n": 9.0}, "moving_friction_n"),
                         ({"inductance_in_h": 1e-3}, "inductance_in_h"), ({"contact_travel": 1.0}, "contact_travel"),
                         ({"resistance_ohm": float("nan")}, "resistance_ohm")):
        with pytest.raises(MotorParameterError, match=word):
            replace(good, **change)


def test_faults_start_harmless() -> None:
    assert CoilFaults() == CoilFaults(open=False, short_ohm=None, joint_ohm=0.0, driver_stuck=False)
