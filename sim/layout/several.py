"""Layout files of several boards: which table belongs to which board, and what goes over more than one of them.

Each board's tables are then read as a file of one board is (see parts.py). Here is what only the whole file tells:
names that must be unique, motors of one junction on one board, buttons and followers that work without a host, routes
over several boards.
"""

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

from sim.layout import keys
from sim.layout.names import no_such, number_named
from sim.layout.panel import split_throw
from sim.layout.parts import LISTS, PartDocument, part_data
from sim.layout.reading import Document, Where, check_table, check_tables, shown

# A table whose board can't be told, because something is wrong that has been noted.
NOWHERE = -1


@dataclass
class Rows:
    """The tables of one list: as written, their names, and the board of each."""

    tables: list[Any]
    names: list[str]
    boards: list[int]


class Sorter:
    """Sorts the tables of a file by board. After `sort`, `parts` has each board's document (None: nothing to read)."""

    def __init__(self, document: Document) -> None:
        self.document = document
        self.boards: list[dict[str, Any]] = []
        self.names: list[str] = []
        self.rows: dict[str, Rows] = {}
        self.parts: list[PartDocument | None] = []

    def sort(self) -> None:
        """Give every table to its board; problems are noted in the document."""
        document = self.document
        data = dict(document.data)
        for name in ("io", "inputs", "outputs"):
            if data.pop(name, None) is not None:
                document.wrong((name,), f"is a board's own here: write [board.{name}] below its [[board]]")
        checked = check_table(document, (), data, keys.FILE_OF_SEVERAL)
        self.boards = check_tables(document, ("board",), checked.get("board", []), keys.BOARD_OF_SEVERAL)
        self.names = [str(board.get("name", "")) for board in self.boards]
        self._check_boards()
        for name in LISTS:
            tables = data.get(name, [])
            tables = tables if isinstance(tables, list) and name in checked else []
            names = [str(table.get("name", "")) if isinstance(table, dict) else "" for table in tables]
            self.rows[name] = Rows(tables, names, [])
        for name, place in (
            ("bank", self._place_of_bank), ("junction", self._place_of_junction), ("route", self._place_of_route),
            ("button", self._place_of_button), ("follower", self._place_of_follower),
        ):  # fmt: skip
            rows = self.rows[name]
            for number, table in enumerate(rows.tables):
                # What is no table is noted by whoever reads it: any board will do.
                rows.boards.append(place((name, number), table) if isinstance(table, dict) else 0)
            if name in ("bank", "junction", "route"):
                self._check_names(name)
        self.parts = [self._part(board) for board in range(len(self.boards))]

    # ---- boards

    def _check_boards(self) -> None:
        seen: dict[tuple[str, object], str] = {}
        for number, board in enumerate(self.boards):
            name = self.names[number]
            for key in ("name", "uid", "address"):
                value = board.get(key)
                if value is None or value == 0:
                    continue
                other = seen.setdefault((key, value), name)
                if key == "name" and self.names.index(name) != number:
                    self.document.wrong(("board", number, key), f"another board is called '{shown(name)}'")
                elif key != "name" and other != name:
                    self.document.wrong(("board", number, key), f"board '{shown(other)}' has the same {key}")

    def _check_names(self, noun: str) -> None:
        """The same name on two boards; twice on one board is found there."""
        rows = self.rows[noun]
        first: dict[str, int] = {}
        for number, name in enumerate(rows.names):
            other = first.setdefault(name, number)
            if name and other != number and rows.boards[other] != rows.boards[number]:
                self.document.wrong((noun, number, "name"), f"another {noun} is called '{shown(name)}'")

    def _named_board(self, where: Where, table: dict[str, Any]) -> int | None:
        """The board that the table's own `board` names; None if it names none."""
        if "board" not in table:
            return None
        value = table["board"]
        if not isinstance(value, (str, int)) or isinstance(value, bool):
            self.document.wrong((*where, "board"), "must be text in quotes")
            return NOWHERE
        number = number_named(str(value), self.names)
        if number < 0 and "" not in self.names:
            self.document.wrong((*where, "board"), no_such(str(value), self.names, "board"))
        return number

    def board_name(self, board: int) -> str:
        """A board's name, as it may stand in a message."""
        return f"board '{shown(self.names[board])}'"

    # ---- banks and junctions

    def _place_of_bank(self, where: Where, table: dict[str, Any]) -> int:
        named = self._named_board(where, table)
        if named is not None:
            return named
        if len(self.boards) > 1:
            self.document.wrong((*where, "board"), f"is missing: the boards are {', '.join(self.names)}")
            return NOWHERE
        return 0

    def _found(self, noun: str, where: Where, value: object) -> int:
        """The number of a bank, junction or route in the whole file; -1 (and noted, if it can't be meant)."""
        rows = self.rows[noun]
        if not isinstance(value, (str, int)) or isinstance(value, bool):
            self.document.wrong(where, "must be text in quotes")
            return -1
        number = number_named(str(value), rows.names)
        if number < 0 and "" not in rows.names and not self.document.is_wrong((noun,)):
            self.document.wrong(where, no_such(str(value), rows.names, noun))
        return number

    def _board_of(self, noun: str, number: int) -> int:
        return self.rows[noun].boards[number] if number >= 0 else NOWHERE

    def _place_of_junction(self, where: Where, table: dict[str, Any]) -> int:
        if "bank" not in table:
            return 0  # noted there: any board will do
        board = self._board_of("bank", self._found("bank", (*where, "bank"), table["bank"]))
        motors = table.get("motors")
        for place, motor in enumerate(motors if isinstance(motors, list) else ()):
            at: Where = (*where, "motors", place, "bank")
            if not isinstance(motor, dict) or "bank" not in motor or board < 0:
                continue
            other = self._board_of("bank", self._found("bank", at, motor["bank"]))
            if other not in (board, NOWHERE):
                self.document.wrong(
                    at, f"is on {self.board_name(other)}, the junction's bank on {self.board_name(board)}: all motors "
                    "of a junction are on banks of one board",
                )  # fmt: skip
                return NOWHERE
        return board

    # ---- routes

    def throws_of(self, where: Where, table: dict[str, Any]) -> Iterator[tuple[Where, int, str]]:
        """Of each throw of a route: where it stands, its junction's number in the whole file (or -1), its lie."""
        throws = table.get("throws")
        for place, text in enumerate(throws if isinstance(throws, list) else ()):
            if isinstance(text, str) and ":" in text:
                junction, lie = split_throw(text, self.rows["junction"].names)
                at: Where = (*where, "throws", place)
                yield at, self._found("junction", at, junction), lie

    def _place_of_route(self, where: Where, table: dict[str, Any]) -> int:
        """Its board; that of none if it goes over several, or names something that is not there."""
        numbers = [junction for _, junction, _ in self.throws_of(where, table)]
        if -1 in numbers:
            return NOWHERE
        boards = {self._board_of("junction", number) for number in numbers}
        return boards.pop() if len(boards) == 1 else NOWHERE if boards else 0

    def is_spanning(self, number: int) -> bool:
        """True if the route goes over several boards."""
        table = self.rows["route"].tables[number]
        if not isinstance(table, dict):
            return False
        throws = self.throws_of(("route", number), table)
        return len({self._board_of("junction", junction) for _, junction, _ in throws} - {NOWHERE}) > 1

    # ---- buttons and followers

    def _place_of_button(self, where: Where, table: dict[str, Any]) -> int:
        return self._own_place(where, table, "input", "button", (("junction", "throws"), ("route", "sets")))

    def _place_of_follower(self, where: Where, table: dict[str, Any]) -> int:
        return self._own_place(where, table, "output", "follower", (("junction", "follows"),))

    def _own_place(
        self, where: Where, table: dict[str, Any], terminal: str, noun: str, uses: tuple[tuple[str, str], ...]
    ) -> int:
        """The board of a button or follower: named, or told by its input or output; what it uses must be there too."""
        board = self._named_board(where, table)
        if board is None:
            board = self._told_by(where, table, terminal)
        if board < 0:
            return NOWHERE
        for target, verb in uses:
            if target not in table:
                continue
            number = self._found(target, (*where, target), table[target])
            other = self._board_of(target, number)
            if target == "route" and number >= 0 and self.is_spanning(number):
                text = f"goes over several boards: a {noun} works without a host, so it can't set it"
            elif other not in (board, NOWHERE):
                text = (
                    f"is on {self.board_name(other)}, the {noun} on {self.board_name(board)}: it works without a host, "
                    f"so it {verb} only what its own board has"
                )
            elif number >= 0 and other == board:
                continue
            else:
                return NOWHERE  # noted where the target stands
            self.document.wrong((*where, target), text)
            return NOWHERE
        return board

    def _told_by(self, where: Where, table: dict[str, Any], terminal: str) -> int:
        """The board whose inputs (or outputs) have the name that stands here."""
        if len(self.boards) == 1 or terminal not in table:
            return 0
        name = str(table[terminal])
        having = [number for number in range(len(self.boards)) if name in self._terminals(number, f"{terminal}s")]
        if len(having) == 1:
            return having[0]
        if having:
            text = " and ".join(self.board_name(number) for number in having)
            self.document.wrong((*where, "board"), f"is missing: {text} have an {terminal} '{shown(name)}'")
        elif name.isdigit():
            self.document.wrong((*where, "board"), f"is missing: the number of an {terminal} does not tell its board")
        else:
            known = [each for number in range(len(self.boards)) for each in self._terminals(number, f"{terminal}s")]
            self.document.wrong((*where, terminal), no_such(name, known, f"{terminal} named"))
        return NOWHERE

    def _terminals(self, board: int, table: str) -> dict[str, Any]:
        found = self.boards[board].get(table, {})
        return found if isinstance(found, dict) else {}

    # ---- parts

    def _part(self, board: int) -> PartDocument | None:
        """One board's document; None, and noted, if nothing is on it."""
        places = {name: [number for number, its in enumerate(self.rows[name].boards) if its == board] for name in LISTS}
        missing = [noun for noun in ("bank", "junction") if not places[noun]]
        if missing:
            if not self.document.is_wrong(("bank",), ("junction",), ("board", board)):
                self.document.wrong(("board", board), f"no {missing[0]} is on {self.board_name(board)}")
            return None
        elsewhere = {
            (table, name): self.names[other]
            for other in range(len(self.boards)) if other != board
            for table in ("inputs", "outputs") for name in self._terminals(other, table)
        }  # fmt: skip
        rows = {name: [self._as_alone(table) for table in self._tables(name, places[name])] for name in LISTS}
        written = self.document.data["board"][board]
        data = part_data(self.document.data, written, rows)
        return PartDocument(self.document, board, self.names[board], data, places, elsewhere)

    def _tables(self, name: str, places: list[int]) -> list[Any]:
        return [self.rows[name].tables[place] for place in places]

    def _as_alone(self, table: Any) -> Any:
        """A table as it would stand in its board's own file: its `board` is known, and numbers become names."""
        if not isinstance(table, dict):
            return table
        alone = {key: value for key, value in table.items() if key != "board"}
        for noun in ("bank", "junction", "route"):
            if noun in alone:
                alone[noun] = self._as_name(noun, alone[noun])
        if isinstance(alone.get("motors"), list):
            alone["motors"] = [
                {**motor, "bank": self._as_name("bank", motor["bank"])}
                if isinstance(motor, dict) and "bank" in motor else motor
                for motor in alone["motors"]
            ]  # fmt: skip
        if isinstance(alone.get("throws"), list):
            alone["throws"] = [self._throw_by_name(text) for text in alone["throws"]]
        return alone

    def _as_name(self, noun: str, value: Any) -> Any:
        names = self.rows[noun].names
        number = number_named(str(value), names) if isinstance(value, (str, int)) else -1
        return names[number] if number >= 0 and names[number] else value

    def _throw_by_name(self, text: Any) -> Any:
        if not isinstance(text, str) or ":" not in text:
            return text
        junction, lie = split_throw(text, self.rows["junction"].names)
        return f"{self._as_name('junction', junction)}: {lie}"
