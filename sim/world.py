"""The world around a virtual board: circuit, ADC, the pulse hardware, contacts, buttons, and time in microseconds.

It checks from outside, with its own book-keeping, what must always hold, and raises InvariantBroken if it does not.
Everything random comes from one seed.
"""

import random
from dataclasses import dataclass, field

from shared_protocol import settings_table as table
from shared_protocol.settings import Settings
from sim.circuit import Circuit
from sim.circuit_parameters import BankParameters, SupplyParameters
from sim.inputs import Inputs
from sim.motor import Motor
from sim.pulse_hardware import PulseHardware, PulseRecord

SAMPLE_US = 100
FRESH_SAMPLES = 5
FRESH_US = 5000
ADC_STEPS = 4096
NOISE_STEPS = 0.7


class InvariantBroken(AssertionError):
    """The firmware did what it must never do."""


@dataclass
class Sense:
    """The voltage sense of a bank. `fault`: 'none', 'upper_open' (reads nothing) or 'lower_open' (reads the most)."""

    range_mv: int
    fault: str = "none"


@dataclass
class Reading:
    """What the ADC's ring says of one bank, in millivolts; -1 where there are no fresh samples."""

    low_mv: int = -1
    mean_mv: int = -1
    last_mv: int = 0
    age_us: int = 0


@dataclass
class World:
    """One board's surroundings. `now_us` is true time; the board's ticks start at `first_tick_us` and wrap."""

    settings: Settings
    supply: SupplyParameters
    banks: list[BankParameters]
    motors: list[Motor]
    seed: int = 0
    first_tick_us: int = 0
    first_tick_ms: int = 0
    now_us: int = 0
    pulses: list[PulseRecord] = field(default_factory=list)
    follower_bits: list[int] = field(default_factory=lambda: [0, 0])
    stopped: bool = False

    def __post_init__(self) -> None:
        self._rng = random.Random(self.seed)
        bank_of = [(motor.bank, self.motors[motor.i]) for motor in self.settings.motors]
        self.circuit = Circuit(self.supply, self.banks, bank_of, random.Random(self.seed + 1))
        assert self.settings.timing is not None
        self._settle_us = self.settings.timing.settle_ms * 1000
        self.hardware = [PulseHardware(bank, self.settings) for bank in self.settings.banks]
        self.inputs = Inputs(self.settings, self.motors, random.Random(self.seed + 2))
        self.sense = [Sense(bank.range_mv) for bank in self.settings.banks]
        self._settled_us = 0
        self._rest_us: dict[tuple[int, int], int] = {}
        self._sent: dict[int, int] = {}

    # ---- time

    def next_event_us(self) -> int | None:
        """When the world itself next changes something that the board should see soon; None if nothing is due."""
        times = [unit.ends_us for unit in self.hardware if unit.ends_us is not None and unit.ends_us > self.now_us]
        moment = self.inputs.next_event_us(self.now_us)
        if moment is not None:
            times.append(moment)
        return min(times) if times else None

    def advance(self, until_us: int) -> None:
        """Let time pass; pulses end exactly when they must."""
        while True:
            running = [unit for unit in self.hardware if unit.on_until_us is not None]
            ends = min((unit.on_until_us or 0 for unit in running), default=until_us + 1)
            if ends > until_us:
                break
            self.circuit.advance(ends / 1e6)
            self.now_us = ends
            for unit in running:
                if unit.on_until_us == ends:
                    unit.end_pulse()
                    self.circuit.set_drivers(unit.number, ())
                    self._settled_us = ends + self._settle_us
        self.circuit.advance(until_us / 1e6)
        self.now_us = until_us
        self.inputs.update(self.now_us)

    def ticks_us(self) -> int:
        """The board's microsecond ticks."""
        return (self.first_tick_us + self.now_us) & ((1 << 30) - 1)

    def ticks_ms(self) -> int:
        """The board's millisecond ticks."""
        return (self.first_tick_ms + self.now_us // 1000) & ((1 << 30) - 1)

    # ---- the ADC

    def read_bank(self, number: int) -> Reading:
        """What the ring of samples says now."""
        volts = self.circuit.bank_v(number)
        disturbed = any(unit.on_until_us is not None for unit in self.hardware)
        fresh_us = min(self.now_us - self._settled_us, FRESH_US)
        last_mv = self._sample(number, volts)
        if disturbed or fresh_us < FRESH_SAMPLES * SAMPLE_US:
            return Reading(-1, -1, last_mv, 0)
        low_mv = last_mv
        total_mv = last_mv
        for _ in range(FRESH_SAMPLES - 1):
            sample_mv = self._sample(number, volts)
            total_mv += sample_mv
            low_mv = min(low_mv, sample_mv)
        return Reading(low_mv, total_mv // FRESH_SAMPLES, last_mv, 0)

    def _sample(self, number: int, volts: float) -> int:
        sense = self.sense[number]
        steps = volts * 1000 / sense.range_mv * ADC_STEPS + self._rng.gauss(0, NOISE_STEPS)
        if sense.fault == "upper_open":
            steps = abs(self._rng.gauss(0, NOISE_STEPS))
        elif sense.fault == "lower_open":
            steps = ADC_STEPS - 1
        counts = max(0, min(ADC_STEPS - 1, int(steps)))
        return counts * sense.range_mv >> 12

    # ---- pulses

    def start_pulse(self, bank: int, group: int, mask: int, width_us: int) -> None:
        """The word for a pulse reaches the hardware. Raises InvariantBroken for what must never be sent."""
        unit = self.hardware[bank]
        coils = unit.coils_of(group, mask)
        self._check_pulse(bank, mask, coils, width_us)
        if not unit.begin(self.now_us, width_us):
            raise InvariantBroken(f"bank {bank}: a pulse was sent while another runs")
        self.circuit.set_drivers(bank, coils)
        self.pulses.append(
            PulseRecord(self.now_us, bank, group, mask, width_us, round(self.circuit.bank_v(bank) * 1000))
        )

    def _check_pulse(self, bank: int, mask: int, coils: set[tuple[int, int]], width_us: int) -> None:
        unit = self.hardware[bank]
        if self.stopped:
            raise InvariantBroken("a pulse after the stop was confirmed")
        if len({motor for motor, _ in coils}) != len(coils):
            raise InvariantBroken(f"mask {mask:#x}: both coils of one motor")
        rule = unit.rule_of(coils)
        if rule is None:
            raise InvariantBroken(f"mask {mask:#x}: no lie pulses these coils together")
        if not 3 <= width_us <= min(rule.longest_us, 65_535):
            raise InvariantBroken(f"{width_us} us is longer than the junction's {rule.longest_us} us")
        reading_mv = self.circuit.bank_v(bank) * 1000
        if self.sense[bank].fault == "none" and reading_mv < rule.ready_mv - 5 * self.sense[bank].range_mv / ADC_STEPS:
            raise InvariantBroken(f"bank {bank}: pulse at {reading_mv:.0f} mV, ready voltage {rule.ready_mv} mV")
        for coil in coils:
            rested_us = self.now_us - self._rest_us.get(coil, -(1 << 40))
            if rested_us < (self.settings.motors[coil[0]].rest_ms - 1) * 1000:
                raise InvariantBroken(f"motor {coil[0]}: its coil has rested {rested_us} us only")
            self._rest_us[coil] = self.now_us
        self._check_combination(coils)

    def _check_combination(self, coils: set[tuple[int, int]]) -> None:
        """Positions as commanded: what a mechanism that obeys would make of it."""
        for motor, coil in coils:
            self._sent[motor] = coil
        for junction in self.settings.junctions:
            sent = [self._sent.get(motor) for motor in junction.motors]
            if None not in sent:
                at = sum((side or 0) << place for place, side in enumerate(sent))
                if at in junction.forbid:
                    raise InvariantBroken(f"junction {junction.i}: forbidden combination {at}")

    def power_cut(self) -> None:
        """The board loses its supply: every output off at once, its marks gone (flash stays)."""
        for unit in self.hardware:
            unit.power_cut()
            self.circuit.set_drivers(unit.number, ())
        self._settled_us = self.now_us + self._settle_us
        self.circuit.charge_on[:] = [True] * len(self.banks)
        self.stopped = False

    # ---- what is true, for expectations

    def position(self, junction: int) -> int | None:
        """The lie in which the points really are; None if between, or in no lie of that junction."""
        at = 0
        for place, motor in enumerate(self.settings.junctions[junction].motors):
            position = self.motors[motor].position()
            if position == "between":
                return None
            at |= (position == "reverse") << place
        for lie in self.settings.junctions[junction].lies:
            if lie.at == at:
                return lie.i
        return None


def fitted_switch(settings: Settings, bank: int) -> bool:
    """True if a charge cut-off is fitted: without one the board's wish changes nothing."""
    return settings.banks[bank].charge.guard == table.GUARD_CUTOFF
