"""What the settings in force allow, worked out apart from the firmware, to judge its pulses by.

The firmware checks its own pulses with its own code; this looks at it from outside and shares none of that.
"""

from dataclasses import dataclass

from shared_protocol.settings import JunctionSettings, LieSettings, Settings
from shared_protocol.settings_table import GROUP_COILS

# The longest pulse that the hardware's 16 bits can hold, and the shortest that it times rightly.
HARDWARE_LONGEST_US = 65_535
SHORTEST_US = 3

# A word to the hardware without its width: bank, run of outputs, mask.
Word = tuple[int, int, int]
# A motor's coil: its number in the settings, and 0 for normal, 1 for reverse.
Side = tuple[int, int]


class InvariantBroken(AssertionError):
    """The firmware did what it must never do."""


@dataclass
class Allowed:
    """What one word may do: the lowest ready voltage and longest pulse of all lies that use it; the coils it means."""

    ready_mv: int
    longest_us: int
    sides: tuple[Side, ...]


class Rules:
    """Judges pulses. `positions` holds where each motor was last commanded to (0 normal, 1 reverse, None unknown)."""

    def __init__(self, settings: Settings, positions: list[int | None]) -> None:
        self.settings = settings
        self.positions = positions
        self._rested_from_us: dict[Side, int] = {}
        self._allowed: dict[Word, Allowed] = {}
        for junction in settings.junctions:
            for lie in junction.lies:
                self._allow(junction, lie)

    def _allow(self, junction: JunctionSettings, lie: LieSettings) -> None:
        sides = [(motor, (lie.at >> place) & 1) for place, motor in enumerate(junction.motors)]
        for together in [tuple(sides)] if lie.together else [(side,) for side in sides]:
            words = [self._word(side) for side in together]
            banks = {(bank, group) for bank, group, _ in words}
            if len(banks) != 1:
                # The board's own check refuses such settings; nothing is allowed here either.
                continue
            bank, group = banks.pop()
            mask = sum(mask for _, _, mask in words)
            known = self._allowed.get((bank, group, mask))
            ready_mv, longest_us = lie.ready_mv, lie.pulse_us
            if known is not None:
                ready_mv, longest_us = min(ready_mv, known.ready_mv), max(longest_us, known.longest_us)
            self._allowed[(bank, group, mask)] = Allowed(ready_mv, longest_us, together)

    def _word(self, side: Side) -> Word:
        motor = self.settings.motors[side[0]]
        output = motor.reverse if side[1] else motor.normal
        return motor.bank, output // GROUP_COILS, 1 << (output % GROUP_COILS)

    def inherit(self, earlier: "Rules") -> None:
        """Take over how long each coil has rested: new settings do not cool a coil."""
        self._rested_from_us = dict(earlier._rested_from_us)

    def judge(self, word: Word, width_us: int, true_mv: float | None, margin_mv: float, now_us: int) -> None:
        """Judge a pulse that begins now. true_mv None: the sense is broken. Raises InvariantBroken."""
        bank, group, mask = word
        allowed = self._allowed.get(word)
        if allowed is None:
            raise InvariantBroken(f"bank {bank} group {group} mask {mask:#x}: no lie pulses these outputs together")
        if len({motor for motor, _ in allowed.sides}) != len(allowed.sides):
            raise InvariantBroken(f"bank {bank} mask {mask:#x}: both coils of one motor")
        if not SHORTEST_US <= width_us <= min(allowed.longest_us, HARDWARE_LONGEST_US):
            raise InvariantBroken(f"a pulse of {width_us} us; the junction's is {allowed.longest_us} us")
        if true_mv is not None and true_mv < allowed.ready_mv - margin_mv:
            raise InvariantBroken(f"bank {bank}: pulse at {true_mv:.0f} mV; ready voltage is {allowed.ready_mv} mV")
        self._judge_rest(allowed.sides, width_us, now_us)
        self._judge_combination(allowed.sides)

    def _judge_rest(self, sides: tuple[Side, ...], width_us: int, now_us: int) -> None:
        for side in sides:
            began_us = self._rested_from_us.get(side)
            # The firmware counts whole milliseconds: a millisecond less may pass.
            least_us = (self.settings.motors[side[0]].rest_ms - 1) * 1000
            if began_us is not None and now_us - began_us < least_us:
                raise InvariantBroken(f"motor {side[0]}: its coil has rested {(now_us - began_us) // 1000} ms only")
            self._rested_from_us[side] = now_us

    def _judge_combination(self, sides: tuple[Side, ...]) -> None:
        """A mechanism that obeys must not come into a forbidden combination, not even between two pulses."""
        for motor, side in sides:
            self.positions[motor] = side
        for junction in self.settings.junctions:
            at = 0
            for place, motor in enumerate(junction.motors):
                position = self.positions[motor]
                if position is None:
                    break
                at |= position << place
            else:
                if at in junction.forbid and any(motor in junction.motors for motor, _ in sides):
                    raise InvariantBroken(f"junction {junction.i}: forbidden combination {at}")
