"""`board check`: what the firmware tells through the link, then the board's self-test at its prompt. Fires nothing."""

import queue
import time
from collections.abc import Callable
from dataclasses import dataclass

from host.board.errors import BoardSays, NotBack, NotInstalled
from host.board.leaving import leave
from host.board.restarting import BACK_S, greeted, restart
from host.board.transport import RawPrompt
from host.link import Link, LinkChange
from host.link_errors import PermissionDenied, PortBusy, PortMissing
from host.views import BoardView
from shared_protocol import messages
from shared_protocol.codec import Received, plain

SELF_TEST = "from device.board.pico import self_test; self_test()"
# Reasons of a start that a person should look into.
BAD_STARTS = ("crash", "watchdog")
RESULTS = ("ok", "fail", "skip")
_GREET_S = 4.0
_TELEMETRY_S = 2.5
_TRIES_S = (0.2,)


@dataclass(frozen=True)
class Check:
    """One line of the table. result: ok, fail or skip."""

    name: str
    result: str
    text: str


OnCheck = Callable[[Check], None]


def check_link(port: str, on_check: OnCheck, patience: float = 1.0) -> BoardView | None:
    """Shake hands and hear the telemetry; who the board is, None if it does not answer as a Coilwarden board.

    Raises LinkError if there is no port to talk to.
    """
    with Link(port, back_off_s=_TRIES_S, refused_s=_TRIES_S[0]) as link:
        try:
            board = greeted(link, _GREET_S * patience)
        except NotBack as error:
            if isinstance(link.error, (PortMissing, PermissionDenied, PortBusy)):
                raise link.error from error
            on_check(Check("link", "fail", error.why))
            return None
        settings = f"settings {board.settings_crc}" if board.settings_crc else "no settings"
        on_check(Check("link", "ok", f"{board.kind} {board.uid}, firmware {board.firmware}, {settings}"))
        _telemetry(link, board, on_check, _TELEMETRY_S * patience)
        return board


def _telemetry(link: Link, board: BoardView, on_check: OnCheck, limit_s: float) -> None:
    """What the firmware tells about the whole board: why it started, how it is, how its loop goes."""
    if not board.settings_crc:
        on_check(Check("telemetry", "skip", "a board without settings tells nothing: 'coilwarden settings send'"))
        return
    found = _hear(link, limit_s)
    started = found.get(messages.STARTED.name)
    if started is not None:
        bad = started.word("cause") in BAD_STARTS
        on_check(Check("started", "fail" if bad else "ok", brief(started)))
    state = found.get(messages.STATE.name)
    if state is None:
        on_check(Check("telemetry", "fail", f"none within {limit_s:.0f} s"))
        return
    on_check(Check("telemetry", "ok", brief(state)))
    loop = found.get(messages.LOOP.name)
    on_check(Check("loop", "ok", brief(loop)) if loop else Check("loop", "skip", "this board does not tell"))


def _hear(link: Link, limit_s: float) -> dict[str, Received]:
    """The last of each kind of message, until the slowest of them was heard."""
    end_s = time.monotonic() + limit_s
    found: dict[str, Received] = {}
    while time.monotonic() < end_s and not {messages.STATE.name, messages.LOOP.name} <= set(found):
        try:
            item = link.received.get(timeout=0.1)
        except queue.Empty:
            continue
        if not isinstance(item, LinkChange) and item.message is not None and not item.fault:
            found[item.message.name] = item
    return found


def brief(received: Received) -> str:
    """A message's fields, for people who know the table: 'stop 0, queue 0, up 12 s'."""
    assert received.message is not None
    units = {field.key: field.unit for field in received.message.fields}
    return ", ".join(
        f"{key} {value} {units[key]}".rstrip() for key, value in plain(received.message, received.values).items()
    )


def check_board(port: str, on_check: OnCheck, patience: float = 1.0) -> None:
    """The self-test at the prompt, then a restart. Raises LinkError (see errors.py): NotInstalled, BrokenOff..."""
    leave(port, patience)
    with RawPrompt(port, patience) as prompt:
        try:
            _self_test(prompt, on_check)
            board = restart(prompt, BACK_S * patience)
            on_check(Check("restart", "ok", f"the firmware answers, boot {board.boot}"))
        except NotBack as error:
            on_check(Check("restart", "fail", error.why))
        finally:
            prompt.restart()


def _self_test(prompt: RawPrompt, on_check: OnCheck) -> None:
    prompt.doing = "the self-test"
    ended: list[str] = []

    def take(line: str) -> None:
        word, _, rest = line.partition(" ")
        name, _, rest = rest.partition(" ")
        result, _, text = rest.partition(" ")
        if word != "check" or result not in RESULTS:
            return
        if name == "end":
            ended.append(result)
        else:
            on_check(Check(name, result, text))

    try:
        prompt.run(SELF_TEST, take)
    except BoardSays as error:
        if "ImportError" in error.said or "AttributeError" in error.said:
            raise NotInstalled(prompt.port, error.said) from error
        on_check(Check("self_test", "fail", error.said))
        return
    if not ended:
        on_check(Check("self_test", "fail", "it ended before its last line"))
