"""Files that are no layout at all: too large, not UTF-8, not there, or right in an unusual way."""

import os
from pathlib import Path

import pytest

from sim.layout import BadFile, FileProblem, load_layout
from sim.layout.problems import MOST_LISTED
from tests.layout.files import GOOD, load_text, problems_of


def test_larger_than_a_mebibyte(tmp_path: Path) -> None:
    exact = GOOD + "#" * ((1 << 20) - len(GOOD))
    assert load_text(tmp_path, exact).name == "Saltmarsh Test"
    assert problems_of(tmp_path, exact + "#") == [(0, "file", "is larger than 1 MiB")]


def test_not_utf8(tmp_path: Path) -> None:
    text = GOOD.encode().replace(b"Single", b"Sing\xff", 1)
    assert problems_of(tmp_path, text) == [(39, "file", "is not UTF-8 text")]


def test_null_bytes(tmp_path: Path) -> None:
    ((line, field, message),) = problems_of(tmp_path, b"\0" * 100)
    assert (line, field) == (1, "file") and message.startswith("is not TOML")


def test_windows_text_is_taken(tmp_path: Path) -> None:
    plain = load_text(tmp_path, GOOD)
    windows = b"\xef\xbb\xbf" + GOOD.replace("\n", "\r\n").encode()
    assert load_text(tmp_path, windows).crc() == plain.crc()
    spoilt = windows.replace(b"adc = 1", b"adc = 9")
    assert [problem[:2] for problem in problems_of(tmp_path, spoilt)] == [
        (GOOD.split("\n").index("adc = 1") + 1, "bank 2.adc")
    ]


def test_missing_file_and_folder(tmp_path: Path) -> None:
    for path in (tmp_path / "gone.toml", tmp_path, tmp_path / ("x" * 300), tmp_path / "a\0b"):
        with pytest.raises(BadFile) as caught:
            load_layout(path)
        (problem,) = caught.value.problems
        assert problem.file == str(path) and problem.line == 0 and problem.field == "file" and problem.message


@pytest.mark.skipif(not os.path.exists("/dev/zero"), reason="needs an endless file")
def test_endless_file_is_not_read_to_its_end() -> None:
    with pytest.raises(BadFile, match="larger than 1 MiB"):
        load_layout(Path("/dev/zero"))


def test_five_thousand_junctions_are_one_problem(tmp_path: Path) -> None:
    more = "".join(f'\n[[junction]]\nname = "J{number}"\nbank = "Pins"\nmotors = []\n' for number in range(4997))
    assert problems_of(tmp_path, GOOD + more) == [(38, "junction", "has 5000 entries: at most 64")]


def test_thousands_of_unknown_keys_are_counted(tmp_path: Path) -> None:
    text = GOOD + "".join(f"key{number} = 1\n" for number in range(3000))
    found = problems_of(tmp_path, text)
    first = len(GOOD.split("\n"))
    assert [line for line, _, _ in found] == list(range(first, first + 11))
    assert found[-1][1:] == ("follower 1.key10", "is not a key here, nor are 2989 more of this table")


def test_hundreds_of_problems_are_counted(tmp_path: Path) -> None:
    text = GOOD + '[[junction]]\nname = "x"\nbank = "y"\nmotors = [{ coils = "z", zz = 1, ohm = 0 }]\n' * 50
    found = problems_of(tmp_path, text)
    assert len(found) == MOST_LISTED + 1
    # 50 x 4 in the new junctions and 49 names given before; the first 50 are listed.
    assert found[-1][1:] == ("file", f"and {50 * 4 + 49 - MOST_LISTED} more problems from here on")
    assert [line for line, _, _ in found] == sorted(line for line, _, _ in found)


def test_problems_stand_in_the_order_of_lines_once_each() -> None:
    late, early = FileProblem("f", 9, "a", "x"), FileProblem("f", 2, "b", "y")
    error = BadFile([late, early, late])
    assert error.problems == [early, late]
    assert str(error) == "f:2: b: y\nf:9: a: x"


def test_many_things_wrong_are_all_told(tmp_path: Path) -> None:
    text = (
        GOOD.replace("volts = 16.0", 'volts = "16"').replace("adc = 0", "adc = 7").replace('"Fan: middle"', '"Fun: x"')
        .replace("coils = [2, 3]", "coils = [0, 1]").replace('input = "button A"', 'input = "button X"')
    )  # fmt: skip
    assert [(line, field) for line, field, _ in problems_of(tmp_path, text)] == [
        (5, "supply.volts"), (28, "bank 1.adc"), (49, "junction 2.motors 2.coils"), (72, "route 1.throws 2"),
        (76, "button 1.input"),
    ]  # fmt: skip
