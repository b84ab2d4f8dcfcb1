"""The cautions before the first pulse on a real board: whether they are due, and what they say."""

from host.cli.cautions import CAUTIONS, cautions_for, state_file
from host.terminal.rows import Piece, Rows, row, wrap
from host.views import BoardView


class CautionMemory:
    """Which boards a person has read the cautions for: kept on this machine, and for this run in memory."""

    def __init__(self) -> None:
        self._read: set[str] = set()

    def due(self, board: BoardView | None) -> bool:
        """True if this board is real and its cautions have not been acknowledged."""
        if board is None or board.kind.startswith("virtual") or board.uid in self._read:
            return False
        return board.uid not in self._kept()

    def acknowledge(self, board: BoardView | None) -> None:
        """A person has read them."""
        if board is not None:
            self._read.add(board.uid)
            cautions_for(board.kind, board.uid)

    def _kept(self) -> list[str]:
        try:
            return state_file().read_text("utf-8").splitlines()
        except (OSError, UnicodeDecodeError):
            return []


def caution_rows(width: int) -> Rows:
    """What is to be read."""
    rows: Rows = [row("")]
    for part in wrap("This is a real board: the next throw puts a hard pulse through a coil.", max(20, width - 4)):
        rows.append(row(Piece(f"  {part}", "strong")))
    for caution in CAUTIONS:
        for place, part in enumerate(wrap(caution, max(20, width - 6))):
            rows.append(row("  - " if not place else "    ", part))
    rows.append(row(""))
    rows.append(row(Piece("  y  ", "strong"), "I have read this (nothing fires by that: ask for the throw again)"))
    return rows
