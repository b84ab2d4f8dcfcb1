"""Throws, routes, gate, stop: what the controller does, on CPython and on MicroPython (heap locked in every tick)."""

from bench import Bench
from bench_board import BenchBoard
from bench_layouts import BenchLayout, bank_records, board_records, junction_records, motor_record, two_lies, usual

from device.control.throws import THROWS


def outcome_of(bench: Bench, number: int) -> "tuple[object, object]":
    """Outcome and reason of a throw, (None, None) while there is none."""
    found = bench.outcome(number)
    return (found["o"], found["why"]) if found is not None else (None, None)


def ready(layout: "BenchLayout | None" = None, mv_0: int = 16_000, mv_1: int = 16_000) -> Bench:
    """A bench with a host, its banks charged to what is given and at rest there."""
    board = BenchBoard()
    for bank, mv in ((board.banks[0], mv_0), (board.banks[1], mv_1)):
        bank.mv = mv
        bank.full_mv = mv
    bench = Bench(layout, board, False)
    bench.hello()
    return bench


def case_coils_rest_after_a_restart() -> None:
    bench = Bench(None, None, True, False)
    bench.hello()
    number = bench.throw(0, 1)
    bench.run(20)
    assert outcome_of(bench, number) == ("refused", "resting")


def case_a_full_bank_fires_at_once() -> None:
    bench = ready()
    number = bench.throw(0, 1)
    bench.run(100)
    assert outcome_of(bench, number) == ("done", "sent")
    assert bench.board.pulses == [(0, 0, 2, 40_000, 16_000)]
    assert bench.last("lie", j=0) == {"j": 0, "lie": 1, "src": "sent"}


def case_a_second_throw_is_refused_then_accepted() -> None:
    bench = ready()
    bench.throw(0, 1)
    bench.run(100)
    second = bench.throw(1, 1)
    bench.run(10)
    refused = bench.outcome(second)
    assert refused is not None and refused["o"] == "refused" and refused["why"] == "below_ready"
    assert refused["i"] == 0 and isinstance(refused["ms"], int) and refused["ms"] > 100
    assert len(bench.board.pulses) == 1
    bench.keep_alive(1000)
    third = bench.throw(1, 1)
    bench.run(100)
    assert outcome_of(bench, third) == ("done", "sent")


def case_a_waiting_throw_fires_when_the_bank_is_ready() -> None:
    bench = ready(None, 5000)
    bench.board.banks[0].full_mv = 16_000
    number = bench.throw(0, 1, 5000)
    bench.keep_alive(300)
    assert not bench.board.pulses and outcome_of(bench, number) == (None, None)
    bench.keep_alive(300)
    assert outcome_of(bench, number) == ("done", "sent")
    assert 12_000 <= bench.board.pulses[0][4] <= 12_040


def case_a_waiting_throw_expires_on_time() -> None:
    bench = ready(None, 11_000)
    number = bench.throw(0, 1, 700)
    bench.keep_alive(700)
    assert outcome_of(bench, number) == (None, None)
    bench.run(20)
    assert outcome_of(bench, number) == ("expired", "longest_wait")
    bench.board.banks[0].full_mv = 16_000
    bench.keep_alive(1000)
    assert not bench.board.pulses


def case_noise_at_the_threshold_cannot_fire_early_or_flicker() -> None:
    layout = usual()
    for message, fields in layout.records:
        if message.name == "set_charge":
            fields["stall_ms"] = 60_000
    bench = ready(layout, 11_990)
    bank = bench.board.banks[0]
    bank.rise_mv_per_ms = 0
    number = bench.throw(0, 1, 60_000)
    for turn in range(40):
        bank.sense_mv = 11_930 + 60 * (turn % 2)
        bench.keep_alive(100)
    assert not bench.board.pulses
    bank.sense_mv = 12_000
    bench.run(20)
    assert outcome_of(bench, number)[0] is None and len(bench.board.pulses) == 1


def case_the_shown_state_does_not_flicker() -> None:
    layout = usual(hysteresis_mv=200)
    for message, fields in layout.records:
        if message.name == "set_bank" and fields["i"] == 0:
            fields["full_mv"] = 12_500
    bench = ready(layout, 12_050)
    bank = bench.board.banks[0]
    bench.keep_alive(200)
    assert bench.last("bank", b=0)["state"] == "ready"  # type: ignore[index]
    bench.said.clear()
    for turn in range(20):
        bank.sense_mv = 11_900 + 200 * (turn % 2)
        bench.keep_alive(100)
    assert {found["state"] for found in bench.all("bank") if found["b"] == 0} == {"ready"}
    bank.sense_mv = 11_700
    bench.keep_alive(200)
    assert bench.last("bank", b=0)["state"] == "charging"  # type: ignore[index]


def case_banks_are_independent() -> None:
    bench = ready(None, 3000)
    slow = bench.throw(0, 1, 2000)
    quick = bench.throw(3, 1, 2000)
    bench.keep_alive(300)
    assert outcome_of(bench, slow) == (None, None)
    assert outcome_of(bench, quick) == ("done", "sent")


def case_a_crossover_pulses_both_motors_at_its_own_ready_voltage() -> None:
    bench = ready(None, 16_000, 13_000)
    number = bench.throw(3, 1)
    bench.run(20)
    assert outcome_of(bench, number) == ("refused", "below_ready")
    bench.board.banks[1].full_mv = 15_000
    bench.keep_alive(200)
    number = bench.throw(3, 1)
    bench.run(100)
    assert outcome_of(bench, number) == ("done", "sent")
    assert bench.board.pulses[0][2] == 0b101000


def case_a_coil_rests() -> None:
    bench = ready()
    bench.throw(0, 1)
    bench.run(100)
    bench.board.banks[0].mv = 16_000
    again = bench.throw(0, 1)
    bench.run(10)
    found = bench.outcome(again)
    assert found is not None and found["why"] == "resting" and 300 < int(found["ms"]) < 500  # type: ignore[call-overload]
    other = bench.throw(0, 0)
    bench.run(100)
    assert outcome_of(bench, other) == ("done", "sent")


def case_a_resting_coil_lets_others_pass() -> None:
    bench = ready()
    bench.throw(0, 1)
    bench.run(100)
    bench.board.banks[0].mv = 16_000
    resting = bench.throw(0, 1, 5000)
    passing = bench.throw(1, 1, 5000)
    bench.run(100)
    assert outcome_of(bench, passing) == ("done", "sent") and outcome_of(bench, resting) == (None, None)
    bench.keep_alive(1000)
    assert outcome_of(bench, resting) == ("done", "sent")


def case_a_contact_in_time_is_seen() -> None:
    bench = ready()
    bench.on_pulse = lambda pulse: bench.board.set_input(0, True)
    number = bench.throw(2, 1)
    bench.run(100)
    assert outcome_of(bench, number) == ("done", "seen")
    assert bench.last("lie", j=2) == {"j": 2, "lie": 1, "src": "seen"}


def case_no_contact_in_time_fails_and_the_lie_is_unknown() -> None:
    bench = ready()
    number = bench.throw(2, 1)
    bench.run(280)
    assert outcome_of(bench, number) == (None, None)
    bench.run(100)
    assert outcome_of(bench, number) == ("failed", "no_contact")
    assert bench.outcome(number)["i"] == 2  # type: ignore[index]
    assert bench.last("lie", j=2) == {"j": 2, "lie": -1, "src": "none"}
    assert len(bench.board.pulses) == 1


def case_one_retry_at_a_raised_ready_voltage() -> None:
    layout = usual()
    for message, fields in layout.records:
        if message.name == "set_junction" and fields["i"] == 2:
            fields["retry_mv"] = 1500
    bench = ready(layout)
    number = bench.throw(2, 1, 5000)
    bench.keep_alive(2500)
    assert outcome_of(bench, number) == ("failed", "no_contact")
    assert len(bench.board.pulses) == 2 and bench.board.pulses[1][4] >= 13_500


def case_points_moved_by_hand_are_seen() -> None:
    bench = ready()
    bench.board.in_bits[0] = 1
    bench.run(20)
    assert bench.last("lie", j=2) == {"j": 2, "lie": 1, "src": "seen"}
    bench.board.in_bits[0] = 0
    bench.run(20)
    assert bench.last("lie", j=2) == {"j": 2, "lie": 0, "src": "seen"}
    assert not bench.board.pulses


def case_two_pulses_every_time() -> None:
    layout = usual()
    for message, fields in layout.records:
        if message.name == "set_junction" and fields["i"] == 0:
            fields["pulses"] = 2
    bench = ready(layout)
    number = bench.throw(0, 1, 5000)
    bench.keep_alive(1500)
    assert outcome_of(bench, number) == ("done", "sent")
    assert [pulse[2] for pulse in bench.board.pulses] == [2, 2]


def case_a_three_way_avoids_its_forbidden_combination() -> None:
    bench = ready()
    now = 0
    for lie in (1, 2, 1, 0, 2, 0, 1):
        number = bench.throw(4, lie, 5000)
        bench.keep_alive(2500)
        assert outcome_of(bench, number) == ("done", "sent")
    for pulse in bench.board.pulses:
        coil = 0
        while pulse[2] >> coil != 1:
            coil += 1
        place = (coil - 4) // 2
        now = (now & ~(1 << place)) | ((coil & 1) << place)
        assert now != 3, bench.board.pulses


def case_lies_of_one_junction_may_have_pulses_of_their_own() -> None:
    layout = usual()
    for message, fields in layout.records:
        if message.name == "set_lie" and fields["j"] == 4:
            fields["pulse_us"] = (40_000, 30_000, 20_000)[int(fields["i"])]  # type: ignore[call-overload]
            fields["full_us"] = fields["pulse_us"]
    bench = ready(layout)
    for lie in (0, 1, 2):
        bench.board.banks[0].full_mv = 16_000
        number = bench.throw(4, lie, 5000)
        bench.keep_alive(2500)
        assert outcome_of(bench, number) == ("done", "sent")
    assert [pulse[3] for pulse in bench.board.pulses] == [40_000, 40_000, 30_000, 30_000, 20_000, 20_000]


def case_the_pulse_shortens_towards_full_bank() -> None:
    layout = usual()
    for message, fields in layout.records:
        if message.name == "set_lie" and fields["j"] == 0:
            fields["full_us"] = 20_000
    for mv, width_us in ((16_000, 20_000), (14_000, 30_000), (12_000, 40_000), (12_010, 39_961)):
        bench = ready(layout, mv)
        bench.throw(0, 1)
        bench.run(50)
        assert [pulse[3] for pulse in bench.board.pulses] == [width_us], (mv, bench.board.pulses)


def case_stop_lets_the_pulse_end_and_nothing_more_fires() -> None:
    bench = ready()
    running = bench.throw(0, 1, 5000)
    waiting = bench.throw(1, 1, 5000)
    bench.run(10)
    assert len(bench.board.pulses) == 1
    bench.send("stop")
    bench.run(20)
    assert outcome_of(bench, waiting) == ("cancelled", "stop")
    bench.keep_alive(2000)
    assert outcome_of(bench, running) == ("done", "sent")
    refused = bench.throw(1, 1, 5000)
    bench.keep_alive(100)
    assert outcome_of(bench, refused) == ("refused", "stop")
    assert len(bench.board.pulses) == 1
    bench.send("release")
    bench.run(20)
    assert bench.last("answer")["to"] == "release"  # type: ignore[index]
    after = bench.throw(1, 1, 5000)
    bench.keep_alive(200)
    assert outcome_of(bench, after) == ("done", "sent")


def case_a_not_while_input_refuses_and_names_itself() -> None:
    layout = usual()
    for message, fields in layout.records:
        if message.name == "set_junction" and fields["i"] == 0:
            fields["bar"] = 7
    bench = ready(layout)
    bench.board.in_bits[0] = 1 << 7
    bench.run(5)
    number = bench.throw(0, 1)
    bench.run(10)
    assert outcome_of(bench, number) == ("refused", "not_while")
    assert bench.outcome(number)["i"] == 7  # type: ignore[index]


def case_wrong_requests_are_refused() -> None:
    bench = ready()
    numbers = (bench.throw(9, 0), bench.throw(0, 5))
    bench.run(20)
    assert [outcome_of(bench, number)[1] for number in numbers] == ["no_such_junction", "no_such_lie"]
    bench.send("throw", id=10, j=0, lie=1, wait=0, boot=99)
    bench.run(20)
    assert outcome_of(bench, 10) == ("refused", "board_restarted")
    number = bench.next_id
    bench.send("route", id=20, r=5, wait=0)
    bench.run(20)
    assert bench.route_end(20)["why"] == "no_such_route"  # type: ignore[index]
    assert not bench.board.pulses and number


def case_a_repeated_id_fires_once_and_returns_its_outcome() -> None:
    bench = ready()
    number = bench.throw(0, 1)
    bench.run(10)
    bench.send("throw", id=number, j=0, lie=1, wait=0)
    bench.run(100)
    bench.send("throw", id=number, j=0, lie=1, wait=0)
    bench.send("throw", id=number, j=0, lie=0, wait=0)
    bench.keep_alive(2000)
    outcomes = [found for found in bench.all("outcome") if found["id"] == number]
    assert len(bench.board.pulses) == 1 and len(outcomes) == 3
    for found in outcomes:
        found["q"] = 0
        assert found == outcomes[0]


def case_an_id_too_old_to_remember_is_refused() -> None:
    bench = ready()
    for _ in range(70):
        bench.throw(9, 0)
        bench.run(10)
    bench.said.clear()
    bench.send("throw", id=1, j=0, lie=1, wait=0)
    bench.run(20)
    assert outcome_of(bench, 1) == ("refused", "old_id")
    assert not bench.board.pulses


def case_a_route_over_two_banks() -> None:
    bench = ready()
    bench.on_pulse = lambda pulse: bench.board.set_input(0, pulse[0] == 1)
    number = bench.route(0)
    bench.keep_alive(4000)
    end = bench.route_end(number)
    assert end is not None and (end["o"], end["done"], end["of"]) == ("done", 4, 4), end
    steps = [found["step"] for found in bench.all("outcome") if found["id"] == number]
    assert steps == [1, 2, 3, 4]


def case_a_route_skips_only_what_is_seen() -> None:
    bench = ready()
    bench.board.in_bits[0] = 1
    bench.run(20)
    bench.throw(0, 1)
    bench.keep_alive(2000)
    fired = len(bench.board.pulses)
    number = bench.route(0)
    bench.keep_alive(4000)
    assert bench.route_end(number)["o"] == "done"  # type: ignore[index]
    reasons = [found["why"] for found in bench.all("outcome") if found["id"] == number]
    assert reasons == ["sent", "sent", "already", "sent"]
    assert len(bench.board.pulses) - fired == 3


def case_a_failed_throw_ends_its_route() -> None:
    bench = ready()
    number = bench.route(0)
    bench.keep_alive(4000)
    end = bench.route_end(number)
    assert end is not None and (end["o"], end["why"], end["done"]) == ("failed", "no_contact", 2)
    last = [found for found in bench.all("outcome") if found["id"] == number][-1]
    assert (last["o"], last["why"]) == ("cancelled", "route_failed")


def case_a_route_keeps_its_pause() -> None:
    bench = ready(usual(pause_ms=700))
    for bank in bench.board.banks:
        bank.rise_mv_per_ms = 200
    times = []
    bench.on_pulse = lambda pulse: times.append(bench.board.ms)  # type: ignore[func-returns-value]
    bench.route(0)
    bench.keep_alive(2500)
    assert len(times) >= 3
    for place in range(1, len(times)):
        assert times[place] - times[place - 1] >= 700


def case_fullest_bank_first_in_a_route() -> None:
    order = []
    for kind in ("as_listed", "fullest"):
        bench = ready(usual(order=kind, pause_ms=100), 14_500)
        bench.route(0)
        bench.keep_alive(200)
        order.append(bench.board.pulses[0][0])
    assert order == [0, 1]


def case_cancel_ends_what_waits() -> None:
    bench = ready(None, 1000)
    number = bench.throw(0, 1, 5000)
    bench.run(50)
    bench.send("cancel", id=number)
    bench.run(50)
    assert outcome_of(bench, number) == ("cancelled", "operator")
    bench.send("cancel", id=number)
    bench.run(50)
    assert bench.last("answer") == {"to": "cancel", "ok": 0, "why": "no_such_throw", "i": number}
    bench.board.banks[0].full_mv = 16_000
    bench.keep_alive(2000)
    assert not bench.board.pulses


def case_a_silent_host_loses_its_throws_buttons_go_on() -> None:
    bench = ready(usual(silence_ms=1500), 3000)
    number = bench.throw(0, 1, 60_000)
    bench.run(1400)
    assert bench.controller.queue.throws.count == 1  # type: ignore[union-attr]
    bench.run(300)
    assert bench.controller.queue.throws.count == 0  # type: ignore[union-attr]
    bench.hello()
    assert outcome_of(bench, number) == ("cancelled", "host_lost")
    bench.board.banks[0].full_mv = 16_000
    bench.run(3000)
    bench.board.in_bits[0] = 1 << 10
    bench.run(100)
    assert len(bench.board.pulses) == 1


def case_a_kept_message_is_sent_until_acknowledged() -> None:
    bench = ready()
    bench.acknowledge = False
    number = bench.throw(0, 1)
    bench.keep_alive(3500)
    found = [found for found in bench.all("outcome") if found["id"] == number]
    assert len(found) >= 3 and len({int(each["q"]) for each in found}) == 1  # type: ignore[call-overload]
    bench.send("ack", q=found[0]["q"])
    bench.run(100)
    bench.said.clear()
    bench.keep_alive(3000)
    assert not bench.all("outcome")


def case_a_kept_message_is_sent_once_if_it_is_acknowledged() -> None:
    for step_us in (100, 250, 500, 1000):
        bench = ready()
        number = bench.throw(0, 1)
        bench.run(200, step_us)
        bench.send("clear", scope="all", i=0)
        bench.run(700, step_us)
        assert len([found for found in bench.all("outcome") if found["id"] == number]) == 1, step_us


def case_the_queue_says_when_it_is_full() -> None:
    bench = ready(None, 11_000, 11_000)
    numbers = []
    for _ in range(THROWS + 2):
        numbers.append(bench.throw(0, 1, 2000))
        bench.run(30)
    bench.run(400)
    assert [outcome_of(bench, number)[1] for number in numbers[-2:]] == ["queue_full", "queue_full"]
    bench.keep_alive(3000)
    outcomes = [outcome_of(bench, number)[0] for number in numbers]
    assert outcomes == ["expired"] * THROWS + ["refused"] * 2


def case_leave_finishes_the_pulse_and_cancels_the_queue() -> None:
    bench = ready()
    running = bench.throw(0, 1, 5000)
    waiting = bench.throw(1, 1, 5000)
    bench.run(10)
    bench.board.say(b"\x03")
    bench.run(20)
    assert not bench.controller.left
    bench.run(500)
    assert bench.controller.left
    assert outcome_of(bench, running) == ("done", "sent")
    assert outcome_of(bench, waiting) == ("cancelled", "leaving")
    assert len(bench.board.pulses) == 1


def case_restart_is_taken_with_the_right_boot_only() -> None:
    bench = ready()
    bench.send("restart", boot=2)
    bench.run(100)
    assert bench.board.was_reset == 0 and bench.last("answer")["ok"] == 0  # type: ignore[index]
    bench.send("restart")
    bench.run(1000)
    assert bench.board.was_reset > 0


def case_nothing_fires_at_power_up() -> None:
    bench = Bench()
    bench.run(3000)
    assert not bench.board.pulses


def case_lies_are_restored_through_the_queue_if_asked() -> None:
    bench = Bench(usual(restore="yes"))
    bench.hello()
    bench.throw(0, 1)
    bench.keep_alive(1000)
    bench.throw(4, 2, 5000)
    bench.keep_alive(63_000, 10_000)
    board = bench.board
    assert board.slots[2][0].startswith(b"lies 1 - ")
    pulses = len(board.pulses)
    again = Bench(None, board)
    for _ in range(100):
        again.run(100)
    fired = [pulse[2] for pulse in board.pulses[pulses:]]
    assert fired[0] == 2 and 0b010000 in fired and 0b10000000 in fired, fired


def case_time_may_wrap_at_any_moment() -> None:
    for start_us, start_ms in (((1 << 30) - 30_000, 5), (7, (1 << 30) - 30), ((1 << 30) - 1, (1 << 30) - 1)):
        board = BenchBoard(2, start_us, start_ms)
        bench = Bench(None, board)
        bench.hello()
        numbers = [bench.throw(0, 1, 5000), bench.throw(1, 1, 5000), bench.throw(0, 0, 5000)]
        bench.keep_alive(2500)
        for number in numbers:
            assert outcome_of(bench, number) == ("done", "sent")


def case_idle_for_more_than_half_a_period_and_more_than_a_whole_one() -> None:
    bench = ready()
    number = bench.throw(0, 1)
    bench.run(100)
    assert outcome_of(bench, number) == ("done", "sent")
    period_ms = 1 << 30
    # Steps far longer than a tick, but short against a quarter period: what a sweep must cope with.
    for _ in range(2 * 60 + 3):
        bench.board.pass_us(period_ms * 10)
        bench.tick()
    bench.hello()
    again = bench.throw(0, 1)
    bench.run(100)
    assert outcome_of(bench, again) == ("done", "sent"), outcome_of(bench, again)


def case_with_no_settings_everything_is_refused() -> None:
    board = BenchBoard()
    board.slots[0] = [b"rubbish", b"slot 1 1 00000000"]
    bench = Bench(None, board)
    bench.hello()
    number = bench.throw(0, 1)
    bench.run(20)
    assert outcome_of(bench, number) == ("refused", "no_settings")
    assert bench.last("board")["crc"] == ""  # type: ignore[index]


def case_a_wrong_version_is_named() -> None:
    bench = Bench()
    bench.send("hello", v=99)
    bench.run(20)
    assert bench.last("wrong_version") == {"v": 1, "fw": "1.0.0", "asked": 99}


def case_junction_on_a_single_bank_board() -> None:
    layout = BenchLayout()
    board_records(layout)
    bank_records(layout, 1)
    motor_record(layout, 0, 0, 0)
    junction_records(layout, 0, "turnout", [0], two_lies())
    bench = Bench(layout, BenchBoard(1))
    bench.hello()
    number = bench.throw(0, 1)
    bench.run(100)
    assert outcome_of(bench, number) == ("done", "sent")


def case_a_pulse_is_judged_before_the_next_of_its_bank() -> None:
    """Between two milliseconds only voltages are looked at: the next throw must not push an unjudged one out."""
    bench = ready()
    bench.board.banks[0].drop_percent = 20
    first = bench.throw(0, 1, 3000)
    second = bench.throw(1, 1, 3000)
    while bench.controller.queue.throws.count < 2:  # type: ignore[union-attr]
        bench.run(1)
    for _ in range(10):
        bench.board.pass_us(10_000)
    # A slice has seen that the pulse and its gap are over.
    bench.controller.plant.banks[0].look()  # type: ignore[union-attr]
    bench.controller.plant.changes.happened = True  # type: ignore[union-attr]
    bench.controller.queue.dispatch.tick(bench.board.ticks_ms())  # type: ignore[union-attr]
    assert bench.board.pulse_count == 1
    bench.keep_alive(1500)
    assert outcome_of(bench, first)[0] is not None
    assert outcome_of(bench, second)[0] is not None
