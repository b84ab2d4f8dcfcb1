"""`stop`, `release`, `cancel`, `clear`: requests that fire nothing."""

import argparse
from typing import TYPE_CHECKING, Any

from host.cli import common
from host.cli.common import DONE, NO, Wrong, say, say_json

if TYPE_CHECKING:
    from host.session import Session

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
    """Stop, and wait until the board says so. The stop goes out first: the status is not waited for."""
    with common.unready_session(args) as session:
        link = session.link
        link.open()
        # `stop` sends nothing and says so until the board is there, then sends once.
        if not session.wait_for(lambda: session.stop() or link.error is not None, common.CONNECT_S):
            raise Wrong(f"stop: not sent, there is no board at {link.port}")
        if link.error is not None:
            raise link.error
        return _tell_answer(args, session, "stop", 0)


def run_release(args: argparse.Namespace) -> int:
    """Release, and wait until the board says so."""
    with common.session_with(args) as session:
        before = _count(session, "release")
        if not session.release():
            raise Wrong("release: not sent, there is no connection to the board")
        return _tell_answer(args, session, "release", before)


def _tell_answer(args: argparse.Namespace, session: "Session", word: str, before: int) -> int:
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
    with common.session_with(args) as session:
        before = _count(session, "cancel")
        if not session.cancel(args.id):
            raise Wrong("cancel: not sent, there is no connection to the board")
        return _tell_answer(args, session, "cancel", before)


def run_clear(args: argparse.Namespace) -> int:
    """Clear, and wait for the answer."""
    if (args.scope == "all") != (args.name is None):
        raise Wrong("clear: 'all' takes no name" if args.scope == "all" else f"clear: which {args.scope}?")
    with common.session_with(args) as session:
        common.need_settings(session)
        number = _which(session, args.scope, args.name)
        before = _count(session, "clear")
        if not session.clear(args.scope, number):
            raise Wrong("clear: not sent, there is no connection to the board")
        return _tell_answer(args, session, "clear", before)


def _which(session: "Session", scope: str, name: str | None) -> int:
    if name is None:
        return 0
    if scope == "bank":
        return common.bank_number(session.model, name)
    if scope == "junction":
        return common.junction_number(session.model, name)
    if not (name.isascii() and name.isdigit() and 1 <= int(name) <= _MOST_BUTTONS):
        raise Wrong(f"clear: '{name}' is no number of a button")
    return int(name) - 1


def _count(session: "Session", word: str) -> int:
    """How many answers to that request have come so far."""
    answers = session.model.answers
    return answers[word].count if word in answers else 0
