"""Several boards worked as one: a session for each, requests in the numbers of the whole layout.

Losing one board does not stop the others. Coming back only reads: nothing that was asked for is asked for again.
"""

import queue
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from host.fleet_model import BoardPart, FleetModel, PartModel
from host.fleet_routes import HostRoutes
from host.link_errors import LinkError, NoAnswer
from host.model import Records
from host.seats import Port, Seat, Seating
from host.session import LinkLike, Part, Session, first_id
from host.transfer import SettingsTransfer
from host.views import Names, OutcomeView

if TYPE_CHECKING:
    from sim.layout import Layout

# How often waiting looks at all ports while nothing comes in at one.
LOOK_S = 0.02
USUAL_PAUSE_MS = 100


@dataclass
class Asked:
    """A request to several boards: of each, how many answers it had given before. missed: boards not reached."""

    counts: dict[int, int]
    missed: list[str]
    # What one board alone may answer with no while the whole is a yes: there was nothing to do for it.
    any_is_enough: bool


class Fleet:
    """All boards of a layout. Call `poll` often (or `wait_for`); everything happens in the caller's thread.

    links: one a port, in any order: who is where is told by the boards. clock: seconds, monotonic. first: the first
    request number. Links are opened by `open`, and closed by who made them.
    """

    def __init__(
        self,
        layout: "Layout",
        links: Sequence[LinkLike],
        clock: Callable[[], float] = time.monotonic,
        first: int | None = None,
    ) -> None:
        self.layout = layout
        self.clock = clock
        self.links = list(links)
        self.ports = [Port(link) for link in self.links]
        self._next = first if first is not None else first_id(time.time())
        self._parts = self._make_parts()
        self.model = FleetModel(layout, self._parts)
        self._seating = Seating([part.seat for part in self._parts], self.ports, self._note)
        self._sessions = [Session(part.seat, part.model, clock, self._next) for part in self._parts]
        self._routes = HostRoutes(self)
        self._owners: dict[int, int] = {}
        self._asked: dict[str, Asked] = {}

    def _make_parts(self) -> list[BoardPart]:
        layout = self.layout
        routes = [(number, route.place) for number, route in enumerate(layout.routes) if route.place is not None]
        parts = []
        for number, board in enumerate(layout.boards):
            seat = Seat(board, board.uid or f"virtual-{number + 1}")
            parts.append(
                BoardPart(
                    number, board, seat, PartModel(board, self._teller(board.name)),
                    _numbers(layout.junction_places, number), _numbers(layout.bank_places, number),
                    tuple(whole for whole, place in routes if place[0] == number),
                    _numbers(layout.button_places, number),
                )
            )  # fmt: skip
        return parts

    def _teller(self, name: str) -> Callable[[float, str, str], None]:
        several = len(self.layout.boards) > 1
        return lambda at_s, level, text: self.model.note(at_s, level, f"{name}: {text}" if several else text)

    def _note(self, level: str, text: str) -> None:
        self.model.note(self.clock(), level, text)

    # ---- time and news

    def open(self) -> None:
        """Begin to connect at all ports."""
        for link in self.links:
            link.open()

    @property
    def error(self) -> LinkError | None:
        """Why none of the boards is there; None while one is, or may yet come."""
        if any(port.hello is not None or port.link.error is None for port in self.ports):
            return None
        return self.ports[0].link.error

    @property
    def all_told(self) -> bool:
        """True if every port has told who is there, or why nobody is."""
        return all(port.hello is not None or port.link.error is not None for port in self.ports)

    def poll(self) -> int:
        """Take what came in at all ports, do what is due. Returns how many things came in."""
        count = self._seating.poll()
        for session in self._sessions:
            session.poll()
        now_s = self.clock()
        self._routes.poll(now_s)
        self._look_at_answers(now_s)
        self._merge(now_s)
        return count

    def _merge(self, now_s: float) -> None:
        self.model.steps.update(self._routes.step_of())
        self.model.own_items = self._routes.waiting(now_s)
        self.model.trouble = next((port.text for port in self.ports if port.text), "")
        self.model.merge(now_s)

    def wait_for(self, predicate: Callable[[], bool], timeout_s: float) -> bool:
        """Poll until `predicate` holds; False if it does not in time."""
        until_s = self.clock() + timeout_s
        place = 0
        while True:
            self.poll()
            if predicate():
                return True
            left_s = until_s - self.clock()
            if left_s <= 0:
                return False
            port = self.ports[place % len(self.ports)]
            place += 1
            try:
                item = port.link.received.get(timeout=min(left_s, LOOK_S / len(self.ports)))
            except queue.Empty:
                continue
            self._seating.take(port, item)

    def connect(self, timeout_s: float = 8.0) -> None:
        """Wait until every port has told what is there. Raises LinkError if no board of the layout is."""
        self.open()
        self.wait_for(self._is_settled, timeout_s)
        if any(session.status_whole for session in self._sessions):
            return
        errors = [link.error for link in self.links if link.error is not None]
        strange = [port for port in self.ports if port.hello is not None and port.text]
        if strange:
            raise LinkError(strange[0].name, strange[0].text, "see 'coilwarden boards', and the ids in the layout file")
        if errors:
            raise errors[0]
        raise LinkError(self.links[0].port, "the board does not tell its status", "reset it, then try again")

    def _is_settled(self) -> bool:
        for port in self.ports:
            if port.hello is not None:
                seat = port.seat
                told = seat is None or any(session.status_whole for session in self._sessions if session.link is seat)
            else:
                told = port.link.error is not None and not isinstance(port.link.error, NoAnswer)
            if not told:
                return False
        return True

    # ---- what the desk and the commands ask

    @property
    def parts(self) -> list[Part]:
        """Each board's session, with the numbers that people know its junctions and banks by."""
        several = len(self._parts) > 1
        return [
            Part(part.name if several else "", session, part.junctions, part.banks, part.seat.spare)
            for part, session in zip(self._parts, self._sessions, strict=True)
        ]

    @property
    def boards(self) -> list[BoardPart]:
        """The boards, in the order of the file."""
        return self._parts

    @property
    def unreached(self) -> str:
        """Which boards a request to all would not reach, in a sentence; '' if it reaches all."""
        missing = [part.name for part in self._parts if not part.model.is_connected]
        return f"board{'s' if len(missing) > 1 else ''} {', '.join(missing)} not reached" if missing else ""

    def throw(self, junction: int, lie: int, wait_ms: int = 0) -> int:
        """Ask once for one throw; 0 ms: now or not at all. Returns its number: see `outcome_of`."""
        board, own = self.layout.junction_places[junction]
        number = self._new_id()
        hindrance = self._parts[board].hindrance
        if hindrance:
            who = f"{self.names.junction(junction)}, {self.names.lie(junction, lie)}"
            self._unsent(OutcomeView(number, 0, "throw", "unsent", "", "", self.clock(), junction, lie), who, hindrance)
        else:
            self._owners[number] = board
            self._sessions[board].throw(own, lie, wait_ms, number)
        self._merge(self.clock())
        return number

    def route(self, route: int, wait_ms: int = 0) -> int:
        """Ask once for a route, of one board or run by the host; the wait is for each throw. Returns its number."""
        view = self.layout.routes[route]
        number = self._new_id()
        if view.place is None:
            self._routes.start(number, route, list(view.throws), wait_ms, self.clock())
        else:
            board, own = view.place
            hindrance = self._parts[board].hindrance
            if hindrance:
                ended = OutcomeView(number, 0, "route", "unsent", "", "", self.clock(), route=route)
                self._unsent(ended, self.names.route(route), hindrance)
            else:
                self._owners[number] = board
                self._sessions[board].route(own, wait_ms, number)
        self._merge(self.clock())
        return number

    def _unsent(self, ended: OutcomeView, who: str, hindrance: str) -> None:
        ended.text = f"{who}: not sent: {hindrance}"
        self.tell(ended, "bad")

    def cancel(self, number: int) -> bool:
        """Cancel the request `number`, as far as it has not fired. False if no board could be told."""
        if self._routes.is_running(number):
            asked = self._routes.cancel(number)
            if asked is None:
                self.model.take_answer("cancel", True, "ok", "cancel: done", self.clock())
                return True
            board, number = asked
        else:
            board = self._owner_of(number)
        boards = [board] if board >= 0 else self._reachable()
        return self._broadcast("cancel", boards, lambda session: session.cancel(number), any_is_enough=True)

    def _owner_of(self, number: int) -> int:
        if number in self._owners:
            return self._owners[number]
        for part in self._parts:
            if any(item.id == number for item in part.model.queue):
                return part.number
        return -1

    def stop(self) -> bool:
        """The operator's stop, to all boards. False if none could be told."""
        self._routes.stop()
        return self._broadcast("stop", self._reachable(), lambda session: session.stop())

    def release(self) -> bool:
        """End the stop, on all boards. False if none could be told."""
        return self._broadcast("release", self._reachable(), lambda session: session.release())

    def clear(self, scope: str, number: int = 0) -> bool:
        """Put what is out back into use; scope is 'bank', 'junction', 'button' or 'all'. Raises ValueError."""
        if scope == "all":
            return self._broadcast("clear", self._reachable(), lambda session: session.clear("all"), True)
        places = {
            "bank": self.layout.bank_places, "junction": self.layout.junction_places,
            "button": self.layout.button_places,
        }[scope]  # fmt: skip
        if not 0 <= number < len(places):
            return False
        board, own = places[number]
        return self._broadcast("clear", [board], lambda session: session.clear(scope, own), any_is_enough=True)

    def send_settings(self, records: Records) -> SettingsTransfer:
        """Send settings to the only board. Raises sim.layout.SeveralBoards: then each part's session sends its own."""
        assert self.layout.only
        return self._sessions[0].send_settings(records)

    def fetch_settings(self) -> bool:
        """Ask all boards for their settings. False if none could be asked."""
        return any([session.fetch_settings() for session in self._sessions])

    def outcome_of(self, number: int) -> OutcomeView | None:
        """How the request `number` ended; None while that is not known."""
        return self.model.outcomes.get((number, 0))

    def _new_id(self) -> int:
        number = max(self._next, *[session.next_id for session in self._sessions])
        self._next = number + 1
        return number

    # ---- requests to several boards

    def _reachable(self) -> list[int]:
        return [part.number for part in self._parts if part.model.is_connected]

    def _broadcast(
        self, request: str, boards: list[int], ask: Callable[[Session], bool], any_is_enough: bool = False
    ) -> bool:
        counts: dict[int, int] = {}
        for board in boards:
            answer = self._parts[board].model.answers.get(request)
            before = answer.count if answer is not None else 0
            if ask(self._sessions[board]):
                counts[board] = before
        missed = [] if any_is_enough else [part.name for part in self._parts if part.number not in counts]
        if counts:
            self._asked[request] = Asked(counts, missed, any_is_enough)
        return bool(counts)

    def _look_at_answers(self, now_s: float) -> None:
        """Boards' answers to what all were asked make one answer, once none is outstanding."""
        for request, asked in list(self._asked.items()):
            answers = {board: self._parts[board].model.answers.get(request) for board in asked.counts}
            given = {
                board: answer for board, answer in answers.items()
                if answer is not None and answer.count > asked.counts[board]
            }  # fmt: skip
            silent = [board for board in asked.counts if board not in given]
            if any(self._parts[board].model.is_connected for board in silent):
                continue
            del self._asked[request]
            missed = asked.missed + [self._parts[board].name for board in silent]
            good = [answer for answer in given.values() if answer.ok]
            ok = bool(good) if asked.any_is_enough else len(good) == len(asked.counts)
            worst = next((answer for answer in given.values() if answer.ok == ok), None)
            text = worst.text if worst is not None else f"{request}: no answer"
            if not ok and worst is not None and len(given) > 1:
                name = next(self._parts[board].name for board, answer in given.items() if answer is worst)
                text = f"board {name}: {text}"
            if missed and request in ("stop", "release"):
                text += f"; board {', '.join(missed)} NOT reached"
                if request == "stop":
                    text += ": use its own stop, or switch its coil supply off"
                ok = False
            why = worst.why if worst is not None else ""
            self.model.take_answer(request, ok, why, text, now_s)

    # ---- what the host's routes ask (see host.fleet_routes.Boards)

    @property
    def names(self) -> Names:
        """Names of the whole layout."""
        return self.model.names

    def place_of(self, junction: int) -> tuple[int, int]:
        """The board of a junction, and its number there."""
        return self.layout.junction_places[junction]

    def name_of(self, board: int) -> str:
        """The board's name."""
        return self._parts[board].name

    def hindrance_of(self, board: int) -> str:
        """Why nothing may be asked of a board."""
        return self._parts[board].hindrance

    def is_stopped(self, board: int) -> bool:
        """True if the board tells a stop."""
        return self._parts[board].model.stopped

    def losses_of(self, board: int) -> int:
        """How often the board was lost or has restarted."""
        return self._parts[board].model.losses

    def pause_s_of(self, board: int) -> float:
        """The pause between two throws of a route, by the board's settings."""
        settings = self._parts[board].model.settings
        timing = settings.timing if settings is not None else None
        return (timing.pause_ms if timing is not None else USUAL_PAUSE_MS) / 1000

    def ask(self, board: int, junction: int, lie: int, wait_ms: int) -> int:
        """Ask a board for a throw of a route that the host runs."""
        return self._sessions[board].throw(junction, lie, wait_ms, self._new_id())

    def withdraw(self, board: int, number: int) -> None:
        """Cancel a throw of a route."""
        self._sessions[board].cancel(number)

    def ended(self, board: int, number: int) -> OutcomeView | None:
        """How a throw of a route ended."""
        ended = self._sessions[board].outcome_of(number)
        return FleetModel.outcome_of(self._parts[board], ended) if ended is not None else None

    def tell(self, ended: OutcomeView, level: str) -> None:
        """An outcome of the host's own; told as an event too if it has a level."""
        self.model.keep_outcome(ended)
        if level:
            self.model.note(ended.at_s, level, ended.text)


def _numbers(places: list[tuple[int, int]], board: int) -> tuple[int, ...]:
    """The numbers in the whole layout of what is on a board, by their own numbers."""
    return tuple(number for number, place in enumerate(places) if place[0] == board)
