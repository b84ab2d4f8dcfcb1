"""The simulated layout's power circuit: one supply, capacitor banks, drivers, coils and plungers.

While nothing moves and no current changes, the linear charging network is solved exactly (sim.charging);
while a pulse runs, its equations are integrated (sim.pulse, sim.pulse_run). SI units throughout.
"""

import random
from collections.abc import Iterable
from dataclasses import dataclass

from sim.charging import LONGEST_STRETCH_S, ChargingRun
from sim.circuit_parameters import BankFaults, BankParameters, CircuitError, CoilFaults, Energy, SupplyParameters
from sim.motor import Motor
from sim.network import BankConstants, Network, bank_constants
from sim.pulse import (
    CIRCUIT_HEAT,
    FRICTION_HEAT,
    HEAT_0,
    MOTOR_STATES,
    PLACE,
    SHORT_INDUCTANCE_SHARE,
    SPEED,
    SUPPLIED,
    ActiveMotor,
)
from sim.pulse_run import PulseRun, stop_touched

__all__ = ["BankFaults", "BankParameters", "Circuit", "CircuitError", "CoilFaults", "Energy", "SupplyParameters"]

LONGEST_HELD_STRETCH_S = 0.05  # how often a held plunger is asked whether it still stays

Coil = tuple[int, int]


@dataclass
class Moment:
    """All that changes in a circuit: capacitor voltages, coils' flux linkages, plungers' place and speed, coil heat,
    totals (energy supplied, circuit heat, friction heat) and energy lost in interrupted currents, in SI units.
    """

    capacitor_v: list[float]
    flux: list[list[float]]
    places: list[tuple[float, float]]
    heat_j: list[list[float]]
    totals: list[float]
    interrupted_j: float

    def copy(self) -> "Moment":
        """Return a copy that can be changed."""
        return Moment(list(self.capacitor_v), [list(f) for f in self.flux], list(self.places),
                      [list(h) for h in self.heat_j], list(self.totals), self.interrupted_j)


class Circuit:
    """One supply feeding banks that feed motors.

    supply, banks: parameters; they and the faults may be changed at any time, and count from ``time_s`` on.
    motors: (bank index, motor) for each motor; a coil is named (motor index, coil 0 or 1).
    rng: source of all randomness (the friction of each throw).

    Attributes: ``time_s``; ``supply_on``; ``charge_on``, a flag a bank (charge cut-off); ``coil_faults``, by coil;
    ``bank_faults``, a list. Banks start empty, charging is on. Raises CircuitError for impossible parameters.
    """

    def __init__(self, supply: SupplyParameters, banks: list[BankParameters], motors: list[tuple[int, Motor]],
                 rng: random.Random) -> None:
        if not banks:
            raise CircuitError("a circuit needs at least one bank")
        for bank, _ in motors:
            if not 0 <= bank < len(banks):
                raise CircuitError(f"there is no bank {bank}")
        self.time_s = 0.0
        self.supply, self.banks, self.rng = supply, list(banks), rng
        self.motors = [motor for _, motor in motors]
        self.bank_of = [bank for bank, _ in motors]
        self.charge_on = [True] * len(banks)
        self.coil_faults = {(m, c): CoilFaults() for m in range(len(motors)) for c in (0, 1)}
        self.bank_faults = [BankFaults() for _ in banks]
        self._supply_on = True
        self._commanded: list[frozenset[Coil]] = [frozenset()] * len(banks)
        self._driven: frozenset[Coil] = frozenset()
        self._changed = True
        for watched in (supply, *self.banks, *self.bank_faults, *self.coil_faults.values()):
            watched.watch(self._note_change)
        for motor in self.motors:
            motor.on_change = self._note_change
        self._outside_j = 0.0
        self._coil_ohm: dict[Coil, float] = {}
        self._shorted: dict[Coil, bool] = {}
        self._held: list[tuple[int, int, float]] = []  # motor, coil, ampere per volt at the bank's terminals
        self._base = Moment([0.0] * len(banks), [[0.0, 0.0] for _ in motors],
                            [(motor.position_m, motor.velocity) for motor in self.motors],
                            [[0.0, 0.0] for _ in motors], [0.0, 0.0, 0.0], 0.0)
        self._read_parameters()
        self._outside_j = self._stored_j(self._base)
        self._run: ChargingRun | PulseRun = self._begin()

    # ---- what may be changed ----

    @property
    def supply_on(self) -> bool:
        """Whether the supply is switched on."""
        return self._supply_on

    @supply_on.setter
    def supply_on(self, on: bool) -> None:
        self._supply_on = on
        self._note_change()

    def set_drivers(self, bank: int, coils: Iterable[Coil]) -> None:
        """Command exactly these coils, (motor, coil), of a bank on from now; stuck drivers stay on besides.

        Raises CircuitError for a coil that is not on that bank.
        """
        wanted = frozenset(coils)
        for coil in wanted:
            if coil not in self.coil_faults or self.bank_of[coil[0]] != bank:
                raise CircuitError(f"bank {bank} has no coil {coil}")
        if wanted != self._commanded[bank]:
            self._commanded[bank] = wanted
            self._note_change()

    def set_bank_v(self, bank: int, volts: float) -> None:
        """Set a bank's capacitor to a voltage, as if charged or discharged by hand."""
        self._take_over()
        self._outside_j -= self._stored_j(self._base)
        self._base.capacitor_v[bank] = volts
        self._outside_j += self._stored_j(self._base)
        self._run = self._begin()

    # ---- time ----

    def advance(self, until_s: float) -> None:
        """Move the circuit's time to ``until_s``, second. Raises CircuitError for a time that has passed."""
        if until_s < self.time_s:
            raise CircuitError(f"time cannot go back from {self.time_s} s to {until_s} s")
        if self._changed or self.charge_on != self._last_charge_on:
            self._take_over()
            self._run = self._begin()
        while True:
            run = self._run
            if until_s < run.end_s:
                break
            if isinstance(run, PulseRun):
                run.next_step()
                if run.settled():
                    self._base = self._moment(run.start_s)
                    self._record_motors(self._base)
                    self._run = self._charge(run.start_s, None)
            else:
                self._base = self._moment(run.end_s)
                self._run = self._charge(run.end_s, run.next_modes) if self._all_stay() else self._begin_at(run.end_s)
        self.time_s = until_s
        if isinstance(self._run, PulseRun):
            self._record_motors(self._moment(until_s))

    # ---- what can be seen ----

    def bank_v(self, bank: int) -> float:
        """Return a bank's voltage at its terminals (the sense point), volt."""
        if isinstance(self._run, ChargingRun):
            return self._run.terminal_v(bank, self.time_s)
        return self._run.equations.look(self._run.view(self.time_s))[0][bank]

    def capacitor_v(self, bank: int) -> float:
        """Return the voltage of a bank's capacitor behind its series resistance, volt."""
        return self._moment(self.time_s).capacitor_v[bank]

    def coil_a(self, motor: int, coil: int) -> float:
        """Return a coil's current, ampere."""
        moment = self._moment(self.time_s)
        flux = moment.flux[motor][coil]
        return flux / self._inductance(motor, coil, moment.places[motor][0]) if flux != 0.0 else 0.0

    def supply_a(self) -> float:
        """Return the current drawn from the supply, ampere."""
        if isinstance(self._run, ChargingRun):
            return self._run.supply_a(self.time_s)
        return self._run.equations.look(self._run.view(self.time_s))[1]

    def coil_heat_j(self, motor: int, coil: int) -> float:
        """Return the heat that a coil's winding has received since the circuit was made, joule."""
        return self._moment(self.time_s).heat_j[motor][coil]

    def energy(self) -> Energy:
        """Return the energy balance since the circuit was made, joule."""
        moment = self._moment(self.time_s)
        return Energy(
            supplied_j=moment.totals[SUPPLIED], outside_j=self._outside_j,
            capacitors_j=self._capacitors_j(moment), magnetic_j=self._magnetic_j(moment),
            mechanical_j=self._mechanical_j(moment), coil_heat_j=sum(map(sum, moment.heat_j)),
            circuit_heat_j=moment.totals[CIRCUIT_HEAT], friction_heat_j=moment.totals[FRICTION_HEAT],
            interrupted_j=moment.interrupted_j)

    # ---- energies ----

    def _capacitors_j(self, moment: Moment) -> float:
        return sum(0.5 * bank.capacitance_f * v * v
                   for bank, v in zip(self._constants, moment.capacitor_v, strict=True))

    def _magnetic_j(self, moment: Moment) -> float:
        return sum(0.5 * moment.flux[m][c] ** 2 / self._inductance(m, c, moment.places[m][0])
                   for m in range(len(self.motors)) for c in (0, 1) if moment.flux[m][c] != 0.0)

    def _mechanical_j(self, moment: Moment) -> float:
        return sum(motor.stored_energy(*place) for motor, place in zip(self.motors, moment.places, strict=True))

    def _stored_j(self, moment: Moment) -> float:
        return self._capacitors_j(moment) + self._magnetic_j(moment) + self._mechanical_j(moment)

    def _inductance(self, motor: int, coil: int, place_m: float) -> float:
        if self._shorted[motor, coil]:
            return self.motors[motor].parameters.inductance_out_h * SHORT_INDUCTANCE_SHARE
        return self.motors[motor].inductance_at(coil, place_m)

    # ---- from one stretch to the next ----

    def _note_change(self) -> None:
        self._changed = True

    def _read_parameters(self) -> None:
        """Take in all parameters, faults and commands as they are now."""
        self.supply.check()
        for bank in self.banks:
            bank.check()
        for bank_faults in self.bank_faults:
            bank_faults.check()
        self._constants = [bank_constants(bank, faults)
                           for bank, faults in zip(self.banks, self.bank_faults, strict=True)]
        for coil, coil_faults in self.coil_faults.items():
            coil_faults.check()
            sound = self.motors[coil[0]].parameters.resistance_ohm
            self._coil_ohm[coil] = sound if coil_faults.short_ohm is None else coil_faults.short_ohm
            self._shorted[coil] = coil_faults.short_ohm is not None
        self._last_charge_on = list(self.charge_on)
        self._draw_friction()
        self._changed = False

    def _draw_friction(self) -> None:
        stuck = {coil for coil, faults in self.coil_faults.items() if faults.driver_stuck}
        before = {motor for motor, _ in self._driven}
        self._driven = frozenset(stuck.union(*self._commanded))
        for motor in sorted({motor for motor, _ in self._driven} - before):
            self.motors[motor].draw_friction(self.rng)

    def _take_over(self) -> None:
        """End the present stretch now and let changes from outside count from here."""
        self._base = self._moment(self.time_s)
        before = self._stored_j(self._base)
        self._base.places = [(motor.position_m, motor.velocity) for motor in self.motors]
        self._read_parameters()
        self._outside_j += self._stored_j(self._base) - before

    def _begin(self) -> ChargingRun | PulseRun:
        return self._begin_at(self.time_s)

    def _begin_at(self, time_s: float) -> ChargingRun | PulseRun:
        active = [a for a in map(self._active, range(len(self.motors))) if a is not None]
        if not active:
            return self._charge(time_s, None)
        state = [*self._base.capacitor_v, *self._base.totals]
        for a in active:
            state += [*self._base.flux[a.index], *self._base.places[a.index], *self._base.heat_j[a.index]]
        return PulseRun(self._network(self._constants), active, time_s, state)

    def _network(self, constants: list[BankConstants]) -> Network:
        return Network(self.supply, constants, [self._supply_on and on for on in self.charge_on])

    def _active(self, m: int) -> ActiveMotor | None:
        """Return a motor's switches for a pulse, or None when nothing is going on in it."""
        motor, bank = self.motors[m], self.bank_of[m]
        flux, (place, speed) = self._base.flux[m], self._base.places[m]
        driven = [(m, c) in self._driven and not self.coil_faults[m, c].open for c in (0, 1)]
        closed = [motor.coil_connected(c) for c in (0, 1)]
        fed = [d and c for d, c in zip(driven, closed, strict=True)]
        for c in (0, 1):
            can_go_on = closed[c] and not self.coil_faults[m, c].open and self.banks[bank].diode_v is not None
            if flux[c] != 0.0 and not fed[c] and not (can_go_on and flux[c] > 0.0):
                self._base.interrupted_j += 0.5 * flux[c] ** 2 / self._inductance(m, c, place)
                flux[c] = 0.0
        active = ActiveMotor(
            m, motor, bank, fed, closed, driven, [self._coil_ohm[m, c] for c in (0, 1)],
            [self.coil_faults[m, c].joint_ohm for c in (0, 1)], [self._shorted[m, c] for c in (0, 1)],
            stop=stop_touched(motor))
        if motor.jammed:
            self._base.totals[FRICTION_HEAT] += 0.5 * motor.parameters.mass_kg * speed ** 2
            self._base.places[m] = (place, 0.0)
            motor.record(place, 0.0)
        elif speed != 0.0:
            active.sign = 1 if speed > 0.0 else -1
        else:
            push = active.push(place, *flux)
            active.sign = 0 if abs(push) <= active.stick_n else 1 if push > 0.0 else -1
        going_on = any(fed) or any(f != 0.0 for f in flux) or active.sign != 0
        return active if going_on else None

    def _charge(self, time_s: float, modes: list[int] | None) -> ChargingRun:
        """Begin a stretch of the exact solution; coils still fed are resistances in it."""
        load_s = [0.0] * len(self.banks)
        fed = [(m, c) for m, c in sorted(self._driven)
               if not self.coil_faults[m, c].open and self.motors[m].coil_connected(c)]
        for m, c in fed:
            load_s[self.bank_of[m]] += 1.0 / self._loop_ohm(m, c)
        share = [1.0 / (1.0 + bank.common_ohm * s) for bank, s in zip(self.banks, load_s, strict=True)]
        self._held = [(m, c, share[self.bank_of[m]] / self._loop_ohm(m, c)) for m, c in fed]
        constants = [bank_constants(bank, faults, s * k) for bank, faults, s, k in
                     zip(self.banks, self.bank_faults, load_s, share, strict=True)]
        longest = LONGEST_HELD_STRETCH_S if fed else LONGEST_STRETCH_S
        return ChargingRun(self._network(constants), time_s, self._base.capacitor_v, modes, longest)

    def _loop_ohm(self, m: int, c: int) -> float:
        return self._coil_ohm[m, c] + self.coil_faults[m, c].joint_ohm + self.banks[self.bank_of[m]].driver_ohm

    def _all_stay(self) -> bool:
        """Say whether every plunger held by a settled coil still rests."""
        actives = [self._active(m) for m in {m for m, _, _ in self._held}]
        return all(a is None or a.sign == 0 for a in actives)

    def _moment(self, time_s: float) -> Moment:
        """Return everything that is known at a time of the present stretch."""
        run, moment = self._run, self._base.copy()
        if isinstance(run, PulseRun):
            state = run.view(time_s)
            banks = len(self.banks)
            moment.capacitor_v = state[:banks]
            moment.totals = state[banks:banks + 3]
            moment.interrupted_j += run.interrupted_j
            for a in run.motors:
                part = state[a.at:a.at + MOTOR_STATES]
                moment.flux[a.index] = part[:PLACE]
                moment.places[a.index] = (part[PLACE], part[SPEED])
                moment.heat_j[a.index] = part[HEAT_0:]
            return moment
        moment.capacitor_v = run.capacitor_v(time_s)
        moment.totals[SUPPLIED] += run.supplied_j(time_s)
        moment.totals[CIRCUIT_HEAT] += run.circuit_heat_j(time_s)
        self._add_held(run, moment, time_s)
        return moment

    def _add_held(self, run: ChargingRun, moment: Moment, time_s: float) -> None:
        for bank in range(len(self.banks)):
            held = [(m, c, s) for m, c, s in self._held if self.bank_of[m] == bank]
            if not held:
                continue
            squared = run.terminal_square_integral(bank, time_s)
            volts = run.terminal_v(bank, time_s)
            in_load = (run.network.banks[bank].ground_s - run.network.banks[bank].leak_s) * squared
            for m, c, siemens in held:
                heat = self._coil_ohm[m, c] * siemens ** 2 * squared
                moment.heat_j[m][c] += heat
                in_load -= heat
                moment.flux[m][c] = siemens * volts * self._inductance(m, c, moment.places[m][0])
            moment.totals[CIRCUIT_HEAT] += in_load

    def _record_motors(self, moment: Moment) -> None:
        for motor, place in zip(self.motors, moment.places, strict=True):
            motor.record(*place)
