"""What became of the requests of this boot: a repeated number gets its outcome and fires nothing."""

from device.control.outbox import Outbox
from shared_protocol import messages
from shared_protocol.words import REFUSED, WHY_OLD_ID

KEPT_REQUESTS = 32
_FIELDS = 9

UNKNOWN_ID, RUNNING, FINISHED, TOO_OLD = 0, 1, 2, 3


class RequestMemory:
    """The newest requests with their outcomes. Numbers must grow; a smaller one that is not here is too old."""

    def __init__(self, outbox: Outbox) -> None:
        self._outbox = outbox
        self._ids = [0] * KEPT_REQUESTS
        self._is_route = [False] * KEPT_REQUESTS
        self._finished = [False] * KEPT_REQUESTS
        self._values = [[0] * _FIELDS for _ in range(KEPT_REQUESTS)]
        self._next = 0
        self._highest = 0

    def state(self, number: int) -> int:
        """UNKNOWN_ID for a new number, else what is known of it."""
        if number > self._highest:
            return UNKNOWN_ID
        place = self._find(number)
        if place < 0:
            return TOO_OLD
        return FINISHED if self._finished[place] else RUNNING

    def repeated(self, number: int) -> bool:
        """True if the number is not new: its outcome is told again, if it has one; it fires nothing."""
        state = self.state(number)
        if state == FINISHED:
            self.tell(number)
        elif state == TOO_OLD:
            values = self._outbox.kept(messages.OUTCOME)
            values[1] = number
            values[2] = 0
            for field in range(3, 11):
                values[field] = -1
            values[5] = REFUSED
            values[6] = WHY_OLD_ID
        return state != UNKNOWN_ID

    def begin(self, number: int, is_route: bool) -> None:
        """A new request is taken up. One that still runs is never forgotten."""
        for _ in range(KEPT_REQUESTS):
            if self._ids[self._next] == 0 or self._finished[self._next]:
                break
            self._next = (self._next + 1) % KEPT_REQUESTS
        place = self._next
        self._next = (place + 1) % KEPT_REQUESTS
        self._ids[place] = number
        self._is_route[place] = is_route
        self._finished[place] = False
        if number > self._highest:
            self._highest = number

    def finish(self, number: int, values: "list[object]") -> None:
        """Remember how it ended: the values of its outcome or route_end message, from the third on."""
        place = self._find(number)
        if place < 0:
            return
        self._finished[place] = True
        kept = self._values[place]
        for field in range(min(_FIELDS, len(values) - 2)):
            kept[field] = values[field + 2]  # type: ignore[call-overload]

    def tell(self, number: int) -> None:
        """Send its outcome again."""
        place = self._find(number)
        if place < 0:
            return
        values = self._outbox.kept(messages.ROUTE_END if self._is_route[place] else messages.OUTCOME)
        values[1] = number
        kept = self._values[place]
        for field in range(_FIELDS):
            values[field + 2] = kept[field]

    def _find(self, number: int) -> int:
        for place in range(KEPT_REQUESTS):
            if self._ids[place] == number:
                return place
        return -1
