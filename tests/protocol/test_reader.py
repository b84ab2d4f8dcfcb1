"""From bytes to lines: resynchronises, drops long lines whole, passes text on, and never raises."""

import random

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shared_protocol import messages
from shared_protocol.codec import Codec
from shared_protocol.fields import Message
from shared_protocol.registry import board_reads, by_name
from tests.protocol.strategies import ALL
from tests.protocol.strategies import messages as any_message

EVERYTHING = by_name(ALL)
STOP = Codec(EVERYTHING).encode(messages.STOP, [])


@given(st.lists(any_message(), min_size=1, max_size=6), st.data())
def test_pieces_do_not_matter(pairs: list[tuple[Message, list[object]]], data: st.DataObject) -> None:
    writer = Codec(EVERYTHING)
    stream = b"".join(writer.encode(message, values) for message, values in pairs)
    cuts = sorted(data.draw(st.lists(st.integers(0, len(stream)), max_size=8)))
    reader = Codec(EVERYTHING)
    found = []
    for start, end in zip([0, *cuts], [*cuts, len(stream)], strict=True):
        found += reader.feed(stream[start:end])
    assert [(received.message, received.values) for received in found] == pairs


@given(st.binary(max_size=600))
def test_after_any_garbage_the_next_line_is_read(garbage: bytes) -> None:
    reader = Codec(EVERYTHING)
    reader.feed(garbage)
    found = reader.feed(b"\n" + STOP)
    assert found[-1].message is messages.STOP


def test_text_is_passed_on() -> None:
    (text, stop) = Codec(EVERYTHING).feed(b"Traceback (most recent call last):\n" + STOP)
    assert text.text == b"Traceback (most recent call last):" and text.fault == "" and text.message is None
    assert stop.message is messages.STOP


@pytest.mark.parametrize("length", [238, 239, 240, 241, 5000])
def test_long_lines_are_dropped_whole(length: int) -> None:
    found = Codec(EVERYTHING).feed(b"x" * length + b"\n" + STOP)
    assert found[0].fault == ("too_long" if length > 239 else "")
    assert [received.message for received in found[1:]] == [messages.STOP]


@pytest.mark.parametrize("place", range(len(STOP) - 1))
def test_every_single_damaged_byte_is_noticed(place: int) -> None:
    for flip in range(1, 256):
        damaged = bytearray(STOP)
        damaged[place] ^= flip
        found = Codec(EVERYTHING).feed(bytes(damaged))
        assert not [received for received in found if received.message is not None]


def damaged(line: bytes, rng: random.Random) -> bytes:
    """One of the things that a bad link does to a line."""
    kind = rng.randrange(7)
    place = rng.randrange(len(line))
    if kind == 0:
        return line[:place] + bytes([line[place] ^ (1 << rng.randrange(8))]) + line[place + 1 :]
    if kind == 1:
        return line[:place] + line[place + 1 :]
    if kind == 2:
        return line[:place] + bytes([rng.randrange(256)]) + line[place:]
    if kind == 3:
        return line[:place]
    if kind == 4:
        return line[place:]
    if kind == 5:
        other = rng.randrange(len(line))
        return line[: min(place, other)] + line[max(place, other) :]
    return bytes(rng.randrange(256) for _ in range(rng.randrange(300)))


def test_100_000_damaged_lines_give_no_wrong_message() -> None:
    rng = random.Random(20261201)
    writer = Codec(board_reads())
    lines = [
        (messages.STOP, []),
        (messages.THROW, [7, 11, 3, 1, 5000]),
        (messages.ROUTE, [7, 12, 2, 0]),
        (messages.CLEAR, [7, 1, 3]),
        (messages.COMMIT, [7, b"CBF43926"]),
        (messages.ACK, [4711]),
    ]
    sent = [(message, values, writer.encode(message, values)) for message, values in lines]
    reader = Codec(board_reads())
    for _ in range(100_000):
        _, _, line = rng.choice(sent)
        broken = damaged(line, rng)
        for received in reader.feed(broken + b"\n"):
            if received.message is not None:
                # What comes through is what was sent, whole.
                assert any(received.message is m and received.values == v for m, v, _ in sent)
