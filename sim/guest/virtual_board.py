"""A board whose hardware is simulated: the seam over three preallocated buffers.

Runs unchanged on CPython and MicroPython. Between two ticks `exchange` is called once: time passes in the world, which
takes what this board wants and tells how things are. Within a tick nothing moves. On MicroPython the heap is locked
from `before_tick` to `after_tick`, so a tick that allocates fails.
"""

import array

from device.board.seam import Board
from device.board.slots import FileSlots
from sim.guest import exchange as at

try:
    import gc

    from micropython import heap_lock, heap_unlock  # type: ignore[import-not-found,unused-ignore]

    ON_MICROPYTHON = True
except ImportError:
    ON_MICROPYTHON = False

    def heap_lock() -> None:
        """CPython has no such lock."""

    def heap_unlock() -> None:
        """CPython has no such lock."""


def no_exchange() -> None:
    """Stands where the exchange will be set."""
    raise NotImplementedError


class VirtualBoard(Board):
    """See the seam. `slots` keeps lines in slots (see MemorySlots, FileSlots)."""

    kind = b"virtual"
    caps = b"3 banks"

    def __init__(self, slots: "MemorySlots | FileSlots", uid: bytes, boot: int) -> None:
        self.io = array.array("i", [0] * at.WORDS)
        self.rx = bytearray(at.RX_BYTES)
        self.tx = bytearray(at.TX_BYTES)
        self.exchange = no_exchange
        self.uid = uid
        self.boot = boot
        self._slots = slots

    def configure(self, settings: object) -> None:
        """The world takes the settings from the slots when it hears of it; its wiring it has from the layout file."""
        self.io[at.CONFIGURED] = 1

    def before_tick(self, due_us: int) -> None:
        self.io[at.DUE_US] = due_us
        self.exchange()
        heap_lock()

    def after_tick(self) -> None:
        heap_unlock()

    def collect(self) -> None:
        """Collect garbage, on MicroPython, and tell how much of the heap is in use."""
        if ON_MICROPYTHON:
            gc.collect()
            self.io[at.HEAP_USED] = gc.mem_alloc()  # type: ignore[attr-defined,unused-ignore]

    def ticks_us(self) -> int:
        return self.io[at.TICKS_US]

    def ticks_ms(self) -> int:
        return self.io[at.TICKS_MS]

    def bank_low_mv(self, bank: int) -> int:
        return self.io[at.BANKS_IN + bank * at.BANK_IN_WORDS + at.LOW_MV]

    def bank_mean_mv(self, bank: int) -> int:
        return self.io[at.BANKS_IN + bank * at.BANK_IN_WORDS + at.MEAN_MV]

    def bank_last_mv(self, bank: int) -> int:
        return self.io[at.BANKS_IN + bank * at.BANK_IN_WORDS + at.LAST_MV]

    def bank_age_us(self, bank: int) -> int:
        return self.io[at.BANKS_IN + bank * at.BANK_IN_WORDS + at.AGE_US]

    def pulse_running(self, bank: int) -> bool:
        return self.io[at.BANKS_IN + bank * at.BANK_IN_WORDS + at.RUNNING] != 0

    def start_pulse(self, bank: int, group: int, mask: int, width_us: int) -> bool:
        running = at.BANKS_IN + bank * at.BANK_IN_WORDS + at.RUNNING
        if self.io[running] or mask == 0 or width_us < 3 or width_us > 65_535:
            return False
        place = at.BANKS_OUT + bank * at.BANK_OUT_WORDS
        self.io[place + at.GROUP] = group
        self.io[place + at.MASK] = mask
        self.io[place + at.WIDTH_US] = width_us
        self.io[running] = 1
        return True

    def charge(self, bank: int, on: bool) -> None:
        bits = self.io[at.CHARGE] | (1 << bank)
        self.io[at.CHARGE] = bits ^ (1 << bank) if on else bits

    def inputs(self, word: int) -> int:
        return self.io[at.INPUTS + word]

    def followers(self, word: int, bits: int) -> None:
        self.io[at.FOLLOWERS + word] = bits

    def read_byte(self) -> int:
        taken = self.io[at.RX_TAKEN]
        if taken >= self.io[at.RX_COUNT]:
            return -1
        self.io[at.RX_TAKEN] = taken + 1
        return self.rx[taken]

    def write_byte(self, byte: int) -> bool:
        count = self.io[at.TX_COUNT]
        if count >= self.io[at.TX_ROOM]:
            return False
        self.tx[count] = byte
        self.io[at.TX_COUNT] = count + 1
        return True

    def slot_rewind(self, slot: int) -> bool:
        return self._slots.rewind(slot)

    def slot_line(self) -> bytes:
        return self._slots.line()

    def slot_begin(self, slot: int) -> bool:
        self.io[at.FLASHED] += 1
        return self._slots.begin(slot)

    def slot_write(self, line: bytes) -> bool:
        self.io[at.WROTE] = 1
        return self._slots.write(line)

    def slot_end(self) -> bool:
        self.io[at.FLASHED] += 1
        return self._slots.end()

    def slot_append(self, slot: int, line: bytes) -> bool:
        self.io[at.FLASHED] += 1
        return self._slots.append(slot, line)

    def feed_watchdog(self) -> None:
        self.io[at.FED] += 1

    def reset(self) -> None:
        self.io[at.RESET] = 1


class MemorySlots:
    """Slots in memory: `kept` outlives the board, as flash does."""

    def __init__(self, kept: "dict[int, list[bytes]]") -> None:
        self._kept = kept
        self._open = 0
        self._reading: "list[bytes]" = []

    def rewind(self, slot: int) -> bool:
        """Begin to read a slot."""
        self._reading = list(self._kept.get(slot, []))
        return slot in self._kept

    def line(self) -> bytes:
        """Its next line, empty at the end."""
        return self._reading.pop(0) if self._reading else b""

    def begin(self, slot: int) -> bool:
        """Empty a slot and write to it."""
        self._kept[slot] = []
        self._open = slot
        return True

    def write(self, line: bytes) -> bool:
        """Append to the slot that is open."""
        self._kept[self._open].append(line)
        return True

    def end(self) -> bool:
        """Close it."""
        return True

    def append(self, slot: int, line: bytes) -> bool:
        """Append to a closed slot."""
        self._kept.setdefault(slot, []).append(line)
        return True
