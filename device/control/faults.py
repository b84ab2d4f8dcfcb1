"""The book of faults: the first one of each bank, junction and button is kept until the operator clears it."""

from device.control.outbox import Outbox
from device.control.ticks import Changes
from shared_protocol import messages
from shared_protocol.words import SCOPE_BANK, SCOPE_BUTTON, SCOPE_JUNCTION


class FaultBook:
    """Codes of words.FAULTS by scope and number; 0 means in use."""

    def __init__(self, banks: int, junctions: int, buttons: int, outbox: Outbox, changes: Changes) -> None:
        self._outbox = outbox
        self._changes = changes
        self.codes = [[0] * banks, [0] * junctions, [0] * buttons]
        self._first = [[0] * banks, [0] * junctions, [0] * buttons]
        self._second = [[0] * banks, [0] * junctions, [0] * buttons]
        self._near = [[-1] * banks, [-1] * junctions, [-1] * buttons]

    def bank_out(self, bank: int) -> bool:
        """True if the bank is out."""
        return self.codes[SCOPE_BANK][bank] != 0

    def junction_out(self, junction: int) -> bool:
        """True if the junction is out."""
        return self.codes[SCOPE_JUNCTION][junction] != 0

    def button_out(self, button: int) -> bool:
        """True if the button is out."""
        return self.codes[SCOPE_BUTTON][button] != 0

    def report(self, scope: int, number: int, code: int, first: int, second: int, near: int) -> bool:
        """Keep a fault with its evidence, unless one is kept already; True if it is new."""
        if self.codes[scope][number]:
            return False
        self.codes[scope][number] = code
        self._changes.happened = True
        self._first[scope][number] = first
        self._second[scope][number] = second
        self._near[scope][number] = near
        self.tell(scope, number)
        return True

    def tell(self, scope: int, number: int) -> None:
        """Send what is kept (again)."""
        values = self._outbox.kept(messages.FAULT)
        values[1] = scope
        values[2] = number
        values[3] = self.codes[scope][number]
        values[4] = self._first[scope][number]
        values[5] = self._second[scope][number]
        values[6] = self._near[scope][number]

    def clear(self, scope: int, number: int) -> bool:
        """Put one back into use; True if it was out."""
        if not self.codes[scope][number]:
            return False
        self.codes[scope][number] = 0
        self._changes.happened = True
        values = self._outbox.kept(messages.CLEARED)
        values[1] = scope
        values[2] = number
        return True

    def take_over(self, other: "FaultBook") -> None:
        """Keep what another book of the same banks, junctions and buttons has kept."""
        self.codes = other.codes
        self._first = other._first
        self._second = other._second
        self._near = other._near
