"""`desk`: the terminal, on a board or on a virtual one."""

import argparse
from contextlib import ExitStack
from pathlib import Path
from typing import Any

from host.cli import common
from host.cli.common import Wrong


def add(commands: Any, shared: argparse.ArgumentParser) -> None:
    """Add the command to the parser."""
    parser = commands.add_parser("desk", parents=[shared], help="the terminal; without --port on a virtual board")
    parser.add_argument("--picture", type=Path, metavar="OUT.svg", help="draw one screen to this file and end")
    parser.add_argument("--kind", choices=("cpython", "micropython"), default="cpython", help="of the virtual board")
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """Open the terminal; it shows 'searching' and 'lost' itself, so no connection is waited for here."""
    from host.link import Link
    from host.terminal.app import run_desk

    with ExitStack() as stack:
        if args.ports:
            layout = common.layout_of(args)
            ports = common.ports_of(args) if common.is_for_fleet(layout) else [common.port_of(args)]
        else:
            from sim.serving import ServingError, VirtualBoards

            layout = common.layout_or_demo(args)
            boards = VirtualBoards(layout, args.kind)
            try:
                boards.start()
            except ServingError as error:
                raise Wrong(f"desk: {error}") from error
            stack.callback(boards.close)
            ports = boards.urls
        links = [Link(port) for port in ports]
        for link in links:
            stack.callback(link.close)
        session = common.host_for(layout, links)
        session.open()
        return int(run_desk(session, layout, args.picture))
