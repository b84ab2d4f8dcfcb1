"""Settings records as they are built from a layout file: each remembers where in the file it came from."""

from shared_protocol.codec import Codec, ValueOutOfTable, values_from
from shared_protocol.fields import NAME, Message
from shared_protocol.registry import board_reads
from sim.layout.reading import Document, Where
from sim.layout.wire_keys import owner_key

Origin = tuple[Where, dict[str, str]]

# As many as one settings transaction may announce: see the message `stage`.
MOST_RECORDS = 400


class Records:
    """The records so far, in wire order, each with its origin: its table, and the owner's key of each field."""

    def __init__(self, document: Document) -> None:
        self._document = document
        self.rows: list[tuple[Message, list[object]]] = []
        self.origins: list[Origin] = []
        self._codec = Codec(board_reads())

    def add(self, message: Message, where: Where, other_keys: dict[str, str] | None = None, **fields: object) -> None:
        """Add one record. `other_keys` where a field's key differs from the usual. Problems go into the document.

        Once something is wrong the records are of no use to anybody: nothing is added then.
        """
        if self._document.problems:
            return
        others = other_keys or {}
        keys = {field.key: others.get(field.key, owner_key(message, field.key)) for field in message.fields}
        try:
            values = values_from(message, fields)
            self._codec.body(message, values)
        except ValueOutOfTable as error:
            wrong = str(error).split(": ")[1]
            self._document.wrong(where if not keys.get(wrong) else (*where, keys[wrong]), _out_of_table(message, wrong))
            return
        self.rows.append((message, values))
        self.origins.append((where, keys))


def _out_of_table(message: Message, key: str) -> str:
    """What is wrong with a field that the wire can't carry."""
    for field in message.fields:
        if field.key == key and field.kind == NAME:
            return f"must have {field.low} to {field.high} letters"
        if field.key == key:
            return f"must lie in {field.low} to {field.high} {field.unit}".rstrip()
    return "makes a record too long for the board: use shorter names or fewer entries"
