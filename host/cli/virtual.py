"""`virtual`: serves a virtual board on a loopback socket."""

import argparse
from typing import Any

from host.cli import common
from host.cli.common import BAD, DONE, Wrong, complain, say


def add(commands: Any, shared: argparse.ArgumentParser) -> None:
    """Add the command to the parser."""
    parser = commands.add_parser("virtual", parents=[shared], help="serve a virtual board on a loopback socket")
    parser.add_argument("--listen", type=_port, required=True, metavar="PORT", help="TCP port; 0: any free one")
    parser.add_argument("--kind", choices=("cpython", "micropython"), default="cpython", help="what runs the firmware")
    parser.set_defaults(run=run)


def _port(text: str) -> int:
    if not (text.isascii() and text.isdigit() and int(text) <= 65_535):
        raise argparse.ArgumentTypeError(f"'{text}' is no port number from 0 to 65535")
    return int(text)


def run(args: argparse.Namespace) -> int:
    """Serve until interrupted."""
    from sim.serving import ServingError, VirtualServer

    layout = common.layout_or_demo(args)
    server = VirtualServer(layout, kind=args.kind, port=args.listen)
    try:
        port = server.start()
    except ServingError as error:
        raise Wrong(f"virtual: {error}") from error
    try:
        say(f"{layout.name} ({args.kind}) is at socket://127.0.0.1:{port}; ctrl-c ends it")
        import sys

        sys.stdout.flush()
        server.wait()
    except KeyboardInterrupt:
        return DONE
    finally:
        server.close()
    if server.failure is not None:
        complain(f"virtual: the virtual board failed: {server.failure}")
        return BAD
    return DONE
