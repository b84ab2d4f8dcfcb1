"""`throw`, `route`, `stop`, `release`, `status`: one request, one answer."""

import argparse
import time
from typing import TYPE_CHECKING, Any

from host.cli import common
from host.cli.cautions import cautions_for
from host.cli.common import BAD, DONE, NO, Wrong, complain, say, say_json

if TYPE_CHECKING:
    from host.cli.common import Host
    from host.model import LayoutModel
    from host.views import BankView, OutcomeView

DEFAULT_WAIT_MS = 5000
MOST_WAIT_MS = 60_000
# What the board may need beyond the wait: pulses, retries, contacts, the way there and back.
ANSWER_S = 8.0
REQUEST_S = 4.0
CANCEL_S = 1.0


def add(commands: Any, shared: argparse.ArgumentParser) -> None:
    """Add the commands to the parser."""
    firing = argparse.ArgumentParser(add_help=False)
    firing.add_argument(
        "--wait", type=_wait_ms, default=DEFAULT_WAIT_MS, metavar="MS",
        help=f"how long it may wait for its bank; 0: now or not at all (usual {DEFAULT_WAIT_MS})",
    )  # fmt: skip
    firing.add_argument("--yes", action="store_true", help="the cautions are known: do not show them")
    parser = commands.add_parser("throw", parents=[shared, firing], help="throw one junction to one lie")
    parser.add_argument("junction", help="its name, or its number from 1")
    parser.add_argument("lie", help="the owner's word for it, its name, or its number from 1")
    parser.set_defaults(run=run_throw)
    parser = commands.add_parser("route", parents=[shared, firing], help="set a route")
    parser.add_argument("name", help="its name, or its number from 1")
    parser.set_defaults(run=run_route)
    for word, run, text in (
        ("status", run_status, "how things are; exit status 1 if the board is stopped or something is out"),
    ):
        parser = commands.add_parser(word, parents=[shared], help=text)
        parser.set_defaults(run=run)


def _wait_ms(text: str) -> int:
    if not (text.isascii() and text.isdigit() and int(text) <= MOST_WAIT_MS):
        raise argparse.ArgumentTypeError(f"'{text}' is no whole number of milliseconds from 0 to {MOST_WAIT_MS}")
    return int(text)


def run_throw(args: argparse.Namespace) -> int:
    """Throw, and wait for the outcome."""
    with common.session_with(args, common.layout_of(args)) as session:
        common.need_settings(session)
        junction = common.junction_number(session.model, args.junction)
        lie = common.lie_number(session.model, junction, args.lie)
        _caution(args, session)
        return _finish(args, session, session.throw(junction, lie, args.wait), args.wait / 1000 + ANSWER_S)


def run_route(args: argparse.Namespace) -> int:
    """Set a route, and wait for its end."""
    with common.session_with(args, common.layout_of(args)) as session:
        common.need_settings(session)
        number = common.route_number(session.model, args.name)
        _caution(args, session)
        throws = len(session.model.routes[number].throws)
        each_s = max(args.wait, DEFAULT_WAIT_MS) / 1000 + 2.0
        return _finish(args, session, session.route(number, args.wait), throws * each_s + ANSWER_S)


def _caution(args: argparse.Namespace, session: "Host") -> None:
    texts = () if args.yes else [text for each in session.model.boards for text in cautions_for(each.kind, each.uid)]
    for text in dict.fromkeys(texts):
        complain(f"caution: {text}")


def _finish(args: argparse.Namespace, session: "Host", number: int, limit_s: float) -> int:
    """Wait for the end of request `number`; if nobody waits any more, cancel what has not fired."""
    ended = None
    cancelled = False
    try:
        session.wait_for(lambda: session.outcome_of(number) is not None, limit_s)
        ended = session.outcome_of(number)
    finally:
        if ended is None:
            cancelled = session.cancel(number)
            if cancelled:
                session.wait_for(lambda: session.outcome_of(number) is not None, CANCEL_S)
                ended = session.outcome_of(number)
    if ended is None:
        what = "it was told to cancel it" if cancelled else "there is no connection any more"
        raise Wrong(
            f"the board did not tell the outcome in time, {what}: not known whether it fired; look at the points"
        )
    if args.json:
        say_json(outcome_json(session.model, number, ended))
    else:
        for step in steps_of(session.model, number):
            say(step.text)
        say(ended.text)
    if ended.outcome in ("unsent", "unknown"):
        return BAD
    return DONE if ended.outcome == "done" else NO


def steps_of(model: "LayoutModel", number: int) -> "list[OutcomeView]":
    """The outcomes of a route's throws, in order."""
    return [model.outcomes[key] for key in sorted(model.outcomes) if key[0] == number and key[1] > 0]


def outcome_json(model: "LayoutModel", number: int, ended: "OutcomeView") -> dict[str, Any]:
    """How a request ended; the same keys always."""
    found: dict[str, Any] = {
        "request": ended.kind, "id": number, "outcome": ended.outcome, "why": ended.why, "text": ended.text,
    }  # fmt: skip
    if ended.kind == "route":
        found.update(route=model.names.route(ended.route), done=ended.done, of=ended.of)
        found["throws"] = [_throw_json(model, step) for step in steps_of(model, number)]
        return found
    found.update(_throw_json(model, ended))
    return found


def _throw_json(model: "LayoutModel", ended: "OutcomeView") -> dict[str, Any]:
    return {
        "junction": model.names.junction(ended.junction),
        "lie": model.names.lie(ended.junction, ended.lie),
        "outcome": ended.outcome,
        "why": ended.why,
        "text": ended.text,
        "ms": ended.ms,
        "concerns": ended.which,
        "mv": ended.mv,
        "after_mv": ended.after_mv,
    }


def run_status(args: argparse.Namespace) -> int:
    """How things are."""
    with common.session_with(args, common.layout_of(args)) as session:
        model = session.model
        if model.boards and all(board.settings_crc for board in model.boards):
            common.need_settings(session)
            session.wait_for(lambda: all(bank.heard_at_s is not None or bank.lost for bank in model.banks), REQUEST_S)
        now_s = time.monotonic()
        go = model.go_line(now_s)
        boards = board_rows(session)
        if args.json:
            say_json(status_json(model, now_s) | {"boards": boards})
        else:
            for line in status_lines(model, now_s):
                say(line)
            for row in boards if len(boards) > 1 else ():
                say(_board_text(row))
        return DONE if go.level in ("go", "wait") else NO


def status_json(model: "LayoutModel", now_s: float) -> dict[str, Any]:
    """All of it; the same keys always."""
    go, board = model.go_line(now_s), model.board
    names = ("kind", "uid", "firmware", "boot", "settings_crc")
    return {
        "go": {"level": go.level, "text": go.text},
        "board": {name: getattr(board, name) for name in names} if board else None,
        "settings_match": model.settings_match,
        "stopped": model.stopped,
        "banks": [_bank_json(bank) for bank in model.banks],
        "junctions": [
            {
                "number": junction.number + 1, "name": junction.name, "kind": junction.kind, "lie": junction.lie,
                "word": junction.word, "source": junction.source, "waiting": junction.waiting,
                "out": junction.fault is not None,
            }
            for junction in model.junctions
        ],
        "queue": [
            {
                "id": item.id, "step": item.step, "junction": model.names.junction(item.junction),
                "lie": model.names.lie(item.junction, item.lie), "by": item.by, "state": item.state,
                "due_ms": item.due_ms,
            }
            for item in model.queue
        ],
        "faults": [
            {
                "scope": fault.scope, "number": fault.number + 1, "who": fault.who, "code": fault.code,
                "what": fault.what, "remedy": fault.remedy, "evidence": fault.evidence_text,
            }
            for fault in model.faults
        ],
    }  # fmt: skip


def board_rows(session: "Host") -> list[dict[str, Any]]:
    """Each board of the layout: whether it is there, where, and whether what sits there is a spare."""
    rows = []
    for part in session.parts:
        model = part.session.model
        board = model.board if model.connection.state == "connected" else None
        rows.append(
            {
                "name": part.name, "connected": board is not None, "port": part.session.link.port if board else "",
                "uid": board.uid if board else "", "spare": part.spare, "settings_match": model.settings_match,
                "stopped": model.stopped if board else None, "junctions": [number + 1 for number in part.junctions],
            }
        )  # fmt: skip
    return rows


def _board_text(row: dict[str, Any]) -> str:
    if not row["connected"]:
        return f"board {row['name']}: not connected"
    spare = "a spare, " if row["spare"] else ""
    stopped = ", stopped" if row["stopped"] else ""
    other = ", other settings than the layout file" if row["settings_match"] is False else ""
    return f"board {row['name']}: {spare}{row['uid']} at {row['port']}{stopped}{other}"


def _bank_json(bank: "BankView") -> dict[str, Any]:
    return {
        "number": bank.number + 1, "name": bank.name, "mv": bank.mv, "age_ms": bank.age_ms, "state": bank.state,
        "ready_ms": bank.ready_ms, "full_mv": bank.full_mv, "out": bank.fault is not None,
    }  # fmt: skip


def status_lines(model: "LayoutModel", now_s: float) -> list[str]:
    """All of it, for people."""
    from host.wording import fault_text, volts

    lines = [model.go_line(now_s).text]
    if model.settings_match is False:
        lines.append("the board's settings differ from the layout file: see 'coilwarden settings compare'")
    for bank in model.banks:
        lines.append(f"bank {bank.name}: {volts(bank.mv)} of {volts(bank.full_mv)}, {bank.state}")
    for junction in model.junctions:
        source = "" if junction.source == "none" else f" ({junction.source})"
        waiting = ", waiting" if junction.waiting else ""
        out = ", out" if junction.fault is not None else ""
        lines.append(f"{junction.number + 1:2} {junction.name}: {junction.word}{source}{waiting}{out}")
    for item in model.queue:
        due = f"due in {item.due_ms} ms" if item.due_ms >= 0 else "it can't be told when"
        who = model.names.junction(item.junction)
        lines.append(f"queued: {who} to {model.names.lie(item.junction, item.lie)}, {item.state}, {due}")
    lines.extend(fault_text(fault) for fault in model.faults)
    return lines
