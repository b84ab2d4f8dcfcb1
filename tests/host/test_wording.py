"""Every reason and every fault of the shared tables can be said in plain words."""

import re

import pytest

from host import wording
from host.views import FaultView, Names, OutcomeView
from shared_protocol.words import FAULTS, OUTCOMES, REASONS

NAMES = Names(["East", "West"], ["Throat"], [["to the yard", "to the quay"]], ["Up main"], {5: "points key"})


def ended(**fields: object) -> OutcomeView:
    view = OutcomeView(1, 0, "throw", "refused", "below_ready", "", 0.0, 0, 1)
    for key, value in fields.items():
        setattr(view, key, value)
    return view


def test_refusal_names_bank_voltage_and_time() -> None:
    text = wording.outcome_text(ended(which=0, mv=9800, ms=640), NAMES)
    assert text == "refused: bank East is at 9.8 V, below the ready voltage; would pass in 640 ms"
    assert "bank West is at 9.8 V" in wording.outcome_text(ended(which=1, mv=9800, ms=640), NAMES)


def test_throw_is_said_in_the_owners_words() -> None:
    text = wording.throw_text(ended(outcome="done", why="seen", ms=55), NAMES)
    assert text == "Throat, to the quay: done: a contact saw it arrive"


@pytest.mark.parametrize("why", REASONS)
def test_every_reason_is_whole_words(why: str) -> None:
    for outcome in OUTCOMES:
        for which in (-1, 0, 63):
            for ms in (-1, 0, 640, 3200):
                for text in (
                    wording.outcome_text(ended(outcome=outcome, why=why, which=which, ms=ms, mv=ms), NAMES),
                    wording.remedy_text(why, which, ms),
                    wording.answer_text("clear", False, why, which),
                    wording.rejected_text(which, "delay", why),
                    wording.route_text(ended(outcome=outcome, why=why, route=0), NAMES),
                ):
                    assert "{" not in text and "-1" not in text and "_" not in text
                    assert "  " not in text and not text.endswith((" ", ";", ":"))


def test_numbers_are_filled_in() -> None:
    assert wording.remedy_text("below_ready", ms=640) == "wait 640 ms"
    assert wording.remedy_text("not_while", 5, names=NAMES) == "free input points key"
    assert "points key" in wording.outcome_text(ended(why="not_while", which=5), NAMES)
    assert "bank West" in wording.outcome_text(ended(why="bank_out", which=1), NAMES)
    assert "motor 3" in wording.outcome_text(ended(why="one_of_two", which=2, outcome="failed"), NAMES)


@pytest.mark.parametrize("code", FAULTS[1:])
def test_every_fault_has_evidence_remedy_and_a_short_form(code: str) -> None:
    row = wording.fault_row(code)
    fault = FaultView("bank", 1, code, row[1], row[2], wording.evidence_text(code, 300, 7900), 0, 0.0)
    fault.who, fault.near_name = "bank West", "Throat"
    assert row[2] in wording.fault_text(fault) and fault.evidence_text in wording.fault_text(fault)
    line = wording.out_line(fault, 1)
    assert line.level == "out" and line.text.startswith("bank West out: ") and line.text.endswith("(and 1 more)")
    assert ("Throat" in line.text) == (code in ("no_drop", "held_down")), "no coil is to blame for a missing supply"
    assert len(line.text) <= 100


def test_evidence_has_units() -> None:
    assert wording.evidence_text("no_drop", 300, 7900) == "0.3 V dropped, 7.9 V expected"
    assert wording.evidence_text("no_drop", -200, 7900) == "-0.2 V dropped, 7.9 V expected"
    assert wording.evidence_text("recharge_stalled", 9000, 5000) == "9.0 V reached, 5.0 s waited"
    assert wording.evidence_text("contacts_disagree", 1, 0) == "contact 1 closed, contact 2 open"
    assert re.fullmatch(r"input 12, 10\.0 s held", wording.evidence_text("button_stuck", 12, 10_000))
