"""The program under a pilot: throws, routes, stop, cancel, cautions."""

import pytest
from textual import events
from textual.pilot import Pilot
from textual.widgets import Input

from host.terminal.ask_screen import AskScreen
from host.terminal.main_screen import MainScreen
from tests.terminal.bench import Bench, CautionsOnce
from tests.terminal.driving import news, press, rows, run, said

SCREENS = {"main": "", "routes": "o", "faults": "f", "tuning": "t", "log": "l", "help": "?", "palette": "ctrl+p"}


# ---- throwing


def test_number_and_enter_throws() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "7")
        assert said(bench, "prompt").startswith("Junction: 7_  Enter throws Quay to main (lies quay")
        assert bench.sent("throw") == []
        await press(bench, pilot, "enter")
        assert bench.sent("throw") == [[7, 1000, 6, 0, 5000]]
        await press(bench, pilot, "1", "r", "enter")
        assert bench.sent("throw")[1:] == [[7, 1001, 0, 1, 5000]]
        assert bench.sent("release") == []

    run(bench, story)


def test_a_lie_is_chosen_by_its_letter() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "1", "1", "enter")
        assert "To which lie?" in said(bench, "prompt")
        assert "m yard 2, l yard 1, r yard 3" in said(bench, "answer")
        await press(bench, pilot, "r")
        assert bench.sent("throw") == [[7, 1000, 10, 2, 5000]]
        assert bench.sent("release") == []

    run(bench, story)


def test_a_refusal_shows_why_and_how_long() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "m", "7", "enter")
        assert bench.sent("throw") == [[7, 1000, 6, 0, 0]]
        assert "NOW" in said(bench, "prompt")
        bench.desk.outcome(1, 1000, j=6, lie=0, o="refused", why="below_ready", ms=640, i=1, mv=9800, after=-1)
        await news(bench, pilot)
        answer = " ".join(said(bench, "answer").split())
        assert "refused" in answer and "bank East is at 9.8 V, below the ready voltage" in answer and "640 ms" in answer

    run(bench, story)


def test_a_route_by_its_letter() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "o")
        assert isinstance(bench.app.screen, AskScreen)
        assert any("Boat train" in line for line in rows(bench, "question"))
        await press(bench, pilot, "c")
        assert bench.sent("route") == [[7, 1000, 2, 5000]]
        assert isinstance(bench.app.screen, MainScreen)
        await press(bench, pilot, "o", "escape")
        assert len(bench.sent("route")) == 1

    run(bench, story)


def test_keys_typed_ahead_are_not_lost() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        for key in ("o", "c"):
            bench.app.post_message(events.Key(key, key))
        await pilot.pause()
        await pilot.pause()
        assert bench.sent("route") == [[7, 1000, 2, 5000]]
        for key in ("1", "r", "enter", "7", "enter", "o"):
            bench.app.post_message(events.Key(key, key if len(key) == 1 else None))
        await pilot.pause()
        assert bench.sent("throw") == [[7, 1001, 0, 1, 5000], [7, 1002, 6, 0, 5000]]
        assert isinstance(bench.app.screen, AskScreen)

    run(bench, story)


@pytest.mark.parametrize("screen", SCREENS)
def test_the_space_bar_stops_from_every_screen(screen: str) -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        if SCREENS[screen]:
            await press(bench, pilot, SCREENS[screen])
        await pilot.press("space")
        assert bench.sent("stop") == [[]]

    run(bench, story)


def test_the_space_bar_stops_while_a_value_is_typed() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "t", "enter", "1", "space")
        assert isinstance(bench.app.focused, Input) and bench.app.focused.value == "1"
        assert bench.sent("stop") == [[]]
        await press(bench, pilot, "escape", "escape", "l", "slash", "a", "space")
        assert len(bench.sent("stop")) == 2
        await press(bench, pilot, "escape", "escape", "f", "space")
        assert len(bench.sent("stop")) == 3

    run(bench, story)


def test_stop_and_release_are_shown() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "space")
        assert said(bench, "answer").startswith("! STOP sent")
        bench.stopped()
        await news(bench, pilot)
        assert said(bench, "go").startswith(" ## STOP ##")
        await press(bench, pilot, "r")
        assert bench.sent("release") == [[7]]

    run(bench, story)


def test_one_request_is_cancelled_at_once_several_are_chosen() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        bench.expects(1001, 0, 1, 1, 500)
        await press(bench, pilot, "x")
        assert bench.sent("cancel") == [[7, 1001]]
        bench.expects(1002, 0, 6, 0, 900)
        await press(bench, pilot, "x", "2")
        assert bench.sent("cancel")[1:] == [[7, 1002]]
        await press(bench, pilot, "x", "x")
        assert bench.sent("cancel")[2:] == [[7, 1001], [7, 1002]]

    run(bench, story)


def test_the_cautions_come_before_the_first_pulse_and_fire_nothing() -> None:
    bench = Bench(cautions=CautionsOnce())

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "7", "enter")
        assert any("Stop is not isolation" in line for line in rows(bench, "question"))
        await press(bench, pilot, "enter", "7")
        assert isinstance(bench.app.screen, AskScreen)
        await press(bench, pilot, "escape", "7", "enter")
        assert isinstance(bench.app.screen, AskScreen)
        await press(bench, pilot, "y")
        assert bench.sent("throw") == []
        await press(bench, pilot, "7", "enter")
        assert len(bench.sent("throw")) == 1

    run(bench, story)


def test_quitting_asks_while_something_waits() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        bench.expects(1001, 0, 1, 1, 500)
        await press(bench, pilot, "q")
        assert isinstance(bench.app.screen, AskScreen)
        await press(bench, pilot, "escape")
        bench.desk.state(queue=0)
        bench.session.poll()
        await pilot.press("q")
        await pilot.pause()

    run(bench, story)
    assert bench.app.return_value == 0
