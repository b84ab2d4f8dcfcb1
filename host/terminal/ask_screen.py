"""One question, answered by one key: routes, what to cancel, the cautions, settings to be sent."""

from collections.abc import Callable
from typing import ClassVar

from textual import events
from textual.app import ComposeResult
from textual.binding import Binding, BindingType

from host.terminal.desk_screen import DeskScreen
from host.terminal.lines import Lines
from host.terminal.rows import Rows

RowMaker = Callable[[int], Rows]


class AskScreen(DeskScreen[str]):
    """Shows rows; ends with the key that was pressed, if it is one of `keys`, or '' for Escape."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "leave", "Leave"),
        Binding("pageup", "page(-1)", "Page up", show=False),
        Binding("pagedown", "page(1)", "Page down", show=False),
        Binding("up", "line(-1)", "Up", show=False),
        Binding("down", "line(1)", "Down", show=False),
    ]

    def __init__(self, title: str, rows: RowMaker, keys: str | tuple[str, ...], keys_text: str) -> None:
        super().__init__()
        self._heading = title
        self._rows = rows
        self._keys = tuple(keys)
        self.keys_text = keys_text

    def body(self) -> ComposeResult:
        """The rows."""
        yield Lines(id="question", classes="panel")

    def show_model(self) -> None:
        """The rows, as they are now."""
        lines = self.lines("question")
        lines.show(self._rows(lines.size.width), self._heading)

    def on_key(self, event: events.Key) -> None:
        """A key that answers."""
        key = event.character if event.character and event.is_printable else event.key
        if key in self._keys:
            event.stop()
            event.prevent_default()
            self.dismiss(key)

    def action_leave(self) -> None:
        """No answer."""
        self.dismiss("")

    def action_page(self, direction: int) -> None:
        """Scroll by a page."""
        lines = self.lines("question")
        lines.scroll_relative(y=direction * max(1, lines.size.height - 1), animate=False)

    def action_line(self, direction: int) -> None:
        """Scroll by a line."""
        self.lines("question").scroll_relative(y=direction, animate=False)
