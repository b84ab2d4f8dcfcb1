"""What differs between two sets of settings records: old and new, field by field, in the owner's names."""

from dataclasses import dataclass

from shared_protocol import settings_table as table
from shared_protocol.codec import plain
from shared_protocol.fields import Message

Records = list[tuple[Message, list[object]]]

# What names a record of each kind for people; the others are the only one of their kind.
_WHAT = {
    table.SET_BOARD.name: "board",
    table.SET_TIMING.name: "timing",
    table.SET_IO.name: "inputs and outputs",
    table.SET_BANK.name: "bank",
    table.SET_CHARGE.name: "charge path of bank",
    table.SET_MOTOR.name: "motor",
    table.SET_JUNCTION.name: "junction",
    table.SET_LIE.name: "lie",
    table.SET_ROUTE.name: "route",
    table.SET_BUTTON.name: "button",
    table.SET_FOLLOWER.name: "follower",
}


@dataclass(frozen=True)
class Difference:
    """One field that differs. `record` in the owner's names; `field` '' and `old` or `new` None: a whole record.

    Values are plain: words and names as text. `unit` is the field's unit, perhaps ''.
    """

    record: str
    field: str
    old: object
    new: object
    unit: str = ""

    def __str__(self) -> str:
        if not self.field:
            return f"{self.record}: {'added' if self.old is None else 'removed'}"
        return f"{self.record}: {self.field}: {_shown(self.old, self.unit)} -> {_shown(self.new, self.unit)}"


def differences(old: Records, new: Records) -> list[Difference]:
    """Field by field, in the order of `new`; what only `old` has comes last."""
    names = _junction_names(old) | _junction_names(new)
    before = {_key(message, values): (message, values) for message, values in old}
    found = []
    for message, values in new:
        key = _key(message, values)
        label = record_label(message, values, names)
        if key in before:
            found += _fields(label, message, before.pop(key)[1], values)
        else:
            found.append(Difference(label, "", None, "record"))
    for message, values in before.values():
        found.append(Difference(record_label(message, values, names), "", "record", None))
    return found


def label_of(records: Records, number: int) -> str:
    """The record `number` (from 0) in the owner's names; '' if there is none."""
    if not 0 <= number < len(records):
        return ""
    return record_label(*records[number], _junction_names(records))


def record_label(message: Message, values: list[object], junction_names: dict[object, object]) -> str:
    """A record in the owner's names, counted from 1: 'bank East', 'Yard throat, lie normal', 'motor 3'."""
    fields = plain(message, values)
    what = _WHAT.get(message.name, message.name)
    if message is table.SET_LIE:
        junction = junction_names.get(fields["j"]) or f"junction {_from_one(fields['j'])}"
        return f"{junction}, lie {fields['name']}"
    if message is table.SET_JUNCTION:
        return str(fields["name"] or f"junction {_from_one(fields['i'])}")
    if "i" not in fields:
        return what
    return f"{what} {fields.get('name') or _from_one(fields['i'])}"


def _fields(label: str, message: Message, old: list[object], new: list[object]) -> list[Difference]:
    before, after = plain(message, old), plain(message, new)
    return [
        Difference(label, field.key, before[field.key], after[field.key], field.unit if field.unit != "bytes" else "")
        for field in message.fields
        if before[field.key] != after[field.key]
    ]


def _key(message: Message, values: list[object]) -> tuple[object, ...]:
    fields = plain(message, values)
    return (message.name, fields.get("j") if message is table.SET_LIE else None, fields.get("i"))


def _junction_names(records: Records) -> dict[object, object]:
    rows = [plain(message, values) for message, values in records if message is table.SET_JUNCTION]
    return {row["i"]: row["name"] for row in rows}


def _from_one(number: object) -> int:
    assert isinstance(number, int)
    return number + 1


def _shown(value: object, unit: str) -> str:
    if isinstance(value, list):
        return "[" + ", ".join(str(each) for each in value) + "]"
    text = f"'{value}'" if isinstance(value, str) and (not value or " " in value) else str(value)
    return f"{text} {unit}" if unit else text
