"""The tuning screen: choose what to tune, change values, see old and new, send, read the board's answer."""

from typing import ClassVar

from rich.text import Text
from textual import events
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical, VerticalScroll
from textual.markup import escape
from textual.widgets import Input, OptionList, Static
from textual.widgets.option_list import Option

from host.model import LayoutModel
from host.session import Part
from host.terminal.ask_screen import AskScreen
from host.terminal.curve_plot import CurvePlot
from host.terminal.curve_view import curve_of
from host.terminal.desk_screen import DeskScreen, Words
from host.terminal.layout_sizes import TALL, WIDE
from host.terminal.rows import Piece, Rows, row
from host.terminal.tuning import Entry, Place, Subject, Tuning, change_text

# The curve is drawn again no faster than this: it is by far the largest part of the screen.
CURVE_S = 1.0
KEYS = "up/down Enter Tab  F2 review and send  F4 drop changes  Esc back  SPACE stop"
SEVERAL_KEYS = "F2 review and send  F3 next board  F4 drop changes  Esc back  SPACE stop"


class EntryRow(Horizontal):
    """Label, input, unit and range of one entry."""

    def __init__(self, entry: Entry, tuning: Tuning) -> None:
        super().__init__(classes="entry")
        self.entry = entry
        self.tuning = tuning
        self.input = Input(tuning.text(entry), compact=True, select_on_focus=True)
        self.input.cursor_blink = False
        self.limits = Words(classes="unit")

    def compose(self) -> ComposeResult:
        """The three parts."""
        yield Static(self.entry.label, classes="label", markup=False)
        yield self.input
        yield self.limits
        yield Static(self.entry.field.text, classes="says", markup=False)

    def on_mount(self) -> None:
        """As it stands."""
        self.mark()

    def mark(self) -> None:
        """Show whether it is changed or wrong, and what the board has."""
        changed, wrong = self.tuning.changed(self.entry), self.tuning.wrong(self.entry)
        self.set_class(changed, "changed")
        self.set_class(bool(wrong), "wrong")
        sign = "X " if wrong else ("* " if changed else "  ")
        old = f"was {self.tuning.old_text(self.entry)}; " if changed else ""
        self.limits.say(f"{sign}{old}{self.entry.limits}")


class TuningScreen(DeskScreen[None]):
    """A form made from the settings table."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "leave", "Back"),
        Binding("ctrl+s,f2", "review", "Review and send"),
        Binding("ctrl+r,f4", "revert", "Drop changes"),
        Binding("f3", "next_board", "Next board"),
        Binding("up", "move(-1)", "Up", show=False),
        Binding("down", "move(1)", "Down", show=False),
    ]
    keys_text = KEYS

    def __init__(self, tunings: list[Tuning]) -> None:
        super().__init__()
        self._tunings = tunings
        self._board = 0
        self._subjects: list[Subject] = []
        self._shown: Subject | None = None
        self._curve_s = -CURVE_S
        self._asked_for_settings = False

    # ---- which board

    @property
    def _part(self) -> Part:
        """The board that is tuned."""
        return self.desk.session.parts[self._board]

    @property
    def _tuning(self) -> Tuning:
        """Its settings."""
        return self._tunings[self._board]

    @property
    def _model(self) -> LayoutModel:
        """What it has said, in its own numbers."""
        return self._part.session.model

    @property
    def _whom(self) -> str:
        """The board, for sentences."""
        return f"board {self._part.name}" if self._part.name else "the board"

    def action_next_board(self) -> None:
        """The next board of the layout, unless settings are under way."""
        if self._tuning.sending or len(self._tunings) < 2:
            return
        self._board = (self._board + 1) % len(self._tunings)
        self._asked_for_settings = False
        self._subjects = []
        self._shown = None
        self._name_board()
        self.query_one("#form", VerticalScroll).remove_children()
        self._take_settings()
        self.show_all()

    def _name_board(self) -> None:
        self._tuning.numbers = self._part.junctions
        several = len(self._tunings) > 1
        self.query_one("#subjects", OptionList).border_title = self._part.name if several else "Tune what?"
        self.keys_text = SEVERAL_KEYS if several else KEYS

    # ---- what it shows

    def body(self) -> ComposeResult:
        """Subjects beside the form, the sentence, the curve."""
        with Horizontal(id="tune"):
            subjects = OptionList(id="subjects", compact=True)
            yield subjects
            with Vertical():
                form = VerticalScroll(id="form", can_focus=False)
                form.border_title = "Wiring and names are in the layout file"
                yield form
        yield Words(id="sentence")
        yield CurvePlot(id="curve")

    def on_mount(self) -> None:
        """Begin with the first subject."""
        super().on_mount()
        self._name_board()
        self._take_settings()
        self.query_one("#subjects", OptionList).focus()

    def _take_settings(self) -> None:
        if self._tuning.take(self._model) or not self._subjects:
            self._list_subjects()
        if not self._tuning.base and not self._asked_for_settings:
            self._asked_for_settings = True
            if self._part.session.fetch_settings() or not self._part.name:
                self.desk.say("info", "The board's settings are not known yet: asking for them.")
            else:
                self.desk.say("warn", f"Board {self._part.name} is not connected: its settings are not known.")

    def _list_subjects(self) -> None:
        chooser = self.query_one("#subjects", OptionList)
        at = chooser.highlighted or 0
        self._subjects = self._tuning.subjects()
        chooser.clear_options()
        chooser.add_options([Option(Text(subject.title)) for subject in self._subjects])
        if self._subjects:
            chooser.highlighted = min(at, len(self._subjects) - 1)
            self._show_subject(self._subjects[min(at, len(self._subjects) - 1)])
            chooser.focus()

    def _show_subject(self, subject: Subject) -> None:
        self._shown = subject
        self._curve_s = -CURVE_S
        form = self.query_one("#form", VerticalScroll)
        with self.app.batch_update():
            form.remove_children()
            form.mount_all([EntryRow(entry, self._tuning) for entry in subject.entries])
        form.scroll_home(animate=False)
        form.border_title = escape(f"{subject.title.strip()} - wiring and names are in the layout file")
        self._say_sentence()

    def show_model(self) -> None:
        """The curve, the transaction, settings that came."""
        self.set_class(self.size.width >= WIDE, "wide")
        self.query_one("#curve").set_class(self.size.height >= TALL, "tall")
        self._take_settings()
        answer = self._tuning.answer(self._model)
        if answer is not None:
            self.desk.say(*answer)
            self.call_after_refresh(self.show_all)
        elif self._tuning.sending:
            self.desk.say("info", self._tuning.progress_text())
        now_s = self.desk.now_s()
        if now_s - self._curve_s >= CURVE_S:
            self._curve_s = now_s
            self._show_curve(now_s)

    def _show_curve(self, now_s: float) -> None:
        plot = self.query_one("#curve", CurvePlot)
        part = self._part
        bank = self._shown.bank if self._shown is not None else -1
        bank = part.banks[max(0, bank)] if max(0, bank) < len(part.banks) else -1
        only = self._shown.junction if self._shown is not None else -1
        only = part.junctions[only] if 0 <= only < len(part.junctions) else -1
        ready = self._tuning.ready_mv(self._model)
        changed = {(part.junctions[junction], lie): mv for (junction, lie), mv in ready.items()}
        rows = max(1, plot.size.height - 3)
        plot.show(curve_of(self.desk.model, self.desk.history, bank, now_s, rows, changed, only))

    def _say_sentence(self) -> None:
        row_now = self._row_in_focus()
        text = ""
        if row_now is not None:
            wrong = self._tuning.wrong(row_now.entry)
            text = f"X {wrong}" if wrong else row_now.entry.sentence
        elif self._tuning.change_count:
            text = f"{self._tuning.change_count} changed, not sent yet: F2 shows old and new."
        else:
            text = "Enter or Tab goes to the values. Nothing is sent before you have seen old and new."
        self.query_one("#sentence", Words).say(text)

    def _row_in_focus(self) -> EntryRow | None:
        focused = self.focused
        parent = focused.parent if isinstance(focused, Input) else None
        return parent if isinstance(parent, EntryRow) else None

    # ---- events

    def on_option_list_option_highlighted(self, chosen: OptionList.OptionHighlighted) -> None:
        """Another subject."""
        subject = self._subjects[chosen.option_index]
        if subject is not self._shown:
            self._show_subject(subject)

    def on_option_list_option_selected(self, _: OptionList.OptionSelected) -> None:
        """Enter on a subject: to its first value."""
        self._focus_row(0)

    def on_input_changed(self, changed: Input.Changed) -> None:
        """A value is typed."""
        parent = changed.input.parent
        if isinstance(parent, EntryRow):
            self._tuning.write(parent.entry, changed.value)
            parent.mark()
            self._say_sentence()

    def on_input_submitted(self, _: Input.Submitted) -> None:
        """Enter: to the next value, unless this one is wrong."""
        at = self._row_in_focus()
        if at is not None and not self._tuning.wrong(at.entry):
            self.action_move(1)

    def on_descendant_focus(self, _: events.DescendantFocus) -> None:
        """The sentence belongs to what is in focus."""
        self._say_sentence()

    # ---- actions

    def _focus_row(self, number: int) -> None:
        rows = list(self.query(EntryRow))
        if rows:
            rows[max(0, min(number, len(rows) - 1))].input.focus()

    def action_move(self, step: int) -> None:
        """The value above or below."""
        at = self._row_in_focus()
        if at is not None:
            self._focus_row(list(self.query(EntryRow)).index(at) + step)

    def action_leave(self) -> None:
        """Stop sending; else from the values to the list; else back."""
        chooser = self.query_one("#subjects", OptionList)
        transfer = self._tuning.transfer
        if transfer is not None and transfer.open:
            transfer.cancel()
            if transfer.open:
                self.desk.say("info", "All is sent: the board's answer decides. It comes within seconds.")
        elif self.focused is not chooser:
            chooser.focus()
        else:
            self.dismiss(None)
        self._say_sentence()

    def action_revert(self) -> None:
        """Drop every change."""
        self._tuning.revert()
        self.desk.say("info", "All changes dropped; nothing was sent.")
        if self._shown is not None:
            self._show_subject(self._shown)
        self.show_all()

    def action_review(self) -> None:
        """Check the whole; show old and new; send on Enter."""
        if self._tuning.sending:
            return
        if not self._tuning.change_count:
            self.desk.say("info", "Nothing is changed: nothing to send.")
            self.show_all()
            return
        problem, place = self._tuning.problem()
        if problem:
            self.desk.say("bad", f"Nothing sent. {problem}")
            self._go_to(place)
            self.show_all()
            return
        self.desk_app.push_screen(
            AskScreen(
                f"Old and new - send to {self._whom}?",
                self._change_rows,
                ("enter",),
                "Enter send  Esc back  SPACE stop",
            ),
            self._reviewed,
        )

    def _reviewed(self, key: str | None) -> None:
        if key == "enter":
            self._tuning.send(self._part.session)
        self.show_all()

    def _change_rows(self, width: int) -> Rows:
        rows: Rows = [row("")]
        for change in self._tuning.changes():
            head, detail = change_text(change, width - 4)
            rows += [row("  ", Piece(head, "strong")), row("  ", Piece(detail, "warn"))]
        return [*rows, row(""), row("  All settings go as one transaction: the board takes all of them or none.")]

    def _go_to(self, place: Place | None) -> None:
        """To the value that is wrong, on whatever subject it is."""
        if place is None:
            return
        for number, subject in enumerate(self._subjects):
            places = [entry.place for entry in subject.entries]
            if place in places:
                self.query_one("#subjects", OptionList).highlighted = number
                if subject is not self._shown:
                    self._show_subject(subject)
                self.call_after_refresh(self._focus_row, places.index(place))
                return
