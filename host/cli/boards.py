"""`boards`: which boards are there."""

import argparse
from typing import TYPE_CHECKING, Any

from host.cli.common import BAD, CONNECT_S, DONE, say, say_json
from host.link_errors import LinkError

if TYPE_CHECKING:
    from host.seats import Port
    from host.views import BoardView
    from sim.layout import Layout

# USB vendor number of RP2040 and RP2350 boards that run MicroPython; from memory.
BOARD_VENDOR = 0x2E8A


def add(commands: Any, shared: argparse.ArgumentParser) -> None:
    """Add the command to the parser."""
    parser = commands.add_parser("boards", parents=[shared], help="list the boards that are there")
    parser.set_defaults(run=run)


def likely_ports() -> list[str]:
    """Ports that may be boards, by their USB vendor. Nothing is opened."""
    from serial.tools import list_ports

    return sorted(str(port.device) for port in list_ports.comports() if port.vid == BOARD_VENDOR)


def run(args: argparse.Namespace) -> int:
    """Ask each likely port (or those named) who it is. Only a hello is said, and a status asked for.

    With a layout file it is told which of its boards each one is.
    """
    from host.cli.common import layout_of

    layout = layout_of(args)
    ports = list(dict.fromkeys(args.ports)) or likely_ports()
    rows = _ask_all(ports, layout) if layout is not None and ports else [_ask(port) for port in ports]
    missing = [] if layout is None else [name for name in layout.board_names if name not in [r["board"] for r in rows]]
    if args.json:
        say_json({"boards": rows} if layout is None else {"boards": rows, "missing": missing})
    else:
        for row in rows:
            say(_line(row))
        if not rows:
            say("no board found")
        for name in missing if layout is not None else ():
            say(f"board {name} of the layout is not there")
    return DONE if any(not row["error"] for row in rows) else BAD


def _empty(port: str) -> dict[str, Any]:
    return {
        "port": port, "kind": "", "uid": "", "firmware": "", "boot": 0, "settings_crc": "", "address": 0, "board": "",
        "spare": False, "note": "", "error": "",
    }  # fmt: skip


def _ask(port: str) -> dict[str, Any]:
    from host.link import Link
    from host.model import LayoutModel
    from host.session import Session

    row = _empty(port)
    link = Link(port)
    try:
        session = Session(link, LayoutModel())
        session.connect(CONNECT_S)
        _fill(row, session.model.board)
    except LinkError as error:
        row["error"] = str(error)
    finally:
        link.close()
    return row


def _fill(row: dict[str, Any], board: "BoardView | None") -> None:
    from host.seats import address_of

    if board is not None:
        row.update(kind=board.kind, uid=board.uid, firmware=board.firmware, boot=board.boot)
        row.update(settings_crc=board.settings_crc, address=address_of(board.caps))


def _ask_all(ports: list[str], layout: "Layout") -> list[dict[str, Any]]:
    """All ports at once: which is which board of the layout."""
    import contextlib

    from host.fleet import Fleet
    from host.link import Link

    with contextlib.ExitStack() as stack:
        links = [stack.enter_context(contextlib.closing(Link(port))) for port in ports]
        fleet = Fleet(layout, links)
        with contextlib.suppress(LinkError):
            fleet.connect(CONNECT_S)
        return [_port_row(port) for port in fleet.ports]


def _port_row(port: "Port") -> dict[str, Any]:
    from host.news import board_of

    row = _empty(port.name)
    if port.hello is None:
        row["error"] = str(port.link.error or f"{port.name}: no answer from the board; reset it")
        return row
    _fill(row, board_of(port.hello))
    if port.seat is not None:
        row.update(board=port.seat.name, spare=port.seat.spare)
    row["note"] = port.text
    return row


def _line(row: dict[str, Any]) -> str:
    if row["error"]:
        return str(row["error"])
    settings = f"settings {row['settings_crc']}" if row["settings_crc"] else "no settings"
    text = f"{row['port']}: {row['kind']} {row['uid']}, firmware {row['firmware']}, boot {row['boot']}, {settings}"
    if row["address"]:
        text += f", address {row['address']}"
    if row["board"]:
        text += f": {'a spare for ' if row['spare'] else ''}board {row['board']}"
    return f"{text}; {row['note']}" if row["note"] else text
