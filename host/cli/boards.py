"""`boards`: which boards are there."""

import argparse
from typing import TYPE_CHECKING, Any

from host.cli.common import BAD, CONNECT_S, DONE, say, say_json
from host.link_errors import LinkError

if TYPE_CHECKING:
    from host.views import BoardView

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
    """Ask each likely port (or the named one) who it is. Only a hello is said."""
    rows = [_ask(port) for port in ([args.port] if args.port else likely_ports())]
    if args.json:
        say_json({"boards": rows})
    else:
        for row in rows:
            say(_line(row))
        if not rows:
            say("no board found")
    return DONE if any(not row["error"] for row in rows) else BAD


def _ask(port: str) -> dict[str, Any]:
    from host.link import Link
    from host.model import LayoutModel
    from host.session import Session

    row: dict[str, Any] = {
        "port": port, "kind": "", "uid": "", "firmware": "", "boot": 0, "settings_crc": "", "error": "",
    }  # fmt: skip
    link = Link(port)
    try:
        session = Session(link, LayoutModel())
        session.connect(CONNECT_S)
        board: BoardView | None = session.model.board
        if board is not None:
            row.update(kind=board.kind, uid=board.uid, firmware=board.firmware, boot=board.boot)
            row.update(settings_crc=board.settings_crc)
    except LinkError as error:
        row["error"] = str(error)
    finally:
        link.close()
    return row


def _line(row: dict[str, Any]) -> str:
    if row["error"]:
        return str(row["error"])
    settings = f"settings {row['settings_crc']}" if row["settings_crc"] else "no settings"
    return f"{row['port']}: {row['kind']} {row['uid']}, firmware {row['firmware']}, boot {row['boot']}, {settings}"
