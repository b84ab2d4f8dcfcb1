"""Faults: told by millivolts, times and inputs only; the first is kept; what is out fires nothing until cleared."""

from bench import Bench
from bench_board import BenchBoard
from bench_layouts import BenchLayout, bank_records, board_records, junction_records, motor_record, two_lies, usual


def resting(layout: "BenchLayout | None" = None, mv: int = 16_000) -> Bench:
    """A bench with a host, both banks resting at `mv`."""
    board = BenchBoard()
    for bank in board.banks:
        bank.mv = mv
        bank.full_mv = mv
    bench = Bench(layout, board, False)
    bench.hello()
    return bench


def code_of(bench: Bench, scope: str, number: int) -> object:
    """The fault told of one bank, junction or button, None if there is none."""
    found = bench.last("fault", scope=scope, i=number)
    return found["code"] if found is not None else None


def case_supply_missing_from_the_start() -> None:
    board = BenchBoard()
    for bank in board.banks:
        bank.rise_mv_per_ms = 0
        bank.mv = 30
    bench = Bench(None, board, False)
    bench.hello()
    bench.keep_alive(3000)
    assert code_of(bench, "bank", 0) == "supply_missing"
    number = bench.throw(0, 1, 5000)
    bench.run(20)
    assert bench.outcome(number)["why"] == "bank_out"  # type: ignore[index]


def case_supply_lost_while_full() -> None:
    bench = resting()
    bank = bench.board.banks[0]
    bank.rise_mv_per_ms = 0
    for _ in range(40):
        bank.mv -= 80
        bench.keep_alive(100)
    assert code_of(bench, "bank", 0) == "supply_missing" and code_of(bench, "bank", 1) is None


def case_supply_lost_in_a_recharge() -> None:
    bench = resting()
    bench.board.banks[0].rise_mv_per_ms = 0
    bench.throw(0, 1)
    bench.keep_alive(1000)
    assert code_of(bench, "bank", 0) == "supply_missing"


def case_waiting_throws_fail_when_their_bank_goes_out() -> None:
    bench = resting()
    bench.board.banks[0].rise_mv_per_ms = 0
    bench.throw(0, 1)
    waiting = bench.throw(1, 1, 5000)
    other = bench.throw(3, 1, 5000)
    bench.keep_alive(1000)
    assert bench.outcome(waiting)["o"] == "failed"  # type: ignore[index]
    assert bench.outcome(waiting)["why"] == "bank_out"  # type: ignore[index]
    assert bench.outcome(other)["o"] == "done"  # type: ignore[index]


def case_a_driver_stuck_on_holds_the_bank_down() -> None:
    bench = resting()
    bank = bench.board.banks[0]
    bank.rise_mv_per_ms = 0
    for mv in (13_000, 8000, 5000, 3000, 2000, 1500, 1400, 1400):
        bank.mv = mv
        bench.keep_alive(100)
    assert code_of(bench, "bank", 0) == "held_down"
    assert code_of(bench, "bank", 1) is None


def case_a_driver_stuck_after_a_pulse() -> None:
    bench = resting()
    bank = bench.board.banks[0]
    bank.rise_mv_per_ms = 0
    bench.throw(0, 1)
    bench.run(70)
    for mv in (2600, 2100, 1700, 1500, 1400):
        bank.mv = mv
        bench.run(60)
    bench.keep_alive(500)
    assert code_of(bench, "bank", 0) == "held_down"
    assert bench.last("fault")["near"] == 0  # type: ignore[index]


def case_a_driver_stuck_at_power_up() -> None:
    board = BenchBoard()
    board.banks[0].mv = 1400
    board.banks[0].full_mv = 1400
    bench = Bench(None, board, False)
    bench.hello()
    bench.keep_alive(3000)
    assert code_of(bench, "bank", 0) == "held_down"


def case_held_down_switches_the_cut_off() -> None:
    layout = usual()
    for message, fields in layout.records:
        if message.name == "set_charge":
            fields["cut_pin"] = -1
    bench = resting(layout)
    bench.board.banks[0].rise_mv_per_ms = 0
    bench.board.banks[0].mv = 13_000
    bench.keep_alive(300)
    assert code_of(bench, "bank", 0) == "held_down" and not bench.board.banks[0].charge_on
    bench.send("clear", scope="bank", i=0)
    bench.run(50)
    assert bench.board.banks[0].charge_on


def case_recharge_stalled() -> None:
    bench = resting()
    bench.board.banks[0].full_mv = 11_000
    bench.throw(0, 1)
    bench.keep_alive(5500)
    found = bench.last("fault")
    assert found is not None and (found["code"], found["i"]) == ("recharge_stalled", 0)
    assert found["e1"] == 11_000 and int(found["e2"]) >= 5000  # type: ignore[call-overload]


def case_an_open_coil_does_not_drop_the_bank() -> None:
    bench = resting()
    bench.board.banks[0].drop_percent = 1
    number = bench.throw(0, 1)
    bench.run(100)
    assert bench.outcome(number)["why"] == "no_drop"  # type: ignore[index]
    assert code_of(bench, "junction", 0) == "no_drop"
    assert bench.last("lie", j=0) is None
    again = bench.throw(0, 0, 5000)
    other = bench.throw(1, 0, 5000)
    bench.board.banks[0].drop_percent = 80
    bench.keep_alive(300)
    assert bench.outcome(again)["why"] == "junction_out"  # type: ignore[index]
    assert bench.outcome(other)["o"] == "done"  # type: ignore[index]
    bench.send("clear", scope="junction", i=0)
    bench.keep_alive(1000)
    assert bench.last("cleared") is not None
    after = bench.throw(0, 1, 5000)
    bench.keep_alive(1500)
    assert bench.outcome(after)["o"] == "done"  # type: ignore[index]


def case_a_shorted_coil_empties_the_bank() -> None:
    bench = resting()
    bench.board.banks[0].drop_percent = 99
    number = bench.throw(0, 1)
    bench.run(100)
    assert bench.outcome(number)["why"] == "held_down"  # type: ignore[index]
    assert code_of(bench, "junction", 0) == "held_down"


def case_a_big_bank_is_judged_by_its_expected_drop() -> None:
    # 10,000 uF into 8 ohm from 22 V still holds 9.7 V after 65 ms (calculated): a fixed fraction would call it open.
    layout = BenchLayout()
    board_records(layout)
    bank_records(layout, 1, full_mv=22_000, peak_mv=23_000, cap_uf=10_000, charge_dohm=1000, rated_mw=20_000)
    motor_record(layout, 0, 0, 0, coil_cohm=800)
    junction_records(layout, 0, "turnout", [0], two_lies(pulse_us=65_000, full_us=65_000, ready_mv=20_000))
    board = BenchBoard(1)
    board.banks[0].full_mv = 22_000
    board.banks[0].drop_percent = 56
    bench = Bench(layout, board)
    bench.hello()
    number = bench.throw(0, 1)
    bench.run(130)
    assert bench.outcome(number)["o"] == "done", bench.outcome(number)  # type: ignore[index]


def case_a_limited_source_is_no_shorted_coil() -> None:
    # 300 mA through 4.5 ohm hold 1.35 V at most, whatever little resistance stands in the charge path.
    layout = BenchLayout()
    board_records(layout)
    bank_records(layout, 1, kind="limited", limit_ma=300, charge_dohm=10, cap_uf=2200, guard="fuse")
    motor_record(layout, 0, 0, 0)
    junction_records(layout, 0, "turnout", [0], two_lies())
    board = BenchBoard(1)
    board.banks[0].drop_percent = 90
    bench = Bench(layout, board)
    bench.hello()
    number = bench.throw(0, 1)
    bench.run(100)
    assert bench.outcome(number)["o"] == "done", bench.outcome(number)  # type: ignore[index]


def case_sense_out_of_range() -> None:
    bench = resting()
    bench.board.banks[0].sense_mv = 30_000
    bench.keep_alive(200)
    found = bench.last("fault")
    assert found is not None and (found["code"], found["e1"], found["e2"]) == ("sense_range", 30_000, 17_000)
    bench.send("clear", scope="bank", i=0)
    early = bench.throw(0, 1)
    bench.run(6)
    assert bench.outcome(early)["why"] in ("stale", "bank_out"), "a reading that can't be fires nothing"  # type: ignore[index]
    bench.run(100)
    number = bench.throw(0, 1)
    bench.run(20)
    assert bench.outcome(number)["why"] == "bank_out"  # type: ignore[index]
    assert not bench.board.pulses


def case_a_broken_divider_reads_nothing_at_once() -> None:
    bench = resting()
    bench.board.banks[0].sense_mv = 0
    bench.keep_alive(200)
    assert code_of(bench, "bank", 0) == "sense_range"


def case_the_first_fault_is_kept() -> None:
    bench = resting()
    bench.board.banks[0].sense_mv = 30_000
    bench.keep_alive(200)
    bench.board.banks[0].sense_mv = 0
    bench.keep_alive(6000)
    assert {found["code"] for found in bench.all("fault") if found["i"] == 0} == {"sense_range"}
    bench.said.clear()
    bench.send("ask", what="status")
    bench.run(100)
    assert code_of(bench, "bank", 0) == "sense_range"


def case_clear_all() -> None:
    bench = resting()
    bench.board.banks[0].sense_mv = 30_000
    bench.board.banks[1].sense_mv = 30_000
    bench.keep_alive(200)
    bench.board.banks[0].sense_mv = -1
    bench.board.banks[1].sense_mv = -1
    bench.send("clear", scope="all", i=0)
    bench.run(50)
    assert len(bench.all("cleared")) == 2
    bench.send("clear", scope="all", i=0)
    bench.run(50)
    assert bench.last("answer") == {"to": "clear", "ok": 0, "why": "not_out", "i": 0}
    number = bench.throw(0, 1)
    bench.run(100)
    assert bench.outcome(number)["o"] == "done"  # type: ignore[index]


def with_contact(kind: str, **fields: object) -> Bench:
    """One turnout whose motor has contacts on inputs 0 and 1."""
    layout = BenchLayout()
    board_records(layout)
    bank_records(layout, 1)
    motor_record(layout, 0, 0, 0, contact=kind, c1=0, c2=1, **fields)
    junction_records(layout, 0, "turnout", [0], two_lies())
    board = BenchBoard(1)
    board.set_input(1, True)
    bench = Bench(layout, board)
    bench.hello()
    bench.send("ask", what="status")
    bench.run(100)
    return bench


def case_contacts_of_both_kinds_are_read() -> None:
    for kind in ("two", "inverse"):
        bench = with_contact(kind)
        assert bench.last("lie", j=0) == {"j": 0, "lie": 0, "src": "seen"}
        bench.board.set_input(1, False)
        bench.board.set_input(0, True)
        bench.run(50)
        assert bench.last("lie", j=0) == {"j": 0, "lie": 1, "src": "seen"}


def case_between_two_contacts_nothing_is_known() -> None:
    bench = with_contact("two")
    bench.board.set_input(1, False)
    bench.keep_alive(1000)
    assert bench.last("lie", j=0) == {"j": 0, "lie": -1, "src": "none"}
    assert code_of(bench, "junction", 0) is None


def case_contacts_that_disagree_for_long_are_a_fault() -> None:
    for kind, first, second in (("two", True, True), ("inverse", False, False)):
        bench = with_contact(kind)
        bench.board.set_input(0, first)
        bench.board.set_input(1, second)
        bench.keep_alive(400)
        assert code_of(bench, "junction", 0) is None
        bench.keep_alive(300)
        assert code_of(bench, "junction", 0) == "contacts_disagree"


def case_a_contact_that_bounces_is_not_believed() -> None:
    bench = with_contact("inverse")
    bench.said.clear()
    for turn in range(100):
        bench.board.set_input(0, turn % 2 == 0)
        bench.board.set_input(1, turn % 2 == 1)
        bench.run(1)
    assert not bench.all("lie")


def self_ending(contact: str = "none") -> Bench:
    """A motor of 15 ohm that ends its own pulse."""
    layout = BenchLayout()
    board_records(layout)
    bank_records(layout, 1, guard="ptc")
    c1 = 0 if contact != "none" else -1
    motor_record(layout, 0, 0, 0, coil_cohm=1500, ends="yes", contact=contact, c1=c1)
    junction_records(layout, 0, "turnout", [0], two_lies())
    board = BenchBoard(1)
    board.banks[0].drop_percent = 20
    bench = Bench(layout, board)
    bench.hello()
    return bench


def throw_and_wait(bench: Bench, lie: int) -> "tuple[object, object]":
    """Throw junction 0 and see how it ends."""
    number = bench.throw(0, lie, 5000)
    bench.keep_alive(1500)
    found = bench.outcome(number)
    assert found is not None
    return found["o"], found["why"]


def case_a_motor_that_ends_its_own_pulse_arrives() -> None:
    bench = self_ending()
    assert throw_and_wait(bench, 1) == ("done", "arrived")
    assert bench.last("lie", j=0) == {"j": 0, "lie": 1, "src": "sent"}
    bench.board.banks[0].drop_percent = 0
    assert throw_and_wait(bench, 1) == ("done", "sent")
    assert code_of(bench, "junction", 0) is None


def case_a_motor_that_does_not_end_its_pulse_did_not_arrive() -> None:
    bench = self_ending()
    bench.board.banks[0].drop_percent = 45
    assert throw_and_wait(bench, 1) == ("failed", "kept_on")
    assert bench.controller.plant.junctions[0].lie == -1  # type: ignore[union-attr]


def case_both_coils_open_is_a_fault_one_is_not() -> None:
    bench = self_ending()
    assert throw_and_wait(bench, 1) == ("done", "arrived")
    bench.board.banks[0].drop_percent = 0
    # It may have been moved by hand: nothing is claimed, and it stays in use.
    assert throw_and_wait(bench, 0) == ("failed", "no_drop")
    assert code_of(bench, "junction", 0) is None
    assert throw_and_wait(bench, 1) == ("failed", "no_drop")
    assert code_of(bench, "junction", 0) == "no_drop"


def case_a_contact_decides_for_a_motor_that_ends_its_pulse() -> None:
    bench = self_ending("one")
    bench.on_pulse = lambda pulse: bench.board.set_input(0, True)
    bench.board.banks[0].drop_percent = 45
    assert throw_and_wait(bench, 1) == ("done", "seen")
    bench.board.banks[0].drop_percent = 0
    assert throw_and_wait(bench, 1) == ("done", "seen")


def pair(contact: str) -> Bench:
    """A crossover with contacts on inputs 0 and 1, on a bank where a short pulse tells one coil from two."""
    layout = BenchLayout()
    board_records(layout)
    bank_records(layout, 1, cap_uf=10_000)
    motor_record(layout, 0, 0, 0, contact=contact, c1=0 if contact == "one" else -1)
    motor_record(layout, 1, 0, 1, contact=contact, c1=1 if contact == "one" else -1)
    rows = [
        {"at": 0, "together": "yes", "pulse_us": 20_000, "full_us": 20_000},
        {"at": 3, "together": "yes", "pulse_us": 20_000, "full_us": 20_000},
    ]  # type: list[dict[str, object]]
    junction_records(layout, 0, "crossover", [0, 1], rows)
    bench = Bench(layout, BenchBoard(1))
    bench.hello()
    return bench


def case_one_of_two_motors_not_arriving_says_so() -> None:
    bench = pair("one")
    bench.board.banks[0].drop_percent = 57
    bench.on_pulse = lambda pulse: bench.board.set_input(0, True)
    assert throw_and_wait(bench, 1) == ("failed", "one_of_two")
    assert bench.last("outcome")["i"] == 1  # type: ignore[index]


def case_one_of_two_coils_missing_shows_in_the_drop() -> None:
    bench = pair("none")
    bench.board.banks[0].drop_percent = 57
    assert throw_and_wait(bench, 1) == ("done", "sent")
    bench.board.banks[0].drop_percent = 34
    assert throw_and_wait(bench, 0) == ("failed", "no_drop")
    assert code_of(bench, "junction", 0) == "no_drop"


def case_no_fresh_samples_after_a_pulse_is_judged_all_the_same() -> None:
    bench = resting()
    number = bench.throw(0, 1)
    bench.run(20)
    bench.board.banks[0].sense_mv = 3000
    bench.board.settle_ms = 100_000
    bench.keep_alive(500)
    assert bench.outcome(number)["o"] == "done"  # type: ignore[index]
    stale = bench.throw(1, 1)
    bench.run(50)
    assert bench.outcome(stale)["why"] == "stale"  # type: ignore[index]
