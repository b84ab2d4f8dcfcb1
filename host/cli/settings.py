"""`settings show / check / send / fetch / compare / card`: layout file against board."""

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from host.cli import common
from host.cli.common import BAD, DONE, NO, Wrong, complain, say, say_json
from shared_protocol.codec import Codec, plain
from shared_protocol.registry import board_reads

if TYPE_CHECKING:
    from host.model import Records
    from host.session import Session
    from shared_protocol.settings import Settings
    from sim.layout import Layout

TRANSFER_S = 60.0


def add(commands: Any, shared: argparse.ArgumentParser) -> None:
    """Add the commands to the parser."""
    from host.cli import card

    parser = commands.add_parser("settings", help="layout file against board")
    actions = parser.add_subparsers(dest="action", metavar="ACTION", required=True)
    for word, run, text in (
        ("show", run_show, "the settings of the layout file, or of the board"),
        ("check", run_check, "check a layout file: problems by line, pins used and left"),
        ("send", run_send, "send the layout's settings to the board, as one transaction"),
        ("fetch", run_fetch, "the board's records, one a line; --out writes them to a file"),
        ("compare", run_compare, "what differs between layout file and board; exit status 1 if anything does"),
        ("card", card.run, "one page for the lid: junctions, blink codes, what to do with no computer"),
    ):
        action = actions.add_parser(word, parents=[shared], help=text)
        action.set_defaults(run=run)
        if word == "fetch":
            action.add_argument("--out", type=Path, metavar="FILE", help="write the records to this file")
        if word in ("check", "send"):
            action.add_argument("file", nargs="?", type=Path, help="the layout file (or --layout)")


def _layout(args: argparse.Namespace) -> "Layout":
    """The layout that a command works on. Raises BadFile or Wrong."""
    if getattr(args, "file", None) is not None:
        if args.layout is not None and args.layout != args.file:
            raise Wrong(f"two layout files were named: {args.file} and {args.layout}")
        args.layout = args.file
    return common.layout_or_demo(args)


def records_of(session: "Session") -> "Records":
    """The board's own records. Raises Wrong if it has none, or does not tell them."""
    model = session.model
    if model.board is not None and not model.board.settings_crc:
        raise Wrong("the board has no settings: send it a layout with 'coilwarden settings send --layout FILE'")
    if model.board_records is None:
        session.fetch_settings()
        session.wait_for(lambda: model.board_records is not None, common.SETTINGS_S)
    if model.board_records is None:
        raise Wrong("the board does not tell its settings: try again")
    return model.board_records


def named_settings(args: argparse.Namespace) -> "tuple[Records, Settings | None]":
    """Records and settings of the layout that was named, else of the board that is there."""
    if args.layout is not None or not args.port:
        layout = _layout(args)
        return layout.records, layout.settings
    with common.session_with(args) as session:
        return records_of(session), session.model.settings


def bodies_of(records: "Records") -> list[str]:
    """The records as they are kept and sent, one a line."""
    codec = Codec(board_reads())
    return [codec.body(message, values).decode() for message, values in records]


def records_json(records: "Records") -> list[dict[str, Any]]:
    """The records with words and names as text."""
    return [{"record": message.name, **plain(message, values)} for message, values in records]


def run_show(args: argparse.Namespace) -> int:
    """Every field of every record, with its unit."""
    records, _ = named_settings(args)
    if args.json:
        say_json({"records": records_json(records)})
        return DONE
    for message, values in records:
        shown = plain(message, values)
        units = {field.key: field.unit for field in message.fields}
        parts = [f"{key} {_shown(value, units[key])}" for key, value in shown.items()]
        say(f"{message.name}: " + ", ".join(parts))
    return DONE


def _shown(value: object, unit: str) -> str:
    if isinstance(value, str):
        return f"'{value}'" if unit == "bytes" else value
    return f"{value} {unit}".rstrip()


def run_check(args: argparse.Namespace) -> int:
    """A layout file that can't be used raises BadFile, which main tells by line."""
    layout = _layout(args)
    used, left = layout.pins_used_and_left
    if args.json:
        say_json(
            {
                "file": str(layout.path), "name": layout.name, "records": len(layout.records), "crc": layout.crc(),
                "pins_used": used, "pins_left": left, "notes": list(layout.warnings),
            }
        )  # fmt: skip
        return DONE
    if args.layout is None:
        for warning in layout.warnings:
            complain(f"note: {warning}")
    settings = layout.settings
    say(
        f"{layout.name}: good. {len(settings.banks)} banks, {len(settings.junctions)} junctions, "
        f"{len(settings.motors)} motors, {len(settings.routes)} routes; "
        f"{used} pins used, {left} left; {len(layout.records)} records, CRC {layout.crc()}"
    )
    return DONE


def _rows(session: "Session", layout: "Layout") -> list[Any]:
    """What differs between the board's records and the layout's; empty if the board has none."""
    from host.settings_diff import differences

    board = session.model.board
    if board is None or not board.settings_crc or board.settings_crc == layout.crc():
        return []
    return differences(records_of(session), layout.records)


def _row_json(row: Any) -> dict[str, Any]:
    return {"record": row.record, "field": row.field, "board": row.old, "file": row.new, "unit": row.unit}


def _row_text(row: Any) -> str:
    unit = f" {row.unit}" if row.unit else ""
    return f"{row.record}, {row.field}: board {row.old}{unit}, file {row.new}{unit}"


def run_compare(args: argparse.Namespace) -> int:
    """What differs."""
    layout = _layout(args)
    with common.session_with(args) as session:
        board = session.model.board
        if board is not None and not board.settings_crc:
            raise Wrong("the board has no settings: send it a layout with 'coilwarden settings send --layout FILE'")
        same = board is not None and board.settings_crc == layout.crc()
        rows = _rows(session, layout)
    if args.json:
        say_json({"same": same, "differences": [_row_json(row) for row in rows]})
    else:
        for row in rows:
            say(_row_text(row))
        say("the board holds the settings of the layout file" if same else f"{len(rows)} differences")
    return DONE if same else NO


def run_send(args: argparse.Namespace) -> int:
    """Old and new are shown, then all is sent as one transaction."""
    if getattr(args, "file", None) is None and args.layout is None:
        raise Wrong("settings send: name the layout file")
    layout = _layout(args)
    with common.session_with(args) as session:
        rows = _rows(session, layout)
        if not args.json:
            for row in rows:
                say(_row_text(row))
        transfer = session.send_settings(layout.records)
        session.wait_for(lambda: not transfer.open, TRANSFER_S)
        if args.json:
            say_json(
                {
                    "state": transfer.state, "text": transfer.text, "record": transfer.record,
                    "field": transfer.field, "why": transfer.why, "crc": layout.crc(),
                    "differences": [_row_json(row) for row in rows],
                }
            )  # fmt: skip
        else:
            (say if transfer.state == "accepted" else complain)(transfer.text)
        if transfer.state == "accepted":
            return DONE
        return NO if transfer.state == "rejected" else BAD


def run_fetch(args: argparse.Namespace) -> int:
    """The board's records."""
    with common.session_with(args) as session:
        records = records_of(session)
    bodies = bodies_of(records)
    if args.out is not None:
        try:
            args.out.write_text("".join(body + "\n" for body in bodies), "ascii")
        except OSError as error:
            raise Wrong(f"{args.out}: {error.strerror or error}") from error
    if args.json:
        say_json({"records": records_json(records)})
    elif args.out is not None:
        say(f"{len(bodies)} records written to {args.out}")
    else:
        for body in bodies:
            say(body)
    return DONE
