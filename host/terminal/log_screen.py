"""The event log with a filter."""

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.widgets import Input

from host.terminal.desk_screen import DeskScreen
from host.terminal.events_view import EventFilter, event_rows, filter_title
from host.terminal.lines import Lines


class LogScreen(DeskScreen[None]):
    """All events kept; v: which levels, /: a text that must occur."""

    keys_text = "/ filter by text  v how bad  PgUp PgDn up/down scroll  End newest  Esc back  SPACE stop"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "leave", "Back"),
        Binding("l,q", "leave", "Back", show=False),
        Binding("v", "level", "How bad"),
        Binding("slash", "filter", "Filter"),
        Binding("up", "scroll(-1)", "Up"),
        Binding("down", "scroll(1)", "Down"),
        Binding("pageup", "scroll(-10)", "Page up"),
        Binding("pagedown", "scroll(10)", "Page down"),
        Binding("end", "newest", "Newest"),
    ]

    def __init__(self) -> None:
        super().__init__()
        self.chosen = EventFilter()
        self._follows = True
        self._shown: tuple[object, ...] = ()

    def body(self) -> ComposeResult:
        """The filter's text, shown while it is edited, and the events."""
        entry = Input(placeholder="text that must occur, Enter", id="filter", compact=True)
        entry.cursor_blink = False
        entry.display = False
        yield entry
        yield Lines(id="log", classes="panel")

    def show_model(self) -> None:
        """The events that the filter keeps."""
        events = self.desk.model.events
        lines = self.lines("log")
        shown = (len(events), events[-1] if events else None, self.chosen.text, self.chosen.least, lines.size.width)
        if shown != self._shown:
            # Some hundred events are wrapped anew only when there is something new to see.
            self._shown = shown
            kept = [event for event in events if self.chosen.keeps(event)]
            rows = event_rows(kept, lines.size.width, self.desk_app.stamp)
            lines.show(rows, filter_title(events, self.chosen))
        if self._follows:
            lines.scroll_end(animate=False, immediate=True)

    def on_input_submitted(self, entered: Input.Submitted) -> None:
        """The filter's text is given."""
        self.chosen.text = entered.value.strip()
        self._close_filter()

    def action_filter(self) -> None:
        """Edit the filter's text."""
        entry = self.query_one("#filter", Input)
        entry.display = True
        entry.focus()

    def action_level(self) -> None:
        """The next level."""
        self.chosen.next_level()
        self.show_all()

    def action_scroll(self, step: int) -> None:
        """Look further up or down."""
        lines = self.lines("log")
        lines.scroll_relative(y=step, animate=False, immediate=True)
        self._follows = lines.scroll_offset.y >= lines.max_scroll_y
        self.show_all()

    def action_newest(self) -> None:
        """Follow the newest again."""
        self._follows = True
        self.show_all()

    def action_leave(self) -> None:
        """Close the filter, else back."""
        if self.query_one("#filter", Input).has_focus:
            self._close_filter()
        else:
            self.dismiss(None)

    def _close_filter(self) -> None:
        entry = self.query_one("#filter", Input)
        entry.display = False
        self.set_focus(None)
        self.show_all()
