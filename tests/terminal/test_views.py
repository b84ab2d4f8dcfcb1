"""View models: what the screens say, read without colour."""

import pytest

from host.terminal import (
    banks_view,
    commands,
    events_view,
    faults_view,
    go_view,
    help_view,
    junctions_view,
    queue_view,
    routes_view,
)
from host.terminal.layout_sizes import share_out
from host.terminal.rows import text_of, texts_of
from host.views import Event, GoLine
from shared_protocol import messages
from tests.terminal.bench import Bench


@pytest.fixture(name="bench")
def _bench() -> Bench:
    return Bench()


# ---- go line


@pytest.mark.parametrize(
    ("level", "text", "shown"),
    [
        ("go", "ready", " >> GO <<   ready: every bank is full enough for every throw"),
        ("wait", "wait 1.2 s for bank East", " .. WAIT .. 1.2 s for bank East"),
        ("wait", "wait: asking the board how things are", " .. WAIT .. asking the board how things are"),
        ("stop", "stopped: press r to release", " ## STOP ## press r to release"),
        ("out", "bank East out: Quay coil open", " !! OUT !!  bank East out: Quay coil open"),
        ("lost", "lost: no word from the board for 3 s", " ?? LOST ?? no word from the board for 3 s"),
        ("lost", "lost 3 s ago: the board is gone", " ?? LOST ?? lost 3 s ago: the board is gone"),
    ],
)
def test_the_go_line_says_its_state_in_a_word(level: str, text: str, shown: str) -> None:
    assert go_view.go_text(GoLine(level, text), 80).rstrip() == shown


def test_a_long_go_line_loses_its_frame_before_its_advice() -> None:
    text = "bank West out: Throat nothing charges it, look at the supply and its fuse"
    assert go_view.go_text(GoLine("out", text), 80).rstrip() == f" OUT: {text}"


def test_a_long_go_line_is_cut_at_the_width() -> None:
    assert len(go_view.go_text(GoLine("out", "x" * 200), 80)) == 80


def test_the_title_tells_that_board_and_file_differ(bench: Bench) -> None:
    assert go_view.title_text(bench.model) == "Saltmarsh Quay, test board"
    bench.link.greets(crc="00000000")
    bench.session.poll()
    assert go_view.title_text(bench.model) == "Saltmarsh Quay, board and file differ"
    bench.link.breaks()
    bench.session.poll()
    assert go_view.title_text(bench.model) == "Saltmarsh Quay, as last told"


# ---- junctions


def test_junctions_in_the_owners_words(bench: Bench) -> None:
    shown = texts_of(junctions_view.junction_rows(bench.model, 46, 100.0))
    assert shown[0] == "  1 Throat     to platform 1    seen    West"
    assert shown[2] == "  3 Goods      goods shed       sent    West"
    assert shown[3] == "  4 Bay        unknown          unknown West"
    assert shown[10] == " 11 Yard fan   yard 3           sent    East"


def test_a_waiting_junction_has_a_mark_and_where_it_goes(bench: Bench) -> None:
    bench.expects(1001, 0, 1, 1, 500)
    assert texts_of(junctions_view.junction_rows(bench.model, 46, 100.0))[1].startswith("  2>Loop       main > loop  ")


def test_the_way_it_lies_is_kept_where_the_target_does_not_fit(bench: Bench) -> None:
    bench.expects(1001, 0, 0, 1, 500)
    assert texts_of(junctions_view.junction_rows(bench.model, 46, 100.0))[0].startswith(
        "  1>Throat     to platform 1  "
    )


def test_out_is_said_at_the_junction_and_marked_for_its_bank(bench: Bench) -> None:
    bench.fault(1, "bank", 1, "supply_missing", 3100, 16000)
    bench.fault(2, "junction", 4, "contacts_disagree", 1, 1)
    shown = texts_of(junctions_view.junction_rows(bench.model, 46, 100.0))
    assert shown[4].startswith("  5!Shed") and " OUT " in shown[4]
    assert shown[6].startswith("  7!Quay") and " seen " in shown[6]
    assert shown[0].startswith("  1 Throat")


def test_what_was_told_before_the_link_was_lost_stands_in_brackets(bench: Bench) -> None:
    bench.link.breaks()
    bench.session.poll()
    shown = texts_of(junctions_view.junction_rows(bench.model, 46, 100.0))
    assert "(seen)" in shown[0]
    assert "(sent)" in shown[2]
    assert "unknown" in shown[3]


def test_a_wide_panel_shows_ready_voltages_and_ages(bench: Bench) -> None:
    line = texts_of(junctions_view.junction_rows(bench.model, 83, 103.5))[1]
    assert "12.4 V" in line and line.endswith(" 3 s")
    heading = text_of(junctions_view.heading(83))
    assert heading.index("needs at least") == line.index("12.4 V")


def test_ready_voltages_apart_by_more_than_half_a_volt_are_both_shown(bench: Bench) -> None:
    junction = bench.model.junctions[1]
    junction.lies[1].ready_mv = junction.lies[0].ready_mv + 500
    assert junctions_view.needs(junction) == "12.9 V"
    junction.lies[1].ready_mv += 1
    assert junctions_view.needs(junction) == "main 12.4, loop 12.9 V"


@pytest.mark.parametrize("width", [20, 30, 46, 60, 76, 90, 120])
def test_rows_are_never_wider_than_the_panel(bench: Bench, width: int) -> None:
    bench.expects(1001, 0, 0, 1, 500)
    shown = junctions_view.junction_rows(bench.model, width, 100.0, picked=0)
    assert all(len(text_of(line)) <= max(width, 24) for line in shown)
    assert all(piece.look == "picked" for piece in shown[0])


# ---- banks


def test_a_bar_shows_voltage_and_the_highest_ready_voltage() -> None:
    assert banks_view.bar(8000, 16000, 8) == "████░░░░"
    assert banks_view.bar(8000, 16000, 8, 14000) == "████░░░|"
    assert banks_view.bar(-1, 16000, 4) == "░░░░"
    assert banks_view.bar(20000, 16000, 4) == "████"
    assert banks_view.bar(100, 0, 4) == "░░░░"


def test_the_banks_time_to_ready_counts_down_with_the_age(bench: Bench) -> None:
    bench.bank(0, 9800, "charging", 1200)
    bank = bench.model.banks[0]
    assert banks_view.bank_text(bank, 100.0) == "charging, ready in 1.2 s"
    assert banks_view.bank_text(bank, 100.5) == "charging, ready in 0.7 s"
    bench.bank(0, 9800, "charging", -1)
    assert banks_view.bank_text(bank, 100.0) == "charging, not told how long"
    bench.bank(0, 9800, "stale", -1)
    assert banks_view.bank_text(bank, 100.0) == "no fresh reading"


def test_an_old_reading_is_said_to_be_old(bench: Bench) -> None:
    fresh = texts_of(banks_view.bank_rows(bench.model, 34, 100.5))
    assert fresh[0].endswith("16.0 V") and fresh[1].strip() == "ready"
    old = texts_of(banks_view.bank_rows(bench.model, 34, 112.3))
    assert old[1].strip().startswith("was ready") and old[1].endswith("12 s old")


def test_a_bank_that_is_out_says_why(bench: Bench) -> None:
    bench.fault(1, "bank", 0, "supply_missing", 3100, 16000)
    bench.bank(0, 3100, "out", -1)
    assert texts_of(banks_view.bank_rows(bench.model, 50, 100.0))[1].strip() == "OUT: nothing charges the bank"


def test_no_settings_is_said() -> None:
    bench = Bench(ready=False)
    bench.model.banks.clear()
    bench.model.junctions.clear()
    assert "No settings are known" in texts_of(junctions_view.junction_rows(bench.model, 46, 0.0))[0]
    assert "no settings" in texts_of(banks_view.bank_rows(bench.model, 34, 0.0))[0]


# ---- queue


def test_the_queue_counts_down_from_what_the_board_said(bench: Bench) -> None:
    bench.expects(1001, 1, 1, 1, 1600)
    bench.expects(1001, 2, 0, 1, 400)
    shown = texts_of(queue_view.queue_rows(bench.model, 50, 5, 100.0))
    assert shown == [
        "  1 Throat > to platform 2               in 0.4 s",
        "  2 Loop > loop                          in 1.6 s",
    ]
    assert texts_of(queue_view.queue_rows(bench.model, 50, 5, 101.0)) == [
        "  1 Throat > to platform 2               due",
        "  2 Loop > loop                          in 0.6 s",
    ]
    assert queue_view.queue_title(bench.model, 100.0) == "Queue: 2, last in 1.6 s"


def test_a_time_that_is_not_told_is_not_guessed(bench: Bench) -> None:
    bench.expects(1001, 0, 1, 1, -1)
    assert queue_view.queue_title(bench.model, 100.0) == "Queue: 1"
    assert texts_of(queue_view.queue_rows(bench.model, 50, 5, 100.0))[0].endswith("not told")


def test_states_of_a_throw_in_words(bench: Bench) -> None:
    bench.expects(1001, 0, 1, 1, 0, "pulse")
    bench.expects(1002, 0, 0, 1, 0, "answer")
    assert [queue_view.when(item, 100.0) for item in bench.model.queue] == ["pulse", "looks"]


def test_of_a_long_queue_the_soonest_are_shown_and_all_are_counted(bench: Bench) -> None:
    for step in range(1, 11):
        bench.expects(1001, step, step - 1, 0, 1100 - 100 * step)
    shown = texts_of(queue_view.queue_rows(bench.model, 32, 3, 100.0))
    assert [line.split()[0] for line in shown] == ["10", "9", "8"]
    assert queue_view.queue_title(bench.model, 100.0) == "Queue: 10, last in 1.0 s"


def test_who_asked_is_said_when_it_was_not_this_desk(bench: Bench) -> None:
    bench.link.says(messages.EXPECT, id=0, step=0, j=0, lie=1, by="button", st="waiting", due=100)
    bench.session.poll()
    assert "button Throat > to platform 2" in texts_of(queue_view.queue_rows(bench.model, 60, 3, 100.0))[0]


# ---- routes, faults, events, help, commands


def test_routes_say_how_far_they_are_set(bench: Bench) -> None:
    shown = texts_of(routes_view.route_rows(bench.model, 33))
    assert shown[0] == " a  Arrival platform 1   1 of 3"
    assert shown[4] == " e  Show reset          2 of 10"
    bench.link.says(messages.LIE, j=8, lie=0, src="sent")
    bench.link.says(messages.LIE, j=9, lie=0, src="seen")
    bench.session.poll()
    assert texts_of(routes_view.route_rows(bench.model, 33))[0].endswith(" set")


def test_every_throw_of_a_route_is_named_where_it_is_chosen(bench: Bench) -> None:
    text = " ".join(" ".join(texts_of(routes_view.choice_rows(bench.model, 60))).split())
    assert "b Arrival platform 2 (0 of 3 lie so already) Yard lead to the yard, Crossover straight" in text


def test_route_letters_are_enough_for_every_route() -> None:
    assert len({routes_view.letter_of(number) for number in range(32)}) == 32


def test_a_fault_says_what_evidence_and_what_to_do(bench: Bench) -> None:
    bench.fault(1, "bank", 1, "no_drop", 300, 7900, near=6)
    text = "\n".join(texts_of(faults_view.fault_lines(bench.model, 80, 104.0, 0)))
    for part in (
        "> 1  bank East (Quay last) is out",
        "the bank did not drop: coil or wire open",
        "0.3 V dropped, 7.9 V expected",
        "move it by hand; look at the coil",
        "4 s ago; blink code on the board: 3",
    ):
        assert part in text
    short = texts_of(faults_view.fault_rows(bench.model, 46, 4))
    assert len(short) <= 4
    assert "Do: move it by hand" in " ".join(short)


def test_no_fault_is_said_too(bench: Bench) -> None:
    assert faults_view.faults_title(bench.model) == "Faults: none"
    assert "Nothing is out" in texts_of(faults_view.fault_lines(bench.model, 80, 0.0, 0))[1]


def test_the_event_filter() -> None:
    events = [Event(1.0, "info", "Loop moved"), Event(2.0, "warn", "bank East slow"), Event(3.0, "bad", "loop jammed")]
    chosen = events_view.EventFilter("LOOP")
    assert [event.at_s for event in events if chosen.keeps(event)] == [1.0, 3.0]
    chosen.next_level()
    chosen.next_level()
    assert [event.at_s for event in events if chosen.keeps(event)] == [3.0]
    assert events_view.filter_title(events, chosen) == (
        "Event log: 1 of 3 events, warnings and worse, containing 'LOOP'"
    )
    chosen.next_level()
    chosen.next_level()
    assert chosen.least == 0


def test_events_carry_a_sign_and_wrap() -> None:
    events = [Event(1.0, "bad", "one two three four five"), Event(2.0, "good", "six")]
    shown = texts_of(events_view.event_rows(events, 22, lambda at_s: f"{at_s:.0f} s"))
    assert shown == [" 1 s X one two three", "       four five", " 2 s + six"]
    assert texts_of(events_view.event_rows(events, 22, lambda at_s: f"{at_s:.0f} s", most=2)) == shown[1:]
    assert texts_of(events_view.one_line_rows(events, 22, lambda at_s: f"{at_s:.0f} s", 2)) == [
        " 1 s X one two three…", " 2 s + six"
    ]  # fmt: skip


def test_help_names_keys_words_and_cautions() -> None:
    text = " ".join(" ".join(texts_of(help_view.help_rows(78))).split())
    for part in ("SPACE stop, from every screen", "seen a contact saw", "Stop is not isolation", "ctrl+p"):
        assert part in text
    assert all(len(line) <= 78 for line in texts_of(help_view.help_rows(78)))


def test_the_palette_offers_every_action(bench: Bench) -> None:
    bench.fault(1, "bank", 1, "no_drop", 300, 7900, near=6)
    titles = [command.title for command in commands.all_commands(bench.model)]
    for title in ("Stop", "Release", "Throw 7 Quay to quay", "Throw 11 Yard fan to yard 1", "Route Boat train",
                  "Clear bank East", "Tuning", "Event log", "Cancel all that waits"):  # fmt: skip
        assert title in titles
    assert len(titles) == len(set(titles))


# ---- room


def test_the_demo_layout_fits_80_by_24() -> None:
    sizes = share_out(80, 24, 11, 2, 5)
    assert sizes.top == 12 and sizes.left >= 46
    assert sizes.top + sizes.middle + sizes.events + sizes.answer + 3 == 24
    assert sizes.middle >= 4


@pytest.mark.parametrize("height", range(12, 70))
@pytest.mark.parametrize("junctions", [1, 11, 64])
def test_the_room_is_shared_out_whole(height: int, junctions: int) -> None:
    for faults in (False, True):
        sizes = share_out(100, height, junctions, 3, 32, faults)
        assert sizes.top + sizes.middle + sizes.events + sizes.answer + 3 >= height
        assert min(sizes.top, sizes.middle, sizes.events, sizes.left, sizes.queue) > 0
        if height >= 24:
            assert sizes.top + sizes.middle + sizes.events + sizes.answer + 3 == height
