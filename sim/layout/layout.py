"""A layout that has been read and found right: records for the board, physics for the simulator, names for people."""

from dataclasses import dataclass, field
from pathlib import Path

from shared_protocol.codec import Codec
from shared_protocol.fields import Message
from shared_protocol.registry import board_reads
from shared_protocol.settings import Settings
from shared_protocol.settings_check import pins_used
from sim.circuit_parameters import BankParameters, SupplyParameters
from sim.layout.reading import Where
from sim.motor import Motor, MotorParameters


@dataclass(frozen=True)
class MotorPhysics:
    """What the simulator puts in a motor's place, and where it is at first."""

    parameters: MotorParameters
    starts: str


@dataclass(frozen=True)
class PhysicsLayout:
    """The simulator's half of a layout: one entry a motor of the settings."""

    supply: SupplyParameters
    banks: list[BankParameters]
    motors: list[MotorPhysics]

    def make_motors(self) -> list[Motor]:
        """Fresh motors, each where it starts."""
        return [Motor(motor.parameters, "reverse" if motor.starts == "reverse" else "normal") for motor in self.motors]


@dataclass
class Layout:
    """One board's layout."""

    path: Path
    name: str
    records: list[tuple[Message, list[object]]]
    settings: Settings
    physics: PhysicsLayout
    junction_words: list[list[str]]
    input_names: dict[str, int] = field(default_factory=dict)
    warnings: list[str] = field(default_factory=list)
    # Where in the file each record came from, and which of the owner's keys each field came from.
    origins: list[tuple[Where, dict[str, str]]] = field(default_factory=list)

    def record_bodies(self) -> list[bytes]:
        """The records as they go over the wire and into a slot."""
        codec = Codec(board_reads())
        return [codec.body(message, values) for message, values in self.records]

    def crc(self) -> str:
        """CRC-32 of the record bodies, as a board tells it."""
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
        """A junction by its name, or its number as people count (from 1). Raises KeyError."""
        return number_of(text, [junction.name.decode() for junction in self.settings.junctions], "junction")

    def route_number(self, text: str) -> int:
        """A route by name or number. Raises KeyError."""
        return number_of(text, [route.name.decode() for route in self.settings.routes], "route")

    def bank_number(self, text: str) -> int:
        """A bank by name or number. Raises KeyError."""
        return number_of(text, [bank.name.decode() for bank in self.settings.banks], "bank")

    def lie_number(self, junction: int, text: str) -> int:
        """A lie of a junction by its name or the owner's words. Raises KeyError."""
        names = [lie.name.decode() for lie in self.settings.junctions[junction].lies]
        words = self.junction_words[junction]
        if text in words:
            return words.index(text)
        if text in names:
            return names.index(text)
        known = ", ".join(dict.fromkeys(names + words))
        raise KeyError(f"junction {junction + 1} has no lie '{text}'; it has: {known}")


def number_of(text: str, names: list[str], what: str) -> int:
    """The number (from 0) of a name, or of a number as people count. Raises KeyError naming what there is."""
    if text in names:
        return names.index(text)
    if text.isdigit() and 1 <= int(text) <= len(names):
        return int(text) - 1
    raise KeyError(f"there is no {what} '{text}'; there are: {', '.join(names) or 'none'}")
