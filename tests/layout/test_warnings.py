"""What is allowed but unwise is said, once, and nothing else is."""

import re
from pathlib import Path

import pytest

from tests.layout.files import GOOD, load_text

CASES = (
    ("slow recharge", "adc = 1", "adc = 1\ncapacitance_uf = 40000", "'Chain': three time constants take 5.6 s"),
    ("rating not stated", "resistor_w = 10\n", "", "'Pins': its charge resistor is taken to be rated 10 W"),
    ("weak capacitors", "adc = 1", "adc = 1\nrated_v = 20", "capacitors rated 20 V; 1.25 times .* is 21.0 V"),
    ("ready voltage high", 'name = "left"', 'name = "left"\nready_v = 14.0', "'Fan', left: .* above 85 % of the full"),
    ("bleed holds it down", "adc = 1", "adc = 1\nfull_v = 16.0\nbleed_ohm = 200", "with its bleed the bank only fills"),
    ("retry without contact", 'name = "Cross"', 'name = "Cross"\nretry_v = 0.5', "'Cross': retry_v does nothing"),
    ("number for a name", 'name = "Cross"', 'name = "3"', "junction '3' has a number for its name, but is junction 2"),
    ("rotary without go", 'kind = "set"', 'kind = "rotary"\nroute = "Through"', "no button of kind go"),
    ("entrance without buttons", 'name = "Through"', 'name = "Through"\nentrance = 1\nexit = 2', "no buttons have its"),
)


@pytest.mark.parametrize(("name", "old", "new", "said"), CASES, ids=[case[0] for case in CASES])
def test_warning(name: str, old: str, new: str, said: str, tmp_path: Path) -> None:
    text = GOOD.replace(old, new)
    assert text != GOOD
    if "rotary" in new:
        text = text.replace('junction = "Single"\nlie = "loop"\n\n', "\n")
    found = load_text(tmp_path, text).warnings
    assert found and all(re.search(said, warning) for warning in found), found


def test_two_pulses_for_a_motor_that_ends_its_own(tmp_path: Path) -> None:
    text = GOOD.replace("{ coils = [4, 5] }", "{ coils = [4, 5], ends_own_pulse = true }").replace(
        'name = "Fan"', 'name = "Fan"\npulses = 2'
    )
    (warning,) = load_text(tmp_path, text).warnings
    assert warning == "'Fan': a motor that ends its own pulse gains nothing from two pulses"


def test_two_names_that_the_board_can_not_tell_apart(tmp_path: Path) -> None:
    text = GOOD.replace("Single", "G\u00e4").replace("Cross", "G\u00f6")
    (warning,) = load_text(tmp_path, text).warnings
    assert warning == "junction 'G\u00f6': the board can only keep 'G?', as of another junction"
