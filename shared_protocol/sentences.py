"""The sentences of the tables, read from the docstrings of the modules that hold the tables. Not for boards.

A section is `NAME: sentence`; in it a line `    KEY [UNIT]: sentence`; a line indented further goes on with the one
above.
"""

import re

from shared_protocol import words
from shared_protocol.fields import Message

_HEAD = re.compile(r"^([a-z_0-9]+):(?: (.*))?$")
_ROW = re.compile(r"^    ([a-z_0-9]+)(?: \[([^\]]*)\])?: (.*)$")
EVERYWHERE = "everywhere"

Section = tuple[str, dict[str, tuple[str, str]]]


class SentenceMissing(ValueError):
    """A message, field or word has no sentence; names it."""


def sections(docstring: str) -> dict[str, Section]:
    """Name -> its sentence, and of each key the unit and sentence."""
    found: dict[str, Section] = {}
    rows: dict[str, tuple[str, str]] = {}
    last = ""
    for line in docstring.splitlines():
        head = _HEAD.match(line)
        row = _ROW.match(line)
        if head:
            rows = {}
            found[head[1]] = (head[2] or "", rows)
        elif row and found:
            last = row[1]
            rows[last] = (row[2] or "", row[3])
        elif line.startswith("        ") and last in rows:
            rows[last] = (rows[last][0], f"{rows[last][1]} {line.strip()}")
    return found


def attach(docstring: str, messages: tuple[Message, ...]) -> None:
    """Give messages and their fields sentences and units. Raises SentenceMissing."""
    found = sections(docstring)
    common = found.get(EVERYWHERE, ("", {}))[1]
    for message in messages:
        if message.name not in found:
            raise SentenceMissing(message.name)
        text, rows = found[message.name]
        message.text = text
        for field in message.fields:
            row = rows.get(field.key, common.get(field.key))
            if row is None:
                raise SentenceMissing(f"{message.name}: {field.key}")
            field.unit, field.text = row


def _columns(section: str, names: tuple[str, ...], count: int) -> list[list[str]]:
    """The texts of words, divided by bars, in the order of their numbers. Raises SentenceMissing."""
    rows = sections(words.__doc__ or "")[section][1]
    table = []
    for name in names:
        if name not in rows:
            raise SentenceMissing(f"{section}: {name}")
        parts = [part.strip() for part in rows[name][1].split("|")]
        table.append(parts + [""] * (count - len(parts)))
    return table


_REASONS = _columns("reason", words.REASONS, 2)
REASON_TEXTS = tuple(row[0] for row in _REASONS)
REASON_REMEDIES = tuple(row[1] for row in _REASONS)
# Of each fault: word, what happened, what to do, its first and its second evidence.
FAULT_TEXTS = tuple(
    (name, row[0], row[1], row[2], row[3])
    for name, row in zip(words.FAULTS, _columns("fault", words.FAULTS, 4), strict=True)
)
