"""The exact solution of the banks while no coil current changes: charging, leaking, feeding a held coil.

The capacitors and resistances form a linear network with a symmetric matrix, so each stretch between two
changes of mode (a charge path blocks, conducts, or leaves its current limit) is a sum of exponentials.
A coil held on, its plunger at rest and its current settled, is a resistance in that network.
"""

import math
from collections.abc import Sequence

from sim.exponentials import first_upward_crossing, integral, product_integral, symmetric_modes, value
from sim.network import BLOCKED, LIMITED, OFF, RESISTIVE, Network

LONGEST_STRETCH_S = 3600.0
MODE_HYSTERESIS_A = 1e-9


class ChargingRun:
    """One stretch of the exact solution, from ``start_s`` until ``end_s``, when a mode changes at the latest.

    network: supply and banks; the banks' constants hold what settled coils put across their terminals.
    capacitor_v: voltages of the capacitors (behind their ESR) at the start, volt. modes: how each charge path
    conducts, or None to find out. longest_s: where to end when nothing happens before.
    """

    def __init__(self, network: Network, start_s: float, capacitor_v: Sequence[float],
                 modes: Sequence[int] | None = None, longest_s: float = LONGEST_STRETCH_S) -> None:
        self.network = network
        self.start_s = start_s
        if modes is None:
            network.charge([bank.share * v for bank, v in zip(network.banks, capacitor_v, strict=True)])
            modes = network.modes
        self.modes = list(modes)
        self._solve(list(capacitor_v))
        after, self.next_modes = self._first_event(longest_s)
        self.end_s = start_s + after

    def _solve(self, start_v: list[float]) -> None:
        network, banks, n = self.network, self.network.banks, len(self.network.banks)
        source = network.source_ohm
        resistive = [b for b in range(n) if self.modes[b] == RESISTIVE]
        spread = 1.0 + source * sum(banks[b].charge_s for b in resistive)
        # Supply node = node_0 + sum node_k * capacitor_v[k].
        node_0 = (network.voltage_v + source * (
            sum(banks[b].charge_s * banks[b].charge_diode_v for b in resistive)
            - sum(banks[b].limit_a for b in range(n) if self.modes[b] == LIMITED))) / spread
        node_k = [source * banks[b].charge_s * banks[b].share / spread if b in resistive else 0.0
                  for b in range(n)]
        conductance = [[0.0] * n for _ in range(n)]
        drive = [0.0] * n
        for b in range(n):
            conductance[b][b] = banks[b].share * banks[b].ground_s
            if self.modes[b] == LIMITED:
                drive[b] = banks[b].share * banks[b].limit_a
            elif self.modes[b] == RESISTIVE:
                weight = banks[b].share * banks[b].charge_s
                drive[b] = weight * (node_0 - banks[b].charge_diode_v)
                conductance[b][b] += weight * banks[b].share
                for k in resistive:
                    conductance[b][k] -= weight * node_k[k]
        self._set_modes_of_decay(conductance, drive, start_v)
        self.node = self._combine(node_0, node_k)
        self.current = [self._charge_current(b) for b in range(n)]
        self.terminal = [[banks[b].share * (v + banks[b].esr_ohm * i)
                          for v, i in zip(self.capacitor[b], self.current[b], strict=True)] for b in range(n)]

    def _set_modes_of_decay(self, conductance: list[list[float]], drive: list[float],
                            start_v: list[float]) -> None:
        n = len(drive)
        root = [math.sqrt(bank.capacitance_f) for bank in self.network.banks]
        matrix = [[conductance[i][k] / (root[i] * root[k]) for k in range(n)] for i in range(n)]
        rates, vectors = symmetric_modes(matrix)
        self.rates = [0.0, *rates]
        self.capacitor = [[0.0] * (n + 1) for _ in range(n)]
        for k, (rate, vector) in enumerate(zip(rates, vectors, strict=True), start=1):
            start = sum(vector[i] * root[i] * start_v[i] for i in range(n))
            settled = sum(vector[i] * drive[i] / root[i] for i in range(n)) / rate
            for i in range(n):
                self.capacitor[i][0] += vector[i] * settled / root[i]
                self.capacitor[i][k] = vector[i] * (start - settled) / root[i]

    def _combine(self, constant: float, weights: Sequence[float]) -> list[float]:
        total = [0.0] * len(self.rates)
        total[0] = constant
        for weight, row in zip(weights, self.capacitor, strict=True):
            if weight != 0.0:
                total = [t + weight * c for t, c in zip(total, row, strict=True)]
        return total

    def _charge_current(self, b: int) -> list[float]:
        if self.modes[b] == LIMITED:
            return [self.network.banks[b].limit_a] + [0.0] * (len(self.rates) - 1)
        if self.modes[b] == RESISTIVE:
            return self._available(b)
        return [0.0] * len(self.rates)

    def _available(self, b: int) -> list[float]:
        """Return the current that the resistance alone would let through (negative when blocked)."""
        bank = self.network.banks[b]
        current = [bank.charge_s * (s - bank.share * v)
                   for s, v in zip(self.node, self.capacitor[b], strict=True)]
        current[0] -= bank.charge_s * bank.charge_diode_v
        return current

    def _first_event(self, longest_s: float) -> tuple[float, list[int] | None]:
        earliest, modes = longest_s, None
        for b in self.network.charging:
            mode = self.modes[b]
            available = self._available(b)
            tests: list[tuple[int, float, float]] = []
            if mode == RESISTIVE:
                tests.append((BLOCKED, -1.0, 0.0))
                if self.network.banks[b].limit_a != math.inf:
                    tests.append((LIMITED, 1.0, self.network.banks[b].limit_a))
            elif mode == LIMITED:
                tests.append((RESISTIVE, -1.0, -self.network.banks[b].limit_a))
            elif mode == BLOCKED:
                tests.append((RESISTIVE, 1.0, 0.0))
            for new_mode, sign, level in tests:
                excess = [sign * c for c in available]
                excess[0] -= level + MODE_HYSTERESIS_A
                found = first_upward_crossing(excess, self.rates, earliest)
                if found is not None and found < earliest:
                    earliest = found
                    modes = list(self.modes)
                    modes[b] = new_mode
        return earliest, modes

    def capacitor_v(self, time_s: float) -> list[float]:
        """Return the capacitors' voltages behind their ESR at a time of this stretch, volt."""
        return [value(row, self.rates, time_s - self.start_s) for row in self.capacitor]

    def terminal_v(self, bank: int, time_s: float) -> float:
        """Return a bank's terminal voltage at a time of this stretch, volt."""
        return value(self.terminal[bank], self.rates, time_s - self.start_s)

    def supply_a(self, time_s: float) -> float:
        """Return the supply's current at a time of this stretch, ampere."""
        return sum(value(row, self.rates, time_s - self.start_s) for row in self.current)

    def terminal_square_integral(self, bank: int, time_s: float) -> float:
        """Return the integral of the terminal voltage squared since the start, V**2 s (for coil heat)."""
        row = self.terminal[bank]
        return product_integral(row, row, self.rates, time_s - self.start_s)

    def supplied_j(self, time_s: float) -> float:
        """Return what the supply has delivered since the start, joule."""
        return self.network.voltage_v * sum(integral(row, self.rates, time_s - self.start_s)
                                            for row in self.current)

    def circuit_heat_j(self, time_s: float) -> float:
        """Return the heat in source, charge paths, ESR and leaks (not in coils) since the start, joule."""
        t = time_s - self.start_s
        drawn = [sum(column) for column in zip(*self.current, strict=True)]
        heat = self.network.source_ohm * product_integral(drawn, drawn, self.rates, t)
        for b, bank in enumerate(self.network.banks):
            if self.modes[b] not in (OFF, BLOCKED):
                across = [s - v for s, v in zip(self.node, self.terminal[b], strict=True)]
                heat += product_integral(self.current[b], across, self.rates, t)
            heat += bank.leak_s * self.terminal_square_integral(b, time_s)
            inward = [i - bank.ground_s * v
                      for i, v in zip(self.current[b], self.terminal[b], strict=True)]
            heat += bank.esr_ohm * product_integral(inward, inward, self.rates, t)
        return heat

