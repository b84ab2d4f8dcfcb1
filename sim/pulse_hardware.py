"""The hardware that times a bank's pulses: width, then gap, and words that come meanwhile are thrown away."""

from dataclasses import dataclass

from shared_protocol.settings import BankSettings, Settings
from shared_protocol.settings_check import coil_of
from shared_protocol.settings_table import GROUP_COILS


@dataclass(frozen=True)
class PulseRecord:
    """A pulse that was given: when it began, which outputs, how long, and the bank's true voltage then."""

    at_us: int
    bank: int
    group: int
    mask: int
    width_us: int
    mv: int


@dataclass(frozen=True)
class PulseRule:
    """What the settings allow for one set of coils."""

    ready_mv: int
    longest_us: int


class PulseHardware:
    """One bank's timer and drivers."""

    def __init__(self, bank: BankSettings, settings: Settings) -> None:
        self.number = bank.i
        self._gap_us = bank.gap_ms * 1000
        self.on_until_us: int | None = None
        self.ends_us: int | None = None
        self.thrown_away = 0
        self._coils: dict[int, tuple[int, int]] = {}
        self._rules: dict[frozenset[tuple[int, int]], PulseRule] = {}
        for motor in settings.motors:
            if motor.bank == bank.i:
                self._coils[motor.normal] = (motor.i, 0)
                self._coils[motor.reverse] = (motor.i, 1)
        self._read_rules(settings)

    def _read_rules(self, settings: Settings) -> None:
        for junction in settings.junctions:
            for lie in junction.lies:
                sets: list[set[tuple[int, int]]] = [set()] if lie.together else []
                for place, number in enumerate(junction.motors):
                    motor = settings.motors[number]
                    if motor.bank != self.number:
                        continue
                    coil = self._coils[coil_of(motor, lie.at, place)]
                    if lie.together:
                        sets[0].add(coil)
                    else:
                        sets.append({coil})
                for coils in sets:
                    self._add_rule(frozenset(coils), lie.ready_mv, lie.pulse_us)

    def _add_rule(self, coils: frozenset[tuple[int, int]], ready_mv: int, pulse_us: int) -> None:
        if not coils:
            return
        known = self._rules.get(coils)
        if known is not None:
            ready_mv = min(ready_mv, known.ready_mv)
            pulse_us = max(pulse_us, known.longest_us)
        self._rules[coils] = PulseRule(ready_mv, pulse_us)

    def coils_of(self, group: int, mask: int) -> set[tuple[int, int]]:
        """The coils (motor, 0 normal or 1 reverse) behind a mask. An output without a coil is left out."""
        outputs = [group * GROUP_COILS + bit for bit in range(GROUP_COILS) if (mask >> bit) & 1]
        return {self._coils[output] for output in outputs if output in self._coils}

    def rule_of(self, coils: set[tuple[int, int]]) -> PulseRule | None:
        """What the settings allow for these coils together; None if nothing."""
        return self._rules.get(frozenset(coils))

    def begin(self, now_us: int, width_us: int) -> bool:
        """A word arrives; False if it is thrown away."""
        if self.running(now_us):
            self.thrown_away += 1
            return False
        self.on_until_us = now_us + width_us
        self.ends_us = self.on_until_us + self._gap_us
        return True

    def end_pulse(self) -> None:
        """The width is over; the gap begins."""
        self.on_until_us = None

    def running(self, now_us: int) -> bool:
        """True while the pulse or its gap runs."""
        return self.ends_us is not None and now_us < self.ends_us

    def power_cut(self) -> None:
        """Everything off, nothing remembered."""
        self.on_until_us = None
        self.ends_us = None
