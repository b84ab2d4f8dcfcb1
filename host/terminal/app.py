"""The program: polls the session, draws what changed, turns keys into requests."""

import time
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import ClassVar

from textual import events
from textual.app import App, SystemCommand
from textual.binding import Binding, BindingType
from textual.screen import Screen

from host.terminal import commands, help_view, routes_view
from host.terminal.ask_screen import AskScreen
from host.terminal.caution_view import CautionMemory, caution_rows
from host.terminal.desk import Desk
from host.terminal.desk_screen import DeskScreen
from host.terminal.faults_screen import FaultsScreen
from host.terminal.log_screen import LogScreen
from host.terminal.main_screen import ACTIONS, MainScreen
from host.terminal.rows import Rows
from host.terminal.session_like import SessionLike
from host.terminal.tuning import Tuning
from host.terminal.tuning_screen import TuningScreen

POLL_S = 0.05
# Drawn no faster than this, and at least this often: countdowns and ages go on when nothing comes in.
FASTEST_S = 0.1
SLOWEST_S = 0.5

Stamp = Callable[[float], str]


def wall_stamp(clock: Callable[[], float]) -> Stamp:
    """Times of the session's clock as times of day."""
    ahead_s = time.time() - clock()
    return lambda at_s: time.strftime("%H:%M:%S", time.localtime(at_s + ahead_s))


class DeskApp(App[int]):
    """The desk. `live` False: it polls only when told (tests, pictures)."""

    CSS_PATH = "desk.tcss"
    TITLE = "Coilwarden"
    BINDINGS: ClassVar[list[BindingType]] = [Binding("space", "stop", "STOP", priority=True)]

    def __init__(
        self,
        session: SessionLike,
        stamp: Stamp | None = None,
        live: bool = True,
        cautions: CautionMemory | None = None,
    ) -> None:
        super().__init__()
        self.animation_level = "none"
        self.desk = Desk(session, cautions)
        # One for each board.
        self.tunings: list[Tuning] = []
        self.stamp = stamp or wall_stamp(session.clock)
        self._live = live
        self._drawn_s = 0.0
        self._changed = True

    def get_default_screen(self) -> Screen[None]:
        """The main screen."""
        return MainScreen()

    def on_mount(self) -> None:
        """Begin to poll."""
        self.theme = "textual-dark"
        self.desk.poll()
        self.desk.use_settings_wait()
        if self._live:
            self.set_interval(POLL_S, self.tick)

    async def on_event(self, event: events.Event) -> None:
        """Keys of the desk are taken here, in the order in which they come.

        The space bar goes before everything else: a field that takes text would keep it. The keys of the main screen
        act before the next one is looked at: bindings act later, and a fast typist's second key would be lost.
        """
        if isinstance(event, events.Key):
            if event.key == "space":
                self.action_stop()
                return
            if isinstance(self.screen, MainScreen) and await self._main_key(event):
                return
        await super().on_event(event)

    async def _main_key(self, event: events.Key) -> bool:
        """A key on the main screen. True if it meant something."""
        if self.typed(event.key, event.character if event.is_printable else None):
            return True
        action = ACTIONS.get(event.key)
        return action is not None and await self.run_action(action)

    def tick(self) -> None:
        """Take the news; draw what changed, but no faster than is useful."""
        self._changed = self.desk.poll() or self._changed
        since_s = self.desk.now_s() - self._drawn_s
        if since_s >= SLOWEST_S or (since_s >= FASTEST_S and (self._changed or self.desk.counts_down)):
            self.draw()

    def draw(self) -> None:
        """Draw the screen in front; under the command palette the one that shows through."""
        self._changed = False
        self._drawn_s = self.desk.now_s()
        for screen in reversed(self.screen_stack):
            if isinstance(screen, DeskScreen):
                screen.show_all()
                break

    def typed(self, key: str, character: str | None) -> bool:
        """A key that may belong to the number being typed. True if it did."""
        taken = self.desk.typed(key, character)
        if taken:
            if self.desk.caution_due and self.desk.caution_wanted:
                self._show_cautions()
            self.draw()
        return taken

    # ---- actions

    def action_stop(self) -> None:
        """Stop: at once, from every screen."""
        self.desk.stop()
        self.draw()

    def action_release(self) -> None:
        """End the stop."""
        self.desk.release()
        self.draw()

    def action_now_or_wait(self) -> None:
        """Now or wait."""
        self.desk.mode.switch()
        self.desk.say("info", self.desk.mode.text)
        self.draw()

    def action_change_wait(self, step: int) -> None:
        """A longer or shorter wait."""
        if step > 0:
            self.desk.mode.longer()
        else:
            self.desk.mode.shorter()
        self.desk.say("info", self.desk.mode.text)
        self.draw()

    def action_throw(self, junction: int, lie: int) -> None:
        """Throw (from the command palette)."""
        self.desk.throw(junction, lie)
        self._after_request()

    def action_route(self, number: int) -> None:
        """Set a route."""
        self.desk.route(number)
        self._after_request()

    def action_choose_route(self) -> None:
        """Ask which route."""
        routes = self.desk.model.routes
        # Those without a letter are set from the command palette.
        keys = tuple(routes_view.letter_of(route.number) for route in routes[: len(routes_view.LETTERS)])

        def chosen(key: str | None) -> None:
            if key:
                self.action_route(keys.index(key))

        rows: Callable[[int], Rows] = lambda width: routes_view.choice_rows(self.desk.model, width)  # noqa: E731
        self.push_screen(
            AskScreen("Set which route? Press its letter.", rows, keys, "letter sets the route  Esc back  SPACE stop"),
            chosen,
        )

    def action_cancel(self) -> None:
        """Cancel what waits; asks if there is more than one request."""
        waiting = self.desk.waiting()
        if len(waiting) < 2:
            self.desk.cancel([each.id for each in waiting])
            self.draw()
            return
        keys = tuple("123456789"[: len(waiting)])

        def chosen(key: str | None) -> None:
            if key == "x":
                self.desk.cancel([each.id for each in waiting])
            elif key:
                self.desk.cancel([waiting[keys.index(key)].id])
            self.draw()

        rows = commands.cancel_rows(waiting[: len(keys)])
        self.push_screen(
            AskScreen("Cancel which?", lambda _: rows, (*keys, "x"), "number cancels it  x all  Esc back  SPACE stop"),
            chosen,
        )

    def action_cancel_all(self) -> None:
        """Cancel everything that waits."""
        self.desk.cancel([each.id for each in self.desk.waiting()])
        self.draw()

    def action_clear_fault(self, scope: str, number: int, who: str) -> None:
        """Clear one fault (from the command palette)."""
        self.desk.clear(scope, number, who)
        self.draw()

    def action_faults(self) -> None:
        """The fault screen."""
        self.push_screen(FaultsScreen())

    def action_log(self) -> None:
        """The event log."""
        self.push_screen(LogScreen())

    def action_tuning(self) -> None:
        """The tuning screen."""
        parts = self.desk.session.parts
        self.tunings += [Tuning() for _ in range(len(parts) - len(self.tunings))]
        self.push_screen(TuningScreen(self.tunings))

    def action_help(self) -> None:
        """Keys, words, cautions."""
        self.push_screen(AskScreen("Help", help_view.help_rows, ("q", "?"), "up/down PgUp PgDn  Esc back  SPACE stop"))

    def action_leave(self) -> None:
        """Quit; asks if something waits."""
        if not self.desk.model.queue:
            self.exit(0)
            return

        def chosen(key: str | None) -> None:
            if key == "y":
                self.exit(0)

        rows = commands.leave_rows(len(self.desk.model.queue))
        self.push_screen(AskScreen("Quit?", lambda _: rows, "yq", "y quit  Esc stay  SPACE stop"), chosen)

    def get_system_commands(self, screen: Screen[object]) -> Iterable[SystemCommand]:
        """All actions by name, for the command palette."""
        for command in commands.all_commands(self.desk.model):
            yield SystemCommand(command.title, command.help, self._runner(command.action))

    def _runner(self, action: str) -> Callable[[], None]:
        def run() -> None:
            self.call_later(self.run_action, action)

        return run

    # ---- cautions

    def _after_request(self) -> None:
        if self.desk.caution_due:
            self._show_cautions()
        self.draw()

    def _show_cautions(self) -> None:
        self.desk.caution_wanted = False

        def answered(key: str | None) -> None:
            if key == "y":
                self.desk.acknowledge_cautions()
                self.desk.say("info", "Cautions read. Nothing has fired: ask for the throw again.")
            self.draw()

        self.push_screen(
            AskScreen("Before the first pulse", caution_rows, "y", "y I have read this  Esc not now  SPACE stop"),
            answered,
        )


def run_desk(session: SessionLike, layout: object, picture: Path | None, size: tuple[int, int] = (100, 30)) -> int:
    """Run the terminal until it is left; with `picture` draw one screen to that file and end.

    size: columns and rows of the picture. Returns the exit status: 0, or 2 if the picture can't be drawn.
    """
    if picture is not None:
        from host.terminal.picture import draw_picture

        return draw_picture(session, picture, size)
    return DeskApp(session).run() or 0
