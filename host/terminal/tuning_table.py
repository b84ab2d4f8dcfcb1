"""Which settings may be tuned at the desk, and how a value is read from what a person types.

Numbers, names and wiring belong in the layout file; what is listed here is what tuning is about.
"""

import re

from shared_protocol import settings_table as table
from shared_protocol.fields import WORD, Field

TUNABLE: dict[str, tuple[str, ...]] = {
    table.SET_BOARD.name: ("silence_ms", "tell_ms", "restore", "order"),
    table.SET_TIMING.name: tuple(field.key for field in table.SET_TIMING.fields),
    table.SET_BANK.name: ("full_mv", "peak_mv", "gap_ms"),
    table.SET_CHARGE.name: ("kind", "cap_uf", "charge_dohm", "limit_ma", "guard", "rated_mw", "stall_ms"),
    table.SET_MOTOR.name: ("coil_cohm", "parallel", "ends", "rest_ms", "answer_ms"),
    table.SET_JUNCTION.name: ("retry_mv", "pulses"),
    table.SET_LIE.name: ("ready_mv", "pulse_us", "full_us"),
}
# What a person may write after a number, by the field's unit: how many of the unit one of it makes.
_SUFFIXES = {
    "mV": {"mV": 1, "V": 1000},
    "us": {"us": 1, "ms": 1000, "s": 1_000_000},
    "ms": {"ms": 1, "s": 1000},
    "mW": {"mW": 1, "W": 1000},
    "mA": {"mA": 1, "A": 1000},
    "0.1 ohm": {"ohm": 10},
    "0.01 ohm": {"ohm": 100},
}
_NUMBER = re.compile(r"\s*(-?\d+(?:\.\d+)?)\s*([a-zA-Z]*)\s*")
_DIGITS = 9


def label_of_key(key: str) -> str:
    """The key as words, without its unit: 'ready_mv' is 'ready'."""
    parts = key.split("_")
    if len(parts) > 1 and parts[-1] in ("mv", "us", "ms", "mw", "ma", "uf", "dohm", "cohm"):
        parts = parts[:-1]
    return " ".join(parts)


def shown_value(field: Field, value: object) -> str:
    """As it stands in the entry: a number in the field's unit, or the word."""
    if field.kind == WORD:
        assert isinstance(value, int)
        return field.words[value]
    return str(value)


def limits_text(field: Field) -> str:
    """Unit and range, or the words to choose from."""
    if field.kind == WORD:
        return " | ".join(field.words)
    unit = f"({field.unit})" if field.unit[:1].isdigit() else field.unit
    return f"{field.low} to {field.high} {unit}".strip()


def units_text(field: Field) -> str:
    """Which units may be written behind the number; '' if there is no choice."""
    names = list(_SUFFIXES.get(field.unit, {}))
    return f"May be typed in {' or '.join(names)}." if len(names) > 1 or (names and field.unit != names[0]) else ""


def parse(field: Field, text: str) -> int | str:
    """The value as it is kept, or a sentence that says what is wrong."""
    if field.kind == WORD:
        word = text.strip().lower()
        return field.words.index(word) if word in field.words else f"is one of: {', '.join(field.words)}"
    found = _NUMBER.fullmatch(text)
    if found is None or len(found[1]) > _DIGITS + 4:
        return f"is a number{_in_unit(field)}"
    factor = 1
    if found[2]:
        suffixes = {name.lower(): times for name, times in _SUFFIXES.get(field.unit, {}).items()}
        if found[2].lower() not in suffixes:
            return f"is a number{_in_unit(field)}, not in {found[2]}"
        factor = suffixes[found[2].lower()]
    whole, _, fraction = found[1].partition(".")
    value = _scaled(whole, fraction, factor)
    if value is None:
        return f"is a whole number{_in_unit(field)}"
    if not field.low <= value <= field.high:
        return f"must be from {field.low} to {field.high}{' ' + field.unit if field.unit else ''}, not {value}"
    return value


def _in_unit(field: Field) -> str:
    return f" of {field.unit}" if field.unit else ""


def _scaled(whole: str, fraction: str, factor: int) -> int | None:
    """Exact: 12.45 times 1000 is 12450; None if something is left over."""
    digits = int(whole + fraction) * factor
    tens = 10 ** len(fraction)
    return digits // tens if digits % tens == 0 else None
