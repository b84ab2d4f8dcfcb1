"""The program under a pilot: the first screen, faults, log, palette, keys, pictures."""

from pathlib import Path

import pytest
from textual.binding import Binding
from textual.command import CommandPalette
from textual.pilot import Pilot

from host.terminal import (
    app as app_module,
)
from host.terminal import (
    ask_screen,
    faults_screen,
    log_screen,
    main_screen,
    tuning_screen,
)
from host.terminal.desk_screen import Words
from host.terminal.faults_screen import FaultsScreen
from host.terminal.lines import Lines
from host.terminal.log_screen import LogScreen
from host.terminal.main_screen import MainScreen
from host.terminal.picture import draw_picture, steady
from shared_protocol import messages
from tests.terminal.bench import Bench
from tests.terminal.driving import news, press, rows, run, said

# ---- news


def test_the_first_screen_follows_the_board() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        assert said(bench, "go").startswith(" >> GO <<")
        bench.bank(0, 9800, "charging", 1200)
        bench.link.says(messages.LIE, j=3, lie=1, src="sent")
        bench.expects(1001, 0, 1, 1, 1500)
        await news(bench, pilot)
        assert said(bench, "go").rstrip() == " .. WAIT .. 1.2 s for bank West"
        assert rows(bench, "junctions")[3] == "  4 Bay        bay              sent    West"
        assert rows(bench, "queue") == ["  2 Loop > loop                        in 1.5 s"]
        bench.link.breaks()
        bench.session.poll()
        await news(bench, pilot)
        assert said(bench, "go").startswith(" ?? LOST ??")

    run(bench, story)


def test_all_first_glance_answers_fit_80_by_24() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        bench.fault(1, "bank", 1, "no_drop", 300, 7900, near=6)
        await news(bench, pilot)
        await news(bench, pilot)
        for id, count in (("junctions", 11), ("banks", 4), ("routes", 5)):
            panel = bench.app.screen.query_one(f"#{id}", Lines)
            assert len(panel.rows) == count
            assert panel.size.height >= count, id
            assert panel.max_scroll_y == 0, id
        assert bench.app.screen.query_one("#faults", Lines).size.height >= 3

    run(bench, story)


def test_only_changed_lines_are_drawn_again(monkeypatch: pytest.MonkeyPatch) -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await news(bench, pilot)
        await news(bench, pilot)
        panel = bench.app.screen.query_one("#junctions", Lines)
        drawn: list[object] = []
        monkeypatch.setattr(panel, "refresh", lambda *regions, **_: drawn.extend(regions or ["all"]))
        await news(bench, pilot)
        assert drawn == []
        bench.link.says(messages.LIE, j=3, lie=1, src="sent")
        await news(bench, pilot)
        assert [region.y for region in drawn] == [3]  # type: ignore[attr-defined]

    run(bench, story)


def test_polling_draws_no_faster_than_is_useful(monkeypatch: pytest.MonkeyPatch) -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        drawn: list[float] = []
        monkeypatch.setattr(bench.app.screen, "show_all", lambda: drawn.append(bench.desk.clock.now_s))
        for _ in range(40):
            bench.desk.clock.now_s += 0.05
            bench.bank(0, 16_000, "ready", 0)
            bench.app.tick()
        assert len(drawn) <= 20
        drawn.clear()
        bench.app.tick()
        for _ in range(40):
            bench.desk.clock.now_s += 0.05
            bench.app.tick()
        assert 3 <= len(drawn) <= 5

    run(bench, story)


# ---- faults and log


def test_a_fault_is_picked_and_cleared() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        bench.fault(1, "bank", 1, "no_drop", 300, 7900, near=6)
        bench.fault(2, "junction", 4, "contacts_disagree", 1, 1)
        await press(bench, pilot, "c")
        assert isinstance(bench.app.screen, FaultsScreen)
        assert bench.sent("clear") == []
        await press(bench, pilot, "down", "c")
        assert bench.sent("clear") == [[7, 1, 4]]
        await press(bench, pilot, "a")
        assert bench.sent("clear")[1:] == [[7, 3, 0]]
        bench.link.says(messages.CLEARED, q=3, scope="all", i=0)
        await news(bench, pilot)
        assert "Nothing is out of use." in rows(bench, "all-faults")[1]
        await press(bench, pilot, "c", "escape")
        assert len(bench.sent("clear")) == 2

    run(bench, story)


def test_the_log_is_filtered() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        bench.model.note(101.0, "bad", "Loop jammed")
        bench.model.note(102.0, "info", "Loop moved")
        await press(bench, pilot, "l")
        assert isinstance(bench.app.screen, LogScreen)
        await press(bench, pilot, "slash", "l", "o", "o", "p", "enter")
        assert rows(bench, "log") == [" 0101.0 X Loop jammed", " 0102.0   Loop moved"]
        await press(bench, pilot, "v", "v")
        assert rows(bench, "log") == [" 0101.0 X Loop jammed"]
        await press(bench, pilot, "escape")
        assert isinstance(bench.app.screen, MainScreen)

    run(bench, story)


# ---- the palette, keys, pictures


def test_the_palette_runs_an_action() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "ctrl+p")
        assert isinstance(bench.app.screen, CommandPalette)
        await pilot.press(*"boat")
        await bench.app.workers.wait_for_complete()
        await pilot.pause(0.3)
        await pilot.press("enter")
        await pilot.pause(0.3)
        await pilot.press("enter")
        await pilot.pause()
        await pilot.pause()
        assert bench.sent("route") == [[7, 1000, 2, 5000]]

    run(bench, story)


def test_the_go_line_goes_on_under_the_palette() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        await press(bench, pilot, "ctrl+p")
        bench.bank(0, 9800, "charging", 1200)
        await news(bench, pilot)
        assert isinstance(bench.app.screen, CommandPalette)
        below = bench.app.screen_stack[-2]
        assert below.query_one("#go", Words).said.startswith(" .. WAIT .. 1.2 s")

    run(bench, story)


def test_no_key_clashes_with_terminal_multiplexers() -> None:
    classes = (
        app_module.DeskApp,
        main_screen.MainScreen,
        ask_screen.AskScreen,
        faults_screen.FaultsScreen,
        log_screen.LogScreen,
        tuning_screen.TuningScreen,
    )
    keys = [
        key
        for each in classes
        for binding in each.__dict__["BINDINGS"]
        for key in (binding.key if isinstance(binding, Binding) else binding[0]).split(",")
    ]
    keys += main_screen.ACTIONS
    assert "space" in keys and "r" in keys
    assert not {"ctrl+a", "ctrl+b"} & set(keys)


@pytest.mark.parametrize("size", [(40, 12), (80, 24), (200, 60)])
def test_any_size_is_drawn(size: tuple[int, int]) -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        for key in ("f", "l", "question_mark", "o", "t"):
            await press(bench, pilot, key, "escape")
        await news(bench, pilot)
        assert isinstance(bench.app.screen, MainScreen)
        assert "GO" in said(bench, "go")[:6] and len(said(bench, "go")) == size[0]

    run(bench, story, size)


def test_a_picture_waits_until_the_banks_are_steady() -> None:
    bench = Bench()
    for number in range(20):
        for bank in (0, 1):
            bench.app.desk.history.add(bank, 98.0 + number / 10, 15_000 if bank and number < 12 else 16_000)
    assert steady(bench.app.desk, 0.7)
    assert not steady(bench.app.desk, 1.5)
    bench.bank(0, 9000, "charging", 900)
    assert not steady(bench.app.desk, 0.7)


def test_without_a_board_the_picture_is_drawn_all_the_same(tmp_path: Path) -> None:
    bench = Bench(ready=False)
    assert draw_picture(bench.session, tmp_path / "x.svg", (80, 24), longest_s=0.2) == 0
    assert "LOST" in (tmp_path / "x.svg").read_text("utf-8")


def test_the_wait_is_switched_and_changed() -> None:
    bench = Bench()

    async def story(pilot: Pilot[int]) -> None:
        assert said(bench, "prompt").endswith("[m: WAIT 5.0 s]")
        await press(bench, pilot, "plus")
        assert said(bench, "prompt").endswith("[m: WAIT 10.0 s]")
        await press(bench, pilot, "minus", "minus")
        assert said(bench, "prompt").endswith("[m: WAIT 2.0 s]")
        await press(bench, pilot, "m")
        assert said(bench, "prompt").endswith("[m: NOW]")

    run(bench, story)


def test_a_picture_is_the_same_twice(tmp_path: Path) -> None:
    pictures = []
    for name in ("one.svg", "two.svg"):
        bench = Bench()
        assert draw_picture(bench.session, tmp_path / name, (100, 30), settle_s=0) == 0
        pictures.append((tmp_path / name).read_text("utf-8"))
    assert pictures[0] == pictures[1]
    assert "Saltmarsh" in pictures[0]
    bench = Bench()
    assert draw_picture(bench.session, tmp_path / "missing" / "x.svg", (80, 24), settle_s=0) == 2
