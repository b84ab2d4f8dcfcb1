"""Time in ticks that wrap at 2**30, and marks of past moments that stay right however long ago they were.

A difference of ticks is only right up to half a period. A mark older than a quarter period is therefore turned into
'long ago', by a sweep that looks at one mark each tick.
"""

MASK = (1 << 30) - 1
HALF = 1 << 29
QUARTER = 1 << 28

# What `since` answers for a moment that is long ago: a quarter period (3 days in milliseconds).
LONG_AGO = QUARTER


def elapsed(now: int, then: int) -> int:
    """Ticks from `then` to `now`, negative if `then` is still to come; right within half a period."""
    difference = (now - then) & MASK
    if difference >= HALF:
        # In two steps: 2**30 itself is more than a small integer holds.
        difference -= HALF
        difference -= HALF
    return difference


def later(now: int, by: int) -> int:
    """The tick `by` (0 to a quarter period) after `now`."""
    # Without the sum, which could leave the small integers before it is masked.
    left = MASK - now
    return now + by if by <= left else by - left - 1


class Changes:
    """One for a plant: `happened` tells the queue to look at every throw again, not only at voltages."""

    def __init__(self) -> None:
        self.happened = True


class Marks:
    """A fixed number of past moments. Each is long ago until it is set."""

    def __init__(self, count: int) -> None:
        self._at = [0] * count
        self._old = [True] * count
        self._next = 0

    def set(self, mark: int, now: int) -> None:
        """Mark `mark` is now."""
        self._at[mark] = now
        self._old[mark] = False

    def forget(self, mark: int) -> None:
        """Mark `mark` is long ago."""
        self._old[mark] = True

    def since(self, mark: int, now: int) -> int:
        """Ticks since mark `mark`, LONG_AGO if that is longer than a quarter period."""
        if self._old[mark]:
            return LONG_AGO
        passed = elapsed(now, self._at[mark])
        if passed >= QUARTER or passed < 0:
            self._old[mark] = True
            return LONG_AGO
        return passed

    def sweep(self, now: int) -> None:
        """Look at one mark, the next each time."""
        if self._next >= len(self._at):
            self._next = 0
        if self._at:
            self.since(self._next, now)
        self._next += 1
