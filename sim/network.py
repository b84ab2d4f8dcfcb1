"""The resistive part of the circuit: one supply feeding the banks' charge paths through its source resistance.

A charge path conducts one way only (it has a diode) and may be limited to a constant current. Which paths
conduct, and how, is found from the piecewise linear, falling balance of the supply node, so it is unique.
"""

from collections.abc import Sequence
from dataclasses import dataclass

from sim.circuit_parameters import BankFaults, BankParameters, SupplyParameters

OFF, BLOCKED, RESISTIVE, LIMITED = range(4)
LEAST_LEAK_S = 1e-9  # keeps every time constant finite; far below any real capacitor's leakage


@dataclass(frozen=True)
class BankConstants:
    """One bank as the equations use it; conductances in siemens, the rest in SI units."""

    capacitance_f: float
    esr_ohm: float
    leak_s: float
    ground_s: float  # leak and settled coils together
    charge_ohm: float
    limit_a: float
    charge_diode_v: float
    driver_ohm: float
    diode_v: float | None
    diode_ohm: float
    common_ohm: float
    share: float  # terminal voltage = share * capacitor voltage + drop_ohm * (charge - coil current)
    drop_ohm: float
    charge_s: float  # conductance from the supply node to the capacitor's Thevenin voltage


def bank_constants(bank: BankParameters, faults: BankFaults, load_s: float = 0.0) -> BankConstants:
    """Return the constants of a bank with its faults and ``load_s``, siemens, of settled coils."""
    leak_s = max(LEAST_LEAK_S, 1.0 / bank.leak_ohm + 1.0 / faults.extra_leak_ohm)
    ground_s = leak_s + load_s
    share = 1.0 / (1.0 + bank.esr_ohm * ground_s)
    drop_ohm = bank.esr_ohm * share
    limit = float("inf") if bank.charge_limit_a is None else bank.charge_limit_a
    return BankConstants(
        bank.capacitance_f * faults.capacitance_factor, bank.esr_ohm, leak_s, ground_s, bank.charge_ohm, limit,
        bank.charge_diode_v, bank.driver_ohm, bank.diode_v, bank.diode_ohm, bank.common_ohm,
        share, drop_ohm, 1.0 / (bank.charge_ohm + drop_ohm))


class Network:
    """Supply and charge paths at one moment of switching.

    ``modes`` remembers how each path conducted last; it only saves work, the answer does not depend on it.
    """

    def __init__(self, supply: SupplyParameters, banks: Sequence[BankConstants], enabled: Sequence[bool]) -> None:
        self.voltage_v = supply.voltage_v
        self.source_ohm = supply.source_ohm
        self.banks = list(banks)
        self.charging = [b for b, on in enumerate(enabled) if on]
        self.modes = [RESISTIVE if on else OFF for on in enabled]

    def charge(self, open_v: Sequence[float]) -> tuple[float, list[float]]:
        """Return supply node voltage and charge currents, ampere, from the banks' voltages without charging."""
        node_v = self._balance(open_v)
        currents, fits = self._currents(open_v, node_v)
        if not fits:
            self._find_modes(open_v)
            node_v = self._balance(open_v)
            currents, _ = self._currents(open_v, node_v)
        return node_v, currents

    def _balance(self, open_v: Sequence[float]) -> float:
        source = self.source_ohm
        if source == 0.0:
            return self.voltage_v
        top, bottom = self.voltage_v, 1.0
        for b in self.charging:
            mode = self.modes[b]
            bank = self.banks[b]
            if mode == RESISTIVE:
                top += source * bank.charge_s * (open_v[b] + bank.charge_diode_v)
                bottom += source * bank.charge_s
            elif mode == LIMITED:
                top -= source * bank.limit_a
        return top / bottom

    def _currents(self, open_v: Sequence[float], node_v: float) -> tuple[list[float], bool]:
        currents = [0.0] * len(self.banks)
        fits = True
        for b in self.charging:
            bank = self.banks[b]
            current = (node_v - bank.charge_diode_v - open_v[b]) * bank.charge_s
            mode = self.modes[b]
            if mode == RESISTIVE:
                fits = fits and 0.0 <= current <= bank.limit_a
                currents[b] = min(max(0.0, current), bank.limit_a)
            elif mode == LIMITED:
                fits = fits and current >= bank.limit_a
                currents[b] = bank.limit_a
            else:
                fits = fits and current <= 0.0
        return currents, fits

    def _find_modes(self, open_v: Sequence[float]) -> None:
        """Find the stretch between two kinks in which the falling balance of the node goes through zero."""
        kinks = []
        for b in self.charging:
            bank = self.banks[b]
            kinks.append(open_v[b] + bank.charge_diode_v)
            if bank.limit_a != float("inf"):
                kinks.append(kinks[-1] + bank.limit_a / bank.charge_s)
        kinks = sorted(k for k in kinks if k < self.voltage_v)
        # The balance is positive just below the answer and negative just above: take the highest such stretch.
        low = 0
        while low < len(kinks) and self._surplus(open_v, kinks[low]) > 0.0:
            low += 1
        below = kinks[low - 1] if low else min([*kinks, self.voltage_v]) - 1.0
        above = kinks[low] if low < len(kinks) else self.voltage_v
        middle = 0.5 * (below + above) if self.source_ohm else self.voltage_v
        for b in self.charging:
            bank = self.banks[b]
            current = (middle - bank.charge_diode_v - open_v[b]) * bank.charge_s
            self.modes[b] = BLOCKED if current <= 0.0 else LIMITED if current >= bank.limit_a else RESISTIVE

    def _surplus(self, open_v: Sequence[float], node_v: float) -> float:
        drawn = sum(min(max(0.0, (node_v - self.banks[b].charge_diode_v - open_v[b]) * self.banks[b].charge_s),
                        self.banks[b].limit_a) for b in self.charging)
        return self.voltage_v - node_v - self.source_ohm * drawn
