"""A flash chip in memory whose power fails at a chosen program or erase, in one of the ways in which that happens."""

import random

from littlefs import LittleFS
from littlefs.context import UserContext

BLOCK, BLOCKS, PROGRAM = 4096, 24, 256
BEFORE, PARTIAL, HALF = "before", "partial", "half erased"
WAYS = (BEFORE, PARTIAL, HALF)


class CutFlash(UserContext):
    """`data` is what the chip holds: from the cut on it stands still, while the program goes on with its own picture.

    cut_at counts programs and erases from 1; None: no cut. `steps`: how many there were.
    """

    def __init__(self, data: bytes | None = None, cut_at: int | None = None, way: str = BEFORE) -> None:
        super().__init__(BLOCK * BLOCKS)
        self.data = bytearray(data if data is not None else b"\xff" * (BLOCK * BLOCKS))
        self._seen = bytearray(self.data)
        self.cut_at = cut_at
        self.way = way
        self.steps = 0
        self.erases = 0
        self.dead = False
        self._draw = random.Random(cut_at or 0)

    def read(self, cfg: object, block: int, off: int, size: int) -> bytearray:
        """What the program sees."""
        return self._seen[block * BLOCK + off : block * BLOCK + off + size]

    def prog(self, cfg: object, block: int, off: int, data: bytes) -> int:
        """Bits go from 1 to 0; a cut leaves some of the bytes, the last of them with some bits not yet cleared."""
        start = block * BLOCK + off
        self._seen[start : start + len(data)] = data
        if self.dead:
            return 0
        self.steps += 1
        self.dead = self.steps == self.cut_at
        count = len(data)
        if self.dead:
            count = 0 if self.way == BEFORE else self._draw.randrange(len(data))
        self.data[start : start + count] = data[:count]
        if self.dead and self.way != BEFORE:
            self.data[start + count] = data[count] | self._draw.randrange(256)
        return 0

    def erase(self, cfg: object, block: int) -> int:
        """All bits to 1; a cut leaves a part of the block as it was, and rubbish between."""
        start = block * BLOCK
        self._seen[start : start + BLOCK] = b"\xff" * BLOCK
        self.erases += 1
        if self.dead:
            return 0
        self.steps += 1
        self.dead = self.steps == self.cut_at
        if not self.dead:
            self.data[start : start + BLOCK] = b"\xff" * BLOCK
        elif self.way != BEFORE:
            edge = self._draw.randrange(64, BLOCK - 64)
            self.data[start : start + edge] = b"\xff" * edge
            if self.way == HALF:
                self.data[start + edge : start + edge + 64] = self._draw.randbytes(64)
        return 0

    def sync(self, cfg: object) -> int:
        """Nothing is held back."""
        return 0


def mounted(flash: CutFlash, fresh: bool = False) -> LittleFS:
    """The file system on a chip, as MicroPython lays it out there: blocks of 4096, programs of 256 (from memory)."""
    fs = LittleFS(
        context=flash, block_size=BLOCK, block_count=BLOCKS, read_size=32, prog_size=PROGRAM, cache_size=1024,
        lookahead_size=32, mount=False,
    )  # fmt: skip
    if fresh:
        fs.format()
    fs.mount()
    return fs
