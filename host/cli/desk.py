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
    from host.model import LayoutModel
    from host.session import Session
    from host.terminal.app import run_desk

    with ExitStack() as stack:
        if args.port:
            layout = common.layout_of(args)
            port = str(args.port)
        else:
            from sim.serving import ServingError, VirtualServer

            layout = common.layout_or_demo(args)
            server = VirtualServer(layout, kind=args.kind)
            try:
                port = f"socket://127.0.0.1:{server.start()}"
            except ServingError as error:
                raise Wrong(f"desk: {error}") from error
            stack.callback(server.close)
        link = Link(port)
        stack.callback(link.close)
        session = Session(link, LayoutModel(layout))
        link.open()
        return int(run_desk(session, layout, args.picture))
