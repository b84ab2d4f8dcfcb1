"""What is allowed but unwise, by the limits of common practice (no source)."""

from collections.abc import Iterator

from shared_protocol import settings_table as wire
from shared_protocol.settings_check import charge_time_constant_ms
from sim.layout.banks import BankBuilder
from sim.layout.layout import Layout
from sim.layout.names import plain_name

SLOW_RECHARGE_MS = 3000
HIGH_READY_PERCENT = 85
RATING_SHARE = 1.25


def warnings_of(layout: Layout, parts: list[tuple[BankBuilder, list[dict[str, object]]]]) -> list[str]:
    """One sentence each. `parts`: of each board its banks, and these as their owner wrote them, without defaults."""
    found: list[str] = []
    for number, (banks, stated) in enumerate(parts):
        alone = layout if len(parts) == 1 else layout.alone(number)
        found += [*_of_banks(alone, banks, stated), *_of_voltages(alone, banks), *_of_junctions(alone)]
        found += [] if number else _of_names(layout)
        found += _of_panel(alone)
    return [*found, *_of_ids(layout), *_of_stops(layout)]


def _of_banks(layout: Layout, banks: BankBuilder, stated: list[dict[str, object]]) -> Iterator[str]:
    for number, bank in enumerate(layout.settings.banks):
        name = layout.bank_names[number]
        recharge_ms = 3 * charge_time_constant_ms(bank.charge)
        if recharge_ms > SLOW_RECHARGE_MS and bank.charge.kind != wire.LIMITED:
            yield f"bank '{name}': three time constants take {recharge_ms / 1000:.1f} s; over 3 s is slow"
        if bank.charge.guard == wire.GUARD_NONE and "resistor_w" not in stated[number]:
            yield f"bank '{name}': its charge resistor is taken to be rated 10 W; say resistor_w if it is not"
        rated_v = banks.tables[number].get("rated_v")
        if rated_v is not None and rated_v < RATING_SHARE * banks.peak_v():
            yield (
                f"bank '{name}': capacitors rated {rated_v:g} V; 1.25 times the highest supply voltage is "
                f"{RATING_SHARE * banks.peak_v():.1f} V"
            )


def _of_voltages(layout: Layout, banks: BankBuilder) -> Iterator[str]:
    for number, junction in enumerate(layout.settings.junctions):
        numbers = {layout.settings.motors[motor].bank for motor in junction.motors}
        full_mv = min(layout.settings.banks[bank].full_mv for bank in numbers)
        reached_mv = min(
            banks.tables[bank]["stated_v"] * banks.share_left_by_bleed(banks.tables[bank]) * 1000 for bank in numbers
        )
        for place, lie in enumerate(junction.lies):
            title = f"'{layout.junction_names[number]}', {layout.junction_words[number][place]}"
            if lie.ready_mv + junction.retry_mv >= reached_mv:
                yield f"{title}: with its bleed the bank only fills to {reached_mv / 1000:.1f} V"
            elif lie.ready_mv * 100 > full_mv * HIGH_READY_PERCENT and not lie.together:
                yield f"{title}: its ready voltage is above {HIGH_READY_PERCENT} % of the full bank"


def _of_junctions(layout: Layout) -> Iterator[str]:
    for number, junction in enumerate(layout.settings.junctions):
        title = f"'{layout.junction_names[number]}'"
        motors = [layout.settings.motors[motor] for motor in junction.motors]
        if junction.retry_mv and all(motor.contact == wire.CONTACT_NONE for motor in motors):
            yield f"{title}: retry_v does nothing: no contact tells that a throw failed"
        if junction.pulses == 2 and any(motor.ends for motor in motors):
            yield f"{title}: a motor that ends its own pulse gains nothing from two pulses"


def _of_names(layout: Layout) -> Iterator[str]:
    for noun, names in (
        ("junction", layout.junction_names), ("route", layout.route_names), ("bank", layout.bank_names),
    ):  # fmt: skip
        plain = [plain_name(name) for name in names]
        for number, name in enumerate(names):
            if plain[number] in plain[:number]:
                yield f"{noun} '{name}': the board can only keep '{plain[number]}', as of another {noun}"
            if name.isdigit() and name != str(number + 1):
                yield f"{noun} '{name}' has a number for its name, but is {noun} {number + 1}"


def _of_panel(layout: Layout) -> Iterator[str]:
    settings = layout.settings
    kinds = [button.kind for button in settings.buttons]
    if wire.BUTTON_ROTARY in kinds and wire.BUTTON_GO not in kinds:
        yield "a rotary switch chooses a route, but no button of kind go sets it"
    ends = {(button.kind, button.n) for button in settings.buttons}
    for number, route in enumerate(settings.routes):
        pair = ((wire.BUTTON_ENTRANCE, route.entrance), (wire.BUTTON_EXIT, route.exit))
        if route.entrance >= 0 and not all(end in ends for end in pair):
            yield f"route '{layout.route_names[number]}': no buttons have its entrance and exit numbers"


def _of_ids(layout: Layout) -> Iterator[str]:
    """Of several boards each must be told from the others, whatever port it is plugged into."""
    addresses = [board.address for board in layout.boards]
    for board in layout.boards:
        if len(layout.boards) > 1 and not board.uid and addresses.count(board.address) > 1:
            yield f"board '{board.name}': without uid, or an address of its own, a real board can't be told from others"


def _of_stops(layout: Layout) -> Iterator[str]:
    """A button stops its own board; people expect it to stop all."""
    without = [
        board.name for board in layout.boards
        if all(button.kind != wire.BUTTON_STOP for button in board.settings.buttons)
    ]  # fmt: skip
    if 0 < len(without) < len(layout.boards):
        names = ", ".join(f"'{name}'" for name in without)
        yield f"a stop button stops its own board alone; without one: {names}"
