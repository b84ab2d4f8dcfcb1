"""A small made-up firmware in two versions, and what must hold of a board's files at every moment."""

from pathlib import Path

from host.board.files import BoardFile
from shared_protocol import messages
from shared_protocol.codec import Codec
from shared_protocol.registry import board_reads, host_reads

OWN = {"slot0.txt": b"settings\n", "boot.txt": b"7", "notes/mine.txt": b"mine\n", "crash.txt": b"a crash\n"}

_SAME = [
    BoardFile("/device/__init__.mpy", b""),
    BoardFile("/device/control/__init__.mpy", b""),
]
OLD = [
    BoardFile("/boot.py", b"# coil pins low, first version\n"),
    BoardFile("/main.py", b"# device.control, first version\n"),
    *_SAME,
    BoardFile("/device/control/a.mpy", bytes(range(256)) * 3),
    BoardFile("/device/gone/b.mpy", b"not in the next version"),
    BoardFile("/shared_protocol/c.mpy", b"the same for both"),
]
NEW = [
    BoardFile("/boot.py", b"# coil pins low, second version\n"),
    BoardFile("/main.py", b"# device.control, second version\n"),
    *_SAME,
    BoardFile("/device/control/a.mpy", bytes(reversed(range(256))) * 7),
    BoardFile("/device/come/d.mpy", b"new"),
    BoardFile("/shared_protocol/c.mpy", b"the same for both"),
]


def put(files: Path, firmware: list[BoardFile]) -> None:
    """Put a whole firmware into the folder, beside what is the owner's."""
    for file in firmware:
        path = files / file.path[1:]
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(file.data)


def put_own(files: Path) -> None:
    """What is the owner's, or the board's notes."""
    for name, data in OWN.items():
        (files / name).parent.mkdir(parents=True, exist_ok=True)
        (files / name).write_bytes(data)


def own_is_there(files: Path) -> bool:
    """Nothing of the owner's was touched."""
    return all((files / name).read_bytes() == data for name, data in OWN.items())


def content(files: Path) -> dict[str, bytes]:
    """The firmware's part of the folder: path on the board to data."""
    found = {}
    for path in sorted(files.rglob("*")):
        name = "/" + path.relative_to(files).as_posix()
        if path.is_file() and (name.startswith(("/device/", "/shared_protocol/", "/boot.py", "/main.py"))):
            found[name] = path.read_bytes()
    return found


def as_dict(firmware: list[BoardFile]) -> dict[str, bytes]:
    """The same of a firmware."""
    return {file.path: file.data for file in firmware}


def startable(files: Path) -> str:
    """What a reset would start now: 'old', 'new', 'prompt'; else what is wrong."""
    there = {path: data for path, data in content(files).items() if not path.endswith(".new")}
    if "/main.py" in there:
        # An old file too many cannot be loaded by the new main.py, but it must be gone by then all the same.
        for name, firmware in (("old", OLD), ("new", NEW)):
            if there == as_dict(firmware):
                return name
        return f"a half firmware: {sorted(there)}"
    boot = there.get("/boot.py")
    if there and boot not in (as_dict(OLD)["/boot.py"], as_dict(NEW)["/boot.py"]):
        return f"files without boot.py: {sorted(there)}"
    return "prompt"


def answers(line: bytes, firmware: bytes = messages.FIRMWARE, settings: bytes = b"0A0B0C0D") -> bytes:
    """In place of the made-up firmware's loop: who the board is."""
    if not _is_hello(line):
        return b""
    values: list[object] = [messages.VERSION, firmware, b"rp2040", b"made-up", 3, settings, b"3 banks"]
    return Codec(host_reads()).encode(messages.BOARD, values)


def answers_too_old(line: bytes) -> bytes:
    """A firmware that does not speak this program's version."""
    if not _is_hello(line):
        return b""
    return Codec(host_reads()).encode(messages.WRONG_VERSION, [messages.VERSION + 1, b"9.0.0", messages.VERSION])


def _is_hello(line: bytes) -> bool:
    return any(received.message is messages.HELLO for received in Codec(board_reads()).feed(line))
