"""Routes over several boards, run by the host: one throw after another, each asked for when the one before is done.

A throw is asked for once and never again. The first bad end, a stop, a cancel or the loss of a board that is still
needed ends the route; what was not asked for is told as cancelled.
"""

from dataclasses import dataclass, field
from typing import Protocol

from host.views import Names, OutcomeView, QueueItem
from host.wording import outcome_text, route_text

_LEVELS = {"done": "good", "refused": "warn", "expired": "warn", "cancelled": "warn"}
# How a route ends when one of its throws ended so; whatever else became of a throw, the route has failed.
_ENDS = ("refused", "expired", "cancelled")


class Boards(Protocol):
    """What the host's routes need of the boards. A place is a board and a junction's number there."""

    def place_of(self, junction: int) -> tuple[int, int]:
        """The board of a junction, and its number there."""

    def name_of(self, board: int) -> str:
        """The board's name."""

    def hindrance_of(self, board: int) -> str:
        """Why nothing may be asked of a board; '' if nothing hinders."""

    def is_stopped(self, board: int) -> bool:
        """True if the board tells a stop."""

    def losses_of(self, board: int) -> int:
        """How often the board was lost or has restarted."""

    def pause_s_of(self, board: int) -> float:
        """The pause that the board's settings want between two throws of a route."""

    def ask(self, board: int, junction: int, lie: int, wait_ms: int) -> int:
        """Ask a board for a throw, by its own numbers; returns the request's number."""

    def withdraw(self, board: int, number: int) -> None:
        """Cancel a throw that was asked for, as far as it has not fired."""

    def ended(self, board: int, number: int) -> OutcomeView | None:
        """How a throw ended, in the numbers of the whole layout; None while that is not known."""

    def tell(self, ended: OutcomeView, level: str) -> None:
        """An outcome of the host's own."""

    @property
    def names(self) -> Names:
        """Names of the whole layout."""


@dataclass
class Run:
    """A route that is being set. losses: of each board that it needs, how often it had been lost when it began.

    at: how many of its throws were asked for. asked: the throw that is under way, as board and request number.
    ending: outcome, reason and text of the end that was decided on while a throw is still under way.
    """

    id: int
    route: int
    throws: list[tuple[int, int]]
    wait_ms: int
    losses: dict[int, int]
    at: int = 0
    done: int = 0
    asked: tuple[int, int] | None = None
    due_s: float = 0.0
    ending: tuple[str, str, str] | None = None
    finished: bool = False
    last_board: int = -1
    steps: dict[tuple[int, int], tuple[int, int]] = field(default_factory=dict)

    def boards_left(self, boards: Boards) -> list[int]:
        """The boards of the throw under way and of those to come, in order, each once."""
        first = self.at - 1 if self.asked is not None else self.at
        return list(dict.fromkeys(boards.place_of(junction)[0] for junction, _ in self.throws[first:]))


class HostRoutes:
    """All routes that the host runs. Call `poll` often."""

    def __init__(self, boards: Boards) -> None:
        self._boards = boards
        self._runs: list[Run] = []

    def start(self, number: int, route: int, throws: list[tuple[int, int]], wait_ms: int, now_s: float) -> None:
        """Begin: nothing fires unless all boards that it needs are there and not stopped."""
        needed = dict.fromkeys(self._boards.place_of(junction)[0] for junction, _ in throws)
        losses = {board: self._boards.losses_of(board) for board in needed}
        run = Run(number, route, throws, wait_ms, losses, due_s=now_s)
        hindrance = next((text for text in map(self._boards.hindrance_of, needed) if text), "")
        if hindrance:
            self._end(run, ("unsent", "", f"not sent: {hindrance}"), now_s)
        elif any(map(self._boards.is_stopped, needed)):
            self._end(run, ("refused", "stop", ""), now_s)
        else:
            self._runs.append(run)
            self._ask(run, now_s)

    def cancel(self, number: int) -> tuple[int, int] | None:
        """Cancel a route; returns the throw that was under way (board, number), if any. Raises KeyError if unknown."""
        run = next((each for each in self._runs if each.id == number), None)
        if run is None:
            raise KeyError(number)
        run.ending = run.ending or ("cancelled", "operator", "")
        return run.asked

    def stop(self) -> None:
        """The operator's stop: nothing further is asked for."""
        for run in self._runs:
            run.ending = run.ending or ("cancelled", "stop", "")

    def poll(self, now_s: float) -> None:
        """Look what became of throws; ask for the next ones."""
        for run in self._runs:
            self._look(run, now_s)
        self._runs = [run for run in self._runs if not run.finished]

    def waiting(self, now_s: float) -> list[QueueItem]:
        """The throws that are not asked for yet: when they will fire can't be told."""
        return [
            QueueItem(run.id, step + 1, junction, lie, "host", "waiting", -1, now_s, self._board_name(junction))
            for run in self._runs if run.ending is None
            for step, (junction, lie) in enumerate(run.throws) if step >= run.at
        ]  # fmt: skip

    def _board_name(self, junction: int) -> str:
        return self._boards.name_of(self._boards.place_of(junction)[0])

    def is_running(self, number: int) -> bool:
        """True while the route of that number is being set."""
        return any(run.id == number for run in self._runs)

    def step_of(self) -> dict[tuple[int, int], tuple[int, int]]:
        """Which throw of a board, by board and number, is which step of which route, for routes that are being set."""
        return {key: step for run in self._runs for key, step in run.steps.items()}

    # ---- one route

    def _look(self, run: Run, now_s: float) -> None:
        if run.asked is not None:
            board, number = run.asked
            ended = self._boards.ended(board, number)
            if ended is not None:
                self._throw_ended(run, ended, now_s)
        lost = self._lost(run)
        if lost and run.ending is None:
            run.ending = ("failed", "", lost)
            if run.asked is not None:
                self._boards.withdraw(*run.asked)
        if run.asked is not None and (run.ending is None or self._still_there(run)):
            return
        if run.ending is not None:
            self._end(run, run.ending, now_s)
        elif run.at == len(run.throws):
            self._end(run, ("done", "ok", ""), now_s)
        elif now_s >= run.due_s:
            self._ask(run, now_s)

    def _still_there(self, run: Run) -> bool:
        """True if the board of the throw under way can still tell its end."""
        assert run.asked is not None
        board = run.asked[0]
        return self._boards.losses_of(board) == run.losses[board]

    def _lost(self, run: Run) -> str:
        """Which board that is still needed was lost or can't be used, in a sentence; '' if none."""
        for board in run.boards_left(self._boards):
            hindrance = self._boards.hindrance_of(board)
            if hindrance:
                return hindrance
            if self._boards.losses_of(board) != run.losses[board]:
                return f"board {self._boards.name_of(board)} was lost or has restarted meanwhile"
            if self._boards.is_stopped(board):
                run.ending = run.ending or ("cancelled", "stop", "")
        return ""

    def _ask(self, run: Run, now_s: float) -> None:
        junction, lie = run.throws[run.at]
        board, own = self._boards.place_of(junction)
        number = self._boards.ask(board, own, lie, run.wait_ms)
        run.at += 1
        run.asked = (board, number)
        run.steps[run.asked] = (run.id, run.at)

    def _throw_ended(self, run: Run, ended: OutcomeView, now_s: float) -> None:
        assert run.asked is not None
        run.last_board, run.asked = run.asked[0], None
        self._boards.tell(_as_step(ended, run, run.at), "")
        if ended.outcome == "done":
            run.done += 1
            if run.at < len(run.throws):
                board = self._boards.place_of(run.throws[run.at][0])[0]
                run.due_s = now_s + self._boards.pause_s_of(board)
            else:
                run.ending = None  # nothing was left to stop or cancel
        elif run.ending is None or ended.outcome not in _ENDS:
            text = "" if ended.why else f"board {self._boards.name_of(run.last_board)} was lost: {ended.text}"
            run.ending = (ended.outcome if ended.outcome in _ENDS else "failed", ended.why, text)

    def _end(self, run: Run, how: tuple[str, str, str], now_s: float) -> None:
        """Tell the end of the route, and of the throws that it never asked for."""
        outcome, why, text = how
        names = self._boards.names
        if run.asked is not None:
            junction, lie = run.throws[run.at - 1]
            step = OutcomeView(run.id, run.at, "throw", "unknown", "", "", now_s, junction, lie)
            step.text = f"{names.junction(junction)}, {names.lie(junction, lie)}: not known whether it fired: {text}"
            self._boards.tell(step, "bad")
        rest_why = why if why in ("stop", "operator") else "route_failed"
        for place in range(run.at, len(run.throws)) if outcome != "unsent" else ():
            junction, lie = run.throws[place]
            step = OutcomeView(run.id, place + 1, "throw", "cancelled", rest_why, "", now_s, junction, lie)
            step.text = f"{names.junction(junction)}, {names.lie(junction, lie)}: {outcome_text(step, names)}"
            self._boards.tell(step, "")
        ended = OutcomeView(run.id, 0, "route", outcome, why, "", now_s, route=run.route)
        ended.done, ended.of = run.done, len(run.throws)
        if why:
            ended.text = route_text(ended, names)
        elif outcome == "unsent":
            ended.text = f"{names.route(run.route)}: {text}"
        else:
            ended.text = f"{names.route(run.route)} {outcome}: {text}; {run.done} of {len(run.throws)} throws done"
        run.finished = True
        self._boards.tell(ended, _LEVELS.get(outcome, "bad"))


def _as_step(ended: OutcomeView, run: Run, step: int) -> OutcomeView:
    """The outcome of a throw as that of a step of the route."""
    return OutcomeView(
        run.id, step, "throw", ended.outcome, ended.why, ended.text, ended.at_s, ended.junction, ended.lie,
        ms=ended.ms, which=ended.which, mv=ended.mv, after_mv=ended.after_mv,
    )  # fmt: skip
