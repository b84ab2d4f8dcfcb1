"""What the commands share: exit statuses, output, names, the way to a board."""

import argparse
import json
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from host.model import LayoutModel
    from host.session import Session
    from sim.layout import Layout

DONE, NO, BAD = 0, 1, 2
CONNECT_S = 8.0
SETTINGS_S = 20.0
_HOW_TO_START = "start one with 'coilwarden virtual --listen 7777', then add --port socket://127.0.0.1:7777"


class Wrong(Exception):
    """Bad input, or no board: one plain sentence, exit status 2."""


def say(text: str) -> None:
    """A line for the person."""
    print(text)


def complain(text: str) -> None:
    """A line on stderr."""
    print(text, file=sys.stderr)


def say_json(value: object) -> None:
    """One JSON document on stdout."""
    print(json.dumps(value, indent=2))


def layout_of(args: argparse.Namespace) -> "Layout | None":
    """The layout file that was named, if any; its warnings go to stderr. Raises sim.layout.BadFile or Wrong."""
    if args.layout is None:
        return None
    from sim.layout import load_layout

    layout = load_layout(readable_file(args.layout))
    for warning in layout.warnings:
        complain(f"{args.layout}: note: {warning}")
    return layout


def layout_or_demo(args: argparse.Namespace) -> "Layout":
    """The layout file that was named, else the demo layout. Raises sim.layout.BadFile or Wrong."""
    layout = layout_of(args)
    if layout is not None:
        return layout
    from sim.layout import demo_layout_path, load_layout

    return load_layout(demo_layout_path())


def readable_file(path: Path) -> Path:
    """The path, if a file can be read there. Raises Wrong."""
    try:
        with path.open("rb"):
            return path
    except OSError as error:
        raise Wrong(f"{path}: {error.strerror or error}") from error


def port_of(args: argparse.Namespace) -> str:
    """The port that was named, else that of the only board found. Raises Wrong."""
    if args.port:
        return str(args.port)
    from host.cli.boards import likely_ports

    found = likely_ports()
    if len(found) == 1:
        return found[0]
    if found:
        raise Wrong(f"more than one board is there ({', '.join(found)}): choose one with --port")
    raise Wrong(f"no board found: plug one in and name it with --port, or {_HOW_TO_START}")


@contextmanager
def unready_session(args: argparse.Namespace, layout: "Layout | None" = None) -> "Iterator[Session]":
    """A session whose link is not open yet; closed at the end. Raises Wrong."""
    from host.link import Link
    from host.model import LayoutModel
    from host.session import Session

    link = Link(port_of(args))
    try:
        yield Session(link, LayoutModel(layout))
    finally:
        link.close()


@contextmanager
def session_with(args: argparse.Namespace, layout: "Layout | None" = None) -> "Iterator[Session]":
    """A session whose board has told its status. Raises LinkError or Wrong."""
    with unready_session(args, layout) as session:
        session.connect(CONNECT_S)
        yield session


def need_settings(session: "Session") -> None:
    """Wait until the board's settings are known: names come from them. Raises Wrong if it has none."""
    model = session.model

    def known() -> bool:
        return model.settings_match is True or model.board_records is not None

    if model.board is not None and not model.board.settings_crc:
        raise Wrong("the board has no settings: send it a layout with 'coilwarden settings send --layout FILE'")
    if known():
        return
    session.fetch_settings()
    if not session.wait_for(known, SETTINGS_S):
        raise Wrong("the board does not tell its settings: try again")


def junction_number(model: "LayoutModel", text: str) -> int:
    """A junction by name, or by number as people count (from 1). Raises Wrong."""
    return _number(text, [junction.name for junction in model.junctions], "junction")


def bank_number(model: "LayoutModel", text: str) -> int:
    """A bank by name, or by number as people count (from 1). Raises Wrong."""
    return _number(text, [bank.name for bank in model.banks], "bank")


def lie_number(model: "LayoutModel", junction: int, text: str) -> int:
    """A lie by the owner's words, its name, or its number from 1. Raises Wrong."""
    view = model.junctions[junction]
    for words in ([lie.word for lie in view.lies], [lie.name for lie in view.lies]):
        if text in words:
            return words.index(text)
    if text.isdigit() and 1 <= int(text) <= len(view.lies):
        return int(text) - 1
    known = ", ".join(dict.fromkeys([lie.name for lie in view.lies] + [lie.word for lie in view.lies]))
    raise Wrong(f"junction {view.name} has no lie '{text}'; it has: {known}")


def route_number(model: "LayoutModel", text: str) -> int:
    """A route by name, or by number as people count (from 1). Raises Wrong."""
    return _number(text, [route.name for route in model.routes], "route")


def _number(text: str, names: list[str], what: str) -> int:
    if text in names:
        return names.index(text)
    if text.isascii() and text.isdigit() and 1 <= int(text) <= len(names):
        return int(text) - 1
    raise Wrong(f"there is no {what} '{text}'; there are: {', '.join(names) or 'none'}")
