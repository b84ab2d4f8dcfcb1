"""A good layout for the tests, and the means to spoil it in one place."""

import re
from dataclasses import dataclass
from pathlib import Path

from sim.layout import BadFile, Layout, load_layout

# Short, but with one of everything that can go wrong. Markers `#1` in changed text name the lines of problems.
GOOD = """\
[layout]
name = "Saltmarsh Test"

[supply]
volts = 16.0

[io]
input_pins = [10, 11]
inputs_on_chain = 8
input_chain_pins = [16, 17, 18]
output_pins = [12]
output_chain_pins = [19, 20, 21]

[inputs]
"contact A" = 0
"contact B" = 1
"button A" = 2
"button B" = 3
"key" = 4

[outputs]
"lamp" = 0

[[bank]]
name = "Pins"
first_pin = 0
coils = 6
adc = 0
resistor_w = 10

[[bank]]
name = "Chain"
chain_pins = [14, 15]
coils = 30
adc = 1
guard = "ptc"

[[junction]]
name = "Single"
bank = "Pins"
normal = "main"
reverse = "loop"
motors = [{ coils = [0, 1], contact = "one", contact_inputs = ["contact A"] }]

[[junction]]
name = "Cross"
kind = "crossover"
bank = "Chain"
motors = [{ coils = [0, 1] }, { coils = [2, 3] }]

[[junction]]
name = "Fan"
kind = "three_way"
bank = "Chain"
forbidden = [["reverse", "reverse"]]
motors = [{ coils = [4, 5] }, { coils = [6, 7] }]

[[junction.lie]]
name = "middle"
motors = ["normal", "normal"]

[[junction.lie]]
name = "left"
motors = ["reverse", "normal"]

[[junction.lie]]
name = "right"
motors = ["normal", "reverse"]

[[route]]
name = "Through"
throws = ["Single: main", "Fan: middle"]

[[button]]
kind = "set"
input = "button A"
junction = "Single"
lie = "loop"

[[follower]]
kind = "lamp"
output = "lamp"
junction = "Single"
lie = "loop"
"""


@dataclass(frozen=True)
class Expected:
    """One problem: the marker of its line (or the line itself), its field, a pattern that its message holds."""

    at: str | int
    field: str
    message: str


@dataclass(frozen=True)
class Case:
    """GOOD with one thing changed (or a text of its own), and all problems that come of it."""

    name: str
    old: str
    new: str
    expected: tuple[Expected, ...]

    def text(self) -> str:
        """The spoilt file."""
        if not self.old:
            return self.new
        if GOOD.count(self.old) != 1:
            raise ValueError(f"{self.name}: {self.old!r} must stand once in the good layout")
        return GOOD.replace(self.old, self.new)


def case(name: str, old: str, new: str, *expected: tuple[str | int, str, str]) -> Case:
    """Short for a Case."""
    return Case(name, old, new, tuple(Expected(*each) for each in expected))


def line_of(text: str, at: str | int) -> int:
    """The line that carries a marker at its end."""
    if isinstance(at, int):
        return at
    lines = [number for number, row in enumerate(text.split("\n"), 1) if row.endswith(at)]
    if len(lines) != 1:
        raise ValueError(f"marker {at} must stand once")
    return lines[0]


def load_text(folder: Path, text: str | bytes) -> Layout:
    """Load a layout from text."""
    path = folder / "layout.toml"
    path.write_bytes(text.encode() if isinstance(text, str) else text)
    return load_layout(path)


def problems_of(folder: Path, text: str | bytes) -> list[tuple[int, str, str]]:
    """Line, field and message of every problem of a layout; fails if there is none."""
    try:
        load_text(folder, text)
    except BadFile as error:
        for problem in error.problems:
            assert problem.file == str(folder / "layout.toml")
            assert re.fullmatch(r"[^\n]+:\d+: [^\n:]+: [^\n]+", str(problem)), "one line each"
        return [(problem.line, problem.field, problem.message) for problem in error.problems]
    raise AssertionError("the layout was taken")
