"""The fault screen: cause, evidence, remedy; one is picked, c clears it."""

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType

from host.terminal import faults_view
from host.terminal.desk_screen import DeskScreen
from host.terminal.lines import Lines


class FaultsScreen(DeskScreen[None]):
    """All faults."""

    keys_text = "up/down pick  c clear the picked one  a clear all  Esc back  SPACE stop"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape,f,q", "leave", "Back"),
        Binding("up", "pick(-1)", "Up"),
        Binding("down", "pick(1)", "Down"),
        Binding("c", "clear", "Clear"),
        Binding("a", "clear_all", "Clear all"),
        Binding("r", "app.release", "Release"),
    ]

    def __init__(self) -> None:
        super().__init__()
        self.picked = 0

    def body(self) -> ComposeResult:
        """The list."""
        yield Lines(id="all-faults", classes="panel")

    def show_model(self) -> None:
        """The list as it is now."""
        model = self.desk.model
        self.picked = max(0, min(self.picked, len(model.faults) - 1))
        lines = self.lines("all-faults")
        rows = faults_view.fault_lines(model, lines.size.width, self.desk.now_s(), self.picked)
        lines.show(rows, f"Faults - {faults_view.NEVER_CLEAR_YET}")

    def action_leave(self) -> None:
        """Back."""
        self.dismiss(None)

    def action_pick(self, step: int) -> None:
        """The next or previous fault."""
        self.picked = max(0, min(self.picked + step, len(self.desk.model.faults) - 1))
        self.show_all()
        lines = self.lines("all-faults")
        place = next((y for y, line in enumerate(lines.rows) if line and line[0].look == "picked"), 0)
        lines.scroll_to(y=max(0, place - 1), animate=False)

    def action_clear(self) -> None:
        """Clear the picked one."""
        faults = self.desk.model.faults
        if self.picked < len(faults):
            fault = faults[self.picked]
            self.desk.clear(fault.scope, fault.number, fault.who)
        else:
            self.desk.say("info", "Nothing is out: there is nothing to clear.")
        self.show_all()

    def action_clear_all(self) -> None:
        """Clear all."""
        if self.desk.model.faults:
            self.desk.clear("all", 0, "everything")
        self.show_all()
