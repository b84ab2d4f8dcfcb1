"""The go line: can I go, in one sentence that fits one row."""

from typing import TYPE_CHECKING

from host import wording
from host.views import BankView, GoLine

if TYPE_CHECKING:
    from host.model import LayoutModel

# Telemetry older than this says nothing about now.
SILENT_S = 2.0


def go_line(model: "LayoutModel", now_s: float) -> GoLine:
    """The worst thing first: no board, stopped, out, waiting; else ready."""
    connection = model.connection
    if connection.state != "connected":
        return GoLine("lost", _no_board(model, now_s))
    if model.board is None or not model.board.settings_crc:
        return GoLine("stop", "the board has no settings: send it the layout")
    heard = model.telemetry.heard_at_s
    if heard is None:
        return GoLine("wait", "wait: asking the board how things are")
    if now_s - heard > SILENT_S:
        return GoLine("lost", f"lost: no word from the board for {now_s - heard:.0f} s")
    if model.stopped:
        return GoLine("stop", "stopped: press r to release")
    out = [fault for fault in model.faults if fault.scope != "button"]
    if out:
        return wording.out_line(out[0], len(out) - 1)
    return _banks(model, now_s)


def _no_board(model: "LayoutModel", now_s: float) -> str:
    connection = model.connection
    if connection.state == "lost":
        return f"lost {max(0.0, now_s - connection.since_s):.0f} s ago: {connection.text}"
    return connection.text


def _banks(model: "LayoutModel", now_s: float) -> GoLine:
    worst: GoLine | None = None
    longest_ms = -1
    for bank in model.banks:
        line, wait_ms = _bank(bank, now_s)
        if line is not None and (worst is None or wait_ms > longest_ms):
            worst, longest_ms = line, wait_ms
    return worst or GoLine("go", "ready")


# A wait that can't be told counts as longer than any that can.
_UNTOLD_MS = 10**9


def _bank(bank: BankView, now_s: float) -> tuple[GoLine | None, int]:
    who = f"bank {bank.name}"
    if bank.heard_at_s is None:
        return GoLine("wait", f"wait: nothing heard of {who} yet"), _UNTOLD_MS
    if now_s - bank.heard_at_s > SILENT_S:
        return GoLine("wait", f"wait: nothing heard of {who} for {now_s - bank.heard_at_s:.0f} s"), _UNTOLD_MS
    if bank.state == "ready":
        return None, 0
    if bank.state == "out":
        return GoLine("out", f"{who} out"), _UNTOLD_MS + 2
    if bank.state == "cut_off":
        return GoLine("out", f"{who} is cut off from its supply"), _UNTOLD_MS + 1
    if bank.state == "stale":
        return GoLine("wait", f"wait: no fresh reading of {who}, look at its sense wire"), _UNTOLD_MS
    if bank.ready_ms < 0:
        return GoLine("wait", f"wait for {who}: it is not told how long"), _UNTOLD_MS
    # Rounded up: a wait is never said to be over before it is.
    return GoLine("wait", f"wait {(bank.ready_ms + 99) // 100 / 10:.1f} s for {who}"), bank.ready_ms
