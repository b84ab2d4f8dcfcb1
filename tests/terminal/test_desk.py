"""Typing, requests and their answers, without a screen."""

import pytest

from host.terminal.desk import Desk
from host.terminal.mode_view import WAITS_MS, Mode
from host.terminal.typing_view import Choose, Throw, Typing, Wrong, banks_hint, lie_keys, prompt_text
from host.terminal.voltage_history import KEPT, VoltageHistory
from shared_protocol import messages
from tests.terminal.bench import Bench, CautionsOnce, NoCautions


@pytest.fixture(name="bench")
def _bench() -> Bench:
    return Bench()


@pytest.fixture(name="desk")
def _desk(bench: Bench) -> Desk:
    bench.link.sent.clear()
    return Desk(bench.session, NoCautions())


def keys(desk: Desk, *pressed: str) -> None:
    """Press keys as the main screen hands them on."""
    for key in pressed:
        desk.typed(key, key if len(key) == 1 else None)


# ---- typing


@pytest.mark.parametrize(
    ("typed", "meaning"),
    [
        ("", Wrong("Type a junction number first.")),
        ("7", Throw(6, 0)),
        ("1", Throw(0, 1)),
        ("7r", Throw(6, 1)),
        ("7n", Throw(6, 0)),
        ("07", Throw(6, 0)),
        ("4", Choose(3)),
        ("4n", Throw(3, 0)),
        ("11", Choose(10)),
        ("11l", Throw(10, 1)),
        ("11r", Throw(10, 2)),
        ("12", Wrong("There is no junction 12; there are 11.")),
        ("7x", Wrong("7 Quay has no lie 'x': n main, r quay.")),
        ("711", Wrong("There is no junction 71; there are 11.")),
    ],
)
def test_what_enter_would_do(bench: Bench, typed: str, meaning: object) -> None:
    typing = Typing()
    for character in typed:
        typing.add(character)
    assert typing.meaning(bench.model) == meaning


def test_a_letter_alone_is_no_number() -> None:
    typing = Typing()
    assert not typing.add("r")
    assert typing.text == ""
    assert not typing.back()


def test_backspace_takes_the_letter_then_digits() -> None:
    typing = Typing()
    for character in "11r":
        typing.add(character)
    assert [typing.back() and typing.text for _ in range(3)] == ["11", "1", ""]


def test_the_prompt_says_what_enter_does_before_it_does_it(bench: Bench) -> None:
    typing = Typing()
    assert prompt_text(typing, bench.model) == "Junction: _   (number, Enter)"
    typing.add("7")
    assert prompt_text(typing, bench.model) == (
        "Junction: 7_  Enter throws Quay to main (lies quay; East 16.0 V, needs 12.0 V)"
    )
    typing.clear()
    typing.add("4")
    assert prompt_text(typing, bench.model) == "Junction: 4_  Enter asks which lie of Bay (lies unknown)"
    assert banks_hint(bench.model, bench.model.junctions[6], 0) == "East 16.0 V, needs 12.0 V"


def test_lies_whose_names_begin_alike_get_letters_in_order(bench: Bench) -> None:
    junction = bench.model.junctions[10]
    assert lie_keys(junction) == ["m", "l", "r"]
    junction.lies[1].name = "maybe"
    assert lie_keys(junction) == ["a", "b", "c"]


# ---- requests


def test_enter_throws_to_the_other_lie_with_the_wait_that_is_set(bench: Bench, desk: Desk) -> None:
    keys(desk, "7", "enter")
    assert bench.sent("throw") == [[7, 1000, 6, 0, 5000]]
    assert desk.typing.text == ""
    desk.mode.switch()
    keys(desk, "7", "enter")
    assert bench.sent("throw")[1] == [7, 1001, 6, 0, 0]


def test_more_than_two_lies_are_chosen_by_a_letter(bench: Bench, desk: Desk) -> None:
    keys(desk, "1", "1", "enter")
    assert desk.notice.text.startswith("m yard 2, l yard 1, r yard 3")
    keys(desk, "q", "1")
    assert bench.sent("throw") == []
    assert desk.choosing == 10
    keys(desk, "L")
    assert bench.sent("throw") == [[7, 1000, 10, 1, 5000]]
    assert desk.choosing == -1


def test_escape_leaves_the_choice(bench: Bench, desk: Desk) -> None:
    keys(desk, "1", "1", "enter", "escape", "l")
    assert bench.sent("throw") == []


def test_stop_ends_typing_and_choosing(bench: Bench, desk: Desk) -> None:
    keys(desk, "1", "1", "enter")
    desk.stop()
    keys(desk, "l")
    assert bench.sent("throw") == []
    assert bench.sent("stop") == [[]]


def test_a_stop_that_did_not_leave_is_said_loudly(bench: Bench, desk: Desk) -> None:
    bench.link.breaks()
    desk.poll()
    desk.stop()
    assert desk.notice.level == "bad"
    assert desk.notice.text.startswith("STOP NOT SENT")


def test_coming_back_repeats_nothing_and_says_so(bench: Bench, desk: Desk) -> None:
    desk.poll()
    assert desk.notice.text == ""
    bench.link.breaks()
    desk.poll()
    desk.stop()
    bench.link.sent.clear()
    bench.link.connects(crc=bench.layout.crc())
    desk.poll()
    assert bench.sent("stop") == [] and bench.sent("throw") == []
    assert desk.notice.text.startswith("The board answers again.")


def test_a_refusal_says_why_and_how_long(bench: Bench, desk: Desk) -> None:
    desk.mode.switch()
    keys(desk, "7", "enter")
    bench.desk.outcome(1, 1000, j=6, lie=0, o="refused", why="below_ready", ms=640, i=1, mv=9800, after=-1)
    desk.poll()
    assert desk.notice.level == "warn"
    assert "below the ready voltage" in desk.notice.text
    assert "bank East is at 9.8 V" in desk.notice.text
    assert "640 ms" in desk.notice.text


def test_only_what_was_asked_for_here_comes_to_the_answer_line(bench: Bench, desk: Desk) -> None:
    desk.say("info", "before")
    bench.desk.outcome(1, 77, j=6, lie=0, o="failed", why="no_contact")
    desk.poll()
    assert desk.notice.text == "before"


def test_a_route_goes_with_the_wait_that_is_set(bench: Bench, desk: Desk) -> None:
    desk.route(2)
    assert bench.sent("route") == [[7, 1000, 2, 5000]]


def test_a_throw_without_connection_says_so(bench: Bench, desk: Desk) -> None:
    bench.link.breaks()
    desk.poll()
    keys(desk, "7", "enter")
    assert bench.sent("throw") == []
    assert desk.notice.level == "bad"
    assert "not sent" in desk.notice.text


def test_a_stop_can_be_released_before_the_board_has_told_of_it(bench: Bench, desk: Desk) -> None:
    desk.stop()
    desk.release()
    assert not bench.model.stopped
    assert bench.sent("stop") == [[]] and bench.sent("release") == [[7]]
    bench.link.breaks()
    desk.poll()
    desk.release()
    assert desk.notice.level == "bad" and len(bench.sent("release")) == 1


def test_answers_to_other_requests_are_shown_with_the_reason(bench: Bench, desk: Desk) -> None:
    desk.clear("bank", 1, "bank East")
    desk.poll()
    assert desk.notice.text == "asked to put bank East back into use"
    bench.link.says(messages.ANSWER, to="clear", ok=0, why="not_out", i=-1)
    desk.poll()
    assert desk.notice.level == "bad" and "nothing is out there" in desk.notice.text
    desk.stop()
    assert desk.notice.text == "STOP sent."
    bench.link.says(messages.ANSWER, to="stop", ok=1, why="ok", i=-1)
    desk.poll()
    assert desk.notice.text.startswith("STOP is on")
    desk.say("info", "later")
    bench.link.says(messages.ANSWER, to="release", ok=0, why="busy", i=-1)
    desk.poll()
    assert desk.notice.text == "later"


def test_cancel_takes_each_request_once(bench: Bench, desk: Desk) -> None:
    bench.expects(1001, 1, 1, 1, 500)
    bench.expects(1001, 2, 0, 1, 900)
    bench.expects(1002, 0, 6, 0, 1200)
    waiting = desk.waiting()
    assert [(each.id, each.text) for each in waiting] == [(1001, "route: 2 Loop and what follows"), (1002, "7 Quay")]
    desk.cancel([each.id for each in waiting])
    assert bench.sent("cancel") == [[7, 1001], [7, 1002]]


def test_nothing_to_cancel_is_said(bench: Bench, desk: Desk) -> None:
    desk.cancel([])
    assert desk.notice.text == "Nothing waits."
    bench.link.says(messages.EXPECT, id=0, step=0, j=0, lie=1, by="button", st="waiting", due=100)
    bench.session.poll()
    assert desk.waiting() == []
    desk.cancel([])
    assert "button" in desk.notice.text


def test_nothing_fires_before_the_cautions_are_read(bench: Bench) -> None:
    desk = Desk(bench.session, CautionsOnce())
    bench.link.sent.clear()
    keys(desk, "7", "enter")
    desk.route(0)
    assert bench.sent("throw") == [] and bench.sent("route") == []
    assert desk.caution_wanted
    desk.cautions.acknowledge(bench.model.board)
    keys(desk, "7", "enter")
    assert len(bench.sent("throw")) == 1


# ---- mode and history


def test_waits_go_up_and_down_and_stay_in_the_tables_range() -> None:
    mode = Mode()
    for _ in range(20):
        mode.longer()
    assert mode.longest_ms == WAITS_MS[-1] == 60_000
    mode.longest_ms = 3000
    mode.shorter()
    assert mode.longest_ms == 2000
    mode.switch()
    assert mode.wait_ms == 0 and mode.short_text == "NOW"


def test_history_keeps_a_reading_once_at_the_time_it_was_taken(bench: Bench) -> None:
    history = VoltageHistory()
    bench.bank(0, 15_000, "ready", 0, age=400)
    history.take(bench.model)
    history.take(bench.model)
    [(at_s, mv)] = history.since(0, 0.0)
    assert abs(at_s - 99.6) < 1e-6 and mv == 15_000
    assert history.since(0, 99.7) == []


def test_history_forgets_the_oldest() -> None:
    history = VoltageHistory()
    for number in range(KEPT + 5):
        history.add(0, float(number), number)
    assert len(history.since(0, 0.0)) == KEPT
    assert history.since(0, 0.0)[0] == (5.0, 5)
