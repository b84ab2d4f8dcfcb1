"""Hypothesis strategies made from the table: any message with any values it allows."""

from hypothesis import strategies as st

from shared_protocol.fields import INT, INTS, NAME, WORD, Field, Message
from shared_protocol.messages import TO_BOARD, TO_HOST
from shared_protocol.settings_table import SETTINGS

ALL = TO_BOARD + TO_HOST + SETTINGS
PLAIN_ASCII = "".join(chr(code) for code in range(32, 127) if chr(code) not in '"\\')


def value_of(field: Field) -> st.SearchStrategy[object]:
    if field.kind in (INT, WORD):
        return st.integers(field.low, field.high)
    if field.kind == NAME:
        return st.text(PLAIN_ASCII, min_size=field.low, max_size=field.high).map(str.encode)
    assert field.kind == INTS
    return st.lists(st.integers(field.low, field.high), max_size=field.most)


def values_of(message: Message) -> st.SearchStrategy[list[object]]:
    return st.tuples(*[value_of(field) for field in message.fields]).map(list)


def messages(chosen: tuple[Message, ...] = ALL) -> st.SearchStrategy[tuple[Message, list[object]]]:
    return st.sampled_from(chosen).flatmap(lambda message: values_of(message).map(lambda values: (message, values)))
