"""One line of the wire: compact JSON, '*', the CRC-32 of the JSON in eight hex digits, newline.

There is one way to write each message, and one function that writes it. A reader accepts exactly that: what json reads
is checked against the table, written again and compared, so nothing that a lax JSON parser lets through can pass.
"""

import json

from shared_protocol.fields import INT, INTS, NAME, WORD, Message

LINE_MAX = 240
BODY_MAX = LINE_MAX - 10  # '*', eight digits, newline

# Why a line was not taken. 0 means it was.
GOOD, BAD_CRC, BAD_JSON, UNKNOWN_MESSAGE, BAD_FIELDS, NOT_CANONICAL, TOO_LONG = 0, 1, 2, 3, 4, 5, 6
FAULTS_OF_LINES = (
    "good",
    "bad_crc",
    "bad_json",
    "unknown_message",
    "bad_fields",
    "not_canonical",
    "too_long",
)


class LineWriter:
    """Writes message bodies into a buffer of its own. Allocates nothing after it is made.

    After `write`, `buffer[:length]` is the body. `length` is 0 if it did not fit.
    """

    def __init__(self) -> None:
        self.buffer = bytearray(BODY_MAX)
        self.length = 0

    def write(self, message: Message, values: "list[object]") -> int:
        """Write `message` with `values` (in table order, see fields.Field). Returns the length, 0 if too long."""
        self.length = 0
        # What a board sends is prepared; what it only reads is put together here, for the comparison (that allocates).
        prefixes = message.prefixes
        fits = self._bytes(prefixes[0] if prefixes else message.begin())
        position = 0
        for kind in message.kinds:
            value = values[position]
            fits = fits and self._bytes(prefixes[position + 1] if prefixes else message.lead(position))
            if kind == INT:
                fits = fits and self._int(value)  # type: ignore[arg-type]
            elif kind == WORD:
                fits = fits and self._word(message, position, value)  # type: ignore[arg-type]
            elif kind == NAME:
                fits = fits and self._byte(34) and self._bytes(value) and self._byte(34)  # type: ignore[arg-type]
            else:
                fits = fits and self._ints(value)  # type: ignore[arg-type]
            position += 1
        if not (fits and self._byte(125)):
            self.length = 0
        return self.length

    def _word(self, message: Message, position: int, number: int) -> bool:
        if message.quoted:
            return self._bytes(message.quoted[position][number])
        return self._byte(34) and self._bytes(message.words[position][number].encode()) and self._byte(34)

    def _byte(self, byte: int) -> bool:
        if self.length >= BODY_MAX:
            return False
        self.buffer[self.length] = byte
        self.length += 1
        return True

    def _bytes(self, text: bytes) -> bool:
        place = self.length
        if place + len(text) > BODY_MAX:
            return False
        buffer = self.buffer
        for byte in text:
            buffer[place] = byte
            place += 1
        self.length = place
        return True

    def _int(self, number: int) -> bool:
        if number < 0:
            if not self._byte(45):
                return False
            number = -number
        place = self.length + 1
        rest = number // 10
        while rest:
            place += 1
            rest //= 10
        if place > BODY_MAX:
            return False
        self.length = place
        buffer = self.buffer
        while True:
            place -= 1
            buffer[place] = 48 + number % 10
            number //= 10
            if number == 0:
                return True

    def _ints(self, numbers: "list[int]") -> bool:
        if not self._byte(91):
            return False
        first = True
        for number in numbers:
            if not first and not self._byte(44):
                return False
            first = False
            if not self._int(number):
                return False
        return self._byte(93)


class Decoded:
    """What came of one body: `fault` is GOOD and message and values are set, or `fault` says why not."""

    def __init__(self, fault: int, message: "Message | None", values: "list[object]") -> None:
        self.fault = fault
        self.message = message
        self.values = values


class LineDecoder:
    """Decodes bodies against one set of messages. Never raises for bad input."""

    def __init__(self, messages: "dict[str, Message]") -> None:
        self._messages = messages
        self._writer = LineWriter()

    def decode(self, body: bytes) -> Decoded:
        """Decode one body (the JSON, without '*', digits and newline)."""
        try:
            read = json.loads(body)
        except Exception:  # json raises various things on the two interpreters; all mean the same
            return Decoded(BAD_JSON, None, [])
        if not isinstance(read, dict):
            return Decoded(BAD_JSON, None, [])
        name = read.get("m")
        message = self._messages.get(name) if isinstance(name, str) else None
        if message is None:
            return Decoded(UNKNOWN_MESSAGE, None, [])
        if len(read) != len(message.keys) + 1:
            return Decoded(BAD_FIELDS, message, [])
        values: "list[object]" = []
        for position in range(len(message.keys)):
            kind = message.kinds[position]
            words = message.words[position] if kind == WORD else ()
            value = in_memory(kind, words, read.get(message.keys[position]))
            if not message.fits(position, value):
                return Decoded(BAD_FIELDS, message, [])
            values.append(value)
        length = self._writer.write(message, values)
        if self._writer.buffer[:length] != body:
            return Decoded(NOT_CANONICAL, message, [])
        return Decoded(GOOD, message, values)


def in_memory(kind: int, words: "tuple[str, ...]", value: object) -> object:
    """A value as json gives it, turned into what is kept in memory; None if that can't be."""
    if kind == WORD:
        return words.index(value) if isinstance(value, str) and value in words else None
    if kind == NAME:
        if not isinstance(value, str):
            return None
        return value.encode()
    if kind == INTS and not isinstance(value, list):
        return None
    return value
