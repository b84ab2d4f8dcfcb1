"""CRC-32 in two halves, against published check values and two libraries."""

import binascii

import pytest
from crccheck.crc import Crc32 as CatalogueCrc32
from hypothesis import given
from hypothesis import strategies as st

from shared_protocol.crc import Crc32, CrcTables

TABLES = CrcTables()

# "123456789" -> CBF43926: the catalogue of CRC algorithms (CRC-32/ISO-HDLC), via the package crccheck.
# The others: recomputed with zlib; the pangram's value is commonly printed (from memory).
CHECK_VALUES = [
    (b"123456789", b"CBF43926"),
    (b"", b"00000000"),
    (b"a", b"E8B7BE43"),
    (b"The quick brown fox jumps over the lazy dog", b"414FA339"),
    (bytes(32), b"190A55AD"),
    (b"\xff" * 32, b"FF6CAB0B"),
]


def crc_text(data: bytes) -> bytes:
    crc = Crc32(TABLES)
    for byte in data:
        crc.add(byte)
    return crc.text()


@pytest.mark.parametrize(("data", "expected"), CHECK_VALUES)
def test_check_values(data: bytes, expected: bytes) -> None:
    assert crc_text(data) == expected


def test_the_catalogue_agrees() -> None:
    assert CatalogueCrc32.calc(b"123456789") == 0xCBF43926


@given(st.binary(max_size=300))
def test_same_as_the_standard_library(data: bytes) -> None:
    assert crc_text(data) == b"%08X" % binascii.crc32(data)


def test_reset_begins_anew() -> None:
    crc = Crc32(TABLES)
    crc.add(7)
    crc.reset()
    for byte in b"123456789":
        crc.add(byte)
    assert crc.text() == b"CBF43926"


def test_halves_stay_small_integers() -> None:
    assert all(0 <= value < 1 << 16 for value in TABLES.high + TABLES.low)
