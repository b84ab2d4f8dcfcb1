"""The models of several boards as one: junctions, banks and routes in the numbers of the whole layout."""

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from host.fleet_go_line import fleet_go_line
from host.model import LayoutModel
from host.seats import Seat
from host.settings_view import plan_of
from host.views import (
    AnswerView,
    BankView,
    BoardView,
    Connection,
    FaultView,
    GoLine,
    JunctionView,
    Names,
    OutcomeView,
    QueueItem,
    RouteView,
)
from shared_protocol.settings import Settings

if TYPE_CHECKING:
    from sim.layout import BoardLayout, Layout

Tell = Callable[[float, str, str], None]
OUTCOMES_KEPT = 500


class PartModel(LayoutModel):
    """One board's model. tell: hears of its events. losses: how often the board was lost or has restarted."""

    def __init__(self, layout: "BoardLayout", tell: Tell) -> None:
        self._tell = tell
        self.losses = 0
        super().__init__(layout)

    def note(self, at_s: float, level: str, text: str) -> None:
        """Add to the event log, here and there."""
        super().note(at_s, level, text)
        self._tell(at_s, level, text)

    def connection_is(self, state: str, text: str, at_s: float) -> None:
        """The link has changed."""
        if state != "connected" and self.connection.state == "connected":
            self.losses += 1
        super().connection_is(state, text, at_s)

    def new_boot(self) -> None:
        """Another boot."""
        self.losses += 1
        super().new_boot()

    @property
    def is_connected(self) -> bool:
        """True while its board is there."""
        return self.connection.state == "connected"


@dataclass
class BoardPart:
    """One board: its seat, its model, and its numbers in the whole layout, by its own."""

    number: int
    layout: "BoardLayout"
    seat: Seat
    model: PartModel
    junctions: tuple[int, ...]
    banks: tuple[int, ...]
    routes: tuple[int, ...]
    buttons: tuple[int, ...]

    @property
    def name(self) -> str:
        """The board's name."""
        return self.layout.name

    @property
    def is_fit(self) -> bool:
        """True if the board's numbers mean what they mean in the layout file, as far as is known."""
        if self.model.settings_match is not False:
            return True
        return self.model.settings_source == "board" and same_things(self.model.settings, self.layout.settings)

    @property
    def missing(self) -> str:
        """What the board's absence means, in a sentence; '' while it is there."""
        if self.model.is_connected:
            return ""
        count = len(self.junctions)
        return f"board {self.name} not connected: {count} junction{'s' if count > 1 else ''} unavailable"

    @property
    def hindrance(self) -> str:
        """Why nothing may be asked of it, in a sentence; '' if nothing hinders."""
        model = self.model
        if not model.is_connected or not self.seat.connected:
            return f"board {self.name} not connected"
        if model.board is not None and not model.board.settings_crc:
            return f"board {self.name} has no settings: send them"
        if self.seat.spare and model.settings_match is False:
            return f"board {self.name} is a spare with other settings: send them"
        if not self.is_fit:
            if model.board_records is None:
                return f"board {self.name} has other settings, which are being read"
            return f"board {self.name} has the settings of another layout: send them"
        return ""


def same_things(one: Settings | None, other: Settings | None) -> bool:
    """True if junctions, lies, banks and routes have the same names in the same order, whatever their figures."""
    return one is not None and other is not None and _things(one) == _things(other)


def _things(settings: Settings) -> list[object]:
    return [
        [bank.name for bank in settings.banks],
        [(junction.name, [(lie.name, lie.at) for lie in junction.lies]) for junction in settings.junctions],
        [(route.name, list(route.throws)) for route in settings.routes],
        [[settings.motors[motor].bank for motor in junction.motors] for junction in settings.junctions],
    ]


class FleetModel(LayoutModel):
    """What all boards said. `merge` brings it up to date; nothing is applied to it directly.

    trouble: what is wrong at the first port where something is. own_items: throws of routes that the host runs, which
    no board knows of yet. steps: which throw of a board, by board and number, is which step of such a route.
    """

    def __init__(self, layout: "Layout", parts: list[BoardPart]) -> None:
        super().__init__()
        self.whole = layout
        self.parts = parts
        self.own_items: list[QueueItem] = []
        self.steps: dict[tuple[int, int], tuple[int, int]] = {}
        self.trouble = ""
        self.settings = parts[0].layout.settings
        self.settings_source = "file"
        self._plans = [plan_of(part.layout.settings) for part in parts]
        self._merged: tuple[object, ...] = ()
        self._sources: dict[tuple[int, int], OutcomeView] = {}
        junctions = [self._plans[board].junctions[number] for board, number in layout.junction_places]
        words = [[lie.word for lie in junction.lies] for junction in junctions]
        names = [junction.name for junction in junctions]
        banks = [self._plans[board].banks[number].name for board, number in layout.bank_places]
        self.names = Names(banks, names, words, layout.route_names)
        self.routes = [RouteView(number, each.name, list(each.throws)) for number, each in enumerate(layout.routes)]
        self.merge(0.0)

    # ---- questions

    @property
    def several(self) -> bool:
        """True if there is more than one board: only then boards are named."""
        return len(self.parts) > 1

    @property
    def boards(self) -> list[BoardView]:
        """The boards that are there."""
        return [part.model.board for part in self.parts if part.model.is_connected and part.model.board is not None]

    @property
    def title(self) -> str:
        """What the layout is called, and how many of its boards are there."""
        if not self.several:
            return self.whole.name
        return f"{self.whole.name}, {sum(part.model.is_connected for part in self.parts)} of {len(self.parts)} boards"

    @property
    def settings_match(self) -> bool | None:
        """True if all boards hold the layout file's settings; None if that can't be told of all."""
        found = [part.model.settings_match for part in self.parts]
        return False if False in found else None if None in found else True

    def go_line(self, now_s: float) -> GoLine:
        """Can I go? One sentence."""
        return fleet_go_line(self.parts, now_s, self.trouble)

    # ---- merging

    def merge(self, at_s: float) -> None:
        """Bring everything up to date, if anything has changed."""
        state = (
            *[(part.model.version, part.seat.port, part.seat.spare) for part in self.parts],
            [(item.id, item.step) for item in self.own_items], len(self.outcomes),
        )  # fmt: skip
        if state == self._merged:
            return
        self._merge_connection(at_s)
        self.stopped = any(part.model.stopped for part in self.parts if part.model.is_connected)
        self.highest_id = max(part.model.highest_id for part in self.parts)
        self.fault_facts = {}
        self.queue = list(self.own_items)
        for part in self.parts:
            for fault in part.model.faults:
                ours = self._fault(part, fault)
                self.fault_facts[(ours.scope, ours.number)] = ours
            self.queue += [self._item(part, item) for item in part.model.queue if item.junction < len(part.junctions)]
            self._merge_outcomes(part)
        self.banks = [self._bank(*place) for place in self.whole.bank_places]
        waiting = {item.junction for item in self.queue}
        self.junctions = [self._junction(*place, waiting) for place in self.whole.junction_places]
        self.version += 1
        self._merged = (*state[:-1], len(self.outcomes))

    def _merge_connection(self, at_s: float) -> None:
        connections = [part.model.connection for part in self.parts]
        here = [each for each in connections if each.state == "connected"]
        lost = [each for each in connections if each.state in ("lost", "refused")]
        found = (here or lost or connections)[0]
        if found.state != self.connection.state:
            self.connection = Connection(found.state, found.text, at_s)
        self.connection.text = found.text
        self.board = self.boards[0] if here else None

    def _bank(self, board: int, number: int) -> BankView:
        part = self.parts[board]
        usable = part.is_fit and number < len(part.model.banks)
        view = replace(part.model.banks[number] if usable else self._plans[board].banks[number])
        view.number = part.banks[number]
        view.lost = part.name if self.several and not part.model.is_connected else ""
        view.fault = self.fault_facts.get(("bank", view.number))
        return view

    def _junction(self, board: int, number: int, waiting: set[int]) -> JunctionView:
        part = self.parts[board]
        usable = part.is_fit and number < len(part.model.junctions)
        view = replace(part.model.junctions[number] if usable else self._plans[board].junctions[number])
        view.number = part.junctions[number]
        view.bank_numbers = [part.banks[bank] for bank in view.bank_numbers]
        view.fault = self.fault_facts.get(("junction", view.number))
        view.waiting = view.number in waiting
        view.lost = not part.model.is_connected
        return view

    def _fault(self, part: BoardPart, fault: FaultView) -> FaultView:
        numbers = {"bank": part.banks, "junction": part.junctions, "button": part.buttons}.get(fault.scope, ())
        number = numbers[fault.number] if fault.number < len(numbers) else fault.number
        near = part.junctions[fault.near] if fault.scope == "bank" and 0 <= fault.near < len(part.junctions) else -1
        who = f"button {number + 1}" if fault.scope == "button" else fault.who
        return replace(fault, number=number, near=near, who=f"{part.name}: {who}" if self.several else who)

    def _item(self, part: BoardPart, item: QueueItem) -> QueueItem:
        number, step = self.steps.get((part.number, item.id), (item.id, item.step))
        name = part.name if self.several else ""
        return replace(item, id=number, step=step, junction=part.junctions[item.junction], board=name)

    def _merge_outcomes(self, part: BoardPart) -> None:
        for (number, step), ended in part.model.outcomes.items():
            if (part.number, number) in self.steps:
                continue  # the host's route tells of its throws itself
            if self._sources.get((number, step)) is not ended:
                self._sources[(number, step)] = ended
                self.keep_outcome(self.outcome_of(part, ended))
        while len(self._sources) > OUTCOMES_KEPT * len(self.parts):
            del self._sources[next(iter(self._sources))]

    @staticmethod
    def outcome_of(part: BoardPart, ended: OutcomeView) -> OutcomeView:
        """A board's outcome in the numbers of the whole layout."""
        junction = part.junctions[ended.junction] if 0 <= ended.junction < len(part.junctions) else -1
        route = part.routes[ended.route] if 0 <= ended.route < len(part.routes) else -1
        return replace(ended, junction=junction, route=route)

    def take_answer(self, request: str, ok: bool, why: str, text: str, at_s: float) -> None:
        """The boards' answer to a request that is no throw, as one."""
        before = self.answers.get(request)
        self.answers[request] = AnswerView(ok, why, -1, text, before.count + 1 if before else 1, at_s)
        self.version += 1
