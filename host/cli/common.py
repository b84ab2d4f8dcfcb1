"""What the commands share: exit statuses, output, names, the way to a board."""

import argparse
import json
import sys
from collections.abc import Iterator
from contextlib import ExitStack, contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, TypeAlias

if TYPE_CHECKING:
    from host.fleet import Fleet
    from host.link import Link
    from host.model import LayoutModel
    from host.session import Part, Session
    from sim.layout import Layout

    Host: TypeAlias = Session | Fleet

DONE, NO, BAD = 0, 1, 2
CONNECT_S = 8.0
SETTINGS_S = 20.0
HOW_TO_SEND = "send it a layout with 'coilwarden settings send --layout FILE'"
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
    found = ports_of(args)
    if len(found) == 1:
        return found[0]
    if args.ports:
        raise Wrong(
            f"several ports were named ({', '.join(found)}), but no layout file of several boards: see --layout"
        )
    raise Wrong(f"more than one board is there ({', '.join(found)}): choose one with --port")


def ports_of(args: argparse.Namespace) -> list[str]:
    """The ports that were named, else those where boards are found. Raises Wrong if there are none, or one twice."""
    from host.cli.boards import likely_ports

    found = list(args.ports) or likely_ports()
    if not found:
        raise Wrong(f"no board found: plug one in and name it with --port, or {_HOW_TO_START}")
    twice = next((port for port in found if found.count(port) > 1), None)
    if twice is not None:
        raise Wrong(f"port {twice} was named twice")
    return found


def is_for_fleet(layout: "Layout | None") -> bool:
    """True if the layout says which board is which: it has several, or names the id of its only one."""
    return layout is not None and (len(layout.boards) > 1 or bool(layout.only.uid))


@contextmanager
def unready_session(args: argparse.Namespace, layout: "Layout | None" = None) -> "Iterator[Host]":
    """A session, or one for each board of the layout, with no link open yet; closed at the end. Raises Wrong."""
    from host.link import Link

    with ExitStack() as stack:
        ports = ports_of(args) if is_for_fleet(layout) else [port_of(args)]
        links = [Link(port) for port in ports]
        for link in links:
            stack.callback(link.close)
        yield host_for(layout, links)


def host_for(layout: "Layout | None", links: "list[Link]") -> "Host":
    """What works the boards at these links."""
    from host.fleet import Fleet
    from host.model import LayoutModel
    from host.session import Session

    if layout is not None and is_for_fleet(layout):
        return Fleet(layout, links)
    return Session(links[0], LayoutModel(layout))


@contextmanager
def session_with(args: argparse.Namespace, layout: "Layout | None" = None) -> "Iterator[Host]":
    """A session whose board has told its status; of several boards those that are there. Raises LinkError or Wrong."""
    with unready_session(args, layout) as session:
        session.connect(CONNECT_S)
        if session.unreached:
            complain(session.model.go_line(session.clock()).text)
        yield session


def need_settings(session: "Host") -> None:
    """Wait until the boards' settings are known: names come from them. Raises Wrong if one has none."""
    parts = [part for part in session.parts if part.session.model.connection.state == "connected"]
    for part in parts:
        board = part.session.model.board
        if board is not None and not board.settings_crc:
            raise Wrong(f"{who_is(part)} has no settings: {HOW_TO_SEND}")
    for part in parts:
        if not _settings_known(part):
            part.session.fetch_settings()
    session.wait_for(lambda: all(map(_settings_known, parts)), SETTINGS_S)
    silent = [who_is(part) for part in parts if not _settings_known(part)]
    if silent:
        raise Wrong(f"{silent[0]} does not tell its settings: try again")


def _settings_known(part: "Part") -> bool:
    model = part.session.model
    return model.settings_match is True or model.board_records is not None


def who_is(part: "Part") -> str:
    """'the board', or which one."""
    return f"board {part.name}" if part.name else "the board"


def chosen_parts(args: argparse.Namespace, session: "Host") -> "list[Part]":
    """The board that was named with --board, else all that are there. Raises Wrong if one that is wanted is not."""
    parts = session.parts
    wanted = getattr(args, "board", None)
    if wanted is not None:
        number = _number(wanted, [part.name for part in parts], "board")
        parts = [parts[number]]
        if parts[0].session.model.connection.state != "connected":
            raise Wrong(f"{who_is(parts[0])} is not connected")
    return [part for part in parts if part.session.model.connection.state == "connected"]


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
