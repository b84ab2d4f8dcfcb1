"""The queue: what waits, for which lie, and when it is expected; counted down from what the board said and its age."""

from host.model import LayoutModel
from host.terminal.rows import Piece, Row, Rows, fit, row, seconds
from host.views import QueueItem

_ORIGINS = {"host": "", "button": "button ", "power_up": "power-up "}


def left_ms(item: QueueItem, now_s: float) -> float | None:
    """Milliseconds until its pulse, by what the board said less the age of that; None if it can't be told."""
    if item.due_ms < 0:
        return None
    return max(0.0, item.due_ms - (now_s - item.heard_at_s) * 1000)


def when(item: QueueItem, now_s: float) -> str:
    """When its pulse is expected."""
    if item.state == "pulse":
        return "pulse"
    if item.state == "answer":
        return "looks"
    left = left_ms(item, now_s)
    if left is None:
        return "not told"
    return f"in {seconds(left)}" if left > 0 else "due"


def in_order(model: LayoutModel, now_s: float) -> list[QueueItem]:
    """The soonest first; what can't be told last."""

    def place(item: QueueItem) -> tuple[bool, float, int, int]:
        left = left_ms(item, now_s)
        return (left is None, left if left is not None else 0.0, item.id, item.step)

    return sorted(model.queue, key=place)


def queue_title(model: LayoutModel, now_s: float) -> str:
    """How many, and when the last of them is expected."""
    if not model.queue:
        return "Queue: empty"
    times = [left_ms(item, now_s) for item in model.queue]
    known = [each for each in times if each is not None]
    last = f", last in {seconds(max(known))}" if known and len(known) == len(times) else ""
    return f"Queue: {len(model.queue)}{last}"


def queue_rows(model: LayoutModel, width: int, height: int, now_s: float) -> Rows:
    """A row a throw, the soonest, as many as fit; the title counts them all."""
    items = in_order(model, now_s)
    if not items:
        return [row(Piece(" nothing waits", "dim"))]
    return [_item(model, item, width, now_s) for item in items[: max(1, height)]]


def _item(model: LayoutModel, item: QueueItem, width: int, now_s: float) -> Row:
    origin = _ORIGINS.get(item.by, "")
    what = f"{origin}{model.names.junction(item.junction)} > {model.names.lie(item.junction, item.lie)}"
    if item.board and len(what) + len(item.board) + 3 <= width - 14:
        what += f" ({item.board})"
    return row(
        Piece(fit(str(item.junction + 1), 3, right=True) + " ", "strong"),
        Piece(fit(what, width - 14)),
        Piece(" "),
        Piece(fit(when(item, now_s), 9), "warn"),
    )
