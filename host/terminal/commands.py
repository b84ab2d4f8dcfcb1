"""What the command palette offers, and the rows of small questions."""

from collections.abc import Iterator
from dataclasses import dataclass

from host.model import LayoutModel
from host.terminal.desk import Waiting
from host.terminal.rows import Piece, Rows, row


@dataclass(frozen=True)
class Command:
    """One entry: title, a sentence, the action."""

    title: str
    help: str
    action: str


FIXED = (
    Command("Stop", "Nothing further fires until it is released (space bar)", "app.stop"),
    Command("Release", "End the stop (r)", "app.release"),
    Command("Now or wait", "Switch between now-or-not and waiting for the bank (m)", "app.now_or_wait"),
    Command("Longer wait", "Let throws wait longer (+)", "app.change_wait(1)"),
    Command("Shorter wait", "Let throws wait less long (-)", "app.change_wait(-1)"),
    Command("Cancel all that waits", "What has not fired does not fire (x)", "app.cancel_all"),
    Command("Faults", "Cause, evidence, what to do, clear (f)", "app.faults"),
    Command("Tuning", "Ready voltages, pulses, timing, the voltage curve (t)", "app.tuning"),
    Command("Event log", "Everything that happened (l)", "app.log"),
    Command("Help", "Keys, words, cautions (?)", "app.help"),
    Command("Quit", "Leave the desk; the panel goes on (q)", "app.leave"),
)


def all_commands(model: LayoutModel) -> Iterator[Command]:
    """Fixed ones, a throw for each lie of each junction, the routes, a clear for each fault."""
    yield from FIXED
    for junction in model.junctions:
        for lie in junction.lies:
            title = f"Throw {junction.number + 1} {junction.name} to {lie.word}"
            yield Command(title, f"now lies: {junction.word}", f"app.throw({junction.number}, {lie.number})")
    for route in model.routes:
        yield Command(f"Route {route.name}", f"{len(route.throws)} throws", f"app.route({route.number})")
    for fault in model.faults:
        action = f"app.clear_fault({fault.scope!r}, {fault.number}, {fault.who!r})"
        yield Command(f"Clear {fault.who}", fault.what, action)


def cancel_rows(waiting: list[Waiting]) -> Rows:
    """A row a request, then 'all'."""
    rows = [row(Piece(f"  {place + 1}  ", "strong"), each.text) for place, each in enumerate(waiting)]
    return [row(""), *rows, row(""), row(Piece("  x  ", "strong"), "all of them")]


def leave_rows(waiting: int) -> Rows:
    """What quitting does while something waits."""
    throws = "1 throw waits" if waiting == 1 else f"{waiting} throws wait"
    return [
        row(""),
        row(Piece(f"  {throws}.", "strong")),
        row("  What was asked for here is cancelled when this program falls silent."),
        row("  Buttons on the panel go on."),
        row(""),
        row(Piece("  y  ", "strong"), "quit"),
    ]
