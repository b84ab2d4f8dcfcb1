"""What a message is made of: fields with a kind, a range, a unit and one sentence.

Runs on CPython and MicroPython. A board keeps no sentences in memory: it drops them while the table is built.
"""

import json

INT = 0
WORD = 1
NAME = 2
INTS = 3

KIND_NAMES = ("whole number", "word", "name", "list of whole numbers")

# Integers on the wire stay below 2**30, so that no interpreter has to allocate for them.
INT_MAX = 999_999_999
NAME_MAX = 24

# Only CPython's json has this; a board needs no sentences, and its memory is small.
KEEPS_TEXTS = hasattr(json, "JSONDecoder")


class Field:
    """One field of a message.

    kind: INT, WORD (value is the index in `words`), NAME (ASCII bytes), INTS (list).
    low, high: range of the number, of each number of a list, or of the length of a name (bytes).
    most: longest list. unit, text: for people; empty on a board.
    """

    # What most fields do not have: kept once, in the class. A board has some 180 fields and little memory.
    words: "tuple[str, ...]" = ()
    word_bytes: "tuple[bytes, ...]" = ()
    most = 0
    default: "int | None" = None
    unit = ""
    text = ""

    def __init__(self, key: str, kind: int, low: int, high: int) -> None:
        self.key = key
        self.kind = kind
        self.low = low
        self.high = high
        # With the comma before it: a message's name comes first.
        self.prefix = b',"' + key.encode() + b'":'

    def explained(self, unit: str, text: str) -> "Field":
        """Keep unit and sentence, where there is memory for them."""
        if KEEPS_TEXTS:
            self.unit = unit
            self.text = text
        return self


def whole(key: str, low: int, high: int, unit: str, text: str, default: "int | None" = None) -> Field:
    """A whole number field."""
    field = Field(key, INT, low, high).explained(unit, text)
    if default is not None:
        field.default = default
    return field


def word(key: str, words: "tuple[str, ...]", text: str, default: "int | None" = None) -> Field:
    """A field that holds one of some fixed ASCII words."""
    field = Field(key, WORD, 0, len(words) - 1).explained("", text)
    field.words = words
    field.word_bytes = tuple([b'"' + each.encode() + b'"' for each in words])
    if default is not None:
        field.default = default
    return field


def name(key: str, text: str, high: int = NAME_MAX, low: int = 0) -> Field:
    """A short printable ASCII text without quote and backslash."""
    return Field(key, NAME, low, high).explained("bytes", text)


def numbers(key: str, low: int, high: int, most: int, text: str) -> Field:
    """A list of at most `most` whole numbers."""
    field = Field(key, INTS, low, high).explained("", text)
    field.most = most
    return field


def name_is_plain(value: bytes) -> bool:
    """Printable ASCII without quote and backslash, so that no escape ever occurs on the wire."""
    for byte in value:
        if byte < 32 or byte > 126 or byte == 34 or byte == 92:
            return False
    return True


def value_fits(field: Field, value: object) -> bool:
    """True if `value` (as kept in memory: see Field) is of the kind and in the range of `field`."""
    kind = field.kind
    if kind == NAME:
        return isinstance(value, bytes) and field.low <= len(value) <= field.high and name_is_plain(value)
    if kind == INTS:
        if not isinstance(value, list) or len(value) > field.most:
            return False
        for number in value:
            if not is_whole(number) or not field.low <= number <= field.high:
                return False
        return True
    if not is_whole(value):
        return False
    assert isinstance(value, int)
    return field.low <= value <= field.high


def is_whole(value: object) -> bool:
    """A whole number: JSON's true and false are not numbers, though Python says they are."""
    return isinstance(value, int) and not isinstance(value, bool)


class Message:
    """One kind of message: its name on the wire, its fields in order, what it is for.

    `kept` messages carry a number `q` as their first field; the board sends them again until acknowledged.
    """

    text = ""

    def __init__(self, name: str, fields: "tuple[Field, ...]", text: str, kept: bool = False) -> None:
        self.name = name
        self.fields = fields
        self.kept = kept
        self.prefix = b'{"m":"' + name.encode() + b'"'
        if KEEPS_TEXTS:
            self.text = text

    def position(self, key: str) -> int:
        """The place of the field `key`. Raises KeyError if there is none."""
        place = 0
        for field in self.fields:
            if field.key == key:
                return place
            place += 1
        raise KeyError(key)

    def has(self, key: str) -> bool:
        """True if there is such a field."""
        for field in self.fields:
            if field.key == key:
                return True
        return False
