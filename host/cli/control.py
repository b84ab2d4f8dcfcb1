"""`stop`, `release`, `cancel`, `clear`: requests that fire nothing."""

import argparse
from contextlib import ExitStack
from typing import TYPE_CHECKING, Any

from host.cli import common
from host.cli.common import DONE, NO, Wrong, complain, say, say_json

if TYPE_CHECKING:
    from host.cli.common import Host
    from host.views import AnswerView
    from sim.layout import Layout

REQUEST_S = 4.0
_MOST_BUTTONS = 64


def add(commands: Any, shared: argparse.ArgumentParser) -> None:
    """Add the commands to the parser."""
    parser = commands.add_parser("stop", parents=[shared], help="the operator's stop: nothing further fires")
    parser.set_defaults(run=run_stop)
    parser = commands.add_parser("release", parents=[shared], help="end the stop")
    parser.set_defaults(run=run_release)
    parser = commands.add_parser("cancel", parents=[shared], help="cancel a throw or route as far as it has not fired")
    parser.add_argument("id", type=_id, help="its number, as --json and the log tell it")
    parser.set_defaults(run=run_cancel)
    parser = commands.add_parser("clear", parents=[shared], help="put what is out back into use")
    parser.add_argument("scope", choices=("all", "bank", "junction", "button"))
    parser.add_argument("name", nargs="?", help="which bank or junction, by name or number from 1; a button by number")
    parser.set_defaults(run=run_clear)


def _id(text: str) -> int:
    if not (text.isascii() and text.isdigit() and 1 <= int(text) <= 999_999_999):
        raise argparse.ArgumentTypeError(f"'{text}' is no request number")
    return int(text)


def run_stop(args: argparse.Namespace) -> int:
    """Stop, and wait until every board says so. The stop goes out first: no status is waited for.

    Several ports need no layout file: whoever is there is stopped.
    """
    layout = _layout_if_good(args)
    with ExitStack() as stack:
        if common.is_for_fleet(layout):
            hosts = [stack.enter_context(common.unready_session(args, layout))]
        else:
            ones = [argparse.Namespace(**{**vars(args), "ports": (port,)}) for port in common.ports_of(args)]
            hosts = [stack.enter_context(common.unready_session(one)) for one in ones]
        return _stop(args, hosts)


def _layout_if_good(args: argparse.Namespace) -> "Layout | None":
    """The layout file that was named; nothing that is wrong with it may keep a stop from going out."""
    from sim.layout import BadFile

    try:
        return common.layout_of(args)
    except (BadFile, Wrong) as error:
        complain(f"coilwarden: {error}")
        return None


def _stop(args: argparse.Namespace, hosts: "list[Host]") -> int:
    """Tell each board once, as soon as it is there; what each one answers."""
    boards = [
        (common.who_is(part) if part.name or len(hosts) == 1 else part.session.link.port, host, part.session)
        for host in hosts for part in host.parts
    ]  # fmt: skip
    sent: set[int] = set()
    for host in hosts:
        host.open()

    def is_sent() -> bool:
        for host in hosts[1:]:
            host.poll()
        for place, (_, _, session) in enumerate(boards):
            # It sends nothing and says so while the board is not there.
            if place not in sent and session.stop():
                sent.add(place)
        return all(place in sent or host.all_told for place, (_, host, _) in enumerate(boards))

    def is_answered() -> bool:
        for host in hosts[1:]:
            host.poll()
        return all("stop" in boards[place][2].model.answers for place in sent)

    hosts[0].wait_for(is_sent, common.CONNECT_S)
    if not sent:
        raise next((host.error for host in hosts if host.error is not None), None) or Wrong(
            "stop: not sent, no board of the layout is there"
        )
    hosts[0].wait_for(is_answered, REQUEST_S)
    return _tell_stop(args, [(who, session.model.answers.get("stop")) for who, _, session in boards])


def _tell_stop(args: argparse.Namespace, found: "list[tuple[str, AnswerView | None]]") -> int:
    bad = [(who, answer) for who, answer in found if answer is None or not answer.ok]
    if len(found) == 1 and found[0][1] is None:
        raise Wrong("stop: the board did not answer")
    texts = [f"{who}: {'NOT stopped, no answer' if answer is None else answer.text}" for who, answer in bad]
    first = next(answer for _, answer in bad or found if answer is not None or bad)
    text = "; ".join(texts) if len(found) > 1 and texts else first.text if first is not None else ""
    if args.json:
        say_json({"request": "stop", "ok": not bad, "why": first.why if first is not None else "", "text": text})
    else:
        say(text)
    return NO if bad else DONE


def run_release(args: argparse.Namespace) -> int:
    """Release, and wait until the board says so."""
    with common.session_with(args, common.layout_of(args)) as session:
        before = _count(session, "release")
        if not session.release():
            raise Wrong("release: not sent, there is no connection to the board")
        return _tell_answer(args, session, "release", before)


def _tell_answer(args: argparse.Namespace, session: "Host", word: str, before: int) -> int:
    answers = session.model.answers
    if not session.wait_for(lambda: word in answers and answers[word].count > before, REQUEST_S):
        raise Wrong(f"{word}: the board did not answer")
    answer = answers[word]
    if args.json:
        say_json({"request": word, "ok": answer.ok, "why": answer.why, "text": answer.text})
    else:
        say(answer.text)
    return DONE if answer.ok else NO


def run_cancel(args: argparse.Namespace) -> int:
    """Cancel, and wait for the answer."""
    with common.session_with(args, common.layout_of(args)) as session:
        before = _count(session, "cancel")
        if not session.cancel(args.id):
            raise Wrong("cancel: not sent, there is no connection to the board")
        return _tell_answer(args, session, "cancel", before)


def run_clear(args: argparse.Namespace) -> int:
    """Clear, and wait for the answer."""
    if (args.scope == "all") != (args.name is None):
        raise Wrong("clear: 'all' takes no name" if args.scope == "all" else f"clear: which {args.scope}?")
    with common.session_with(args, common.layout_of(args)) as session:
        common.need_settings(session)
        number = _which(session, args.scope, args.name)
        before = _count(session, "clear")
        if not session.clear(args.scope, number):
            raise Wrong("clear: not sent, there is no connection to the board")
        return _tell_answer(args, session, "clear", before)


def _which(session: "Host", scope: str, name: str | None) -> int:
    if name is None:
        return 0
    if scope == "bank":
        return common.bank_number(session.model, name)
    if scope == "junction":
        return common.junction_number(session.model, name)
    if not (name.isascii() and name.isdigit() and 1 <= int(name) <= _MOST_BUTTONS):
        raise Wrong(f"clear: '{name}' is no number of a button")
    return int(name) - 1


def _count(session: "Host", word: str) -> int:
    """How many answers to that request have come so far."""
    answers = session.model.answers
    return answers[word].count if word in answers else 0
