"""A layout that has been read and found right: records for the board, physics for the simulator, names for people."""

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


@dataclass
class Layout:
    """One board's layout.

    The names and `junction_words` are the owner's own, in Unicode; records and settings hold them as a board can
    keep them: ASCII, with '?' for the rest. `junction_words` and `lie_names` have a list for each junction.
    `origins`: where in the file each record came from, and the owner's key of each of its fields.
    """

    path: Path
    name: str
    records: list[tuple[Message, list[object]]]
    settings: Settings
    physics: PhysicsLayout
    junction_names: list[str]
    junction_words: list[list[str]]
    lie_names: list[list[str]]
    bank_names: list[str]
    route_names: list[str]
    input_names: dict[str, int] = field(default_factory=dict)
    output_names: dict[str, int] = field(default_factory=dict)
    warnings: list[str] = field(default_factory=list)
    origins: list[Origin] = field(default_factory=list)

    def record_bodies(self) -> list[bytes]:
        """The records as they go over the wire and into a slot."""
        codec = Codec(board_reads())
        return [codec.body(message, values) for message, values in self.records]

    def crc(self) -> str:
        """CRC-32 of the record bodies, each with its newline, as a board tells it: eight hex digits."""
        return Codec(board_reads()).crc_text(b"".join(body + b"\n" for body in self.record_bodies())).decode()

    def slot_lines(self, sequence: int = 1) -> list[bytes]:
        """The lines of a settings slot that holds this layout."""
        bodies = self.record_bodies()
        return [*bodies, f"slot {sequence} {len(bodies)} {self.crc()}".encode()]

    @property
    def pins_used_and_left(self) -> tuple[int, int]:
        """Pins used and pins left."""
        return pins_used(self.settings)

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
