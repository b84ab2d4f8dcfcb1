"""The go line of several boards: which is missing, else the worst of what the others say."""

from typing import TYPE_CHECKING

from host.go_line import go_line
from host.views import GoLine

if TYPE_CHECKING:
    from host.fleet_model import BoardPart

_WORST_FIRST = ("stop", "out", "lost", "wait", "go")


def fleet_go_line(parts: "list[BoardPart]", now_s: float, trouble: str = "") -> GoLine:
    """One sentence: no board at all, a board that is missing or can't be used, else what matters most of the rest.

    trouble: what is wrong at a port, for where no board is there.
    """
    here = [part for part in parts if part.model.is_connected]
    if not here:
        found = [go_line(part.model, now_s) for part in parts]
        told = next((part.model.connection for part in parts if part.model.connection.state == "lost"), None)
        if len(parts) == 1 or told is not None:
            if told is None and trouble:
                return GoLine("lost", trouble)
            return found[0] if told is None or len(parts) == 1 else GoLine("lost", f"no board is there: {told.text}")
        return GoLine("lost", trouble or f"looking for the {len(parts)} boards")
    rest = _worst([part for part in here if not part.hindrance], len(parts) > 1, now_s)
    hindered = [part.missing or part.hindrance for part in parts if part.hindrance]
    if not hindered:
        assert rest is not None
        return rest
    text = "; ".join(hindered)
    if rest is None:
        return GoLine("out", text)
    level = rest.level if rest.level in ("stop", "out") else "lost" if len(here) < len(parts) else "out"
    said = {"go": "else ready", "stop": "else stopped: press r"}.get(rest.level, f"else {rest.text}")
    return GoLine(level, f"{text}; {said}")


def _worst(parts: "list[BoardPart]", several: bool, now_s: float) -> GoLine | None:
    """The line that matters most; the longest wait of several. A stop of some boards names them."""
    lines = [(part, go_line(part.model, now_s)) for part in parts]
    if not lines:
        return None
    stopped = [part.name for part, line in lines if part.model.stopped]
    if stopped and len(stopped) < len(lines):
        return GoLine("stop", f"stopped on {', '.join(stopped)} only: press r to release")
    part, line = min(lines, key=lambda each: (_WORST_FIRST.index(each[1].level), -_waits_ms(each[0])))
    named = several and line.level in ("out", "lost", "wait") and not line.text.startswith("wait")
    return GoLine(line.level, f"{part.name}: {line.text}") if named else line


def _waits_ms(part: "BoardPart") -> int:
    """How long until its last bank is ready; very long if that can't be told."""
    waits = [bank.ready_ms for bank in part.model.banks if bank.state != "ready"]
    return max((wait if wait >= 0 else 10**9 for wait in waits), default=0)
