"""What a message is made of: fields with a kind, a range, a unit and one sentence.

Runs on CPython and MicroPython. A board has little memory: of its messages it keeps only columns of keys, kinds and
ranges; the Field objects are made while a table is read, and sentences stand in docstrings, which its compiler drops.
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

# Only CPython's json has this: a board neither keeps Field objects nor sentences.
KEEPS_FIELDS = hasattr(json, "JSONDecoder")


class Field:
    """One field of a message.

    kind: INT, WORD (value is the index in `words`), NAME (ASCII bytes), INTS (list).
    low, high: range of the number, of each number of a list, or of the length of a name (bytes).
    most: longest list. default: value if none is given. unit, text: for people; empty on a board.
    """

    unit = ""
    text = ""

    def __init__(
        self,
        key: str,
        kind: int,
        low: int,
        high: int,
        words: "tuple[str, ...]" = (),
        most: int = 0,
        default: "int | None" = None,
    ) -> None:
        self.key = key
        self.kind = kind
        self.low = low
        self.high = high
        self.words = words
        self.most = most
        self.default = default


def whole(key: str, low: int, high: int, default: "int | None" = None) -> Field:
    """A whole number field."""
    return Field(key, INT, low, high, (), 0, default)


def word(key: str, words: "tuple[str, ...]", default: "int | None" = None) -> Field:
    """A field that holds one of some fixed ASCII words."""
    return Field(key, WORD, 0, len(words) - 1, words, 0, default)


def name(key: str, high: int = NAME_MAX, low: int = 0) -> Field:
    """A short printable ASCII text without quote and backslash."""
    return Field(key, NAME, low, high)


def numbers(key: str, low: int, high: int, most: int) -> Field:
    """A list of at most `most` whole numbers."""
    return Field(key, INTS, low, high, (), most)


def name_is_plain(value: bytes) -> bool:
    """Printable ASCII without quote and backslash, so that no escape ever occurs on the wire."""
    for byte in value:
        if byte < 32 or byte > 126 or byte == 34 or byte == 92:
            return False
    return True


def is_whole(value: object) -> bool:
    """A whole number: JSON's true and false are not numbers, though Python says they are."""
    return isinstance(value, int) and not isinstance(value, bool)


class Message:
    """One kind of message: its name on the wire, its fields in order, column by column.

    `kept` messages carry a number `q` as their first field; the board sends them again until acknowledged.
    """

    text = ""
    kept = False
    # Columns that most messages do without are made only where they say something.
    words: "tuple[tuple[str, ...], ...]" = ()
    mosts = b""
    defaults: "tuple[int | None, ...]" = ()
    _fields: "tuple[Field, ...]" = ()
    # What the writer puts before each value, and the words in quotes: made once for what a board sends.
    prefixes: "tuple[bytes, ...]" = ()
    quoted: "tuple[tuple[bytes, ...], ...]" = ()

    def __init__(self, name: str, fields: "tuple[Field, ...]", kept: bool = False) -> None:
        self.name = name
        self.keys = tuple([field.key for field in fields])
        self.kinds = bytes([field.kind for field in fields])
        self.lows = tuple([field.low for field in fields])
        self.highs = tuple([field.high for field in fields])
        if kept:
            self.kept = kept
        if WORD in self.kinds:
            self.words = tuple([field.words for field in fields])
        if INTS in self.kinds:
            self.mosts = bytes([field.most for field in fields])
        defaults = tuple([field.default for field in fields])
        if any([default is not None for default in defaults]):
            self.defaults = defaults
        if KEEPS_FIELDS:
            self._fields = fields

    @property
    def fields(self) -> "tuple[Field, ...]":
        """The fields in order. On a board they are made anew: for tests."""
        if self._fields or not self.keys:
            return self._fields
        made = []
        for at in range(len(self.keys)):
            made.append(
                Field(
                    self.keys[at],
                    self.kinds[at],
                    self.lows[at],
                    self.highs[at],
                    self.words[at] if self.words else (),
                    self.mosts[at] if self.mosts else 0,
                    self.defaults[at] if self.defaults else None,
                )
            )
        return tuple(made)

    def position(self, key: str) -> int:
        """The place of the field `key`. Raises KeyError if there is none."""
        place = 0
        for own in self.keys:
            if own == key:
                return place
            place += 1
        raise KeyError(key)

    def has(self, key: str) -> bool:
        """True if there is such a field."""
        return key in self.keys

    def fits(self, at: int, value: object) -> bool:
        """True if `value` (as kept in memory: see Field) is of the kind and in the range of field number `at`."""
        kind = self.kinds[at]
        low = self.lows[at]
        high = self.highs[at]
        if kind == NAME:
            return isinstance(value, bytes) and low <= len(value) <= high and name_is_plain(value)
        if kind == INTS:
            if not isinstance(value, list) or len(value) > self.mosts[at]:
                return False
            for number in value:
                if not is_whole(number) or not low <= number <= high:
                    return False
            return True
        if not is_whole(value):
            return False
        assert isinstance(value, int)
        return low <= value <= high

    def lead(self, at: int) -> bytes:
        """What is written before the value of field number `at`. Allocates."""
        return b',"' + self.keys[at].encode() + b'":'

    def begin(self) -> bytes:
        """What a message begins with. Allocates."""
        return b'{"m":"' + self.name.encode() + b'"'

    def prepare(self, known: "list[tuple[tuple[str, ...], tuple[bytes, ...]]]") -> None:
        """Make what the writer needs, so that writing allocates nothing. `known`: words that are in quotes already."""
        self.prefixes = tuple([self.begin()] + [self.lead(at) for at in range(len(self.keys))])
        if self.words:
            self.quoted = tuple([quoted(words, known) for words in self.words])


def quoted(words: "tuple[str, ...]", known: "list[tuple[tuple[str, ...], tuple[bytes, ...]]]") -> "tuple[bytes, ...]":
    """The words in quotes; equal tables are kept once."""
    for plain, ready in known:
        if plain is words:
            return ready
    ready = tuple([b'"' + each.encode() + b'"' for each in words])
    known.append((words, ready))
    return ready


def explain(sentences: "str | None", messages: "tuple[Message, ...]") -> None:
    """Give the messages their sentences, where there is memory for them."""
    if KEEPS_FIELDS:
        from shared_protocol.sentences import attach

        attach(sentences or "", messages)
