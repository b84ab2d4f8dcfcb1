"""The event log: time, a sign for how good or bad, the sentence; filtered by text and by level."""

from collections.abc import Callable, Iterable
from dataclasses import dataclass

from host.terminal.rows import Piece, Row, Rows, row, wrap
from host.views import Event

Stamp = Callable[[float], str]

SIGNS = {"info": " ", "good": "+", "warn": "!", "bad": "X"}
_LOOKS = {"info": "dim", "good": "good", "warn": "warn", "bad": "bad"}
LEVELS = ("info", "good", "warn", "bad")
SHOWN = ("all", "good and worse", "warnings and worse", "only bad")


@dataclass
class EventFilter:
    """Which events are shown: a text that must occur, and the least level (an index into LEVELS)."""

    text: str = ""
    least: int = 0

    def next_level(self) -> None:
        """The next stricter level; after the strictest, all."""
        self.least = (self.least + 1) % len(LEVELS)

    def keeps(self, event: Event) -> bool:
        """True if it is shown."""
        return LEVELS.index(event.level) >= self.least and self.text.lower() in event.text.lower()


def event_rows(events: Iterable[Event], width: int, stamp: Stamp, most: int = 0) -> Rows:
    """Events in order, long ones wrapped; the newest `most` rows (0: all)."""
    rows: Rows = []
    kept = list(events)
    for event in reversed(kept):
        rows = _event(event, width, stamp) + rows
        if most and len(rows) >= most:
            break
    return rows[-most:] if most else rows


def one_line_rows(events: Iterable[Event], width: int, stamp: Stamp, most: int) -> Rows:
    """The last `most` events, a row each, cut where they are too long."""
    return [_event(event, width, stamp, lines=1)[0] for event in list(events)[-most:]]


def _event(event: Event, width: int, stamp: Stamp, lines: int = 0) -> Rows:
    time = stamp(event.at_s)
    look = _LOOKS[event.level]
    room = max(10, width - len(time) - 5)
    parts = wrap(event.text, room, lines) or [""]
    first: Row = row(Piece(f" {time} ", "dim"), Piece(f"{SIGNS[event.level]} ", look), Piece(parts[0], look))
    return [first, *(row(" " * (len(time) + 4), Piece(part, look)) for part in parts[1:])]


def filter_title(events: Iterable[Event], chosen: EventFilter) -> str:
    """What is shown."""
    kept = list(events)
    shown = sum(1 for event in kept if chosen.keeps(event))
    text = f", containing '{chosen.text}'" if chosen.text else ""
    return f"Event log: {shown} of {len(kept)} events, {SHOWN[chosen.least]}{text}"
