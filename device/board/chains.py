"""Shift registers: an output chain (74HC595 class) for coils and followers, an input chain (74HC165 class).

Both are shifted by the machine's own SoftSPI with the clock resting high: a bit is read before the edge that moves it.
"""

TYPE_CHECKING = False
if TYPE_CHECKING:
    from typing import Any

SHIFT_HZ = 1_000_000
_EIGHT = 8


def chips(outputs: int) -> int:
    """How many chips hold so many places."""
    return (outputs + _EIGHT - 1) // _EIGHT


class OutputChain:
    """All chips in a row: each bank's part in order, then the followers' (those in the first bank's latch).

    Nothing is switched here: a bank's part drives coils only while its output enable is on, and that is PIO's.
    """

    def __init__(self, machine: "Any", pins: "list[int]", parts: "list[int]", latches: "list[int]") -> None:
        """pins: data, clock, read-back. parts: places of each part; latches: the pin that takes it over, in order."""
        data, clock, back = pins
        pin = machine.Pin
        self._spi = machine.SoftSPI(
            baudrate=SHIFT_HZ, polarity=1, phase=0, sck=pin(clock), mosi=pin(data), miso=pin(back)
        )
        self._first: "list[int]" = []
        count = 0
        for places in parts:
            self._first.append(count)
            count += chips(places)
        self._latches = [pin(latch, pin.OUT, value=0) for latch in latches]
        # The byte that is sent first goes furthest.
        self._wanted = bytearray(count)
        self._back = bytearray(count)
        self.bad = 0

    def put(self, part: int, group: int, bits: int, length: int) -> None:
        """Set the bits that are to go to a part, from place 24 * group on; `length` is the part's (steady)."""
        wanted = self._wanted
        chip = self._first[part] + 3 * group
        last = self._first[part] + chips(length)
        for _ in range(3):
            if chip < last:
                wanted[len(wanted) - 1 - chip] = bits & 255
            bits >>= 8
            chip += 1

    def clear(self, part: int, length: int) -> None:
        """No bit of a part is to be set (steady)."""
        for chip in range(self._first[part], self._first[part] + chips(length)):
            self._wanted[len(self._wanted) - 1 - chip] = 0

    def shift(self) -> bool:
        """Send all bits, twice: what comes back the second time must be what went out. True if it is (steady)."""
        self._spi.write_readinto(self._wanted, self._back)
        self._spi.write_readinto(self._wanted, self._back)
        if self._back != self._wanted:
            self.bad += 1
            return False
        return True

    def take_over(self, part: int) -> None:
        """Let a part's outputs become what was shifted (steady)."""
        latch = self._latches[part]
        latch.value(1)
        latch.value(0)


class FollowerChain:
    """An output chain with followers alone: nothing to read back, so its third pin is the latch."""

    def __init__(self, machine: "Any", pins: "list[int]", places: int) -> None:
        data, clock, latch = pins
        pin = machine.Pin
        # SoftSPI wants a pin to read: it gets the latch pin, which becomes an output again after it.
        self._spi = machine.SoftSPI(
            baudrate=SHIFT_HZ, polarity=1, phase=0, sck=pin(clock), mosi=pin(data), miso=pin(latch)
        )
        self._latch = pin(latch, pin.OUT, value=0)
        self._wanted = bytearray(chips(places))

    def write(self, low: int, high: int) -> None:
        """Places 0 to 23 and 24 to 47 (steady)."""
        wanted = self._wanted
        last = len(wanted) - 1
        for chip in range(len(wanted)):
            bits = low if chip < 3 else high
            wanted[last - chip] = (bits >> (8 * (chip if chip < 3 else chip - 3))) & 255
        self._spi.write(wanted)
        self._latch.value(1)
        self._latch.value(0)


class InputChain:
    """Reads contacts and buttons: a contact that is closed pulls its place low."""

    def __init__(self, machine: "Any", pins: "list[int]", places: int) -> None:
        """pins: data, clock, load."""
        data, clock, load = pins
        pin = machine.Pin
        # SoftSPI wants a pin to write to: it gets the load pin, and writes ones, which leave it at rest.
        self._spi = machine.SoftSPI(
            baudrate=SHIFT_HZ, polarity=1, phase=0, sck=pin(clock), mosi=pin(load), miso=pin(data)
        )
        self._load = pin(load, pin.OUT, value=1)
        self._bytes = bytearray(chips(places))

    def read(self) -> None:
        """Take all places in (steady)."""
        self._load.value(0)
        self._load.value(1)
        self._spi.readinto(self._bytes, 255)

    def closed(self, first: int) -> int:
        """24 places from `first`, a multiple of 8, as of the last `read`: 1 is closed (steady)."""
        bits = 0
        chip = first >> 3
        for shift in range(0, 24, 8):
            if chip < len(self._bytes):
                bits |= (self._bytes[chip] ^ 255) << shift
            chip += 1
        return bits
