"""However a layout file is spoilt: it is taken, or refused with lines and fields. Nothing else ever happens."""

import random
import re
from pathlib import Path

import pytest

from sim.layout import BadFile, demo_layout_path
from tests.layout.files import GOOD, load_text
from tests.layout.test_every_setting import REACH

VALUES = (
    "0", "-1", "1", "2", "3", "7", "13", "16", "30", "64", "1e9", "0.5", "true", '""', '"x"', "[]", "[1]", "[0, 1]",
    "{}",
    '["x"]', '"normal"', '"crossover"', '"slip"', '"two"', '"limited"', '"cutoff"', '[["reverse"]]', "[[1]]", "[{}]",
    "2020-01-01", "nan", '"pin 3"', '"chain 3"', '"Single: main"', "0x" + "f" * 5000, '"1"', '"Fan"',
)  # fmt: skip
INLINE_VALUE = re.compile(r"= (\[[^\]]*\]|[^,}\]]+)")


def spoilt(rng: random.Random, text: str) -> str:
    """A text with one to three of its lines changed, removed, doubled or swapped, or a letter changed."""
    rows = text.split("\n")
    for _ in range(rng.randint(1, 3)):
        number = rng.randrange(len(rows))
        row = rows[number]
        how = rng.random()
        values = list(INLINE_VALUE.finditer(row))
        if how < 0.5 and values:
            found = rng.choice(values)
            rows[number] = f"{row[: found.start()]}= {rng.choice(VALUES)} {row[found.end() :]}"
        elif how < 0.65:
            del rows[number]
        elif how < 0.8:
            rows.insert(rng.randrange(len(rows)), row)
        elif how < 0.9:
            other = rng.randrange(len(rows))
            rows[number], rows[other] = rows[other], row
        elif row:
            place = rng.randrange(len(row))
            rows[number] = row[:place] + rng.choice("[]{}\"'=,.#\\0 \t") + row[place + rng.randint(0, 1) :]
    return "\n".join(rows)


@pytest.mark.parametrize("seed", range(10))
def test_spoilt_layouts(seed: int, tmp_path: Path) -> None:
    rng = random.Random(seed)
    taken = 0
    for _ in range(60):
        text = spoilt(rng, rng.choice((GOOD, REACH, demo_layout_path().read_text("utf-8"))))
        try:
            layout = load_text(tmp_path, text)
        except BadFile as error:
            assert error.problems
            for problem in error.problems:
                assert 1 <= problem.line <= text.count("\n") + 1
                assert problem.field and problem.message and "\n" not in str(problem)
        else:
            taken += 1
            assert layout.record_bodies()
    assert taken < 60
