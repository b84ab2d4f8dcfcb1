"""A layout that has been read and found right: records for boards, physics for the simulator, names for people."""

from dataclasses import dataclass, field
from pathlib import Path

from shared_protocol.codec import Codec
from shared_protocol.fields import Message
from shared_protocol.registry import board_reads
from shared_protocol.settings import Settings
from shared_protocol.settings_check import pins_used
from sim.layout.names import no_such, number_named, plain_name
from sim.layout.physics import PhysicsLayout
from sim.layout.records import Origin

Place = tuple[int, int]


class SeveralBoards(Exception):
    """Something that one board has was asked of a layout with several."""

    def __init__(self, names: list[str]) -> None:
        super().__init__(f"the layout has several boards ({', '.join(names)}): choose one")
        self.names = names


@dataclass
class BoardLayout:
    """One board's part of a layout: what the board holds, and what the simulator puts round it.

    name: the owner's name for it. uid: its unique id, '' where the file names none. address: what its address links
    say (0: no links). `origins`: where in the file each record came from, and the owner's key of each of its fields.
    """

    name: str
    records: list[tuple[Message, list[object]]]
    settings: Settings
    physics: PhysicsLayout
    uid: str = ""
    address: int = 0
    input_names: dict[str, int] = field(default_factory=dict)
    output_names: dict[str, int] = field(default_factory=dict)
    origins: list[Origin] = field(default_factory=list)

    def record_bodies(self) -> list[bytes]:
        """The records as they go over the wire and into a slot."""
        codec = Codec(board_reads())
        return [codec.body(message, values) for message, values in self.records]

    def crc(self) -> str:
        """CRC-32 of the record bodies, each with its newline, as a board tells it: eight hex digits."""
        return Codec(board_reads()).crc_text(b"".join(body + b"\n" for body in self.record_bodies())).decode()

    def slot_lines(self, sequence: int = 1) -> list[bytes]:
        """The lines of a settings slot that holds this board's part."""
        bodies = self.record_bodies()
        return [*bodies, f"slot {sequence} {len(bodies)} {self.crc()}".encode()]

    @property
    def pins_used_and_left(self) -> tuple[int, int]:
        """Pins used and pins left."""
        return pins_used(self.settings)


@dataclass(frozen=True)
class Route:
    """A route: its throws as (junction, lie), in the numbers of the whole layout.

    place: the board that has it and its number there; None for a route over several boards, which the host runs.
    """

    name: str
    throws: tuple[tuple[int, int], ...]
    place: Place | None


@dataclass
class Layout:
    """A whole layout, of one board or several. Junctions, banks, routes and buttons are numbered in the file's order.

    The names and `junction_words` are the owner's own, in Unicode; records and settings hold them as a board can
    keep them: ASCII, with '?' for the rest. `junction_words` and `lie_names` have a list for each junction.
    junction_places, bank_places, button_places: the board of each, and its number there.
    """

    path: Path
    name: str
    boards: list[BoardLayout]
    junction_names: list[str]
    junction_words: list[list[str]]
    lie_names: list[list[str]]
    bank_names: list[str]
    routes: list[Route]
    junction_places: list[Place]
    bank_places: list[Place]
    button_places: list[Place]
    warnings: list[str] = field(default_factory=list)

    # ---- boards

    @property
    def only(self) -> BoardLayout:
        """The board of a layout that has one. Raises SeveralBoards."""
        if len(self.boards) != 1:
            raise SeveralBoards(self.board_names)
        return self.boards[0]

    @property
    def board_names(self) -> list[str]:
        """The boards' names."""
        return [board.name for board in self.boards]

    def board_number(self, text: str) -> int:
        """The number (from 0) of a board, by name or number. Raises KeyError."""
        return _number_of(text, self.board_names, "board")

    def alone(self, board: int) -> "Layout":
        """The part of one board as a layout of its own: its routes, and its own numbers."""
        junctions = [number for number, place in enumerate(self.junction_places) if place[0] == board]
        own = {number: place for place, number in enumerate(junctions)}
        return Layout(
            self.path, self.name, [self.boards[board]],
            [self.junction_names[number] for number in junctions],
            [self.junction_words[number] for number in junctions],
            [self.lie_names[number] for number in junctions],
            [self.bank_names[number] for number, place in enumerate(self.bank_places) if place[0] == board],
            [
                Route(route.name, tuple((own[junction], lie) for junction, lie in route.throws), (0, route.place[1]))
                for route in self.routes if route.place is not None and route.place[0] == board
            ],
            [(0, number) for number in range(len(junctions))],
            [(0, place[1]) for place in self.bank_places if place[0] == board],
            [(0, place[1]) for place in self.button_places if place[0] == board],
        )  # fmt: skip

    # ---- the only board

    @property
    def records(self) -> list[tuple[Message, list[object]]]:
        """The only board's records. Raises SeveralBoards, as all below."""
        return self.only.records

    @property
    def settings(self) -> Settings:
        """The only board's settings."""
        return self.only.settings

    @property
    def physics(self) -> PhysicsLayout:
        """What the simulator puts round the only board."""
        return self.only.physics

    @property
    def input_names(self) -> dict[str, int]:
        """Names of the only board's inputs, and their numbers."""
        return self.only.input_names

    @property
    def output_names(self) -> dict[str, int]:
        """Names of the only board's follower outputs, and their numbers."""
        return self.only.output_names

    @property
    def origins(self) -> list[Origin]:
        """Where the only board's records came from."""
        return self.only.origins

    def record_bodies(self) -> list[bytes]:
        """The only board's records as they go over the wire."""
        return self.only.record_bodies()

    def crc(self) -> str:
        """CRC-32 of the only board's records."""
        return self.only.crc()

    def slot_lines(self, sequence: int = 1) -> list[bytes]:
        """The lines of the only board's settings slot."""
        return self.only.slot_lines(sequence)

    @property
    def pins_used_and_left(self) -> tuple[int, int]:
        """Pins used and pins left on the only board."""
        return self.only.pins_used_and_left

    # ---- names

    @property
    def route_names(self) -> list[str]:
        """The routes' names."""
        return [route.name for route in self.routes]

    def junction_number(self, text: str) -> int:
        """The number (from 0) of a junction, by its name or its number as people count. Raises KeyError."""
        return _number_of(text, self.junction_names, "junction")

    def route_number(self, text: str) -> int:
        """The number (from 0) of a route, by name or number. Raises KeyError."""
        return _number_of(text, self.route_names, "route")

    def bank_number(self, text: str) -> int:
        """The number (from 0) of a bank, by name or number. Raises KeyError."""
        return _number_of(text, self.bank_names, "bank")

    def lie_number(self, junction: int, text: str) -> int:
        """The number (from 0) of a lie of a junction, by the owner's words, its name or number. Raises KeyError."""
        words, names = self.junction_words[junction], self.lie_names[junction]
        for known in (words, names, [plain_name(word) for word in words]):
            if text in known:
                return known.index(text)
        number = number_named(text, names)
        if number < 0:
            known = list(dict.fromkeys(words + names))
            raise KeyError(no_such(text, known, f"lie of '{self.junction_names[junction]}'"))
        return number


def _number_of(text: str, names: list[str], what: str) -> int:
    for known in (names, [plain_name(name) for name in names]):
        number = number_named(text, known)
        if number >= 0:
            return number
    raise KeyError(no_such(text, names, what))
