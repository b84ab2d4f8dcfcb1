"""From bytes to lines: no input or output of its own, and never an exception.

It resynchronises at the next newline. Over-long lines are dropped whole. Allocates nothing after it is made.
"""

from shared_protocol.crc import Crc32, CrcTables
from shared_protocol.line import LINE_MAX

NOTHING, LINE, BAD_LINE, TEXT, LONG_LINE = 0, 1, 2, 3, 4

_TAIL = 9  # '*' and eight digits


class LineReader:
    """Takes bytes one at a time.

    `feed` returns NOTHING until a newline; then LINE (a body whose CRC is right), BAD_LINE (like a message, but CRC or
    form is wrong), TEXT (something else was printed) or LONG_LINE. Until the next byte is fed, `buffer[:length]` is the
    body of a LINE, or the text.
    """

    def __init__(self, tables: CrcTables) -> None:
        self.buffer = bytearray(LINE_MAX)
        self.length = 0
        self._count = 0
        self._too_long = False
        self._ended = False
        self._crc = Crc32(tables)

    def feed(self, byte: int) -> int:
        """Take one byte (0 to 255)."""
        if self._ended:
            self._begin()
        if byte == 10:
            self._ended = True
            return self._finish()
        if self._count >= LINE_MAX - 1:
            self._too_long = True
            return NOTHING
        count = self._count
        self.buffer[count] = byte
        if count >= _TAIL:
            self._crc.add(self.buffer[count - _TAIL])
        self._count = count + 1
        return NOTHING

    def _begin(self) -> None:
        self._ended = False
        self._too_long = False
        self._count = 0
        self.length = 0
        self._crc.reset()

    def _finish(self) -> int:
        count = self._count
        if self._too_long:
            self.length = 0
            return LONG_LINE
        buffer = self.buffer
        self.length = count
        if count == 0 or buffer[0] != 123:
            return TEXT
        if count <= _TAIL or buffer[count - _TAIL] != 42:
            return BAD_LINE
        place = 0
        while place < 8:
            if buffer[count - 8 + place] != self._crc.digit(place):
                return BAD_LINE
            place += 1
        self.length = count - _TAIL
        return LINE
