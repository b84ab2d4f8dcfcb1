"""The first screen: can I go, how does each junction lie, what waits, what is wrong."""

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical

from host.terminal import (
    banks_view,
    events_view,
    faults_view,
    junctions_view,
    queue_view,
    routes_view,
    typing_view,
)
from host.terminal.desk_screen import DeskScreen, Words
from host.terminal.go_view import title_text
from host.terminal.layout_sizes import Sizes, share_out
from host.terminal.lines import Lines
from host.terminal.rows import between

_KEYS = "SPACE stop  r release  o route  m mode  x cancel  f fault  t tune  l log  ? q"
_ALL_KEYS = (
    "SPACE stop  number Enter throw  r release  o route  m now/wait  + - wait  x cancel  c clear  f faults  "
    "t tune  l log  ? help  q quit"
)


# What a key does: an action of the program.
ACTIONS = {
    "r": "release",
    "o": "choose_route",
    "m": "now_or_wait",
    "plus": "change_wait(1)",
    "minus": "change_wait(-1)",
    "x": "cancel",
    "c": "faults",
    "f": "faults",
    "t": "tuning",
    "l": "log",
    "question_mark": "help",
    "q": "leave",
}


class MainScreen(DeskScreen[None]):
    """All first-glance answers on one screen."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("pageup", "page(-1)", "Junctions up", show=False),
        Binding("pagedown", "page(1)", "Junctions down", show=False),
    ]

    def body(self) -> ComposeResult:
        """Junctions beside banks and routes; queue beside faults; events; the prompt."""
        with Horizontal(id="top"):
            yield Lines(id="junctions", classes="panel")
            with Vertical(id="right"):
                yield Lines(id="banks", classes="panel")
                yield Lines(id="routes", classes="panel")
        with Horizontal(id="middle"):
            yield Lines(id="queue", classes="panel")
            yield Lines(id="faults", classes="panel")
        yield Lines(id="events", classes="panel")
        yield Words(id="prompt")

    def show_model(self) -> None:
        """Each panel from its view."""
        self.keys_text = _ALL_KEYS if self.size.width > len(_ALL_KEYS) else _KEYS
        sizes = self._arrange()
        self._show_top(sizes)
        self._show_bottom(sizes)
        desk = self.desk
        prompt = typing_view.prompt_text(desk.typing, desk.model, desk.choosing)
        self.query_one("#prompt", Words).say(between(prompt, f"[m: {desk.mode.short_text}]", self.size.width - 2))

    def _show_top(self, sizes: Sizes) -> None:
        model, now_s = self.desk.model, self.desk.now_s()
        desk = self.desk
        typed = model.junctions[desk.choosing] if desk.choosing >= 0 else desk.typing.junction(model)
        junctions = self.lines("junctions")
        width = junctions.size.width
        rows = junctions_view.junction_rows(model, width, now_s, typed.number if typed else -1)
        junctions.show([junctions_view.heading(width), *rows] if sizes.headings else rows, title_text(model))
        if typed is not None:
            self._bring_into_view(junctions, typed.number + sizes.headings)
        banks = self.lines("banks")
        banks.show(banks_view.bank_rows(model, banks.size.width, now_s), "Banks")
        routes = self.lines("routes")
        routes.show(routes_view.route_rows(model, routes.size.width), "Routes (o, then the letter)")

    def _show_bottom(self, sizes: Sizes) -> None:
        model, now_s = self.desk.model, self.desk.now_s()
        queue = self.lines("queue")
        rows = queue_view.queue_rows(model, queue.size.width, queue.size.height, now_s)
        queue.show(rows, queue_view.queue_title(model, now_s))
        faults = self.lines("faults")
        rows = faults_view.fault_rows(model, faults.size.width, faults.size.height)
        faults.show(rows, faults_view.faults_title(model))
        events_panel = self.lines("events")
        make = events_view.event_rows if sizes.headings else events_view.one_line_rows
        rows = make(model.events, events_panel.size.width, self.desk_app.stamp, max(1, events_panel.size.height))
        events_panel.show(rows, "Events (l shows all)")

    def _arrange(self) -> Sizes:
        model = self.desk.model
        counts = (len(model.junctions), len(model.banks), len(model.routes))
        sizes = share_out(self.size.width, self.size.height, *counts, bool(model.faults))
        for name, width, height in (
            ("top", None, sizes.top),
            ("middle", None, sizes.middle),
            ("events", None, sizes.events),
            ("junctions", sizes.left, None),
            ("queue", sizes.queue, None),
            ("banks", None, 2 * len(model.banks) + 1),
        ):
            styles = self.query_one(f"#{name}").styles
            if width is not None and (styles.width is None or styles.width.value != width):
                styles.width = width
            if height is not None and (styles.height is None or styles.height.value != height):
                styles.height = height
        return sizes

    @staticmethod
    def _bring_into_view(lines: Lines, place: int) -> None:
        top, height = lines.scroll_offset.y, max(1, lines.size.height)
        if not top <= place < top + height:
            lines.scroll_to(y=max(0, place - height // 2), animate=False)

    def action_page(self, direction: int) -> None:
        """Scroll the junctions by a page."""
        lines = self.lines("junctions")
        lines.scroll_relative(y=direction * max(1, lines.size.height - 1), animate=False)
