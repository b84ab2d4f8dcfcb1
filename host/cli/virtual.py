"""`virtual`: serves a virtual board on a loopback socket."""

import argparse
import sys
from typing import Any

from host.cli import common
from host.cli.common import BAD, DONE, Wrong, complain, say

LAST_PORT = 65_535


def add(commands: Any, shared: argparse.ArgumentParser) -> None:
    """Add the command to the parser."""
    parser = commands.add_parser("virtual", parents=[shared], help="serve a virtual board on a loopback socket")
    parser.add_argument(
        "--listen", type=_port, required=True, metavar="PORT",
        help="TCP port (further boards of the layout: the next ones); 0: any free one",
    )  # fmt: skip
    parser.add_argument("--kind", choices=("cpython", "micropython"), default="cpython", help="what runs the firmware")
    parser.set_defaults(run=run)


def _port(text: str) -> int:
    if not (text.isascii() and text.isdigit() and int(text) <= LAST_PORT):
        raise argparse.ArgumentTypeError(f"'{text}' is no port number from 0 to 65535")
    return int(text)


def run(args: argparse.Namespace) -> int:
    """Serve until interrupted."""
    from sim.serving import ServingError, VirtualBoards

    layout = common.layout_or_demo(args)
    if args.listen and args.listen + len(layout.boards) - 1 > LAST_PORT:
        raise Wrong(f"virtual: {len(layout.boards)} boards need as many ports from {args.listen}: choose a lower one")
    boards = VirtualBoards(layout, args.kind, args.listen)
    try:
        boards.start()
    except ServingError as error:
        raise Wrong(f"virtual: {error}") from error
    try:
        for url, board in zip(boards.urls, layout.boards, strict=True):
            who = layout.name if len(layout.boards) == 1 else f"{layout.name}, board {board.name}"
            say(f"{who} ({args.kind}) is at {url}; ctrl-c ends it")
        sys.stdout.flush()
        boards.wait()
    except KeyboardInterrupt:
        return DONE
    finally:
        boards.close()
    for failure in boards.failures:
        complain(f"virtual: the virtual board failed: {failure}")
    return BAD if boards.failures else DONE
