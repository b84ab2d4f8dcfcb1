"""A session: the link's news into the model, a person's requests to the board. It reads by itself, never fires."""

import queue
import time
from collections.abc import Callable
from dataclasses import dataclass
from typing import Protocol

from host.link import LinkChange, News
from host.link_errors import LinkError, NoAnswer
from host.model import LayoutModel, Records
from host.requests import Flight, Flights
from host.transfer import SettingsTransfer
from host.views import OutcomeView
from shared_protocol import messages
from shared_protocol.codec import Received
from shared_protocol.fields import INT_MAX, Message
from shared_protocol.words import SCOPES

# A status or settings that did not end in this time is asked for again.
STATUS_S = 1.5
SETTINGS_S = 5.0
SETTINGS_TRIES = 4
# A board that says nothing for this long is greeted again (hello changes nothing); then it counts as lost.
GREET_S = 1.2
SILENT_S = 3.0
# How often waiting looks at its timers while nothing comes in.
LOOK_S = 0.05


def first_id(wall_s: float) -> int:
    """A first request number that is larger than any that an earlier run gave this boot of the board.

    Ten numbers a second of the wall clock, coming round after three years; no person throws faster.
    """
    return int(wall_s * 10) % (INT_MAX - 100_000_000) + 1


class LinkLike(Protocol):
    """What a session needs of a link: host.link.Link has it, and a board's seat in host.seats."""

    @property
    def port(self) -> str:
        """Where the board is."""

    @property
    def error(self) -> LinkError | None:
        """Why there is no connection; None while there is one, or none was tried."""

    @property
    def received(self) -> queue.Queue[News]:
        """What came in."""

    @property
    def connected(self) -> bool:
        """True between the first exchange and the loss of the link."""

    def open(self) -> None:
        """Begin to connect."""

    def send(self, message: Message, values: list[object]) -> bool:
        """Write one message now; False if the link is down: nothing is kept for later."""


@dataclass(frozen=True)
class Part:
    """One board of what a person works on. junctions, banks: the numbers that people know its own ones by.

    name: '' where there is only one board. spare: another board has taken its place.
    """

    name: str
    session: "Session"
    junctions: tuple[int, ...]
    banks: tuple[int, ...]
    spare: bool = False


class Session:
    """One link, one model. Call `poll` often (or `wait_for`); everything happens in the caller's thread.

    clock: seconds, monotonic. first: the first request number.
    """

    def __init__(
        self,
        link: LinkLike,
        model: LayoutModel,
        clock: Callable[[], float] = time.monotonic,
        first: int | None = None,
    ) -> None:
        self.link = link
        self.model = model
        self.clock = clock
        self.transfer: SettingsTransfer | None = None
        self._next = first if first is not None else first_id(time.time())
        self._flights = Flights(model)
        self._boot = 0
        self._uid = ""
        self._status_s: float | None = None
        self._settings_s: float | None = None
        self._settings_tries = 0
        self.status_whole = False
        self._heard_s = clock()
        self._greeted_s = self._heard_s
        self._silent = False
        self._unanswered = False

    # ---- time and news

    def poll(self) -> int:
        """Take what came in, do what is due. Returns how many things came in."""
        count = 0
        while True:
            try:
                item = self.link.received.get_nowait()
            except queue.Empty:
                break
            self._take(item)
            count += 1
        self._due()
        return count

    def wait_for(self, predicate: Callable[[], bool], timeout_s: float) -> bool:
        """Poll until `predicate` holds; False if it does not in time."""
        until_s = self.clock() + timeout_s
        while True:
            self.poll()
            if predicate():
                return True
            left_s = until_s - self.clock()
            if left_s <= 0:
                return False
            try:
                item = self.link.received.get(timeout=min(left_s, LOOK_S))
            except queue.Empty:
                continue
            self._take(item)

    def open(self) -> None:
        """Begin to connect."""
        self.link.open()

    @property
    def error(self) -> LinkError | None:
        """Why there is no connection; None while there is one, or none was tried."""
        return self.link.error

    @property
    def all_told(self) -> bool:
        """True if it is known why there is no connection: then waiting helps no more."""
        return self.link.error is not None

    def connect(self, timeout_s: float = 8.0) -> None:
        """Wait until the board has told its status. Raises LinkError: why there is no board."""
        self.link.open()
        self.wait_for(lambda: self.status_whole or self._hopeless(), timeout_s)
        if self.status_whole:
            return
        if self.link.error is not None:
            raise self.link.error
        raise LinkError(self.link.port, "the board does not tell its status", "reset it, then try again")

    def _hopeless(self) -> bool:
        error = self.link.error
        return error is not None and not isinstance(error, NoAnswer)

    def _take(self, item: Received | LinkChange) -> None:
        now_s = self.clock()
        if isinstance(item, LinkChange):
            self.model.connection_is(item.state, item.text, now_s)
            self._heard_s = self._greeted_s = now_s
            self._silent = False
            self._unanswered = item.state == "connected"
            if item.state != "connected":
                self._lost()
            return
        message = item.message if not item.fault else None
        if message is not None:
            self._heard(now_s)
        if message is not None and message.kept:
            self.link.send(messages.ACK, [item.number("q")])
        self.model.apply(item, now_s)
        if message is not None and message.has("why") and item.word("why") == "board_restarted":
            self._unanswered = True
        if message is messages.BOARD:
            self._board(item, now_s)
        elif message is messages.END:
            self._end(item.word("what"), now_s)
        elif message is not None and self.transfer is not None:
            self._transfer_news(item)

    def _heard(self, now_s: float) -> None:
        self._heard_s = now_s
        if self._silent and self.link.connected:
            self._silent = False
            self.model.connection_is("connected", "the board answers again", now_s)

    def _watch_silence(self, now_s: float) -> None:
        if not self.link.connected:
            return
        silent = now_s - self._heard_s >= GREET_S
        if (silent or self._unanswered) and now_s - self._greeted_s >= GREET_S:
            self._greeted_s = now_s
            # Telemetry alone is no answer: a board that restarted meanwhile has another boot number.
            self._unanswered = self.link.send(messages.HELLO, [messages.VERSION])
        if not self._silent and now_s - self._heard_s >= SILENT_S:
            self._silent = True
            self.model.connection_is("lost", "the board is silent", now_s)
            self._lost()

    def _lost(self) -> None:
        self.status_whole = False
        self._status_s = None
        self._settings_s = None
        self._flights.doubt_all()
        if self.transfer is not None:
            self.transfer.lost()

    def _board(self, item: Received, now_s: float) -> None:
        boot, uid = item.number("boot"), item.name("uid")
        self._unanswered = False
        if self._boot and (boot, uid) != (self._boot, self._uid):
            self._flights.restarted(now_s)
            if self.transfer is not None:
                self.transfer.lost()
        self._boot, self._uid = boot, uid
        self._settings_tries = 0
        self._ask_status(now_s)

    def _end(self, what: str, now_s: float) -> None:
        if what == "status" and self._status_s is not None:
            self._status_s = None
            self.status_whole = True
            self._flights.end_of_status(now_s)
            if self.model.settings_match is not True and self.model.board_records is None:
                self.fetch_settings()
        elif what == "settings":
            self._settings_s = None
            if self.model.board_records is None and self._settings_tries < SETTINGS_TRIES:
                self.fetch_settings()

    def _transfer_news(self, item: Received) -> None:
        assert self.transfer is not None
        self.transfer.take(item)
        if item.message is messages.ACCEPTED:
            self._settings_tries = 0
            # New settings may renumber anything: lies and faults are told anew.
            self._ask_status(self.clock())

    def _due(self) -> None:
        now_s = self.clock()
        self._watch_silence(now_s)
        if self._flights.settle(now_s):
            self._ask_status(now_s)
        if self._status_s is not None and now_s - self._status_s > STATUS_S:
            self._ask_status(now_s)
        if self._settings_s is not None and now_s - self._settings_s > SETTINGS_S:
            self._settings_s = None
            if self._settings_tries < SETTINGS_TRIES:
                self.fetch_settings()
        if self.transfer is not None and self.transfer.open:
            self.transfer.step(now_s)

    def _ask_status(self, now_s: float) -> None:
        if self.link.send(messages.ASK, [messages.ASK_STATUS]):
            self.model.status_asked()
            self._status_s = now_s

    # ---- requests

    def throw(self, junction: int, lie: int, wait_ms: int = 0, number: int = 0) -> int:
        """Ask once for one throw; 0 ms: now or not at all. Returns its number: see `outcome_of`.

        number: the number it is to have, from who sees to it that numbers grow; 0: the session's next.
        """
        flight = Flight(self._new_id(number), "throw", junction, lie, -1, self.clock())
        return self._fly(flight, messages.THROW, [self._boot, flight.id, junction, lie, wait_ms])

    def route(self, route: int, wait_ms: int = 0, number: int = 0) -> int:
        """Ask once for a route; the wait is for each throw. Returns its number; `number` as for a throw."""
        flight = Flight(self._new_id(number), "route", -1, -1, route, self.clock())
        return self._fly(flight, messages.ROUTE, [self._boot, flight.id, route, wait_ms])

    def cancel(self, number: int) -> bool:
        """Cancel the request `number`, as far as it has not fired. False if there is no connection."""
        return self._with_boot(messages.CANCEL, [number])

    def stop(self) -> bool:
        """The operator's stop: nothing further fires until it is released. False if there is no connection."""
        return self.link.send(messages.STOP, [])

    def release(self) -> bool:
        """End the stop. False if there is no connection."""
        return self._with_boot(messages.RELEASE, [])

    def clear(self, scope: str, number: int = 0) -> bool:
        """Put what is out back into use; scope is 'bank', 'junction', 'button' or 'all'. Raises ValueError."""
        return self._with_boot(messages.CLEAR, [SCOPES.index(scope), number])

    def restart_board(self) -> bool:
        """Let the board finish its pulse, cancel its queue and start again. False if there is no connection."""
        return self._with_boot(messages.RESTART, [])

    def send_settings(self, records: Records) -> SettingsTransfer:
        """Send all records as one transaction; `poll` carries it on. Raises ValueOutOfTable: nothing is sent then."""
        if self.transfer is not None and self.transfer.open:
            self.transfer.cancel()
        self.transfer = SettingsTransfer(list(records), max(1, self._boot), self.link.send, self.clock())
        return self.transfer

    def fetch_settings(self) -> bool:
        """Ask for the board's records: they come as `model.board_records`. False if there is no connection."""
        if not self.link.send(messages.ASK, [messages.ASK_SETTINGS]):
            return False
        self.model.settings_asked()
        self._settings_s = self.clock()
        self._settings_tries += 1
        return True

    def outcome_of(self, number: int) -> OutcomeView | None:
        """How the request `number` ended; None while that is not known."""
        return self.model.outcomes.get((number, 0))

    def route_end_of(self, number: int) -> OutcomeView | None:
        """As `outcome_of`, for a route; None for a throw."""
        ended = self.outcome_of(number)
        return ended if ended is not None and ended.kind == "route" else None

    @property
    def in_flight(self) -> int:
        """Requests whose outcome has not come."""
        return len(self._flights)

    def _fly(self, flight: Flight, message: Message, values: list[object]) -> int:
        if self._boot and not self._silent and self.link.send(message, values):
            self._flights.add(flight)
        else:
            self._flights.unsent(flight, self.clock())
        return flight.id

    def _with_boot(self, message: Message, values: list[object]) -> bool:
        return bool(self._boot) and self.link.send(message, [self._boot, *values])

    @property
    def parts(self) -> list[Part]:
        """The only board."""
        return [Part("", self, tuple(range(len(self.model.junctions))), tuple(range(len(self.model.banks))))]

    @property
    def unreached(self) -> str:
        """Nothing to say: whether the only board is reached, each request tells."""
        return ""

    @property
    def next_id(self) -> int:
        """The least number that a further request may have."""
        return max(self._next, self.model.highest_id + 1)

    def _new_id(self, wanted: int) -> int:
        number = max(wanted, self.next_id)
        self._next = number + 1
        return number
