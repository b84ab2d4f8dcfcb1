"""The model of one layout: what the board has said, with its age. No input or output, no clock of its own."""

from collections import deque
from typing import Protocol, TypeAlias

from host import go_line, news
from host.settings_view import Plan, empty_plan, plan_of
from host.views import (
    AnswerView,
    BankView,
    BoardFacts,
    BoardView,
    Connection,
    Event,
    FaultView,
    GoLine,
    JunctionView,
    LieView,
    Names,
    OutcomeView,
    QueueItem,
    RouteView,
    Telemetry,
)
from shared_protocol.codec import Codec, Received
from shared_protocol.fields import Message
from shared_protocol.registry import host_reads
from shared_protocol.settings import Settings
from shared_protocol.settings_check import check
from shared_protocol.settings_table import SETTINGS

__all__ = [
    "AnswerView", "BankView", "BoardFacts", "BoardView", "Connection", "Event", "FaultView", "GoLine", "JunctionView",
    "LayoutModel", "LieView", "Names", "OutcomeView", "QueueItem", "Records", "RouteView", "Telemetry",
]  # fmt: skip

EVENTS_KEPT = 500
OUTCOMES_KEPT = 500
# The board sends a message again only while it is not acknowledged, and keeps fewer than 50 of them.
SERIALS_KEPT = 1024
# A throw in the queue that the board no longer mentions (it does so twice a second) has ended.
FORGOTTEN_S = 3.0

_NOTHING_HEARD = BankView(-1, "", 0)

Records: TypeAlias = list[tuple[Message, list[object]]]


class LayoutLike(Protocol):
    """What the model needs of a layout file."""

    @property
    def settings(self) -> Settings:
        """The settings that the file makes."""

    @property
    def input_names(self) -> dict[str, int]:
        """Names of inputs and their numbers."""

    def crc(self) -> str:
        """CRC-32 of its records."""


class LayoutModel:
    """Apply what the link received; read the views. `version` grows with each change.

    Names and ready voltages come from the board's settings once they are fetched, until then from the layout file.
    """

    def __init__(self, layout: LayoutLike | None = None) -> None:
        self.layout = layout
        self.layout_crc = layout.crc() if layout is not None else ""
        self.version = 0
        self.connection = Connection()
        self.board: BoardView | None = None
        self.stopped = False
        self.telemetry = Telemetry()
        self.banks: list[BankView] = []
        self.junctions: list[JunctionView] = []
        self.routes: list[RouteView] = []
        self.queue: list[QueueItem] = []
        self.events: deque[Event] = deque(maxlen=EVENTS_KEPT)
        self.outcomes: dict[tuple[int, int], OutcomeView] = {}
        self.bad_lines = 0
        self.names = Names()
        self.settings: Settings | None = None
        self.settings_source = "none"
        self.board_records: Records | None = None
        self.answers: dict[str, AnswerView] = {}
        self.highest_id = 0
        # What the board said, by number: kept also for numbers that no settings known here explain.
        self.bank_facts: dict[int, BankView] = {}
        self.lie_facts: dict[int, tuple[int, str, float]] = {}
        self.fault_facts: dict[tuple[str, int], FaultView] = {}
        self._serials: deque[int] = deque(maxlen=SERIALS_KEPT)
        self._told: set[tuple[str, int]] | None = None
        self._told_queue: set[tuple[int, int, int]] = set()
        self._records: Records = []
        self._use(plan_of(layout.settings) if layout is not None else empty_plan(), "file" if layout else "none")

    # ---- questions

    @property
    def faults(self) -> list[FaultView]:
        """What is out, banks first."""
        order = {"bank": 0, "junction": 1, "button": 2}
        return sorted(self.fault_facts.values(), key=lambda fault: (order.get(fault.scope, 3), fault.number))

    @property
    def several(self) -> bool:
        """True if there is more than one board: only then boards are named."""
        return False

    @property
    def boards(self) -> list[BoardView]:
        """The boards that are there."""
        return [self.board] if self.board is not None else []

    @property
    def title(self) -> str:
        """What the layout is called, as far as it is known."""
        if self.settings is None or self.settings.board is None:
            return "no layout"
        return self.settings.board.name.decode() or "layout without a name"

    @property
    def settings_match(self) -> bool | None:
        """True if the board holds the layout file's settings; None if there is nothing to compare."""
        if self.board is None or not self.layout_crc:
            return None
        return self.board.settings_crc == self.layout_crc

    def go_line(self, now_s: float) -> GoLine:
        """Can I go? One sentence."""
        return go_line.go_line(self, now_s)

    # ---- what the session says

    def connection_is(self, state: str, text: str, at_s: float) -> None:
        """The link has changed. What was never found can't be lost."""
        if state == "lost" and self.board is None:
            state = "searching"
        if (self.connection.state, self.connection.text) == (state, text):
            return
        if state != self.connection.state or state == "refused":
            self.note(at_s, {"connected": "good", "searching": "info"}.get(state, "bad"), text)
        since_s = self.connection.since_s if state == self.connection.state else at_s
        self.connection = Connection(state, text, since_s)
        self.version += 1

    def status_asked(self) -> None:
        """A status was asked for: at its end, what it did not tell is gone."""
        self._told = set()
        self._told_queue = set()

    def settings_asked(self) -> None:
        """Settings were asked for: records that come now are the board's."""
        self._records = []

    def note(self, at_s: float, level: str, text: str) -> None:
        """Add to the event log."""
        self.events.append(Event(at_s, level, text))
        self.version += 1

    def keep_outcome(self, ended: OutcomeView) -> None:
        """Remember how a request ended; the oldest are forgotten."""
        self.outcomes[(ended.id, ended.step if ended.kind == "throw" else 0)] = ended
        while len(self.outcomes) > OUTCOMES_KEPT:
            del self.outcomes[next(iter(self.outcomes))]
        self.version += 1

    # ---- what the board says

    def apply(self, received: Received, at_s: float) -> None:
        """Take one thing that came in. Never raises for anything that the table allows."""
        message = received.message
        if message is None or received.fault:
            self._not_a_message(received, at_s)
            return
        if message.kept and self._known(received.number("q")):
            return
        if message in SETTINGS:
            self._records.append((message, list(received.values)))
        else:
            news.take(self, received, at_s)
        self.version += 1

    def _not_a_message(self, received: Received, at_s: float) -> None:
        if received.fault:
            self.bad_lines += 1
            self.version += 1
            return
        text = received.text.decode("ascii", "replace").strip()
        if text:
            shown = "".join(letter if letter.isprintable() else "?" for letter in text)
            self.note(at_s, "info", f"the board prints: {shown}")

    def _known(self, serial: int) -> bool:
        """True if that kept message was taken before."""
        if serial in self._serials:
            return True
        self._serials.append(serial)
        return False

    def new_boot(self) -> None:
        """Another boot: nothing that was known of the one before holds."""
        self._serials.clear()
        self.stopped = False
        self.telemetry = Telemetry()
        self.bank_facts.clear()
        self.fault_facts.clear()
        self.lie_facts.clear()
        self.queue.clear()
        self.refresh()

    def told_fault(self, scope: str, number: int) -> None:
        """The status that runs mentions this fault."""
        if self._told is not None:
            self._told.add((scope, number))

    def told_throw(self, key: tuple[int, int, int]) -> None:
        """The status that runs mentions this throw."""
        self._told_queue.add(key)

    def end_of_status(self) -> None:
        """What the status did not tell is gone."""
        if self._told is None:
            return
        for fault in [key for key in self.fault_facts if key not in self._told]:
            del self.fault_facts[fault]
        self.queue = [item for item in self.queue if (item.id, item.step, item.junction) in self._told_queue]
        self._told = None
        self.refresh()

    def forget_finished(self, at_s: float) -> None:
        """Drop from the queue what the board has not mentioned for long."""
        if any(at_s - item.heard_at_s > FORGOTTEN_S for item in self.queue):
            self.queue = [item for item in self.queue if at_s - item.heard_at_s <= FORGOTTEN_S]
            self.refresh()

    def end_of_settings(self, at_s: float) -> None:
        """All records of the board are here: take them if they are whole."""
        records, self._records = self._records, []
        if self.board is None or not self.board.settings_crc:
            return
        codec = Codec(host_reads())
        bodies = b"".join(codec.body(message, values) + b"\n" for message, values in records)
        if codec.crc_text(bodies).decode() != self.board.settings_crc:
            self.note(at_s, "warn", "the board's settings did not come whole; asking again")
            return
        settings = Settings()
        for message, values in records:
            if settings.add(message, values) is not None:
                return
        if check(settings) is None:
            self.board_records = records
            self._use(plan_of(settings), "board")

    def settings_changed(self, crc: str) -> None:
        """The board holds other settings than before: its records are to be fetched again."""
        if self.board is not None:
            self.board.settings_crc = crc
        self.board_records = None
        if self.layout is not None and self.settings_match:
            self._use(plan_of(self.layout.settings), "file")

    # ---- views

    def _use(self, plan: Plan, source: str) -> None:
        self.settings = plan.settings
        self.settings_source = source
        self.banks = plan.banks
        self.junctions = plan.junctions
        self.routes = plan.routes
        self.names = plan.names
        if self.layout is not None:
            self.names.inputs = {number: name for name, number in self.layout.input_names.items()}
        for scope, number in list(self.fault_facts):
            news.name_fault(self, self.fault_facts[(scope, number)])
        self.refresh()

    def refresh(self) -> None:
        """Bring the views up to date with the facts."""
        for bank in self.banks:
            fact = self.bank_facts.get(bank.number, _NOTHING_HEARD)
            bank.mv, bank.age_ms, bank.state = fact.mv, fact.age_ms, fact.state
            bank.ready_ms, bank.heard_at_s = fact.ready_ms, fact.heard_at_s
            bank.fault = self.fault_facts.get(("bank", bank.number))
        waiting = {item.junction for item in self.queue}
        for junction in self.junctions:
            lie, source, heard = self.lie_facts.get(junction.number, (-1, "none", None))
            junction.lie = lie if lie < len(junction.lies) else -1
            junction.source, junction.heard_at_s = source, heard
            junction.fault = self.fault_facts.get(("junction", junction.number))
            junction.waiting = junction.number in waiting
        self.version += 1
