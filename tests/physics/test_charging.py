"""Charging: exact by definition, blocked and limited paths, coupled banks against an independent integration."""

import math
import random

import benches
import numpy as np
import pytest
from scipy.integrate import solve_ivp

from sim.circuit import BankParameters, Circuit, CircuitError, SupplyParameters
from sim.exponentials import first_upward_crossing, symmetric_modes


def ideal(volts: float = 10.0) -> Circuit:
    bank = BankParameters(1000e-6, esr_ohm=0.0, leak_ohm=math.inf, charge_ohm=100.0)
    return Circuit(SupplyParameters(volts), [bank], [], random.Random(1))


@pytest.mark.parametrize(("constants", "percent"), [
    (1, 63.2121), (2, 86.4665), (3, 95.0213), (4, 98.1684), (5, 99.3262), (6, 99.7521), (7, 99.9088)])
def test_percent_after_time_constants(constants: int, percent: float) -> None:
    """By definition, 1 - exp(-n). (6: calculated.)"""
    circuit = ideal(100.0)
    circuit.advance(constants * 0.1)
    assert circuit.bank_v(0) == pytest.approx(percent, abs=1e-4)


def test_handbook_figure_is_wrong() -> None:
    """US Army training text MM5000, page 75, prints 12.9 % left after two time constants; it is 13.5335 %."""
    circuit = ideal(100.0)
    circuit.advance(0.2)
    left = 100.0 - circuit.bank_v(0)
    assert left == pytest.approx(13.5335, abs=1e-4)
    assert abs(left - 12.9) > 0.6


@pytest.mark.parametrize(("percent", "constants"), [(90, 2.302585), (95, 2.995732), (99, 4.605170)])
def test_time_to_reach(percent: float, constants: float) -> None:
    """By definition, -ln(1 - share) time constants."""
    circuit = ideal(100.0)
    circuit.advance(constants * 0.1)
    assert circuit.bank_v(0) == pytest.approx(percent, abs=1e-4)


def test_energy_left_after_discharge_through_leak() -> None:
    """By definition: energy left is exp(-2 n): 13.5335 % after 1, 36.7879 % after 0.5, 1.0052 % after 2.3."""
    for constants, percent in ((1.0, 13.5335), (0.5, 36.7879), (2.3, 1.0052)):
        circuit = benches.charged(BankParameters(1000e-6, esr_ohm=0.0, leak_ohm=1000.0), [], 20.0)
        assert circuit.energy().capacitors_j == pytest.approx(0.2, rel=1e-12)
        circuit.advance(constants)
        assert circuit.energy().capacitors_j / 0.2 * 100 == pytest.approx(percent, abs=1e-4)


def test_current_limit_is_exact_up_to_the_crossover() -> None:
    """By definition: 1000 uF at 0.1 A rise by 100 V/s until (10 V - v) / 20 ohm falls below 0.1 A, at 8 V."""
    bank = BankParameters(1000e-6, esr_ohm=0.0, leak_ohm=math.inf, charge_ohm=20.0, charge_limit_a=0.1)
    circuit = Circuit(SupplyParameters(10.0), [bank], [], random.Random(1))
    circuit.advance(0.05)
    assert circuit.bank_v(0) == pytest.approx(5.0, rel=1e-7)
    assert circuit.supply_a() == pytest.approx(0.1, rel=1e-9)
    circuit.advance(0.08 + 0.02)
    assert circuit.bank_v(0) == pytest.approx(10.0 - 2.0 * math.exp(-1.0), rel=1e-6)


def test_bank_above_the_supply_is_not_discharged_into_it() -> None:
    """By definition: only the leak discharges it, until the supply takes over."""
    bank = BankParameters(1000e-6, esr_ohm=0.0, leak_ohm=1000.0, charge_ohm=100.0)
    circuit = Circuit(SupplyParameters(11.0), [bank], [], random.Random(1))
    circuit.set_bank_v(0, 20.0)
    circuit.advance(0.3)
    assert circuit.bank_v(0) == pytest.approx(20.0 * math.exp(-0.3), rel=1e-9)
    assert circuit.supply_a() == 0.0
    circuit.advance(60.0)
    assert circuit.bank_v(0) == pytest.approx(10.0, rel=1e-9)
    assert circuit.supply_a() == pytest.approx(0.01, rel=1e-6)


def test_coupled_banks_against_scipy() -> None:
    """Three banks that share the source resistance, one limited, one above the supply: scipy DOP853, rtol 1e-10."""
    supply = SupplyParameters(20.0, 6.0)
    banks = [BankParameters(4700e-6, 0.1, 4700.0, 47.0), BankParameters(2200e-6, 0.2, 2200.0, 15.0, 0.3),
             BankParameters(1000e-6, 0.05, 300.0, 22.0)]
    circuit = Circuit(supply, banks, [], random.Random(1))
    start = [0.0, 3.0, 21.0]
    for b, volts in enumerate(start):
        circuit.set_bank_v(b, volts)

    def current(bank: BankParameters, node: float, v: float) -> float:
        share = 1 / (1 + bank.esr_ohm / bank.leak_ohm)
        limit = math.inf if bank.charge_limit_a is None else bank.charge_limit_a
        return min(max(0.0, (node - share * v) / (bank.charge_ohm + share * bank.esr_ohm)), limit)

    def slopes(_: float, volts: np.ndarray) -> list[float]:
        low, high = 0.0, 30.0
        for _ in range(60):
            node = 0.5 * (low + high)
            drawn = sum(current(b, node, v) for b, v in zip(banks, volts, strict=True))
            low, high = (node, high) if 20.0 - node > 6.0 * drawn else (low, node)
        result = []
        for bank, v in zip(banks, volts, strict=True):
            i = current(bank, low, v)
            share = 1 / (1 + bank.esr_ohm / bank.leak_ohm)
            terminal = share * (v + bank.esr_ohm * i)
            result.append((i - terminal / bank.leak_ohm) / bank.capacitance_f)
        return result

    times = [0.01, 0.05, 0.1, 0.2, 0.5, 1.0]
    solved = solve_ivp(slopes, (0.0, 1.0), start, method="DOP853", rtol=1e-10, atol=1e-10, max_step=2e-3,
                       t_eval=times)
    for k, time_s in enumerate(times):
        circuit.advance(time_s)
        for b in range(3):
            assert circuit.capacitor_v(b) == pytest.approx(solved.y[b][k], abs=2e-6)
    energy = circuit.energy()
    assert abs(energy.imbalance_j()) < 1e-9 * energy.supplied_j


def test_supply_off_and_cut_off_stop_the_charge() -> None:
    circuit = ideal()
    circuit.advance(0.1)
    circuit.supply_on = False
    before = circuit.bank_v(0)
    circuit.advance(0.5)
    assert circuit.bank_v(0) == pytest.approx(before, rel=1e-6)
    circuit.supply_on = True
    circuit.charge_on[0] = False
    circuit.advance(0.9)
    assert circuit.bank_v(0) == pytest.approx(before, rel=1e-6)
    circuit.charge_on[0] = True
    circuit.advance(1.0)
    assert circuit.bank_v(0) == pytest.approx(10.0 - (10.0 - before) * math.exp(-1.0), rel=1e-5)


def test_faded_bank_charges_sooner_and_a_leak_holds_it_down() -> None:
    """By definition: time constant and divider with the changed part."""
    circuit = ideal(100.0)
    circuit.bank_faults[0].capacitance_factor = 0.5
    circuit.advance(0.05)
    assert circuit.bank_v(0) == pytest.approx(63.2121, abs=1e-4)
    circuit.bank_faults[0].extra_leak_ohm = 100.0
    circuit.advance(5.0)
    assert circuit.bank_v(0) == pytest.approx(50.0, rel=1e-6)


def test_time_does_not_go_back_and_bad_parameters_are_refused() -> None:
    circuit = ideal()
    circuit.advance(1.0)
    with pytest.raises(CircuitError, match="time cannot go back"):
        circuit.advance(0.5)
    with pytest.raises(CircuitError, match="no coil"):
        circuit.set_drivers(0, {(0, 1)})
    with pytest.raises(CircuitError, match="capacitance_f"):
        Circuit(SupplyParameters(10.0), [BankParameters(0.0)], [], random.Random(1))
    with pytest.raises(CircuitError, match="charge_ohm"):
        Circuit(SupplyParameters(10.0), [BankParameters(1e-3, charge_ohm=0.0)], [], random.Random(1))


def test_first_crossing_finds_a_narrow_hump() -> None:
    """By definition: e^-t - e^-3t has its only peak, 2 / sqrt(27) = 0.384900, at t = ln(3) / 2."""
    peak = math.log(3.0) / 2.0
    for level in (0.3848, 0.2, 1e-3):
        found = first_upward_crossing([-level, 1.0, -1.0], [0.0, 1.0, 3.0], 3600.0)
        assert found is not None
        assert found < peak
        assert math.exp(-found) - math.exp(-3 * found) == pytest.approx(level, abs=1e-12)
    assert first_upward_crossing([-0.385, 1.0, -1.0], [0.0, 1.0, 3.0], 3600.0) is None


def test_symmetric_modes_against_numpy() -> None:
    rng = random.Random(4)
    for n in (1, 2, 3, 4):
        half = [[rng.uniform(-1, 1) for _ in range(n)] for _ in range(n)]
        matrix = np.array(half) + np.array(half).T
        values, vectors = symmetric_modes(matrix.tolist())
        assert sorted(values) == pytest.approx(np.linalg.eigvalsh(matrix))
        for value, vector in zip(values, vectors, strict=True):
            assert matrix @ np.array(vector) == pytest.approx(value * np.array(vector), abs=1e-12)
