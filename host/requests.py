"""Throws and routes asked for: which are in flight, and what became of each. A request is sent once, never again."""

from dataclasses import dataclass

from host.model import LayoutModel
from host.views import OutcomeView

# A board answers within milliseconds; a request that nothing is heard of for this long is asked after by a status.
NO_WORD_S = 2.0


@dataclass
class Flight:
    """One request on its way: sent at `sent_s`. `doubt`: the next whole status decides whether it is known."""

    id: int
    kind: str
    junction: int
    lie: int
    route: int
    sent_s: float
    doubt: bool = False


class Flights:
    """The requests in flight, against the model's queue and outcomes."""

    def __init__(self, model: LayoutModel) -> None:
        self._model = model
        self._flying: dict[int, Flight] = {}

    def add(self, flight: Flight) -> None:
        """A request has been handed to the link."""
        self._flying[flight.id] = flight

    def __len__(self) -> int:
        return len(self._flying)

    def doubt_all(self) -> None:
        """The link was lost: what is in flight may or may not have arrived."""
        for flight in self._flying.values():
            flight.doubt = True

    def settle(self, now_s: float) -> bool:
        """Let go of what has ended. True if a status should be asked for, because nothing is heard of a request."""
        wanted = False
        for number in [each for each in self._flying if self._ended(each)]:
            del self._flying[number]
        for flight in self._flying.values():
            if flight.doubt or self._queued(flight.id):
                continue
            if now_s - flight.sent_s > NO_WORD_S:
                flight.doubt = True
                wanted = True
        return wanted

    def end_of_status(self, now_s: float) -> None:
        """A whole status has come: a doubtful request that it does not mention is not known to the board."""
        for flight in list(self._flying.values()):
            if flight.doubt and not self._ended(flight.id):
                if self._queued(flight.id):
                    flight.doubt = False
                else:
                    self._unknown(flight, now_s)

    def restarted(self, now_s: float) -> None:
        """The board has another boot number: what it was asked before, nothing will ever tell."""
        for flight in list(self._flying.values()):
            if not self._ended(flight.id):
                self._unknown(flight, now_s)

    def unsent(self, flight: Flight, now_s: float) -> None:
        """A request that never left this computer."""
        self._keep(flight, "unsent", "not sent: there is no connection to the board", now_s)

    def _unknown(self, flight: Flight, now_s: float) -> None:
        text = "not known whether it fired: the link was lost, or its answer; look at the points"
        self._keep(flight, "unknown", text, now_s)
        self._flying.pop(flight.id, None)

    def _keep(self, flight: Flight, outcome: str, text: str, now_s: float) -> None:
        names = self._model.names
        who = names.route(flight.route)
        if flight.kind == "throw":
            who = f"{names.junction(flight.junction)}, {names.lie(flight.junction, flight.lie)}"
        ended = OutcomeView(flight.id, 0, flight.kind, outcome, "", f"{who}: {text}", now_s)
        ended.junction, ended.lie, ended.route = flight.junction, flight.lie, flight.route
        self._model.keep_outcome(ended)
        self._model.note(now_s, "bad", ended.text)

    def _ended(self, number: int) -> bool:
        return (number, 0) in self._model.outcomes

    def _queued(self, number: int) -> bool:
        return any(item.id == number for item in self._model.queue)
