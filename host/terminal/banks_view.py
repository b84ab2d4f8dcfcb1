"""The banks as bars: voltage, what the bank is doing, time to ready, age of the reading."""

from host.model import LayoutModel
from host.terminal.rows import Piece, Row, Rows, age, fit, row, seconds, volts
from host.views import BankView

FULL, EMPTY, MARK = "\u2588", "\u2591", "|"
# A reading this old is said with its age.
OLD_S = 1.0
# A reading this old says how the bank was, not how it is.
PAST_S = 2.0
_LOOKS = {"ready": "good", "charging": "warn", "pulse": "warn", "settling": "warn", "out": "bad", "cut_off": "bad"}
_WORDS = {
    "ready": "ready",
    "charging": "charging",
    "pulse": "pulse running",
    "settling": "settling",
    "stale": "no fresh reading",
    "out": "OUT",
    "cut_off": "cut off from its supply",
    "unknown": "nothing heard",
}


def bank_rows(model: LayoutModel, width: int, now_s: float) -> Rows:
    """Two rows a bank."""
    rows: Rows = []
    if not model.banks:
        return [row(Piece(" no settings: no banks are known", "warn"))]
    names = min(10, max((len(bank.name) for bank in model.banks), default=4))
    for bank in model.banks:
        rows += [_bar_row(model, bank, width, names, now_s), _state_row(bank, width, names, now_s)]
    return rows


def highest_ready_mv(model: LayoutModel, bank: int) -> int:
    """The highest ready voltage on that bank; 0 if none is known."""
    return max(
        (lie.ready_mv for junction in model.junctions if bank in junction.bank_numbers for lie in junction.lies),
        default=0,
    )


def bar(mv: int, full_mv: int, width: int, mark_mv: int = 0) -> str:
    """A bar of `width` cells; a stroke where the bank is ready for everything. Unknown: an empty bar."""
    if full_mv <= 0 or width <= 0:
        return EMPTY * max(0, width)
    filled = min(width, max(0, mv) * width // full_mv)
    cells = [FULL] * filled + [EMPTY] * (width - filled)
    if 0 < mark_mv < full_mv:
        cells[min(width - 1, mark_mv * width // full_mv)] = MARK
    return "".join(cells)


def _look(bank: BankView, now_s: float) -> str:
    return "dim" if bank.lost or is_past(bank, now_s) else _LOOKS.get(bank.state, "warn")


def is_past(bank: BankView, now_s: float) -> bool:
    """True if what is known of it is too old to be called its state."""
    return bank.heard_at_s is None or now_s - bank.heard_at_s > PAST_S


def _bar_row(model: LayoutModel, bank: BankView, width: int, names: int, now_s: float) -> Row:
    room = width - names - 10
    look = _look(bank, now_s)
    return row(
        Piece(" " + fit(bank.name, names) + " ", "strong"),
        Piece(bar(bank.mv, bank.full_mv, room, highest_ready_mv(model, bank.number)), look),
        Piece(fit(f"{volts(bank.mv)} V", 8, right=True), "strong"),
    )


def bank_text(bank: BankView, now_s: float) -> str:
    """What the bank is doing and how long until it is ready."""
    text = _WORDS.get(bank.state, bank.state)
    if bank.heard_at_s is not None and is_past(bank, now_s):
        return f"was {text}"
    passed_ms = (now_s - bank.heard_at_s) * 1000 if bank.heard_at_s is not None else 0.0
    if bank.state in ("charging", "pulse", "settling"):
        # What the board expected, less the time since it said so.
        left_ms = bank.ready_ms - passed_ms
        text += f", ready in {seconds(left_ms)}" if bank.ready_ms >= 0 else ", not told how long"
    return text


def _state_row(bank: BankView, width: int, names: int, now_s: float) -> Row:
    text = bank_text(bank, now_s)
    if bank.fault is not None and not bank.lost:
        text = f"OUT: {bank.fault.what}"
    told = ""
    if bank.heard_at_s is not None and now_s - bank.heard_at_s + max(0, bank.age_ms) / 1000 >= OLD_S:
        told = age(bank.heard_at_s - max(0, bank.age_ms) / 1000, now_s) + " old"
    look = _look(bank, now_s)
    room = width - names - 2
    if bank.lost:
        text = f"board {bank.lost} not connected"
        text = text if len(text) + len(told) < room else "not connected"
    if told:
        return row(" " * (names + 2), Piece(fit(text, room - len(told) - 1), look), Piece(" " + told, "warn"))
    return row(" " * (names + 2), Piece(fit(text, room), look))
