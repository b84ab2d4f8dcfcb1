"""The parser, and what an error becomes: a sentence on stderr and an exit status, never a traceback."""

import argparse
import os
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from host.cli import board, boards, control, desk, rehearsing, settings, throwing, virtual
from host.cli.common import BAD, NO, Wrong, complain
from host.link_errors import LinkError

_EPILOG = (
    "exit status: 0 done; 1 the answer is no; 2 bad input or no board. Without a command: desk on the demo layout."
)


class _Ports(argparse.Action):
    """`--port` may be given several times: `ports` has all of them, `port` the last."""

    def __call__(
        self, parser: argparse.ArgumentParser, namespace: argparse.Namespace, values: Any, option: str | None = None
    ) -> None:
        """One more."""
        namespace.port = values
        namespace.ports = (*getattr(namespace, "ports", ()), values)


def make_parser() -> argparse.ArgumentParser:
    """The parser of all commands."""
    shared = argparse.ArgumentParser(add_help=False)
    shared.add_argument(
        "--port", action=_Ports, default=None, metavar="PORT",
        help="a device, or any pyserial URL such as socket://127.0.0.1:7777; once for each board",
    )  # fmt: skip
    shared.set_defaults(ports=())
    shared.add_argument("--layout", type=Path, metavar="FILE", help="a layout file")
    shared.add_argument("--json", action="store_true", help="print one JSON document")
    parser = argparse.ArgumentParser(
        prog="coilwarden", description="Guards capacitor-discharge turnout motors.", epilog=_EPILOG
    )
    commands = parser.add_subparsers(dest="command", metavar="COMMAND")
    for module in (desk, boards, throwing, control, settings, rehearsing, virtual, board):
        module.add(commands, shared)
    return parser


def main(argv: Sequence[str]) -> int:
    """Run one command. Returns the exit status."""
    parser = make_parser()
    try:
        args = parser.parse_args(list(argv) or ["desk"])
    except SystemExit as leaving:
        # argparse has said what is wrong, or shown the help.
        return leaving.code if isinstance(leaving.code, int) else BAD
    if args.command is None:
        parser.print_usage(sys.stderr)
        return BAD
    return _guarded(args)


def _guarded(args: argparse.Namespace) -> int:
    from sim.layout.problems import BadFile

    try:
        status = int(args.run(args))
        sys.stdout.flush()
        return status
    except BadFile as error:
        for problem in error.problems:
            complain(str(problem))
        return BAD
    except (Wrong, LinkError) as error:
        complain(f"coilwarden: {error}")
        return BAD
    except BrokenPipeError:
        # Whoever read our output has enough. What is left in the buffer has nowhere to go.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return NO
    except KeyboardInterrupt:
        complain("coilwarden: interrupted")
        return NO
