"""What every screen of the desk has: the go line on top, the answer line and the keys at the bottom."""

from typing import TYPE_CHECKING, TypeVar, cast

from textual.app import ComposeResult
from textual.screen import Screen
from textual.widgets import Static

from host.terminal.desk import Desk
from host.terminal.go_view import go_text
from host.terminal.lines import Lines
from host.terminal.rows import wrap

if TYPE_CHECKING:
    from host.terminal.app import DeskApp

Result = TypeVar("Result")
LEVEL_CLASSES = ("go", "wait", "stop", "out", "lost")
ANSWER_LINES = 2


class Words(Static):
    """Plain text without markup that is drawn again only when it changes."""

    def __init__(self, id: str | None = None, classes: str | None = None) -> None:
        super().__init__("", id=id, classes=classes, markup=False)
        self.said = ""

    def say(self, text: str) -> None:
        """Show this text."""
        if text != self.said:
            self.said = text
            self.update(text)


class DeskScreen(Screen[Result]):
    """A screen with go line, body, answer line and keys. Subclasses give `body`, `keys_text`, `show_model`."""

    # None would mean what the program has set: the first that can be focused.
    AUTO_FOCUS = ""
    keys_text = ""

    @property
    def desk(self) -> Desk:
        """What the screens work on."""
        return self.desk_app.desk

    @property
    def desk_app(self) -> "DeskApp":
        """The program."""
        return cast("DeskApp", self.app)

    def compose(self) -> ComposeResult:
        """Go line, body, answer, keys."""
        yield Words(id="go")
        yield from self.body()
        yield Words(id="answer")
        yield Words(id="keys")

    def body(self) -> ComposeResult:
        """What is between go line and answer line."""
        raise NotImplementedError

    def show_model(self) -> None:
        """Show what the body shows."""
        raise NotImplementedError

    def show_all(self) -> None:
        """Show everything that has changed."""
        if not self.is_mounted or self.size.width == 0:
            return
        line = self.desk.model.go_line(self.desk.now_s())
        go = self.query_one("#go", Words)
        go.say(go_text(line, self.size.width))
        for level in LEVEL_CLASSES:
            go.set_class(level == line.level, level)
        notice = self.desk.notice
        answer = self.query_one("#answer", Words)
        answer.say("\n".join(wrap(notice.shown, self.size.width - 2, ANSWER_LINES)))
        for level in ("good", "warn", "bad"):
            answer.set_class(level == notice.level, level)
        self.query_one("#keys", Words).say(self.keys_text)
        self.show_model()

    def on_resize(self) -> None:
        """Room has changed."""
        self.call_after_refresh(self.show_all)

    def on_screen_resume(self) -> None:
        """Back in front."""
        self.call_after_refresh(self.show_all)

    def on_mount(self) -> None:
        """First time."""
        self.call_after_refresh(self.show_all)

    def lines(self, id: str) -> Lines:
        """The `Lines` of that id."""
        return self.query_one(f"#{id}", Lines)
