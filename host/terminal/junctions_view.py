"""The junctions: number, name, which way it lies in the owner's words, how that is known, its bank, what hinders it."""

from dataclasses import dataclass

from host.model import LayoutModel
from host.terminal.rows import Piece, Row, Rows, age, fit, row, volts, wrap
from host.views import JunctionView

_SOURCE_LOOKS = {"seen": "good", "sent": "plain", "none": "warn"}


@dataclass(frozen=True)
class Widths:
    """How wide each column is; 0: not shown."""

    name: int
    word: int
    bank: int
    needs: int = 0
    told: int = 0


def widths_for(width: int) -> Widths:
    """Columns for a panel of that width. Number, mark, how known and gaps take 14."""
    left = width - 14
    if left >= 62:
        return Widths(name=14, word=24, bank=8, needs=left - 52, told=6)
    bank = 6 if left >= 30 else 0
    name = min(12, max(6, (left - bank) * 2 // 5))
    return Widths(name=name, word=max(4, left - bank - name), bank=bank)


def heading(width: int) -> Row:
    """Names of the columns."""
    columns = widths_for(width)
    parts = [" No", " ", fit("junction", columns.name), " ", fit("lies", columns.word), " ", fit("known", 8)]
    if columns.bank:
        parts.append(fit("bank", columns.bank))
    if columns.needs:
        parts.append(fit("needs at least", columns.needs))
    if columns.told:
        parts.append(fit("told", columns.told))
    return row(Piece(fit("".join(parts), width), "head"))


def junction_rows(model: LayoutModel, width: int, now_s: float, picked: int = -1) -> Rows:
    """A row a junction. `picked`: the junction whose number is being typed."""
    if not model.junctions:
        text = "No settings are known: connect a board that has some, or start with --layout."
        return [row(Piece(f" {part}", "warn")) for part in wrap(text, max(10, width - 2))]
    columns = widths_for(width)
    return [_junction(model, junction, columns, now_s, junction.number == picked) for junction in model.junctions]


def known_by(junction: JunctionView) -> str:
    """How its lie is known: 'seen', 'sent', 'unknown'; 'OUT' while it is out of use."""
    if junction.fault is not None:
        return "OUT"
    return "unknown" if junction.source == "none" or junction.lie < 0 else junction.source


def _mark(model: LayoutModel, junction: JunctionView) -> Piece:
    if junction.fault is not None or any(model.banks[each].fault for each in _banks(model, junction)):
        return Piece("!", "bad")
    if junction.waiting:
        return Piece(">", "warn")
    return Piece(" ")


def _banks(model: LayoutModel, junction: JunctionView) -> list[int]:
    return [number for number in junction.bank_numbers if number < len(model.banks)]


def _junction(model: LayoutModel, junction: JunctionView, columns: Widths, now_s: float, picked: bool) -> Row:
    known = known_by(junction)
    lost = junction.lost or model.connection.state != "connected"
    look = "bad" if known == "OUT" else _SOURCE_LOOKS.get(junction.source if junction.lie >= 0 else "none", "plain")
    waits = _waiting_for(model, junction)
    lies = junction.word
    if waits and len(lies) + 3 + len(waits) <= columns.word:
        lies = f"{lies} > {waits}"
    names = ", ".join(model.banks[number].name for number in _banks(model, junction))
    pieces = [
        Piece(fit(str(junction.number + 1), 3, right=True), "strong"),
        _mark(model, junction),
        Piece(fit(junction.name, columns.name), "strong"),
        Piece(" "),
        Piece(fit(lies, columns.word), "warn" if junction.lie < 0 else "plain"),
        Piece(" "),
        Piece(fit(f"({known})" if lost and known in ("seen", "sent") else known, 8), "dim" if lost else look),
    ]
    if columns.bank:
        pieces.append(Piece(fit(names, columns.bank - 1) + " ", "dim"))
    if columns.needs:
        pieces.append(Piece(fit(needs(junction), columns.needs - 1) + " ", "dim"))
    if columns.told:
        pieces.append(Piece(fit(age(junction.heard_at_s, now_s), columns.told), "dim"))
    if picked:
        return tuple(Piece(piece.text, "picked") for piece in pieces)
    return tuple(pieces)


def _waiting_for(model: LayoutModel, junction: JunctionView) -> str:
    if not junction.waiting:
        return ""
    item = next((each for each in model.queue if each.junction == junction.number), None)
    return junction.word_of(item.lie) if item is not None else ""


def needs(junction: JunctionView) -> str:
    """Its ready voltages: one if all lies are within half a volt, else each."""
    values = [lie.ready_mv for lie in junction.lies]
    if not values:
        return ""
    if max(values) - min(values) <= 500:
        return f"{volts(max(values))} V"
    return ", ".join(f"{lie.word} {volts(lie.ready_mv)}" for lie in junction.lies) + " V"
