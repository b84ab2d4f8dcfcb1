"""The routes: the letter that sets each, its name, how far it is set already, its throws."""

from host.model import LayoutModel
from host.terminal.rows import Piece, Rows, fit, row, wrap
from host.views import RouteView

LETTERS = "abcdefghijklmnopqrstuvwxyz1234567890ABCDEFGHIJKLMNOPQRSTUVWXYZ"


def letter_of(number: int) -> str:
    """The key that sets route `number` on the route screen."""
    return LETTERS[number] if number < len(LETTERS) else "?"


def set_already(model: LayoutModel, route: RouteView) -> int:
    """How many of its junctions lie as it wants them, seen or sent."""
    return sum(
        1 for junction, lie in route.throws if junction < len(model.junctions) and model.junctions[junction].lie == lie
    )


def route_text(model: LayoutModel, route: RouteView) -> str:
    """Its throws in the owner's words."""
    return ", ".join(
        f"{model.names.junction(junction)} {model.names.lie(junction, lie)}" for junction, lie in route.throws
    )


def route_rows(model: LayoutModel, width: int) -> Rows:
    """A row a route: its letter, name, how many of its throws lie so already; where there is room, the throws."""
    if not model.routes:
        return [row(Piece(" none", "dim"))]
    rows: Rows = []
    names = min(24, max(len(route.name) for route in model.routes))
    for route in model.routes:
        done = set_already(model, route)
        whole = done == len(route.throws)
        state = "set" if whole else f"{done} of {len(route.throws)}"
        room = width - 4
        name = fit(route.name, names if room >= names + 9 else room - 9)
        pieces = [Piece(f" {letter_of(route.number)}  ", "strong"), Piece(name)]
        pieces.append(Piece(fit(state, 9, right=True), "good" if whole else "dim"))
        left = width - 4 - len(name) - 9 - 2
        if left >= 16:
            pieces.append(Piece("  " + fit(route_text(model, route), left), "dim"))
        rows.append(tuple(pieces))
    return rows


def choice_rows(model: LayoutModel, width: int) -> Rows:
    """Each route whole, for choosing: letter, name, how much is set already, every throw."""
    rows: Rows = [row("")]
    for route in model.routes:
        done = set_already(model, route)
        head = f"{route.name}   ({done} of {len(route.throws)} lie so already)"
        rows.append(row(Piece(f"  {letter_of(route.number)}  ", "strong"), Piece(head, "strong")))
        rows += [row("     ", Piece(part, "dim")) for part in wrap(route_text(model, route), max(20, width - 7))]
    return rows
