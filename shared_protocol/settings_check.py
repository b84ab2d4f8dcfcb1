"""Checks settings as a whole: what no single field's range can tell.

The host runs this over a layout file, the board runs it itself before it takes settings. The first problem is
returned, with the number of its record, its field and the reason word.
"""

from shared_protocol import settings_table as table
from shared_protocol.settings import (
    BankSettings,
    ButtonSettings,
    ChargeSettings,
    JunctionSettings,
    LieSettings,
    MotorSettings,
    Problem,
    Record,
    Settings,
)

# RP2040 boards of the usual shape bring out pins 0 to 22 and 26 to 28; 26 to 28 are the ADC inputs 0 to 2.
ADC_PIN_0 = 26
LAST_PIN = 22
# Read at the start, before settings are known: linked to 3.3 V it asks for a plain prompt. An input there, pulled up by
# its own resistor, would ask for it as well.
BOOT_PIN = 22

# A driver failed short must leave the coil under this (see the decision on drivers failed short).
COIL_LIMIT_MW = 1000
# Beyond this current the sums below would leave 2**30; nothing survives it anyway.
CURRENT_LIMIT_MA = 30_000


def check(settings: Settings) -> "Problem | None":
    """The first problem of `settings`, or None."""
    if settings.board is None or settings.timing is None or settings.io is None:
        return Problem(-1, "m", "missing")
    if not settings.banks or not settings.motors or not settings.junctions:
        return Problem(-1, "m", "missing")
    if settings.charges != len(settings.banks):
        return Problem(-1, "set_charge", "missing")
    for part in (_pins, _banks, _motors, _junctions, _inputs, _routes, _buttons, _followers):
        problem = part(settings)
        if problem:
            return problem
    return None


def _at(settings: Settings, record: Record, field: str, why: str) -> Problem:
    return Problem(settings.record_of.get(id(record), -1), field, why)


class PinUse:
    """Which pins are taken."""

    def __init__(self) -> None:
        self.taken: "set[int]" = set()

    def take(self, pin: int) -> str:
        """Take a digital pin; returns the reason word if that can't be, else nothing."""
        if pin < 0 or (pin > LAST_PIN and not ADC_PIN_0 <= pin <= ADC_PIN_0 + 2):
            return "pin_not_usable"
        if pin in self.taken:
            return "same_pin"
        self.taken.add(pin)
        return ""


def pins_used(settings: Settings) -> "tuple[int, int]":
    """Pins used and pins left."""
    use = PinUse()
    _take_pins(settings, use)
    return len(use.taken), LAST_PIN + 1 + 3 - len(use.taken)


def _pins(settings: Settings) -> "Problem | None":
    return _take_pins(settings, PinUse())


def _take_pins(settings: Settings, use: PinUse) -> "Problem | None":
    io = settings.io
    assert io is not None
    for bank in settings.banks:
        why = use.take(ADC_PIN_0 + bank.adc)
        if why:
            return _at(settings, bank, "adc", why)
        if bank.pin >= 0:
            for pin in range(bank.pin, bank.pin + min(bank.coils, table.COILS_ON_PINS)):
                why = use.take(pin)
                if why:
                    return _at(settings, bank, "pin", why)
        for pin in bank.chain:
            why = use.take(pin)
            if why:
                return _at(settings, bank, "chain", why)
        if bank.charge.cut_pin >= 0:
            why = use.take(bank.charge.cut_pin)
            if why:
                return _at(settings, bank.charge, "cut_pin", why)
    for field, pins in (
        ("inputs", io.inputs),
        ("in_pins", io.in_pins),
        ("outputs", io.outputs),
        ("out_pins", io.out_pins),
    ):
        for pin in pins:
            why = use.take(pin)
            if pin == BOOT_PIN and field != "outputs":
                why = "pin_not_usable"
            if why:
                return _at(settings, io, field, why)
    if (io.in_chain > 0) != (len(io.in_pins) == 3):
        return _at(settings, io, "in_pins", "missing")
    chained = io.out_chain > 0
    for bank in settings.banks:
        chained = chained or bank.pin < 0
    if chained != (len(io.out_pins) == 3):
        return _at(settings, io, "out_pins", "missing")
    if settings.inputs > table.MOST_INPUTS:
        return _at(settings, io, "in_chain", "too_many")
    if settings.outputs > table.MOST_OUTPUTS:
        return _at(settings, io, "out_chain", "too_many")
    return None


def _banks(settings: Settings) -> "Problem | None":
    for bank in settings.banks:
        if bank.pin >= 0 and bank.coils > table.COILS_ON_PINS:
            return _at(settings, bank, "coils", "too_many")
        if (bank.pin < 0) != (len(bank.chain) == 2):
            return _at(settings, bank, "chain", "missing" if bank.pin < 0 else "same_pin")
        if bank.peak_mv < bank.full_mv:
            return _at(settings, bank, "peak_mv", "never_reached")
        if bank.peak_mv > bank.range_mv:
            return _at(settings, bank, "peak_mv", "over_range")
        charge = bank.charge
        if charge.kind == table.LIMITED and charge.limit_ma == 0:
            return _at(settings, charge, "limit_ma", "missing")
        if charge.guard == table.GUARD_CUTOFF and charge.cut_pin < 0:
            return _at(settings, charge, "cut_pin", "missing")
        if charge.stall_ms < 2 * charge_time_constant_ms(charge):
            return _at(settings, charge, "stall_ms", "out_of_range")
    return None


def charge_time_constant_ms(charge: ChargeSettings) -> int:
    """R C of the charge path in milliseconds, at least 1."""
    return max(1, charge.cap_uf * charge.charge_dohm // 10_000)


def shorted_driver_mw(bank: BankSettings, coil_cohm: int) -> "tuple[int, int]":
    """What a driver failed short does: power in the coil and in the charge resistor, in milliwatts (Ohm's law)."""
    charge = bank.charge
    loop_dohm = charge.charge_dohm + coil_cohm // 10
    # Rounded up throughout: what is hot must not be called cool.
    current_ma = bank.peak_mv * 10 // max(1, loop_dohm) + 1
    if charge.kind == table.LIMITED and charge.limit_ma and charge.limit_ma < current_ma:
        current_ma = charge.limit_ma
    if current_ma > CURRENT_LIMIT_MA:
        current_ma = CURRENT_LIMIT_MA
    mw_per_ohm = (current_ma * current_ma + 999) // 1000
    coil_mw = mw_per_ohm * (coil_cohm // 10) // 10
    # Stays below 2**30: the current falls as the resistance rises (40 V at most).
    resistor_mw = mw_per_ohm * charge.charge_dohm // 10
    return coil_mw, resistor_mw


def _motors(settings: Settings) -> "Problem | None":
    taken: "set[int]" = set()
    for motor in settings.motors:
        if motor.bank >= len(settings.banks):
            return _at(settings, motor, "bank", "no_such_bank")
        bank = settings.banks[motor.bank]
        for field, coil in (("normal", motor.normal), ("reverse", motor.reverse)):
            if coil >= bank.coils:
                return _at(settings, motor, field, "no_such_coil")
            key = motor.bank * table.COILS_ON_CHAIN + coil
            if key in taken:
                return _at(settings, motor, field, "same_coil")
            taken.add(key)
        wanted = (0, 1, 2, 2)[motor.contact]
        if (motor.c1 >= 0) + (motor.c2 >= 0) != wanted or (wanted and motor.c1 < 0):
            return _at(settings, motor, "contact", "contact_inputs")
        problem = _stuck_driver(settings, bank, motor)
        if problem:
            return problem
    return None


def _stuck_driver(settings: Settings, bank: BankSettings, motor: MotorSettings) -> "Problem | None":
    if bank.charge.guard != table.GUARD_NONE:
        return None
    # Motors in parallel share the current: the hottest coil is judged as if it were alone.
    coil_mw, resistor_mw = shorted_driver_mw(bank, motor.coil_cohm)
    if coil_mw >= COIL_LIMIT_MW or (bank.charge.kind != table.LIMITED and resistor_mw > bank.charge.rated_mw):
        return _at(settings, bank.charge, "guard", "stuck_driver_burns")
    return None


_MOTORS_OF_KINDS = ((1, 1), (1, 2), (2, 2), (1, 4))


def _junctions(settings: Settings) -> "Problem | None":
    owner: "set[int]" = set()
    for junction in settings.junctions:
        fewest, most = _MOTORS_OF_KINDS[junction.kind]
        if not fewest <= len(junction.motors) <= most:
            return _at(settings, junction, "motors", "wrong_motors")
        for motor in junction.motors:
            if motor >= len(settings.motors):
                return _at(settings, junction, "motors", "no_such_motor")
            if motor in owner:
                return _at(settings, junction, "motors", "motor_twice")
            owner.add(motor)
        if len(junction.lies) < 2:
            return _at(settings, junction, "i", "too_few_lies")
        problem = _lies(settings, junction)
        if problem:
            return problem
    if len(owner) != len(settings.motors):
        for motor_settings in settings.motors:
            if motor_settings.i not in owner:
                return _at(settings, motor_settings, "i", "motor_unused")
    return None


def _lies(settings: Settings, junction: JunctionSettings) -> "Problem | None":
    count = len(junction.motors)
    rows: "set[int]" = set()
    for combination in junction.forbid:
        if combination >= 1 << count:
            return _at(settings, junction, "forbid", "no_such_motor")
    for lie in junction.lies:
        if lie.at >= 1 << count:
            return _at(settings, lie, "at", "no_such_motor")
        if lie.at in rows:
            return _at(settings, lie, "at", "same_lie")
        rows.add(lie.at)
        if lie.at in junction.forbid:
            return _at(settings, lie, "at", "lie_forbidden")
        if sorted(lie.order) != list(range(count)):
            return _at(settings, lie, "order", "bad_order")
        if lie.full_us > lie.pulse_us:
            return _at(settings, lie, "full_us", "full_pulse_longer")
        problem = _lie_voltages(settings, junction, lie)
        if problem:
            return problem
        if junction.forbid and passes_forbidden(junction, lie):
            return _at(settings, lie, "order", "forbidden_in_passing")
    return None


def _lie_voltages(settings: Settings, junction: JunctionSettings, lie: LieSettings) -> "Problem | None":
    first = settings.motors[junction.motors[0]]
    for number in junction.motors:
        motor = settings.motors[number]
        if motor.bank >= len(settings.banks):
            return _at(settings, motor, "bank", "no_such_bank")
        ready_mv = lie.ready_mv + junction.retry_mv
        if ready_mv >= settings.banks[motor.bank].full_mv:
            if lie.ready_mv >= settings.banks[motor.bank].full_mv:
                return _at(settings, lie, "ready_mv", "never_reached")
            return _at(settings, junction, "retry_mv", "never_reached")
        if lie.together and (
            motor.bank != first.bank
            or coil_of(motor, lie.at, 0) // table.GROUP_COILS != coil_of(first, lie.at, 0) // table.GROUP_COILS
        ):
            return _at(settings, lie, "together", "not_together")
    if lie.together:
        return _same_group(settings, junction, lie)
    return None


def coil_of(motor: MotorSettings, at: int, place: int) -> int:
    """The output that pulls `motor`, which is motor `place` of its junction, to where the lie `at` wants it."""
    return motor.reverse if (at >> place) & 1 else motor.normal


def _same_group(settings: Settings, junction: JunctionSettings, lie: LieSettings) -> "Problem | None":
    group = -1
    for place in range(len(junction.motors)):
        coil = coil_of(settings.motors[junction.motors[place]], lie.at, place)
        if group >= 0 and coil // table.GROUP_COILS != group:
            return _at(settings, lie, "together", "not_together")
        group = coil // table.GROUP_COILS
    return None


def passes_forbidden(junction: JunctionSettings, lie: LieSettings) -> bool:
    """True if from some allowed combination the order of `lie` makes a forbidden one in passing."""
    for start in range(1 << len(junction.motors)):
        if start in junction.forbid:
            continue
        now = start
        if lie.together:
            continue
        for place in lie.order:
            now = (now & ~(1 << place)) | (lie.at & (1 << place))
            if now in junction.forbid:
                return True
    return False


def _inputs(settings: Settings) -> "Problem | None":
    contacts: "set[int]" = set()
    for motor in settings.motors:
        for field, number in (("c1", motor.c1), ("c2", motor.c2)):
            if number < 0:
                continue
            if number >= settings.inputs:
                return _at(settings, motor, field, "no_such_input")
            if number in contacts:
                return _at(settings, motor, field, "same_input")
            contacts.add(number)
    for button in settings.buttons:
        if button.input >= settings.inputs:
            return _at(settings, button, "input", "no_such_input")
        if button.input in contacts:
            return _at(settings, button, "input", "same_input")
        contacts.add(button.input)
    for junction in settings.junctions:
        if junction.bar >= settings.inputs:
            return _at(settings, junction, "bar", "no_such_input")
    return None


def _routes(settings: Settings) -> "Problem | None":
    for route in settings.routes:
        throws = route.throws
        if not throws or len(throws) % 2:
            return _at(settings, route, "throws", "bad_route")
        seen: "set[int]" = set()
        for place in range(0, len(throws), 2):
            if throws[place] >= len(settings.junctions):
                return _at(settings, route, "throws", "no_such_junction")
            if throws[place + 1] >= len(settings.junctions[throws[place]].lies):
                return _at(settings, route, "throws", "no_such_lie")
            if throws[place] in seen:
                return _at(settings, route, "throws", "bad_route")
            seen.add(throws[place])
    return None


def _buttons(settings: Settings) -> "Problem | None":
    for button in settings.buttons:
        if button.kind in (table.BUTTON_SET, table.BUTTON_ALTERNATE, table.BUTTON_SWITCH):
            problem = _button_junction(settings, button)
            if problem:
                return problem
        elif button.kind in (table.BUTTON_ROUTE, table.BUTTON_ROTARY):
            if not 0 <= button.n < len(settings.routes):
                return _at(settings, button, "n", "no_such_route")
        elif button.kind in (table.BUTTON_ENTRANCE, table.BUTTON_EXIT) and button.n < 0:
            return _at(settings, button, "n", "bad_button")
    return None


def _button_junction(settings: Settings, button: ButtonSettings) -> "Problem | None":
    if not 0 <= button.j < len(settings.junctions):
        return _at(settings, button, "j", "no_such_junction")
    lies = len(settings.junctions[button.j].lies)
    if button.kind != table.BUTTON_ALTERNATE and not 0 <= button.lie < lies:
        return _at(settings, button, "lie", "no_such_lie")
    if button.kind == table.BUTTON_SWITCH and not 0 <= button.other < lies:
        return _at(settings, button, "other", "no_such_lie")
    return None


def _followers(settings: Settings) -> "Problem | None":
    taken: "set[int]" = set()
    for follower in settings.followers:
        if follower.output >= settings.outputs:
            return _at(settings, follower, "output", "no_such_output")
        if follower.output in taken:
            return _at(settings, follower, "output", "same_pin")
        taken.add(follower.output)
        if follower.j >= len(settings.junctions):
            return _at(settings, follower, "j", "no_such_junction")
        if follower.lie >= len(settings.junctions[follower.j].lies):
            return _at(settings, follower, "lie", "no_such_lie")
    return None
