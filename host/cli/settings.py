"""`settings show / check / send / fetch / compare / card`: layout file against board."""

import argparse
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from host.cli import common
from host.cli.common import BAD, DONE, NO, Wrong, complain, say, say_json
from shared_protocol.codec import Codec, plain
from shared_protocol.fields import NAME
from shared_protocol.registry import board_reads

if TYPE_CHECKING:
    from host.cli.common import Host
    from host.model import Records
    from host.session import Part
    from shared_protocol.fields import Field
    from shared_protocol.settings import Settings
    from sim.layout import BoardLayout, Layout

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
        action.add_argument("--board", metavar="NAME", help="this board of the layout alone, by name or number")
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
    layout = common.layout_or_demo(args)
    if args.board is not None:
        _named_board(args, layout)
    return layout


def _named_board(args: argparse.Namespace, layout: "Layout") -> int:
    try:
        return layout.board_number(args.board)
    except KeyError as error:
        raise Wrong(str(error.args[0])) from error


def _chosen_boards(args: argparse.Namespace, layout: "Layout") -> "list[BoardLayout]":
    """The board that was named, else all of the layout."""
    return layout.boards if args.board is None else [layout.boards[_named_board(args, layout)]]


@dataclass(frozen=True)
class Pair:
    """A board that is there, and its part of the layout. host: what polls all boards."""

    host: "Host"
    part: "Part"
    layout: "BoardLayout"

    @property
    def name(self) -> str:
        """The board's name; '' where the layout has one."""
        return self.part.name

    @property
    def records(self) -> "Records":
        """The board's own records. Raises Wrong if it has none, or does not tell them."""
        return records_of(self.host, self.part)


def _pairs(args: argparse.Namespace, session: "Host", layout: "Layout") -> list[Pair]:
    """The boards that are there, each with its part of the layout; one that was named must be."""
    boards = dict(zip([part.name for part in session.parts], layout.boards, strict=True))
    return [Pair(session, part, boards[part.name]) for part in common.chosen_parts(args, session)]


def records_of(host: "Host", part: "Part") -> "Records":
    """The board's own records. Raises Wrong if it has none, or does not tell them."""
    session, model = part.session, part.session.model
    if model.board is not None and not model.board.settings_crc:
        raise Wrong(f"{common.who_is(part)} has no settings: {common.HOW_TO_SEND}")
    if model.board_records is None:
        session.fetch_settings()
        host.wait_for(lambda: model.board_records is not None, common.SETTINGS_S)
    if model.board_records is None:
        raise Wrong(f"{common.who_is(part)} does not tell its settings: try again")
    return model.board_records


def named_settings(args: argparse.Namespace) -> "list[tuple[str, Records, Settings | None]]":
    """Name, records and settings of each board of the layout that was named, else of the board that is there."""
    if args.layout is not None or not args.ports:
        layout = _layout(args)
        several = len(layout.boards) > 1
        return [
            (board.name if several else "", board.records, board.settings) for board in _chosen_boards(args, layout)
        ]
    with common.session_with(args) as session:
        return [(part.name, records_of(session, part), part.session.model.settings) for part in session.parts]


def bodies_of(records: "Records") -> list[str]:
    """The records as they are kept and sent, one a line."""
    codec = Codec(board_reads())
    return [codec.body(message, values).decode() for message, values in records]


def records_json(records: "Records") -> list[dict[str, Any]]:
    """The records with words and names as text."""
    return [{"record": message.name, **plain(message, values)} for message, values in records]


def run_show(args: argparse.Namespace) -> int:
    """Every field of every record, with its unit."""
    found = named_settings(args)
    if args.json:
        rows = [{"board": name, "records": records_json(records)} for name, records, _ in found]
        say_json({"boards": rows} if len(rows) > 1 else {"records": rows[0]["records"]})
        return DONE
    for name, records, _ in found:
        if len(found) > 1:
            say(f"# board {name}")
        for message, values in records:
            shown = plain(message, values)
            parts = [f"{field.key} {_shown(shown[field.key], field)}" for field in message.fields]
            say(f"{message.name}: " + ", ".join(parts))
    return DONE


def _shown(value: object, field: "Field") -> str:
    return f"'{value}'" if field.kind == NAME else f"{value} {field.unit}".rstrip()


def run_check(args: argparse.Namespace) -> int:
    """A layout file that can't be used raises BadFile, which main tells by line."""
    layout = _layout(args)
    boards = _chosen_boards(args, layout)
    if args.json:
        rows = [_check_row(board) for board in boards]
        found: dict[str, Any] = {"file": str(layout.path), "name": layout.name}
        found |= rows[0][1] if len(layout.boards) == 1 else {"boards": [{"board": name, **row} for name, row in rows]}
        say_json(found | {"notes": list(layout.warnings)})
        return DONE
    if args.layout is None:
        for warning in layout.warnings:
            complain(f"note: {warning}")
    if len(layout.boards) > 1:
        spanning = sum(route.place is None for route in layout.routes)
        say(f"{layout.name}: good. {len(layout.boards)} boards, {spanning} routes over several, run by the host")
    for board in boards:
        used, left = board.pins_used_and_left
        settings = board.settings
        say(
            f"{layout.name + ': good' if len(layout.boards) == 1 else 'board ' + board.name}. "
            f"{len(settings.banks)} banks, {len(settings.junctions)} junctions, "
            f"{len(settings.motors)} motors, {len(settings.routes)} routes; "
            f"{used} pins used, {left} left; {len(board.records)} records, CRC {board.crc()}"
        )
    return DONE


def _check_row(board: "BoardLayout") -> tuple[str, dict[str, Any]]:
    used, left = board.pins_used_and_left
    return board.name, {"records": len(board.records), "crc": board.crc(), "pins_used": used, "pins_left": left}


def _is_same(pair: Pair) -> bool:
    board = pair.part.session.model.board
    return board is not None and board.settings_crc == pair.layout.crc()


def _rows(pair: Pair) -> list[Any]:
    """What differs between the board's records and the layout's; empty if the board has none."""
    from host.settings_diff import differences

    board = pair.part.session.model.board
    if board is None or not board.settings_crc or _is_same(pair):
        return []
    return differences(pair.records, pair.layout.records)


def _row_json(row: Any) -> dict[str, Any]:
    return {"record": row.record, "field": row.field, "board": row.old, "file": row.new, "unit": row.unit}


def _row_text(pair: Pair, row: Any) -> str:
    unit = f" {row.unit}" if row.unit else ""
    who = f"board {pair.name}: " if pair.name else ""
    return f"{who}{row.record}, {row.field}: board {row.old}{unit}, file {row.new}{unit}"


def run_compare(args: argparse.Namespace) -> int:
    """What differs."""
    layout = _layout(args)
    statuses = []
    found = []
    with common.session_with(args, _for_ids(args, layout)) as session:
        for pair in _pairs(args, session, layout):
            board = pair.part.session.model.board
            if board is not None and not board.settings_crc:
                raise Wrong(f"{common.who_is(pair.part)} has no settings: {common.HOW_TO_SEND}")
            rows = _rows(pair)
            same = _is_same(pair)
            statuses.append(DONE if same else NO)
            found.append({"board": pair.name, "same": same, "differences": [_row_json(row) for row in rows]})
            if not args.json:
                for row in rows:
                    say(_row_text(pair, row))
                say(
                    f"{common.who_is(pair.part)} holds the settings of the layout file" if same
                    else f"{len(rows)} differences"
                )  # fmt: skip
        unreached = bool(session.unreached) and args.board is None
    if args.json:
        say_json({"boards": found} if len(layout.boards) > 1 else _without_board(found[0]))
    return BAD if unreached else max(statuses)


def _for_ids(args: argparse.Namespace, layout: "Layout") -> "Layout | None":
    """The layout, where it is needed to know which board is which."""
    return layout if common.is_for_fleet(layout) else None


def _without_board(row: dict[str, Any]) -> dict[str, Any]:
    return {key: value for key, value in row.items() if key != "board"}


def run_send(args: argparse.Namespace) -> int:
    """Old and new are shown, then all is sent as one transaction a board."""
    if getattr(args, "file", None) is None and args.layout is None:
        raise Wrong("settings send: name the layout file")
    layout = _layout(args)
    statuses = []
    found = []
    with common.session_with(args, _for_ids(args, layout)) as session:
        for pair in _pairs(args, session, layout):
            status, row = _send(args, pair)
            statuses.append(status)
            found.append({"board": pair.name, **row})
        unreached = bool(session.unreached) and args.board is None
    if args.json:
        say_json({"boards": found} if len(layout.boards) > 1 else _without_board(found[0]))
    return BAD if unreached else max(statuses)


def _send(args: argparse.Namespace, pair: Pair) -> tuple[int, dict[str, Any]]:
    """Send to one board; status, and what became of it."""
    rows = _rows(pair)
    if not args.json:
        for row in rows:
            say(_row_text(pair, row))
    transfer = pair.part.session.send_settings(pair.layout.records)
    pair.host.wait_for(lambda: not transfer.open, TRANSFER_S)
    if not args.json:
        who = f"board {pair.name}: " if pair.name else ""
        (say if transfer.state == "accepted" else complain)(who + transfer.text)
    told = {
        "state": transfer.state, "text": transfer.text, "record": transfer.record, "field": transfer.field,
        "why": transfer.why, "crc": pair.layout.crc(), "differences": [_row_json(row) for row in rows],
    }  # fmt: skip
    if transfer.state == "accepted":
        return DONE, told
    return (NO if transfer.state == "rejected" else BAD), told


def run_fetch(args: argparse.Namespace) -> int:
    """The boards' records."""
    layout = common.layout_of(args)
    with common.session_with(args, layout if common.is_for_fleet(layout) else None) as session:
        found = [(part.name, records_of(session, part)) for part in common.chosen_parts(args, session)]
    if args.out is not None and len(found) > 1:
        raise Wrong("settings fetch: a file holds one board's records: choose one with --board")
    if args.json:
        rows = [{"board": name, "records": records_json(records)} for name, records in found]
        say_json({"boards": rows} if len(rows) > 1 else {"records": rows[0]["records"]})
    for name, records in found:
        bodies = bodies_of(records)
        if args.out is not None:
            _write(args.out, bodies)
        if args.json:
            continue
        if args.out is not None:
            say(f"{len(bodies)} records written to {args.out}")
            continue
        for line in [*([f"# board {name}"] if len(found) > 1 else []), *bodies]:
            say(line)
    return DONE


def _write(path: Path, bodies: list[str]) -> None:
    try:
        path.write_text("".join(body + "\n" for body in bodies), "ascii")
    except OSError as error:
        raise Wrong(f"{path}: {error.strerror or error}") from error
