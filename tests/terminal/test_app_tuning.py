"""The program under a pilot: tuning."""

import pytest
from textual.pilot import Pilot
from textual.widgets import Input, OptionList

from host.terminal.tuning_screen import EntryRow, TuningScreen
from shared_protocol.settings_table import SET_LIE
from tests.terminal.bench import Bench
from tests.terminal.driving import news, press, rows, run, said

# ---- tuning


async def change(bench: Bench, pilot: Pilot[int], text: str) -> None:
    """On the tuning screen: the second junction's first value."""
    await press(bench, pilot, "t")
    await press(bench, pilot, "down", "enter", *text)


def test_tuning_shows_old_and_new_and_sends_one_transaction() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await change(bench, pilot, "12.6V")
        first = bench.app.screen.query(EntryRow).first()
        assert first.limits.said == "* was 12400; 1000 to 33000 mV"
        await press(bench, pilot, "f2")
        assert "      old 12400 mV   new 12600 mV" in rows(bench, "question")
        assert bench.sent("stage") == []
        await press(bench, pilot, "enter")
        for _ in range(40):
            bench.board_gets_new_settings()
        await news(bench, pilot)
        await news(bench, pilot)
        assert len(bench.sent("stage")) == len(bench.sent("commit")) == 1
        before = [values[7] for message, values in bench.layout.records if message is SET_LIE]
        after = [values[7] for values in bench.sent("set_lie")]
        assert [(old, new) for old, new in zip(before, after, strict=True) if old != new] == [(12_400, 12_600)]
        assert said(bench, "answer").startswith("+ accepted")

    run(bench, story)


def test_old_and_new_can_be_left_without_sending() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await change(bench, pilot, "12.6V")
        await press(bench, pilot, "f2", "escape")
        assert isinstance(bench.app.screen, TuningScreen)
        assert bench.sent("stage") == []
        await press(bench, pilot, "f4")
        assert bench.app.screen.query(EntryRow).first().input.value == "12400"
        await press(bench, pilot, "f2")
        assert isinstance(bench.app.screen, TuningScreen)

    run(bench, story)


@pytest.mark.parametrize(
    ("text", "why"), [("5", "must be from 1000 to 33000 mV, not 5"), ("16000", "the supply can never bring the bank")]
)
def test_what_is_wrong_stays_in_the_form_and_is_not_sent(text: str, why: str) -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await change(bench, pilot, text)
        await press(bench, pilot, "f2")
        assert isinstance(bench.app.screen, TuningScreen)
        assert why in " ".join(said(bench, "answer").split())
        assert bench.sent("stage") == []
        await pilot.pause()
        assert isinstance(bench.app.focused, Input) and bench.app.focused.value == text

    run(bench, story)


def test_enter_stays_on_a_wrong_value_and_leaves_a_right_one() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await change(bench, pilot, "5")
        await press(bench, pilot, "enter")
        assert isinstance(bench.app.focused, Input) and bench.app.focused.value == "5"
        assert "must be from 1000 to 33000 mV" in said(bench, "sentence")
        await press(bench, pilot, "0", "0", "0", "enter")
        assert isinstance(bench.app.focused, Input) and bench.app.focused.value == "40000"
        assert said(bench, "sentence") == "main: pulse - Pulse at the ready voltage. May be typed in us or ms or s."

    run(bench, story)


def test_unknown_settings_are_asked_for() -> None:
    bench = Bench(ready=False)
    bench.desk.ready(crc="00000000")

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "t")
        assert bench.app.screen.query_one(OptionList).option_count == 0
        assert [6 if values == [1] else values for values in bench.sent("ask")] == [6]
        assert "not known yet" in said(bench, "answer")
        await press(bench, pilot, "f2", "f4", "enter", "escape")
        assert bench.sent("stage") == []

    run(bench, story)
