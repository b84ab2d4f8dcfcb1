"""As much of an `rp2` module as pulse_program needs: an assembler for its eight instructions, on CPython.

Encodings: RP2040 datasheet, section 3.4 (from memory; the emulated board compares them with what it really loads).
"""

from collections.abc import Callable
from types import FunctionType

_JMP, _OUT, _PULL, _MOV = 0x0000, 0x6000, 0x8080, 0xA000
_PINS, _X, _Y, _NULL = 0, 1, 2, 3
_X_DEC = 2
_BLOCK = 1 << 5


class PIO:
    """Names that the program's declaration uses."""

    OUT_LOW = 0
    SHIFT_RIGHT = 1


class Program:
    """Opcodes, and what was declared of pins and shifting."""

    def __init__(self, out_init: tuple[int, ...], out_shiftdir: int) -> None:
        self.opcodes: list[int] = []
        self.out_init = out_init
        self.out_shiftdir = out_shiftdir


def asm_pio(out_init: tuple[int, ...], out_shiftdir: int) -> Callable[[FunctionType], Program]:
    """Assemble the decorated function; its names exist only meanwhile."""

    def assemble(function: FunctionType) -> Program:
        labels: dict[str, int] = {}
        for _ in range(2):
            program = Program(out_init, out_shiftdir)
            names = _names(program.opcodes, labels)
            FunctionType(function.__code__, names, function.__name__, function.__defaults__)()
        return program

    return assemble


def _names(opcodes: list[int], labels: dict[str, int]) -> dict[str, object]:
    def label(name: str) -> None:
        labels[name] = len(opcodes)

    def pull(block: int) -> None:
        opcodes.append(_PULL | block)

    def out(to: int, bits: int) -> None:
        opcodes.append(_OUT | (to << 5) | (bits & 31))

    def jmp(condition: int, to: str) -> None:
        opcodes.append(_JMP | (condition << 5) | labels.get(to, 0))

    def mov(to: int, source: int) -> None:
        opcodes.append(_MOV | (to << 5) | source)

    return {
        "label": label, "pull": pull, "out": out, "jmp": jmp, "mov": mov, "block": _BLOCK, "noblock": 0,
        "pins": _PINS, "x": _X, "y": _Y, "null": _NULL, "x_dec": _X_DEC,
    }  # fmt: skip
