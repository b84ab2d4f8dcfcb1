"""The program on a layout of two boards: one missing, a stop to both, routes over both, tuning one after the other."""

from collections.abc import Callable
from typing import Any

import pytest
from textual.pilot import Pilot
from textual.widgets import OptionList

from host.terminal.app import DeskApp
from host.terminal.desk_screen import Words
from host.terminal.lines import Lines
from host.terminal.rows import texts_of
from host.views import BoardView
from shared_protocol import messages
from tests.host.fleet_bench import ROAD_1, TERMINUS, YARD
from tests.host.fleet_bench import Bench as FleetBench
from tests.terminal.bench import NoCautions
from tests.terminal.test_snapshots import SIZES


class Bench(FleetBench):
    """Two boards, and the program on them."""

    def __init__(self, cautions: NoCautions | None = None) -> None:
        super().__init__()
        self.both()
        for port, junction, lie, source in ((0, 0, 0, "seen"), (0, 2, 1, "sent"), (1, 0, 0, "seen"), (1, 1, 1, "sent")):
            self.links[port].says(messages.LIE, j=junction, lie=lie, src=source)
        self.fleet.poll()
        self.app = DeskApp(
            self.fleet, stamp=lambda at_s: f"{at_s:06.1f}", live=False, cautions=cautions or NoCautions()
        )


def play(bench: Bench, story: Callable[[Pilot[int]], Any], size: tuple[int, int] = (80, 24)) -> None:
    """Run a story on the program."""
    import asyncio

    async def go() -> None:
        async with bench.app.run_test(size=size) as pilot:
            await pilot.pause()
            bench.forget()
            await story(pilot)

    asyncio.run(go())


async def press(bench: Bench, pilot: Pilot[int], *keys: str) -> None:
    await pilot.press(*keys)
    for _ in range(2):
        bench.app.desk.poll()
        bench.app.draw()
        await pilot.pause()


def said(bench: Bench, id: str) -> str:
    return bench.app.screen.query_one(f"#{id}", Words).said


def rows(bench: Bench, id: str) -> list[str]:
    return texts_of(bench.app.screen.query_one(f"#{id}", Lines).rows)


def test_a_number_throws_on_the_board_that_has_the_junction() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "5", "enter")
        assert [values[2:4] for values in bench.sent(1, "throw")] == [[0, 1]] and not bench.sent(0, "throw")
        assert said(bench, "answer").startswith("5 Yard entry > to road 4: asked for")
        await press(bench, pilot, "1", "r", "enter")
        assert [values[2:4] for values in bench.sent(0, "throw")] == [[0, 1]]

    play(bench, story)


@pytest.mark.parametrize("size", SIZES, ids=lambda size: f"{size[0]}x{size[1]}")
def test_a_missing_board_is_said_and_the_rest_goes_on(size: tuple[int, int]) -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        bench.goes(1)
        await press(bench, pilot)
        assert "board Yard not connected: 3 junctions unavailable; else ready" in said(bench, "go")
        shown = rows(bench, "junctions")[-7:]
        assert "(seen)" in shown[4] and "(sent)" in shown[5] and "seen" in shown[0] and "(seen)" not in shown[0]
        assert any("not connected" in row for row in rows(bench, "banks"))
        await press(bench, pilot, "5", "enter")
        assert "not sent: board Yard not connected" in " ".join(said(bench, "answer").split())
        await press(bench, pilot, "2", "n", "enter")
        assert len(bench.sent(0, "throw")) == 1 and not bench.sent(1, "throw")

    play(bench, story, size)


def test_the_space_bar_stops_both_and_names_whom_it_did_not_reach() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "space")
        assert [len(bench.sent(port, "stop")) for port in (0, 1)] == [1, 1]
        assert said(bench, "answer") == "! STOP sent."
        bench.answers(0, "stop")
        bench.answers(1, "stop")
        await press(bench, pilot)
        assert said(bench, "answer").startswith("! STOP is on")
        bench.goes(1)
        await press(bench, pilot, "space")
        assert "STOP sent; board Yard not reached." in said(bench, "answer")
        bench.answers(0, "stop")
        await press(bench, pilot)
        assert "board Yard NOT reached: use its own stop" in " ".join(said(bench, "answer").split())

    play(bench, story)


def test_a_route_over_both_is_cancelled_as_one_request() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "o", "b")
        assert [values[2:4] for values in bench.sent(1, "throw")] == [[1, 1]]
        number = bench.sent(1, "throw")[0][1]
        bench.links[1].says(messages.EXPECT, id=number, step=0, j=1, lie=1, by="host", st="waiting", due=900)
        await press(bench, pilot)
        assert rows(bench, "queue")[0].startswith("  6 Yard fan > road 1 (Yard)")
        assert len(bench.app.desk.waiting()) == 1
        await press(bench, pilot, "x")
        assert [values[1] for values in bench.sent(1, "cancel")] == [number]

    play(bench, story, (140, 45))


def test_tuning_goes_from_board_to_board_and_sends_to_the_one_that_is_shown() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "t")
        subjects = bench.app.screen.query_one("#subjects", OptionList)
        assert subjects.border_title == "Terminus" and "F3 next board" in said(bench, "keys")
        await press(bench, pilot, "enter", *"12.5V", "f3")
        assert subjects.border_title == "Yard"
        assert str(subjects.get_option_at_index(0).prompt) == " 5 Yard entry"
        await press(bench, pilot, "enter", *"11.5V", "f2", "enter")
        assert bench.sent(1, "stage") and not bench.sent(0, "stage")
        bench.answers(1, "stage")
        for _ in range(10):
            bench.fleet.poll()
        sent = [values for name, values in bench.links[1].sent if name == "set_lie"]
        assert sent[0][7] == 11_500 and len(bench.sent(1, "commit")) == 1
        # While it is under way it is not left; afterwards the other board's change is still there.
        await press(bench, pilot, "f3")
        assert subjects.border_title == "Yard"
        bench.links[1].says(messages.ANSWER, to="commit", ok=0, why="busy", i=-1)
        await press(bench, pilot)
        await press(bench, pilot, "f3")
        assert subjects.border_title == "Terminus" and bench.app.tunings[0].change_count == 1

    play(bench, story)


def test_tuning_a_board_that_was_never_there() -> None:
    bench = Bench()
    bench.goes(1)
    bench.fleet.boards[YARD].model.board = None

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "t", "f3")
        assert "Board Yard is not connected: its settings are not known." in said(bench, "answer")
        assert bench.app.screen.query_one("#subjects", OptionList).option_count == 0
        await press(bench, pilot, "f3")
        assert bench.app.screen.query_one("#subjects", OptionList).option_count > 0

    play(bench, story)


class Cautions(NoCautions):
    """Due for each board until read."""

    def __init__(self) -> None:
        super().__init__()
        self.read: list[str] = []

    def due(self, board: BoardView | None) -> bool:
        return board is not None and board.uid not in self.read

    def acknowledge(self, board: BoardView | None) -> None:
        if board is not None:
            self.read.append(board.uid)


def test_cautions_are_for_all_boards_that_are_there() -> None:
    cautions = Cautions()
    bench = Bench(cautions)

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "5", "enter")
        assert not bench.sent(1, "throw")
        await press(bench, pilot, "y")
        assert cautions.read == ["virtual-1", "virtual-2"]
        await press(bench, pilot, "5", "enter")
        assert len(bench.sent(1, "throw")) == 1

    play(bench, story)


# ---- pictures


def both(bench: Bench) -> None:
    """As it begins."""


def route(bench: Bench) -> None:
    """A route over both, its first throw waiting."""
    bench.app.desk.route(ROAD_1)
    number = bench.sent(1, "throw")[-1][1]
    bench.links[1].says(messages.BANK, b=0, mv=9800, age=1, state="charging", ready=1200)
    bench.links[1].says(messages.EXPECT, id=number, step=0, j=1, lie=1, by="host", st="waiting", due=1200)


def lost(bench: Bench) -> None:
    """The Yard is out for twelve seconds."""
    bench.goes(1)
    for _ in range(24):
        bench.clock.now_s += 0.5
        bench.quiet(0, TERMINUS)


def fault(bench: Bench) -> None:
    """The Yard's bank is out; the Yard alone is stopped."""
    bench.links[1].says(messages.FAULT, q=1, scope="bank", i=0, code="no_drop", e1=300, e2=7900, near=1)
    bench.links[1].says(messages.BANK, b=0, mv=15_000, age=1, state="out", ready=-1)
    bench.state(1, stop=1)


SCENES: dict[str, tuple[Callable[[Bench], None], tuple[str, ...]]] = {
    "both": (both, ()),
    "route": (route, ()),
    "lost": (lost, ("5", "enter")),
    "fault": (fault, ()),
    "faults": (fault, ("f",)),
    "log": (lost, ("l",)),
    "tuning-yard": (both, ("t", "f3")),
}


@pytest.mark.parametrize("size", SIZES, ids=lambda size: f"{size[0]}x{size[1]}")
@pytest.mark.parametrize("scene", SCENES)
def test_screens_of_two_boards_look_as_kept(snap_compare: Any, scene: str, size: tuple[int, int]) -> None:
    prepare, keys = SCENES[scene]
    bench = Bench()
    prepare(bench)

    async def act(pilot: Pilot[int]) -> None:
        for key in keys:
            await pilot.press(key)
        bench.app.desk.poll()
        # The first drawing moves panels; they are filled when the new sizes are known.
        for _ in range(4):
            bench.app.draw()
            await pilot.pause()

    assert snap_compare(bench.app, terminal_size=size, run_before=act)
