"""The world around a virtual board: circuit, ADC, pulse hardware, contacts, buttons, flash, time in microseconds.

Wiring and physics come from the layout; what is allowed comes from the settings that the board has in force. The world
checks from outside, with its own book-keeping, what must always hold, and raises InvariantBroken if it does not.
Everything random comes from one seed.
"""

import random
from collections.abc import Callable
from dataclasses import dataclass, field

from shared_protocol import settings_table as table
from shared_protocol.settings import Settings
from sim.circuit import Circuit
from sim.circuit_parameters import BankParameters, SupplyParameters
from sim.inputs import Inputs
from sim.motor import Motor
from sim.pulse_hardware import PulseHardware, PulseRecord
from sim.rules import InvariantBroken, Rules
from sim.sensing import ADC_STEPS, MARGIN_STEPS, Noise, Reading, Sense

__all__ = ["InvariantBroken", "World"]

# One step of flash writing that erases a sector (a file of 2 kB takes 50 to 110 ms in two or three of them; tried).
FLASH_US = 40_000
# Clocks of the board wrap here, in microseconds and in milliseconds.
TICKS_MASK = (1 << 30) - 1


def tell_nobody(_at_us: int, _text: str) -> None:
    """Nobody listens."""


@dataclass
class World:
    """One board's surroundings. `now_us` is true time; the board's clocks start at `first_tick_us`, `first_tick_ms`.

    settings: the wiring, as the layout has it. tell: called with time and text for each pulse that begins or ends.
    """

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
    # True while the operator knows that his stop is on: no pulse may begin.
    stopped: bool = False
    tell: Callable[[int, str], None] = tell_nobody

    def __post_init__(self) -> None:
        self._noise = Noise(random.Random(self.seed))
        bank_of = [(motor.bank, self.motors[motor.i]) for motor in self.settings.motors]
        self.circuit = Circuit(self.supply, self.banks, bank_of, random.Random(self.seed + 1))
        self.hardware = [PulseHardware(bank.i, bank.gap_ms * 1000) for bank in self.settings.banks]
        self.inputs = Inputs(self.settings, self.motors, random.Random(self.seed + 2))
        self.sense = [Sense(bank.range_mv, bank.range_mv, bank.zero_mv, bank.zero_mv) for bank in self.settings.banks]
        # Output of a bank: the motor and coil that are wired to it.
        self._wired: dict[tuple[int, int], tuple[int, int]] = {}
        for motor in self.settings.motors:
            self._wired[motor.bank, motor.normal] = (motor.i, 0)
            self._wired[motor.bank, motor.reverse] = (motor.i, 1)
        self._settle_us = 0
        self._settled_us = 0
        # The pulse that ends first, or nothing: asked at every step.
        self._next_end_us: int | None = None
        # Judges pulses; `_in_force` is False until the board that has started has said what settings it has.
        self.rules: Rules | None = None
        self._in_force = False

    # ---- settings

    def put_in_force(self, settings: Settings | None) -> None:
        """The board goes by these settings from now on."""
        self._in_force = settings is not None
        if settings is None or settings.timing is None:
            return
        before = self.rules
        if before is not None and same_wiring(before.settings, settings):
            self.rules = Rules(settings, before.positions)
            self.rules.inherit(before)
        else:
            self.rules = Rules(settings, self._true_positions(settings))
        self._settle_us = settings.timing.settle_ms * 1000
        for bank, unit, sense in zip(settings.banks, self.hardware, self.sense, strict=False):
            unit.gap_us = bank.gap_ms * 1000
            sense.believed_mv = bank.range_mv
            sense.believed_zero_mv = bank.zero_mv

    def _true_positions(self, settings: Settings) -> list[int | None]:
        """Where motors lie, if the settings speak of the motors that are there; else unknown."""
        if not same_wiring(self.settings, settings):
            return [None] * len(settings.motors)
        where = {"normal": 0, "reverse": 1}
        positions = [where.get(motor.position()) for motor in self.motors]
        for junction in settings.junctions:
            # No order of pulses is safe from a combination that is forbidden already: then nothing is known.
            at = sum((positions[motor] or 0) << place for place, motor in enumerate(junction.motors))
            if at in junction.forbid:
                for motor in junction.motors:
                    positions[motor] = None
        return positions

    # ---- time

    def next_event_us(self) -> int | None:
        """When the world itself next changes something that the board should see soon; None if nothing is due."""
        moment = self.inputs.next_event_us(self.now_us)
        for unit in self.hardware:
            if unit.free_us > self.now_us and (moment is None or unit.free_us < moment):
                moment = unit.free_us
        return moment

    def advance(self, until_us: int) -> None:
        """Let time pass; pulses end exactly when they must."""
        while self._next_end_us is not None and self._next_end_us <= until_us:
            self._end_pulses(self._next_end_us)
        self.circuit.advance(until_us / 1e6)
        self.now_us = until_us
        self.inputs.update(until_us)

    def _end_pulses(self, moment_us: int) -> None:
        self.circuit.advance(moment_us / 1e6)
        self.now_us = moment_us
        for unit in self.hardware:
            if unit.on_until_us == moment_us:
                unit.end_pulse()
                left_mv = round(self.circuit.bank_v(unit.number) * 1000)
                self.circuit.set_drivers(unit.number, ())
                self._settled_us = moment_us + self._settle_us
                self.tell(moment_us, f"pulse ends bank {unit.number} at {left_mv} mV")
        self._find_next_end()

    def _find_next_end(self) -> None:
        ends = [unit.on_until_us for unit in self.hardware if unit.on_until_us is not None]
        self._next_end_us = min(ends) if ends else None

    def ticks_us(self) -> int:
        """The board's microsecond ticks."""
        return (self.first_tick_us + self.now_us) & TICKS_MASK

    def ticks_ms(self) -> int:
        """The board's millisecond ticks."""
        return (self.first_tick_ms + self.now_us // 1000) & TICKS_MASK

    # ---- what the board sees and does

    def read_bank(self, number: int) -> Reading:
        """What the ring of samples says now."""
        fresh_us = -1 if self._next_end_us is not None else self.now_us - self._settled_us
        return self.sense[number].read(self.circuit.bank_v(number), fresh_us, self._noise)

    def start_pulse(self, bank: int, group: int, mask: int, width_us: int) -> None:
        """The word for a pulse reaches the hardware. Raises InvariantBroken for what must never be sent."""
        if self.rules is None or not self._in_force:
            raise InvariantBroken("a pulse without settings")
        if bank >= len(self.hardware):
            raise InvariantBroken(f"a pulse on bank {bank}, which is not there")
        if self.stopped:
            raise InvariantBroken("a pulse after the stop was confirmed")
        volts = self.circuit.bank_v(bank)
        sense = self.sense[bank]
        known_mv = volts * 1000 if sense.is_right else None
        margin_mv = MARGIN_STEPS * sense.range_mv / ADC_STEPS
        self.rules.judge((bank, group, mask), width_us, known_mv, margin_mv, self.now_us)
        unit = self.hardware[bank]
        if not unit.begin(self.now_us, width_us):
            raise InvariantBroken(f"bank {bank}: a pulse was sent while another, or its gap, runs")
        self._find_next_end()
        self.circuit.set_drivers(bank, self._coils(bank, group, mask))
        record = PulseRecord(self.now_us, bank, group, mask, width_us, round(volts * 1000))
        self.pulses.append(record)
        text = f"pulse begins bank {bank} group {group} mask {mask} for {width_us} us at {record.mv} mV"
        self.tell(self.now_us, text)

    def _coils(self, bank: int, group: int, mask: int) -> set[tuple[int, int]]:
        """The coils that are really wired to these outputs."""
        outputs = [group * table.GROUP_COILS + bit for bit in range(table.GROUP_COILS) if (mask >> bit) & 1]
        return {self._wired[bank, output] for output in outputs if (bank, output) in self._wired}

    def write_flash(self, steps: int) -> None:
        """Flash is written, in steps that erase: time passes, and samples from before are stale.

        Raises InvariantBroken during a pulse: interrupts are off while flash is written.
        """
        if self._next_end_us is not None:
            raise InvariantBroken("flash was written while a pulse was running")
        if steps:
            self.advance(self.now_us + steps * FLASH_US)
            self._settled_us = self.now_us

    def set_charge(self, bank: int, on: bool) -> None:
        """The board's wish for a charge path: it counts where a cut-off is fitted."""
        fitted = self.settings.banks[bank].charge.guard == table.GUARD_CUTOFF
        if fitted and self.circuit.charge_on[bank] != on:
            self.circuit.charge_on[bank] = on
            self.tell(self.now_us, f"charge path of bank {bank} {'on' if on else 'off'}")

    def power_cut(self) -> None:
        """The board loses its supply, or is reset: every output off at once, its marks gone (flash stays)."""
        for unit in self.hardware:
            if unit.on_until_us is not None:
                self.tell(self.now_us, f"pulse cut short bank {unit.number}")
            unit.power_cut()
            self.circuit.set_drivers(unit.number, ())
        self._next_end_us = None
        self._in_force = False
        self._settled_us = self.now_us + self._settle_us
        self.circuit.charge_on[:] = [True] * len(self.banks)
        self.follower_bits[:] = [0, 0]
        self.stopped = False

    # ---- hands, and what is true

    def move_by_hand(self, junction: int, lie: int) -> None:
        """Somebody moves the points of a junction (of the wiring) to one of its lies."""
        wired = self.settings.junctions[junction]
        for place, motor in enumerate(wired.motors):
            side = (wired.lies[lie].at >> place) & 1
            self.motors[motor].set_by_hand("reverse" if side else "normal")
            # In the middle of a throw nobody can know of it: until pulsed again the motor is where it may be.
            if self.rules is not None and len(self.rules.positions) == len(self.motors):
                self.rules.positions[motor] = None

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

    def follower(self, output: int) -> bool:
        """Whether a follower output is on."""
        return bool((self.follower_bits[output // 24] >> (output % 24)) & 1)


def same_wiring(one: Settings, other: Settings) -> bool:
    """True if both speak of the same motors on the same outputs."""
    if len(one.motors) != len(other.motors) or len(one.banks) != len(other.banks):
        return False
    return all(left.same_wiring(right) for left, right in zip(one.motors, other.motors, strict=True))
