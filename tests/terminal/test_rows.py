"""Rows of text: cutting, padding, times."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from host.terminal import rows
from host.terminal.rows import Piece, row


@given(st.text(st.characters(min_codepoint=32, max_codepoint=126), max_size=60), st.integers(1, 50))
def test_fit_is_always_as_wide_as_asked(text: str, width: int) -> None:
    fitted = rows.fit(text, width)
    assert len(fitted) == width
    if len(text) <= width:
        assert fitted.rstrip() == text.rstrip()
    else:
        assert fitted.endswith(rows.ELLIPSIS)


@given(st.text(st.characters(min_codepoint=32, max_codepoint=126), max_size=80), st.integers(3, 30))
def test_wrap_loses_nothing_and_keeps_the_width(text: str, width: int) -> None:
    lines = rows.wrap(text, width)
    assert all(0 < len(line) <= width for line in lines)
    assert "".join(lines).replace(" ", "") == text.replace(" ", "")


def test_wrap_cuts_the_last_line_with_a_sign() -> None:
    assert rows.wrap("one two three four", 8, most=2) == ["one two", "three f" + rows.ELLIPSIS]


@pytest.mark.parametrize(
    ("ms", "text"), [(0, "0.0 s"), (1, "0.1 s"), (100, "0.1 s"), (101, "0.2 s"), (1200, "1.2 s"), (-5, "0.0 s"),
                     (123_456, "123 s")]
)  # fmt: skip
def test_a_wait_is_never_said_to_be_shorter_than_it_is(ms: float, text: str) -> None:
    assert rows.seconds(ms) == text


@pytest.mark.parametrize(
    ("passed", "text"), [(0.4, "<1 s"), (1.0, "1 s"), (99.9, "99 s"), (130, "2 min"), (9000, "2 h")]
)
def test_ages_in_whole_units(passed: float, text: str) -> None:
    assert rows.age(100.0, 100.0 + passed) == text


def test_an_age_of_nothing_is_never() -> None:
    assert rows.age(None, 5.0) == "never"


def test_fit_row_cuts_across_pieces() -> None:
    line = row("abc", Piece("defgh", "good"))
    assert rows.text_of(rows.fit_row(line, 6)) == "abcde" + rows.ELLIPSIS
    assert rows.fit_row(line, 8) == line
    assert rows.text_of(rows.fit_row(row("abc", "de"), 3)) == "ab" + rows.ELLIPSIS


def test_between_cuts_the_left_first() -> None:
    assert rows.between("a long left side", "[right]", 16) == "a long " + rows.ELLIPSIS + " [right]"
    assert rows.between("left", "much too long for this", 8) == "left    "
