"""One board's part of a layout file of several boards, as a document of its own.

The part is read exactly as a file of one board is; whatever is found wrong is told where it stands in the whole file.
"""

from typing import Any

from sim.layout.problems import FileProblem
from sim.layout.reading import Document, Where

LISTS = ("bank", "junction", "route", "button", "follower")
TERMINALS = ("io", "inputs", "outputs")
SHARED = ("layout", "supply", "timing")
# Of a [[board]] table, what LayoutBuilder does not look for in [board].
_NOT_IN_BOARD = TERMINALS


class PartDocument(Document):
    """The tables of board number `board`: `rows` holds for each list (see LISTS) the places of this board's tables.

    data: what LayoutBuilder reads. elsewhere: names of inputs and outputs ('inputs', name) of other boards, with the
    board's name.
    """

    def __init__(
        self, whole: Document, board: int, name: str, data: dict[str, Any], rows: dict[str, list[int]],
        elsewhere: dict[tuple[str, str], str],
    ) -> None:  # fmt: skip
        self._whole = whole
        self._board = board
        self._name = name
        self._rows = rows
        self._elsewhere = elsewhere
        super().__init__(whole.file, data, self._own_lines(), whole.problems)

    def _own_lines(self) -> dict[Where, int]:
        """The lines of this board's tables, by their paths in this part."""
        places = {name: {row: place for place, row in enumerate(rows)} for name, rows in self._rows.items()}
        found: dict[Where, int] = {}
        for where, line in self._whole.lines.items():
            if len(where) > 1 and where[0] in LISTS:
                place = places[str(where[0])].get(where[1]) if isinstance(where[1], int) else None
                if place is not None:
                    found[(where[0], place, *where[2:])] = line
            elif where[:2] == ("board", self._board):
                rest = where[2:]
                found[rest if rest and rest[0] in TERMINALS else ("board", *rest)] = line
            elif where and where[0] != "board":
                found[where] = line
        return found

    def in_whole(self, where: Where) -> Where:
        """The path in the whole file."""
        if not where:
            return where
        if where[0] in TERMINALS:
            return ("board", self._board, *where)
        if where[0] == "board":
            return ("board", self._board, *where[1:])
        if len(where) > 1 and where[0] in LISTS and isinstance(where[1], int):
            return (where[0], self._rows[str(where[0])][where[1]], *where[2:])
        return where

    def line_of(self, where: Where) -> int:
        """The line of a key, or of the nearest thing around it."""
        return self._whole.line_of(self.in_whole(where))

    def wrong(self, where: Where, message: str) -> None:
        """Note a problem, where it stands in the whole file."""
        if len(where) == 1 and where[0] in LISTS:
            message = f"board '{self._name}': {message}"
        self._whole.wrong(self.in_whole(where), message)

    def note(self, where: Where, problem: FileProblem) -> None:
        """Note a problem that is told in other words than its place."""
        self._whole.note(self.in_whole(where), problem)

    def is_wrong(self, *tables: Where) -> bool:
        """True if something in one of these tables was found wrong."""
        return self._whole.is_wrong(*[self.in_whole(table) for table in tables])

    def numbered(self, table: str, number: int) -> int:
        """The number (from 1) of a table of a list, in the whole file."""
        return self._rows[table][number] + 1

    def elsewhere(self, table: str, name: str) -> str:
        """The other board that has an input or output of this name; '' if none has."""
        return self._elsewhere.get((table, name), "")


def part_data(whole: dict[str, Any], board: dict[str, Any], rows: dict[str, list[Any]]) -> dict[str, Any]:
    """The data of one board's part. board: its [[board]] table as written; rows: its tables of each list."""
    data = {key: whole[key] for key in SHARED if key in whole}
    data["board"] = {key: value for key, value in board.items() if key not in _NOT_IN_BOARD}
    data.update({key: board[key] for key in TERMINALS if key in board})
    data.update({name: tables for name, tables in rows.items() if tables or name in ("bank", "junction")})
    return data
