"""Buttons and followers: the layout runs with no host."""

from bench import Bench
from bench_board import BenchBoard
from bench_layouts import BenchLayout, bank_records, board_records, junction_records, motor_record, two_lies, usual

from shared_protocol import settings_table as table

PRESS = 10


def alone(layout: "BenchLayout | None" = None) -> Bench:
    """A bench without a host."""
    bench = Bench(layout)
    bench.run(100)
    return bench


def press(bench: Bench, number: int, ms: int = 60) -> None:
    """Press a button for a time, then let it rest."""
    bench.board.set_input(number, True)
    bench.run(ms)
    bench.board.set_input(number, False)
    bench.run(60)


def masks(bench: Bench) -> "list[int]":
    """The masks of all pulses."""
    return [pulse[2] for pulse in bench.board.pulses]


def case_an_alternating_button_throws_to_and_fro() -> None:
    bench = alone()
    press(bench, PRESS)
    bench.run(1500)
    press(bench, PRESS)
    bench.run(1500)
    press(bench, PRESS)
    bench.run(1500)
    assert masks(bench) == [1, 2, 1]


def case_a_short_touch_and_bounce_do_nothing() -> None:
    bench = alone()
    for _ in range(5):
        press(bench, PRESS, 10)
    assert masks(bench) == []
    for turn in range(10):
        bench.board.set_input(PRESS, turn % 2 == 0)
        bench.run(5)
    bench.board.set_input(PRESS, True)
    bench.run(60)
    assert len(masks(bench)) == 1
    bench.run(3000)
    assert len(masks(bench)) == 1


def case_a_button_pressed_again_always_fires_again() -> None:
    layout = usual()
    for message, fields in layout.records:
        if message.name == "set_button" and fields["i"] == 0:
            fields["kind"] = "set"
            fields["lie"] = 1
    bench = alone(layout)
    for _ in range(3):
        press(bench, PRESS)
        bench.run(1500)
    assert masks(bench) == [2, 2, 2]


def case_edges_during_a_pulse_are_ignored() -> None:
    bench = alone()
    bench.board.set_input(PRESS, True)
    bench.run(33)
    assert len(masks(bench)) == 1
    bench.board.set_input(PRESS, False)
    bench.run(10)
    bench.board.set_input(PRESS, True)
    bench.run(2000)
    assert len(masks(bench)) == 1


def case_stop_and_release_on_the_board() -> None:
    bench = alone()
    press(bench, 11)
    press(bench, PRESS)
    bench.run(1000)
    assert masks(bench) == []
    press(bench, 12)
    press(bench, PRESS)
    bench.run(1000)
    assert len(masks(bench)) == 1


def case_a_route_button() -> None:
    bench = alone()
    bench.on_pulse = lambda pulse: bench.board.set_input(0, pulse[0] == 1)
    press(bench, 13)
    bench.run(4000)
    assert masks(bench) == [2, 8, 2, 40]


def case_a_stuck_button_is_disabled_alone() -> None:
    bench = alone()
    bench.hello()
    bench.board.set_input(PRESS, True)
    bench.keep_alive(10_500, 2000)
    found = bench.last("fault")
    assert found is not None and (found["scope"], found["i"], found["code"]) == ("button", 0, "button_stuck")
    assert len(masks(bench)) == 1
    bench.board.set_input(PRESS, False)
    bench.run(100)
    press(bench, PRESS)
    bench.run(1000)
    assert len(masks(bench)) == 1
    bench.on_pulse = lambda pulse: bench.board.set_input(0, pulse[0] == 1)
    press(bench, 13)
    bench.run(4000)
    assert len(masks(bench)) == 5
    bench.send("clear", scope="button", i=0)
    bench.run(50)
    press(bench, PRESS)
    bench.run(1500)
    assert len(masks(bench)) == 6


def panel(kinds: "list[dict[str, object]]") -> BenchLayout:
    """Two turnouts on one bank, two routes, and buttons on inputs from 0."""
    layout = BenchLayout()
    board_records(layout, pair_ms=2000)
    bank_records(layout, 1)
    motor_record(layout, 0, 0, 0)
    motor_record(layout, 1, 0, 1)
    junction_records(layout, 0, "turnout", [0], two_lies())
    junction_records(layout, 1, "turnout", [1], two_lies())
    layout.add(table.SET_ROUTE, i=0, name="a", entrance=1, exit=2, throws=[0, 1])
    layout.add(table.SET_ROUTE, i=1, name="b", entrance=2, exit=1, throws=[1, 1])
    number = 0
    for fields in kinds:
        own = {"i": number, "input": number, "j": -1, "lie": -1, "other": -1, "n": -1}  # type: dict[str, object]
        own.update(fields)
        layout.add(table.SET_BUTTON, **own)
        number += 1
    return layout


def panel_bench(kinds: "list[dict[str, object]]", closed: int = -1) -> Bench:
    """A bench with that panel; one input may be closed from the start."""
    board = BenchBoard(1)
    if closed >= 0:
        board.set_input(closed, True)
    bench = Bench(panel(kinds), board)
    bench.run(100)
    return bench


def case_two_buttons_a_turnout() -> None:
    bench = panel_bench([{"kind": "set", "j": 0, "lie": 0}, {"kind": "set", "j": 0, "lie": 1}])
    press(bench, 1)
    bench.run(1500)
    press(bench, 0)
    bench.run(1500)
    assert masks(bench) == [2, 1]


def case_a_switch_is_read_at_power_up_only_if_asked() -> None:
    switch = {"kind": "switch", "j": 0, "lie": 1, "other": 0}  # type: dict[str, object]
    for read, closed, expected in (("no", 0, []), ("yes", 0, [2]), ("no", -1, []), ("yes", -1, [1])):
        own = dict(switch)
        own["read"] = read
        bench = panel_bench([own], closed)
        bench.run(1500)
        assert masks(bench) == expected, (read, closed, masks(bench))
        bench.board.set_input(0, closed < 0)
        bench.run(1500)
        bench.board.set_input(0, closed >= 0)
        bench.run(1500)
        moves = [2, 1] if closed < 0 else [1, 2]
        assert masks(bench) == expected + moves


def case_entrance_then_exit_sets_a_route() -> None:
    kinds = [
        {"kind": "entrance", "n": 1},
        {"kind": "exit", "n": 2},
        {"kind": "entrance", "n": 2},
        {"kind": "exit", "n": 1},
    ]  # type: list[dict[str, object]]
    bench = panel_bench(kinds)
    press(bench, 1)
    bench.run(500)
    assert masks(bench) == []
    press(bench, 0)
    press(bench, 1)
    bench.run(1500)
    assert masks(bench) == [2]
    press(bench, 2)
    press(bench, 3)
    bench.run(1500)
    assert masks(bench) == [2, 8]
    press(bench, 0)
    bench.run(2500)
    press(bench, 1)
    bench.run(1000)
    assert masks(bench) == [2, 8]


def case_a_rotary_switch_chooses_and_go_sets() -> None:
    kinds = [{"kind": "rotary", "n": 0}, {"kind": "rotary", "n": 1}, {"kind": "go"}]  # type: list[dict[str, object]]
    bench = panel_bench(kinds, 0)
    bench.run(500)
    assert masks(bench) == []
    press(bench, 2)
    bench.run(1500)
    assert masks(bench) == [2]
    bench.board.set_input(0, False)
    bench.board.set_input(1, True)
    bench.run(500)
    press(bench, 2)
    bench.run(1500)
    assert masks(bench) == [2, 8]


def case_a_long_press_clears() -> None:
    bench = panel_bench([{"kind": "clear"}])
    bench.hello()
    bench.board.banks[0].sense_mv = 30_000
    bench.keep_alive(200)
    bench.board.banks[0].sense_mv = -1
    bench.board.set_input(0, True)
    bench.keep_alive(2500)
    assert not bench.all("cleared")
    bench.keep_alive(1000)
    assert len(bench.all("cleared")) == 1
    bench.keep_alive(12_000, 5000)
    assert len(bench.all("cleared")) == 1


def lamps_over(bench: Bench, ms: int) -> "list[int]":
    """What the follower outputs showed, every 10 ms."""
    found = []
    for _ in range(ms // 10):
        bench.run(10)
        found.append(bench.board.follower_bits[0])
    return found


def flashes(bits: "list[int]", mask: int) -> int:
    """How often an output changed."""
    changes = 0
    for place in range(1, len(bits)):
        if (bits[place] ^ bits[place - 1]) & mask:
            changes += 1
    return changes


def case_followers_tell_sent_seen_and_waiting() -> None:
    layout = usual()
    layout.add(table.SET_FOLLOWER, i=3, kind="lamp", output=3, j=2, lie=1)
    bench = alone(layout)
    assert lamps_over(bench, 100)[-1] == 0b0100
    press(bench, PRESS)
    bench.run(1500)
    press(bench, PRESS)
    bench.run(1500)
    sent = lamps_over(bench, 2048)
    assert 2 <= flashes(sent, 1) <= 5 and all([bits & 0b110 == 0b010 for bits in sent])
    bench.board.set_input(0, True)
    bench.run(20)
    seen = lamps_over(bench, 2048)
    assert all([bits & 0b1000 for bits in seen])
    bench.board.banks[0].rise_mv_per_ms = 12
    press(bench, PRESS)
    bench.run(100)
    press(bench, PRESS)
    waiting = lamps_over(bench, 512)
    assert flashes(waiting, 1) >= 3, waiting


def case_a_frog_changes_only_after_the_pulse() -> None:
    bench = alone()
    press(bench, PRESS)
    bench.run(1500)
    bench.board.set_input(PRESS, True)
    bench.run(33)
    during = lamps_over(bench, 30)
    assert all([bits & 0b110 == 0b100 for bits in during]), during
    bench.run(100)
    assert bench.board.follower_bits[0] & 0b110 == 0b010
