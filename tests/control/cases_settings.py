"""Settings: whole or the previous ones; staged, checked by the board itself, committed in one step; nothing fires."""

from bench import Bench
from bench_board import BenchBoard
from bench_layouts import BenchLayout, usual

from shared_protocol.codec import Codec
from shared_protocol.registry import board_reads


def send_settings(bench: Bench, layout: BenchLayout, count: int = -1, crc: bytes = b"") -> None:
    """The whole transaction."""
    bodies = layout.bodies()
    codec = Codec(board_reads())
    bench.send("stage", n=count if count > 0 else len(bodies))
    bench.run(20)
    for body in bodies:
        bench.board.say(body + b"*" + codec.crc_text(body) + b"\n")
        bench.run(8)
    whole = codec.crc_text(b"".join([body + b"\n" for body in bodies]))
    bench.send("commit", crc=(crc or whole).decode())
    bench.run(50)


def connected() -> Bench:
    """A bench with a host."""
    bench = Bench()
    bench.hello()
    return bench


def raised(mv: int) -> BenchLayout:
    """The usual layout with another ready voltage for junction 0."""
    layout = usual()
    for message, fields in layout.records:
        if message.name == "set_lie" and fields["j"] == 0:
            fields["ready_mv"] = mv
    return layout


def case_a_transaction_changes_the_ready_voltage() -> None:
    bench = connected()
    before = bench.last("board")["crc"]  # type: ignore[index]
    send_settings(bench, raised(15_500))
    taken = bench.last("accepted")
    assert taken is not None and taken["crc"] != before and taken["seq"] == 2
    bench.board.banks[0].full_mv = 15_400
    bench.board.banks[0].mv = 15_400
    bench.run(600)
    number = bench.throw(0, 1)
    bench.run(50)
    assert bench.outcome(number)["why"] == "below_ready"  # type: ignore[index]
    assert bench.board.slots[1][-1].startswith(b"slot 2 ")
    send_settings(bench, raised(12_000))
    assert bench.last("accepted")["seq"] == 3  # type: ignore[index]
    assert bench.board.slots[0][-1].startswith(b"slot 3 ")
    assert not bench.board.pulses


def case_what_is_known_of_unchanged_motors_stays_known() -> None:
    bench = connected()
    bench.throw(0, 1)
    bench.keep_alive(1000)
    send_settings(bench, raised(13_000))
    bench.said.clear()
    bench.send("ask", what="status")
    bench.run(100)
    assert bench.last("lie", j=0) == {"j": 0, "lie": 1, "src": "sent"}
    assert bench.last("lie", j=1) == {"j": 1, "lie": -1, "src": "none"}


def case_the_stop_outlives_new_settings() -> None:
    bench = connected()
    bench.send("stop")
    bench.run(20)
    send_settings(bench, raised(13_000))
    number = bench.throw(0, 1)
    bench.run(30)
    assert bench.outcome(number)["why"] == "stop"  # type: ignore[index]


def refused(layout: BenchLayout, field: str, why: str) -> None:
    """The board rejects this layout, says where and why, and keeps what it had."""
    bench = connected()
    slots = [list(bench.board.slots[0])]
    send_settings(bench, layout)
    found = bench.last("rejected")
    assert found is not None and (found["field"], found["why"]) == (field, why), found
    assert bench.board.slots[0] == slots[0]
    number = bench.throw(0, 1)
    bench.run(100)
    assert bench.outcome(number)["o"] == "done"  # type: ignore[index]


def changed(name: str, number: int, **new: object) -> BenchLayout:
    """The usual layout with some fields of one record changed."""
    layout = usual()
    place = 0
    for message, fields in layout.records:
        if message.name == name:
            if place == number:
                fields.update(new)
            place += 1
    return layout


def case_wrong_settings_are_rejected_by_the_board_itself() -> None:
    refused(changed("set_motor", 1, normal=0), "normal", "same_coil")
    refused(changed("set_motor", 1, normal=9), "normal", "no_such_coil")
    refused(changed("set_bank", 1, pin=4), "pin", "same_pin")
    refused(changed("set_bank", 0, adc=1), "adc", "same_pin")
    refused(changed("set_lie", 0, ready_mv=16_000), "ready_mv", "never_reached")
    refused(changed("set_charge", 0, charge_dohm=50), "guard", "stuck_driver_burns")
    refused(changed("set_junction", 1, motors=[0]), "motors", "motor_twice")
    refused(changed("set_route", 0, throws=[0, 1, 0, 0]), "throws", "bad_route")
    refused(changed("set_button", 0, input=0), "input", "same_input")
    refused(changed("set_lie", 9, order=[0, 1]), "order", "forbidden_in_passing")


def case_a_resistor_too_small_for_a_stuck_driver_is_refused() -> None:
    # 17 V through 47 + 4.5 ohm: 5.1 W in the resistor (Ohm's law); a limit without a limited source is none.
    refused(changed("set_charge", 0, rated_mw=5000), "guard", "stuck_driver_burns")
    refused(changed("set_charge", 0, charge_dohm=100, rated_mw=100_000, limit_ma=50), "guard", "stuck_driver_burns")
    bench = connected()
    send_settings(bench, changed("set_charge", 0, rated_mw=5200))
    assert bench.last("accepted") is not None


def case_a_count_or_a_sum_that_is_wrong_changes_nothing() -> None:
    for count, crc, why in ((50, b"", "wrong_count"), (-1, b"00000000", "wrong_crc")):
        bench = connected()
        send_settings(bench, raised(15_000), count, crc)
        assert bench.last("rejected")["why"] == why  # type: ignore[index]
        assert bench.controller.store.sequence == 1


def case_a_flash_that_fails_changes_nothing() -> None:
    bench = connected()
    bench.board.flash_works = False
    send_settings(bench, raised(15_000))
    assert bench.last("accepted") is None
    assert bench.controller.store.sequence == 1
    number = bench.throw(0, 1)
    bench.run(100)
    assert bench.outcome(number)["o"] == "done"  # type: ignore[index]


def case_no_throw_while_settings_arrive() -> None:
    bench = connected()
    bench.send("stage", n=10)
    bench.run(20)
    number = bench.throw(0, 1)
    bench.run(20)
    assert bench.outcome(number)["why"] == "settings_coming"  # type: ignore[index]
    bench.send("abandon")
    bench.run(20)
    number = bench.throw(0, 1)
    bench.run(100)
    assert bench.outcome(number)["o"] == "done"  # type: ignore[index]


def case_a_button_comes_before_settings_that_arrive() -> None:
    bench = connected()
    bench.send("stage", n=10)
    bench.run(20)
    bench.board.set_input(10, True)
    bench.run(100)
    assert len(bench.board.pulses) == 1 and not bench.controller.store.staging
    assert bench.last("answer") == {"to": "stage", "ok": 0, "why": "busy", "i": -1}
    bench.send("commit", crc="00000000")
    bench.run(100)
    assert bench.last("answer")["to"] == "commit" and bench.controller.store.sequence == 1  # type: ignore[index]


def case_a_repeated_id_keeps_its_outcome_while_settings_arrive() -> None:
    bench = connected()
    done = bench.throw(0, 1)
    bench.keep_alive(1000)
    bench.send("stage", n=10)
    refused = bench.throw(1, 1)
    bench.send("throw", id=done, j=0, lie=1, wait=0)
    bench.run(50)
    bench.send("abandon")
    bench.run(20)
    bench.send("throw", id=refused, j=1, lie=1, wait=0)
    bench.run(200)
    for number, expected in ((done, "done"), (refused, "refused")):
        told = [found["o"] for found in bench.all("outcome") if found["id"] == number]
        assert told == [expected, expected], told
    assert len(bench.board.pulses) == 1


def case_a_lost_host_drops_the_transaction() -> None:
    bench = connected()
    bench.send("stage", n=10)
    bench.run(4000)
    assert not bench.controller.store.staging or bench.controller.store.staging_lost
    bench.hello()
    number = bench.throw(0, 1)
    bench.run(100)
    assert bench.outcome(number)["o"] == "done"  # type: ignore[index]


def case_a_busy_board_takes_no_settings() -> None:
    bench = connected()
    bench.throw(0, 1)
    bench.run(10)
    bench.send("stage", n=10)
    bench.run(20)
    assert bench.last("answer")["why"] == "busy"  # type: ignore[index]


def case_settings_are_fetched_as_they_were_sent() -> None:
    bench = connected()
    bench.said.clear()
    bench.send("ask", what="settings")
    bench.keep_alive(1500)
    fetched = [r.text for r in bench.said if r.message is not None and r.message.name.startswith("set_")]
    assert fetched == usual().bodies()
    assert bench.last("end")["what"] == "settings"  # type: ignore[index]


def case_the_newer_whole_slot_counts() -> None:
    newer = raised(15_000).slot(7)
    older = usual().slot(6)
    for first, second, expected in (
        (newer, older, 7),
        (older, newer, 7),
        (newer[:-1], older, 6),
        (newer[:5] + newer[-1:], older, 6),
        (older, newer[:-1] + [b"slot 7 23 00000000"], 6),
        (older, newer[:-1] + [b"slot 99999999999 1 00000000"], 6),
        (older, [b"slot x y z"], 6),
        ([], newer, 7),
        ([], [], 0),
    ):
        board = BenchBoard()
        board.slots[0] = list(first)
        board.slots[1] = list(second)
        bench = Bench(None, board)
        assert bench.controller.store.sequence == expected


def case_power_lost_at_any_line_leaves_one_whole_set() -> None:
    lines = len(usual().slot())
    for cut in range(0, lines + 1, 3):
        bench = connected()
        bodies = raised(15_000).slot(2)
        board = bench.board
        board.slots[1] = bodies[:cut]
        again = Bench(None, board)
        again.hello()
        assert again.controller.store.sequence == (2 if cut == lines else 1)
        again.run(500)
        assert not board.pulses


def case_a_trace_is_told_point_by_point() -> None:
    bench = connected()
    bench.board.trace_count = 37
    bench.send("trace", b=0)
    bench.keep_alive(600)
    told: "list[object]" = []
    for line in bench.all("points"):
        assert line["from"] == len(told) and line["step"] == 500
        told += line["mv"]  # type: ignore[operator]
    assert told == [16_000 - 100 * point for point in range(37)] + [0] * 11
    assert bench.all("end")[-1]["what"] == "trace"


def case_a_board_that_knows_tells_how_its_loop_goes() -> None:
    bench = connected()
    bench.keep_alive(1500)
    assert bench.all("loop") == []
    bench.board.figures = [300, 900, 12_000, 50_000, 40_000]
    bench.keep_alive(2500)
    assert bench.last("loop") == {"us": 300, "worst": 900, "collect": 12_000, "adc": 50_000, "free": 40_000}
    assert 2 <= len(bench.all("loop")) <= 3


def case_a_crash_is_told_once() -> None:
    bench = connected()
    assert bench.all("started") == []
    bench.board.cause = 4
    bench.board.crash = b"MemoryError: no room"
    bench.hello()
    assert bench.last("started") == {"cause": "crash", "note": "MemoryError: no room"}
    bench.hello()
    assert bench.last("started") == {"cause": "crash", "note": ""}


def case_the_light_blinks_the_number_of_the_fault() -> None:
    bench = connected()
    bench.controller.plant.faults.report(0, 1, 3, 0, 0, -1)  # type: ignore[union-attr]
    bench.run(5)
    blinks = 0
    was = bench.board.light
    for _ in range(3 * 400 + 1200):
        bench.run(1)
        if bench.board.light and not was:
            blinks += 1
        was = bench.board.light
    assert blinks == 3


def case_no_input_on_the_boot_pin() -> None:
    refused(changed("set_io", 0, inputs=[22]), "inputs", "pin_not_usable")
