"""How the main screen shares out its room."""

from dataclasses import dataclass

WIDE = 110
TALL = 30


@dataclass(frozen=True)
class Sizes:
    """Widths and heights in cells; heights include a panel's title."""

    left: int
    top: int
    middle: int
    queue: int
    events: int
    answer: int
    headings: bool


def share_out(width: int, height: int, junctions: int, banks: int, routes: int, faults: bool = False) -> Sizes:
    """Junctions first: all of them if they fit; then banks and routes beside them, queue and faults, events.

    faults: something is out; on a small screen it takes room from queue and events. The queue itself moves nothing:
    it fills and empties with every throw.
    """
    tall = height >= TALL
    answer = 2
    # Go line, prompt and key line take one each.
    free = height - 3 - answer
    wanted = max(junctions + 1 + tall, 2 * banks + 1 + routes + 1)
    least_below = 4 + 3
    top = max(6, min(wanted, free - least_below))
    below = max(2, free - top)
    middle = max(1, min(below - 1, 4 + faults if not tall else max(4, below * 2 // 5)))
    left = width * 3 // 5 if width >= WIDE else min(width - 30, 46)
    queue = max(24, width * 2 // 5 if faults else width * 3 // 5)
    return Sizes(max(20, left), top, middle, queue, max(1, below - middle), answer, tall)
