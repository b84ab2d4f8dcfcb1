"""One way to write each message: what is written is read back, and nothing else is read at all."""

import json

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shared_protocol import messages, settings_table
from shared_protocol.codec import Codec, ValueOutOfTable, plain, values_from
from shared_protocol.fields import INT, INTS, NAME, WORD, Field, Message
from shared_protocol.line import LINE_MAX
from shared_protocol.registry import board_reads, by_name, host_reads
from tests.protocol.strategies import ALL
from tests.protocol.strategies import messages as any_message

EVERYTHING = by_name(ALL)


def widest(field: Field) -> object:
    longest = max((field.low, field.high), key=lambda number: len(str(number)))
    if field.kind == INT:
        return longest
    if field.kind == WORD:
        return max(range(len(field.words)), key=lambda index: len(field.words[index]))
    if field.kind == NAME:
        return b"x" * field.high
    assert field.kind == INTS
    return [longest] * field.most


@given(any_message())
def test_what_is_written_is_read_back(pair: tuple[Message, list[object]]) -> None:
    message, values = pair
    line = Codec(EVERYTHING).encode(message, values)
    assert len(line) <= LINE_MAX and b"\x03" not in line and line.isascii()
    (received,) = Codec(EVERYTHING).feed(line)
    assert received.fault == "" and received.message is message and received.values == values


@given(any_message())
def test_json_and_plain_values_agree(pair: tuple[Message, list[object]]) -> None:
    message, values = pair
    body = Codec(EVERYTHING).body(message, values)
    read = json.loads(body)
    assert read.pop("m") == message.name
    assert read == plain(message, values)
    assert values_from(message, read) == values


@pytest.mark.parametrize("message", ALL, ids=lambda message: message.name)
def test_the_longest_message_fits_a_line(message: Message) -> None:
    if message is settings_table.SET_IO:
        # Pins are used once each, so not all three lists can be full (the settings check sees to it).
        values: list[object] = [[29] * 14, 48, [29] * 3, [29] * 10, 48, [29] * 3]
    else:
        values = [widest(field) for field in message.fields]
    assert len(Codec(EVERYTHING).encode(message, values)) <= LINE_MAX


@pytest.mark.parametrize("message", ALL, ids=lambda message: message.name)
def test_every_field_is_explained(message: Message) -> None:
    assert message.text.endswith(".")
    for field in message.fields:
        assert field.text.endswith("."), field.key
        assert field.low <= field.high
        if field.default is not None:
            assert field.low <= field.default <= field.high


def test_names_are_not_shared() -> None:
    assert len(board_reads()) == len(messages.TO_BOARD) + len(settings_table.SETTINGS)
    assert len(host_reads()) == len(messages.TO_HOST) + len(settings_table.SETTINGS)
    with pytest.raises(ValueError, match="hello"):
        by_name((messages.HELLO, messages.HELLO))


THROW = b'{"m":"throw","boot":1,"id":2,"j":3,"lie":0,"wait":0}'

# Bodies that some JSON parser takes, or that say what the table does not allow. RFC 8259 (from memory) makes most of
# them no JSON at all; the names follow the classes of public JSON parsing suites (missing, extra, numbers, structure).
NOT_TAKEN = [
    ("trailing comma", b'{"m":"throw","boot":1,"id":2,"j":3,"lie":0,"wait":0,}'),
    ("missing comma", b'{"m":"throw","boot":1,"id":2,"j":3 "lie":0,"wait":0}'),
    ("leading zero", b'{"m":"throw","boot":01,"id":2,"j":3,"lie":0,"wait":0}'),
    ("plus sign", b'{"m":"throw","boot":+1,"id":2,"j":3,"lie":0,"wait":0}'),
    ("minus zero", b'{"m":"throw","boot":1,"id":2,"j":-0,"lie":0,"wait":0}'),
    ("garbage after", b'{"m":"throw","boot":1,"id":2,"j":3,"lie":0,"wait":0}x'),
    ("second object", b'{"m":"stop"}{"m":"stop"}'),
    ("key twice", b'{"m":"throw","boot":1,"id":2,"j":3,"j":3,"lie":0,"wait":0}'),
    ("key twice, one less", b'{"m":"throw","boot":1,"id":2,"j":3,"j":3,"lie":0}'),
    ("unknown key", b'{"m":"throw","boot":1,"id":2,"j":3,"lie":0,"wait":0,"x":1}'),
    ("missing key", b'{"m":"throw","boot":1,"id":2,"j":3,"lie":0}'),
    ("other order", b'{"m":"throw","id":2,"boot":1,"j":3,"lie":0,"wait":0}'),
    ("name not first", b'{"boot":1,"m":"throw","id":2,"j":3,"lie":0,"wait":0}'),
    ("space", b'{"m": "throw","boot":1,"id":2,"j":3,"lie":0,"wait":0}'),
    ("leading space", b' {"m":"throw","boot":1,"id":2,"j":3,"lie":0,"wait":0}'),
    ("float", b'{"m":"throw","boot":1,"id":2,"j":3.0,"lie":0,"wait":0}'),
    ("exponent", b'{"m":"throw","boot":1,"id":2e0,"j":3,"lie":0,"wait":0}'),
    ("huge number", b'{"m":"throw","boot":' + b"9" * 150 + b',"id":2,"j":3,"lie":0,"wait":0}'),
    ("huge exponent", b'{"m":"throw","boot":1e999,"id":2,"j":3,"lie":0,"wait":0}'),
    ("not a number", b'{"m":"throw","boot":NaN,"id":2,"j":3,"lie":0,"wait":0}'),
    ("infinity", b'{"m":"throw","boot":Infinity,"id":2,"j":3,"lie":0,"wait":0}'),
    ("true for one", b'{"m":"throw","boot":true,"id":2,"j":3,"lie":0,"wait":0}'),
    ("null", b'{"m":"throw","boot":null,"id":2,"j":3,"lie":0,"wait":0}'),
    ("number as text", b'{"m":"throw","boot":"1","id":2,"j":3,"lie":0,"wait":0}'),
    ("list for number", b'{"m":"throw","boot":[1],"id":2,"j":3,"lie":0,"wait":0}'),
    ("object for number", b'{"m":"throw","boot":{},"id":2,"j":3,"lie":0,"wait":0}'),
    ("below range", b'{"m":"throw","boot":1,"id":0,"j":3,"lie":0,"wait":0}'),
    ("above range", b'{"m":"throw","boot":1,"id":2,"j":64,"lie":0,"wait":0}'),
    ("2**30", b'{"m":"throw","boot":1073741824,"id":2,"j":3,"lie":0,"wait":0}'),
    ("escaped name", b'{"m":"thro\\u0077","boot":1,"id":2,"j":3,"lie":0,"wait":0}'),
    ("single quotes", b"{'m':'stop'}"),
    ("comment", b'{"m":"stop"/**/}'),
    ("unclosed", b'{"m":"stop"'),
    ("empty object", b"{}"),
    ("no name", b'{"boot":1}'),
    ("unknown message", b'{"m":"fire"}'),
    ("name is a number", b'{"m":1}'),
    ("name is a list", b'{"m":["stop"]}'),
    ("array", b'["stop"]'),
    ("bare word", b"stop"),
    ("bare number", b"1"),
    ("nothing", b""),
    ("deep", b"[" * 200),
    ("deep object", b'{"m":' * 40),
    ("byte order mark", b'\xef\xbb\xbf{"m":"stop"}'),
    ("not ASCII", '{"m":"stöp"}'.encode()),
    ("bad UTF-8", b'{"m":"st\xffop"}'),
    ("lone surrogate", b'{"m":"\\ud800"}'),
    ("NUL", b'{"m":"stop\x00"}'),
    ("a message for the host", b'{"m":"end","what":"status"}'),
    ("unknown word", b'{"m":"ask","what":"everything"}'),
    ("word as number", b'{"m":"ask","what":0}'),
    ("short CRC", b'{"m":"commit","boot":1,"crc":"ABC"}'),
    ("quote in a name", b'{"m":"commit","boot":1,"crc":"ABCDEF\\""}'),
    ("backslash in a name", b'{"m":"commit","boot":1,"crc":"ABCDEF0\\\\"}'),
    ("control character in a name", b'{"m":"commit","boot":1,"crc":"ABCDEF0\\u0001"}'),
]


@pytest.mark.parametrize(("why", "body"), NOT_TAKEN, ids=[row[0] for row in NOT_TAKEN])
def test_lax_json_is_not_taken(why: str, body: bytes) -> None:
    codec = Codec(board_reads())
    assert codec.decode_body(THROW).fault == ""
    received = codec.decode_body(body)
    assert received.fault in ("bad_json", "unknown_message", "bad_fields", "not_canonical")


@given(st.binary(max_size=240))
def test_any_bytes_give_a_value_never_an_exception(body: bytes) -> None:
    received = Codec(board_reads()).decode_body(body)
    assert received.fault or Codec(board_reads()).body(received.message, received.values) == body  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("given_values", "field"),
    [
        ({"boot": 1, "id": 2, "j": 64, "lie": 0, "wait": 0}, "j"),
        ({"boot": 1, "id": 2, "j": True, "lie": 0, "wait": 0}, "j"),
        ({"boot": 1, "id": 2, "j": 3.0, "lie": 0, "wait": 0}, "j"),
        ({"boot": 1, "id": 2, "j": 3, "lie": 0}, "wait"),
        ({"boot": 1, "id": 2, "j": 3, "lie": 0, "wait": 0, "more": 1}, "more"),
    ],
)
def test_a_wrong_value_is_named(given_values: dict[str, object], field: str) -> None:
    with pytest.raises(ValueOutOfTable, match=field):
        Codec(board_reads()).encode(messages.THROW, values_from(messages.THROW, given_values))
