"""CRC-32 (ISO-HDLC, reflected polynomial EDB88320) in two 16-bit halves.

binascii.crc32 returns up to 32 bits, which MicroPython can only hold by allocating. Halves stay small integers, and
a byte at a time spreads the work over ticks. Tests hold it against binascii and published check values.
"""

from binascii import crc32

HEX = b"0123456789ABCDEF"


class CrcTables:
    """The 256-entry table of the byte-wise algorithm, split into high and low halves. Build one, share it."""

    def __init__(self) -> None:
        self.high: "list[int]" = []
        self.low: "list[int]" = []
        for index in range(256):
            high = 0
            low = index
            for _ in range(8):
                carry = low & 1
                low = (low >> 1) | ((high & 1) << 15)
                high >>= 1
                if carry:
                    high ^= 0xEDB8
                    low ^= 0x8320
            self.high.append(high)
            self.low.append(low)


class Crc32:
    """A running CRC-32. Allocates nothing after it is made."""

    def __init__(self, tables: CrcTables) -> None:
        self._table_high = tables.high
        self._table_low = tables.low
        self._high = 0xFFFF
        self._low = 0xFFFF

    def reset(self) -> None:
        """Begin a new sum."""
        self._high = 0xFFFF
        self._low = 0xFFFF

    def add(self, byte: int) -> None:
        """Take one byte (0 to 255)."""
        index = (self._low ^ byte) & 0xFF
        high = self._high
        self._low = ((self._low >> 8) | ((high & 0xFF) << 8)) ^ self._table_low[index]
        self._high = (high >> 8) ^ self._table_high[index]

    def digit(self, place: int) -> int:
        """The ASCII code of hex digit `place` (0 is the most significant of eight)."""
        half = self._high if place < 4 else self._low
        return HEX[((half ^ 0xFFFF) >> (12 - 4 * (place & 3))) & 15]

    def text(self) -> bytes:
        """All eight digits. Allocates: not for the steady loop."""
        return bytes([self.digit(place) for place in range(8)])


def crc_of(data: bytes, before: int = 0) -> int:
    """The sum of many bytes at once, going on from an earlier one: what Crc32 makes of them. Allocates."""
    return crc32(data, before)


def crc_text(crc: int) -> bytes:
    """Eight hex digits of a sum from `crc_of`. Allocates."""
    return b"%08X" % crc
