"""Every bad layout file gives exactly the problems that the table states, each with its line and field."""

import re
from pathlib import Path

import pytest

from tests.layout.cases_tables import TABLES
from tests.layout.cases_whole import WHOLE
from tests.layout.files import GOOD, Case, line_of, load_text, problems_of

CASES = (*TABLES, *WHOLE)


def test_the_good_layout_is_good(tmp_path: Path) -> None:
    assert load_text(tmp_path, GOOD).warnings == []


def test_there_are_enough_cases_and_no_two_alike() -> None:
    assert len(CASES) >= 60
    assert len({case.name for case in CASES}) == len({case.text() for case in CASES}) == len(CASES)


@pytest.mark.parametrize("bad", CASES, ids=[case.name.replace(" ", "_") for case in CASES])
def test_bad_layout(bad: Case, tmp_path: Path) -> None:
    text = bad.text()
    found = problems_of(tmp_path, text)
    assert [(line, field) for line, field, _ in found] == sorted(
        (line_of(text, each.at), each.field) for each in bad.expected
    )
    for _, field, message in found:
        patterns = [each.message for each in bad.expected if each.field == field]
        assert any(re.search(pattern, message) for pattern in patterns), message
        assert len(message) < 300
