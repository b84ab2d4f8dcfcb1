"""Faults: short for the main screen, whole for the fault screen."""

from host.model import LayoutModel
from host.terminal.rows import Piece, Rows, age, row, wrap
from host.views import FaultView

NEVER_CLEAR_YET = "Clear only what is mended: what is cleared may fire again."


def faults_title(model: LayoutModel) -> str:
    """How many."""
    count = len(model.faults)
    return "Faults: none" if not count else f"Faults: {count} (f shows all)"


def who(fault: FaultView) -> str:
    """What is out, and what was thrown last there."""
    text = fault.who or f"{fault.scope} {fault.number + 1}"
    return f"{text} ({fault.near_name} last)" if fault.near_name and fault.scope == "bank" else text


def fault_rows(model: LayoutModel, width: int, height: int) -> Rows:
    """Each fault in two or three rows, as many as fit: what, then what to do."""
    if not model.faults:
        return [row(Piece(" nothing is out", "dim"))]
    rows: Rows = []
    each = max(2, height // max(1, len(model.faults)))
    for fault in model.faults:
        head = wrap(f"{who(fault)}: {fault.what}", width - 3, max(1, each - 2))
        todo = wrap(f"Do: {fault.remedy}", width - 3, max(1, each - len(head)))
        rows += [
            row(Piece(" ! " if not place else "   ", "bad"), Piece(line, "bad")) for place, line in enumerate(head)
        ]
        rows += [row("   ", Piece(line, "strong")) for line in todo]
    return rows[:height]


def fault_lines(model: LayoutModel, width: int, now_s: float, picked: int) -> Rows:
    """Every fault with cause, evidence, remedy, blink code and age; `picked` is the one that clearing means."""
    if not model.faults:
        return [row(""), row(Piece("  Nothing is out of use.", "good"))]
    rows: Rows = []
    for place, fault in enumerate(model.faults):
        mark = ">" if place == picked else " "
        rows.append(row(Piece(f" {mark} {place + 1}  {who(fault)} is out", "picked" if place == picked else "strong")))
        facts = [("what", fault.what), ("evidence", fault.evidence_text or "none"), ("do", fault.remedy)]
        facts.append(("told", f"{age(fault.heard_at_s, now_s)} ago; blink code on the board: {fault.blink}"))
        for name, text in facts:
            for line, part in enumerate(wrap(text, max(20, width - 18))):
                look = "strong" if name == "do" else "plain"
                rows.append(row(Piece(f"      {name if not line else '':<9} ", "dim"), Piece(part, look)))
        rows.append(row(""))
    return rows
