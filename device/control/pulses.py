"""What to pulse for a throw, for how long, and which pulses the settings allow at all."""

from shared_protocol.settings import JunctionSettings, LieSettings, Settings
from shared_protocol.settings_check import coil_of
from shared_protocol.settings_table import GROUP_COILS

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.control.plant import Plant

ALL_TOGETHER = -1


class AllowedPulses:
    """Every mask that the settings allow on one bank, with the longest pulse for it.

    Made from the settings alone, apart from PulsePlan, so that the one place that sends a mask has a second opinion.
    """

    def __init__(self, settings: Settings, bank: int) -> None:
        self._keys: "list[int]" = []
        self._longest_us: "list[int]" = []
        for junction in settings.junctions:
            for lie in junction.lies:
                self._allow_lie(settings, bank, junction, lie)

    def _allow_lie(self, settings: Settings, bank: int, junction: JunctionSettings, lie: LieSettings) -> None:
        together = 0
        group = 0
        for place in lie.order:
            motor = settings.motors[junction.motors[place]]
            if motor.bank != bank:
                continue
            coil = coil_of(motor, lie.at, place)
            group = coil // GROUP_COILS
            bit = 1 << (coil % GROUP_COILS)
            together |= bit
            if not lie.together:
                self._allow(group, bit, lie.pulse_us)
        if lie.together and together:
            self._allow(group, together, lie.pulse_us)

    def _allow(self, group: int, mask: int, longest_us: int) -> None:
        key = (group << GROUP_COILS) | mask
        if key in self._keys:
            # Several lies of a junction may use one coil, each with a pulse of its own.
            place = self._keys.index(key)
            if longest_us > self._longest_us[place]:
                self._longest_us[place] = longest_us
        else:
            self._keys.append(key)
            self._longest_us.append(longest_us)

    def allows(self, group: int, mask: int, width_us: int) -> bool:
        """True if the settings allow this mask for so long."""
        key = (group << GROUP_COILS) | mask
        if key not in self._keys:
            return False
        return width_us <= self._longest_us[self._keys.index(key)]


class PulsePlan:
    """The next pulse of a throw. `make` fills the attributes; one object serves all."""

    def __init__(self, plant: "Plant") -> None:
        self._plant = plant
        self.place = 0
        self.bank = 0
        self.group = 0
        self.mask = 0
        self.cohm = 0
        self.ends_own = False
        self.motors = 0
        self.ready_mv = 0
        self._lie = plant.junctions[0].settings.lies[0]

    def make(self, junction: int, lie: int, place: int, raise_mv: int) -> None:
        """Plan pulse number `place` (from 0) of the way to `lie`; `raise_mv` is added to the ready voltage."""
        settings = self._plant.junctions[junction].settings
        row = settings.lies[lie]
        self._lie = row
        self.ready_mv = row.ready_mv + raise_mv
        self.mask = 0
        self.cohm = 0
        self.motors = 0
        self.ends_own = False
        if row.together:
            self.place = ALL_TOGETHER
            for number in range(len(settings.motors)):
                self._add(settings, row, number)
        else:
            self.place = row.order[place % len(row.order)]
            self._add(settings, row, self.place)

    def count(self, junction: int, lie: int) -> int:
        """How many pulses the whole way takes."""
        settings = self._plant.junctions[junction].settings
        row = settings.lies[lie]
        return (1 if row.together else len(row.order)) * settings.pulses

    def _add(self, settings: JunctionSettings, row: LieSettings, place: int) -> None:
        motor = self._plant.settings.motors[settings.motors[place]]
        coil = coil_of(motor, row.at, place)
        self.bank = motor.bank
        self.group = coil // GROUP_COILS
        self.mask |= 1 << (coil % GROUP_COILS)
        self.ends_own = self.ends_own or motor.ends == 1
        self.motors += 1
        cohm = motor.coil_cohm // motor.parallel
        if self.cohm:
            cohm = self.cohm * cohm // (self.cohm + cohm)
        self.cohm = cohm if cohm > 0 else 1

    def width_us(self, mv: int) -> int:
        """The pulse at a bank voltage: from the pulse at ready voltage to the one at full bank, in a straight line."""
        row = self._lie
        shorter_us = row.pulse_us - row.full_us
        if shorter_us <= 0:
            return row.pulse_us
        span_mv = self._plant.settings.banks[self.bank].full_mv - row.ready_mv
        over_mv = mv - row.ready_mv
        if span_mv <= 0 or over_mv <= 0:
            return row.pulse_us
        if over_mv >= span_mv:
            return row.full_us
        # In 1024ths of the span, so that the product stays small.
        return row.pulse_us - ((shorter_us * ((over_mv << 10) // span_mv)) >> 10)
