"""Whole messages to and from whole lines, for the host and for tests: may allocate."""

from shared_protocol.crc import Crc32, CrcTables
from shared_protocol.fields import INTS, NAME, WORD, Message
from shared_protocol.line import FAULTS_OF_LINES, GOOD, LineDecoder, LineWriter
from shared_protocol.reader import BAD_LINE, LINE, LONG_LINE, NOTHING, LineReader


class ValueOutOfTable(ValueError):
    """A message was to be written that the table does not allow; names message and field."""


class Received:
    """One thing that came in: a message, or text that is no message, or a bad line (`fault` says which)."""

    def __init__(self, message: "Message | None", values: "list[object]", text: bytes, fault: str) -> None:
        self.message = message
        self.values = values
        self.text = text
        self.fault = fault

    def get(self, key: str) -> object:
        """The value of a field. Raises KeyError if the message has no such field."""
        assert self.message is not None
        return self.values[self.message.position(key)]

    def number(self, key: str) -> int:
        """The value of a whole-number or word field (a word as its index)."""
        value = self.get(key)
        assert isinstance(value, int)
        return value

    def word(self, key: str) -> str:
        """The word of a word field."""
        assert self.message is not None
        return self.message.words[self.message.position(key)][self.number(key)]

    def name(self, key: str) -> str:
        """The text of a name field."""
        value = self.get(key)
        assert isinstance(value, bytes)
        return value.decode()


class Codec:
    """Writes and reads lines against one set of messages; bytes in, list of Received out."""

    def __init__(self, messages: "dict[str, Message]") -> None:
        tables = CrcTables()
        self._writer = LineWriter()
        self._crc = Crc32(tables)
        self._reader = LineReader(tables)
        self._decoder = LineDecoder(messages)

    def encode(self, message: Message, values: "list[object]") -> bytes:
        """The whole line, newline included. Raises ValueOutOfTable."""
        body = self.body(message, values)
        return body + b"*" + self.crc_text(body) + b"\n"

    def body(self, message: Message, values: "list[object]") -> bytes:
        """The JSON alone. Raises ValueOutOfTable."""
        if len(values) != len(message.keys):
            raise ValueOutOfTable("%s: %d fields" % (message.name, len(message.keys)))
        for position in range(len(message.keys)):
            if not message.fits(position, values[position]):
                raise ValueOutOfTable("%s: %s" % (message.name, message.keys[position]))
        length = self._writer.write(message, values)
        if length == 0:
            raise ValueOutOfTable("%s: too long" % message.name)
        return bytes(self._writer.buffer[:length])

    def crc_text(self, data: bytes) -> bytes:
        """CRC-32 of `data` as eight hex digits."""
        self._crc.reset()
        for byte in data:
            self._crc.add(byte)
        return self._crc.text()

    def decode_body(self, body: bytes) -> Received:
        """A body that is known to be whole (a settings slot keeps them)."""
        decoded = self._decoder.decode(body)
        return Received(
            decoded.message,
            decoded.values,
            body,
            "" if decoded.fault == GOOD else FAULTS_OF_LINES[decoded.fault],
        )

    def feed(self, data: bytes) -> "list[Received]":
        """Take some bytes; returns what they completed, in order."""
        found: "list[Received]" = []
        reader = self._reader
        for byte in data:
            result = reader.feed(byte)
            if result == NOTHING:
                continue
            text = bytes(reader.buffer[: reader.length])
            if result == LINE:
                found.append(self.decode_body(text))
            elif result == BAD_LINE:
                found.append(Received(None, [], text, "bad_crc"))
            elif result == LONG_LINE:
                found.append(Received(None, [], b"", "too_long"))
            else:
                found.append(Received(None, [], text, ""))
        return found


def values_from(message: Message, given: "dict[str, object]") -> "list[object]":
    """Values in table order from plain ones: words and names as text. Raises ValueOutOfTable naming the field."""
    for key in given:
        if not message.has(key):
            raise ValueOutOfTable("%s: %s" % (message.name, key))
    values: "list[object]" = []
    for field in message.fields:
        if field.key not in given:
            if field.default is None:
                raise ValueOutOfTable("%s: %s" % (message.name, field.key))
            values.append(field.default)
            continue
        value = given[field.key]
        if field.kind == WORD:
            if value not in field.words:
                raise ValueOutOfTable("%s: %s" % (message.name, field.key))
            value = field.words.index(value)
        elif field.kind == NAME and isinstance(value, str):
            value = value.encode()
        elif field.kind == INTS and isinstance(value, (list, tuple)):
            value = list(value)
        values.append(value)
    return values


def plain(message: Message, values: "list[object]") -> "dict[str, object]":
    """The opposite of values_from: words and names as text, in table order."""
    found: "dict[str, object]" = {}
    position = 0
    for field in message.fields:
        value = values[position]
        if field.kind == WORD:
            assert isinstance(value, int)
            value = field.words[value]
        elif field.kind == NAME:
            assert isinstance(value, bytes)
            value = value.decode()
        found[field.key] = value
        position += 1
    return found
