"""`board install / check / console`: the firmware on a board, its self-test, its text."""

import argparse
from typing import TYPE_CHECKING, Any

from host.cli.cautions import cautions_for
from host.cli.common import DONE, NO, Wrong, complain, say, say_json

if TYPE_CHECKING:
    from host.board.checking import Check
    from host.board.installing import Installed

_OFF = "the guard is off: no coil can be fired, and nothing watches the banks"


def add(commands: Any, shared: argparse.ArgumentParser) -> None:
    """Add the commands to the parser."""
    parser = commands.add_parser("board", help="firmware on a board: install, check, console")
    actions = parser.add_subparsers(dest="action", metavar="ACTION", required=True)
    install = actions.add_parser(
        "install", parents=[shared], help="put this program's firmware on a board with MicroPython; settings stay"
    )
    install.set_defaults(run=run_install)
    install.add_argument("--dry-run", action="store_true", help="list what would be done; write nothing")
    install.add_argument("--uncompiled", action="store_true", help="copy source files; they take more of its memory")
    install.add_argument("--replace", action="store_true", help="set another program's main.py and boot.py aside")
    check = actions.add_parser("check", parents=[shared], help="telemetry, and the board's self-test; fires nothing")
    check.set_defaults(run=run_check)
    check.add_argument("--yes", action="store_true", help="do not show the cautions")
    console = actions.add_parser("console", parents=[shared], help="the board's text and your keys; Ctrl-] ends it")
    console.set_defaults(run=run_console)
    console.add_argument("--plain", action="store_true", help="hide messages, show other text alone")
    console.add_argument("--prompt", action="store_true", help="ask the firmware to leave: MicroPython's prompt")
    for action in (install, check):
        action.add_argument(
            "--patience", type=_patience, default=1.0, metavar="N", help="wait N times longer, for what is slow"
        )


def _patience(text: str) -> float:
    try:
        number = float(text)
    except ValueError:
        number = 0.0
    if not 1.0 <= number <= 1000.0:
        raise argparse.ArgumentTypeError(f"'{text}' is no number from 1 to 1000")
    return number


def _port(args: argparse.Namespace) -> str:
    """The port that was named, else that of the only board found. Raises Wrong."""
    from host.cli.boards import likely_ports

    found = list(dict.fromkeys(args.ports)) or likely_ports()
    if not found:
        raise Wrong("no board found: plug one in that has MicroPython on it, or name its port with --port")
    if len(found) > 1:
        raise Wrong(f"one board at a time, not {', '.join(found)}: choose one with --port")
    return str(found[0])


# ---- install


def run_install(args: argparse.Namespace) -> int:
    """Install, or tell what would be done."""
    from host.board.errors import NoCompiler
    from host.board.installing import Installer

    progress = _quiet if args.json else say
    installer = Installer(_port(args), args.uncompiled, args.replace, progress, patience=args.patience)
    try:
        if not args.dry_run:
            return _told(args, installer.install())
        done = installer.look()
    except NoCompiler as error:
        raise Wrong(str(error)) from error
    except KeyboardInterrupt:
        complain("install again: if files were being copied, the board starts to its prompt until then, every coil off")
        raise
    refusal = installer.refusal(done)
    if args.json:
        say_json(_install_json(args, done) | {"refused": str(refusal) if refusal else ""})
    else:
        _tell_plan(done)
        if refusal:
            complain(f"this would be refused: {refusal}")
    return NO if refusal else DONE


def _quiet(_: str) -> None:
    """JSON alone goes out."""


def _tell_plan(done: "Installed") -> None:
    plan = done.plan
    for path in plan.foreign:
        say(f"would set aside {path}, as {path}.owner")
    for path in plan.remove:
        say(f"would remove {path}")
    for file in plan.copies:
        say(f"would copy {file.path}, {len(file.data)} bytes")
    if plan.nothing_to_do:
        say("nothing to do: the board has this firmware")
    else:
        say(f"{len(plan.copies)} files to copy, {plan.bytes_to_copy} bytes; {len(plan.remove)} to remove")


def _told(args: argparse.Namespace, done: "Installed") -> int:
    if args.json:
        say_json(_install_json(args, done))
    else:
        board = done.after
        assert board is not None
        if done.plan.nothing_to_do:
            say("nothing to copy: the board has this firmware")
        else:
            say(f"{len(done.copied)} files copied, {done.plan.bytes_to_copy} bytes; {len(done.removed)} removed")
        say(f"firmware {board.firmware} runs on {board.kind} {board.uid}; {_settings_text(done)}")
    return NO if done.settings_kept is False else DONE


def _settings_text(done: "Installed") -> str:
    assert done.after is not None
    now = done.after.settings_crc
    if done.settings_kept is False:
        assert done.before is not None
        return f"its settings were {done.before.settings_crc or 'none'} and are {now or 'none'} now: look at them"
    if not now:
        return "it has no settings yet: 'coilwarden settings send --layout FILE'"
    return f"settings {now} kept" if done.settings_kept else f"settings {now}"


def _install_json(args: argparse.Namespace, done: "Installed") -> dict[str, Any]:
    board = done.after
    return {
        "dry_run": args.dry_run,
        "copy": [{"path": file.path, "bytes": len(file.data)} for file in done.plan.copies],
        "remove": done.plan.remove,
        "bytes": done.plan.bytes_to_copy,
        "set_aside": done.plan.foreign,
        "micropython": ".".join(str(part) for part in done.survey.version),
        "machine": done.survey.machine,
        "firmware": board.firmware if board else "",
        "kind": board.kind if board else "",
        "uid": board.uid if board else "",
        "settings_crc": board.settings_crc if board else "",
        "settings_kept": done.settings_kept,
    }


# ---- check


def run_check(args: argparse.Namespace) -> int:
    """Telemetry, then the self-test; a table. Exit status 1 if anything fails."""
    from host.board.checking import check_board, check_link

    checks: list[Check] = []

    def take(check: "Check") -> None:
        checks.append(check)
        if not args.json:
            say(f"{check.name:12} {check.result:4} {check.text}".rstrip())

    port = _port(args)
    board = check_link(port, take, args.patience)
    if board is not None and not args.yes:
        for text in cautions_for(board.kind, board.uid):
            complain(f"caution: {text}")
    check_board(port, take, args.patience)
    failed = [check.name for check in checks if check.result == "fail"]
    if args.json:
        rows = [{"name": check.name, "result": check.result, "text": check.text} for check in checks]
        say_json({"port": port, "ok": not failed, "checks": rows})
    else:
        say(f"failed: {', '.join(failed)}" if failed else "the board is in order; nothing was fired")
    return NO if failed else DONE


# ---- console


def run_console(args: argparse.Namespace) -> int:
    """Text and keys until Ctrl-]."""
    from host.board.console import KeyboardAndScreen, talk
    from host.board.leaving import leave

    port = _port(args)
    try:
        terminal = KeyboardAndScreen()
    except OSError as error:
        raise Wrong(f"board console: {error}; it needs one for its keys") from error
    if args.prompt:
        leave(port)
        say(f"the firmware has left, {_OFF}. Ctrl-D starts it again, Ctrl-] ends this")
    else:
        say("Ctrl-] ends this; Ctrl-C makes the firmware leave")
    with terminal:
        at_prompt = talk(port, terminal, args.plain, b"\r" if args.prompt else b"")
    say("")
    if at_prompt:
        complain(f"the board is still at its prompt and {_OFF}: reset it to start the firmware")
    return DONE
