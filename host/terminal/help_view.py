"""The help: keys, words, cautions."""

from host.cli.cautions import CAUTIONS
from host.terminal.rows import Piece, Rows, fit, row, wrap

KEYS = (
    ("SPACE", "stop, from every screen, at once: nothing further fires until r releases"),
    ("7 Enter", "throw junction 7 to its other lie; with more lies, or lie unknown, a letter chooses"),
    ("7r Enter", "throw junction 7 to reverse (7n: to normal; letters as the prompt shows them)"),
    ("Esc", "drop what was typed; leave a screen"),
    ("r", "release the stop"),
    ("o", "set a route: then its letter"),
    ("m, + -", "throw now or not at all, or let it wait for its bank; longer, shorter wait"),
    ("x", "cancel what waits and has not fired"),
    ("c or f", "faults: cause, evidence, what to do, clear"),
    ("t", "tuning: ready voltages, pulses, timing; the voltage curve"),
    ("l", "event log"),
    ("ctrl+p", "all actions by name"),
    ("PgUp PgDn", "more junctions"),
    ("q", "quit; what has not fired is cancelled, panel buttons go on"),
)
WORDS = (
    ("seen", "a contact saw the points move"),
    ("sent", "a pulse was given; nothing can see the points: look at them"),
    ("unknown", "nothing is known since the board started"),
    ("OUT", "out of use by a fault until you clear it"),
    ("> word", "a throw to that lie waits in the queue"),
    ("ready voltage", "below it a pulse is refused; the stroke in a bar is the bank's highest"),
    ("<1 s", "age of what the board said"),
)


def help_rows(width: int) -> Rows:
    """Everything, wrapped to the width."""
    rows: Rows = []
    for title, pairs in (("Keys", KEYS), ("Words and signs", WORDS)):
        rows.append(row(Piece(f" {title}", "head")))
        for name, text in pairs:
            for place, part in enumerate(wrap(text, max(20, width - 17))):
                rows.append(row(Piece(f"  {fit(name if not place else '', 13)} ", "strong"), Piece(part)))
        rows.append(row(""))
    rows.append(row(Piece(" Cautions", "head")))
    for caution in CAUTIONS:
        for place, part in enumerate(wrap(caution, max(20, width - 5))):
            rows.append(row(Piece("  - " if not place else "    "), Piece(part)))
    return rows
