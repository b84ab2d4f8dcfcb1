"""Two boards as one: numbers, what is refused, answers of several boards as one, one board lost."""

import pytest

from shared_protocol import messages
from shared_protocol.codec import Codec, Received
from shared_protocol.fields import Message
from shared_protocol.registry import host_reads
from tests.host.fleet_bench import (
    BAY,
    ENTRY,
    FAN,
    LOOP,
    RUN_ROUND,
    SHUNT,
    SIDING,
    TERMINUS,
    THROAT,
    YARD,
    Bench,
)


def outcome(bench: Bench, number: int) -> tuple[str, str]:
    found = bench.fleet.outcome_of(number)
    assert found is not None
    return found.outcome, found.text


def test_everything_has_the_numbers_of_the_whole_layout() -> None:
    bench = Bench().both()
    model = bench.model
    assert [junction.name for junction in model.junctions] == bench.layout.junction_names
    assert [junction.number for junction in model.junctions] == list(range(7))
    assert [junction.bank_numbers for junction in model.junctions] == [[0]] * 4 + [[1]] * 3
    assert [(bank.number, bank.name, bank.mv) for bank in model.banks] == [(0, "Station", 15_800), (1, "Fan", 15_800)]
    assert [route.name for route in model.routes] == bench.layout.route_names
    assert model.title == "Reedholme, 2 of 2 boards" and model.settings_match is True
    bench.links[1].says(messages.LIE, j=1, lie=2, src="sent")
    bench.fleet.poll()
    assert (model.junctions[FAN].word, model.junctions[FAN].source) == ("road 3", "sent")
    assert model.junctions[LOOP].word == "unknown"


def test_queue_faults_and_events_name_their_board() -> None:
    bench = Bench().both()
    number = bench.fleet.throw(SIDING, 1, 5000)
    bench.links[1].says(messages.EXPECT, id=number, step=0, j=2, lie=1, by="host", st="waiting", due=800)
    bench.links[1].says(messages.EXPECT, id=0, step=0, j=0, lie=1, by="button", st="waiting", due=900)
    bench.links[1].says(messages.FAULT, q=1, scope="bank", i=0, code="no_drop", e1=1, e2=2, near=1)
    bench.links[1].says(messages.FAULT, q=2, scope="junction", i=0, code="contacts_disagree", e1=1, e2=1, near=-1)
    bench.links[1].says(messages.FAULT, q=3, scope="button", i=1, code="button_stuck", e1=1, e2=1, near=-1)
    bench.fleet.poll()
    queue = [(item.id, item.junction, item.lie, item.board) for item in bench.model.queue]
    assert queue == [(number, SIDING, 1, "Yard"), (0, ENTRY, 1, "Yard")]
    faults = [(fault.scope, fault.number, fault.who, fault.near) for fault in bench.model.faults]
    assert faults == [
        ("bank", 1, "Yard: bank Fan", FAN), ("junction", ENTRY, "Yard: Yard entry", -1),
        ("button", 5, "Yard: button 6", -1),
    ]  # fmt: skip
    assert bench.model.banks[1].fault is not None and bench.model.junctions[ENTRY].fault is not None
    assert bench.model.junctions[THROAT].fault is None
    assert any(text.startswith("Yard: bank Fan out (Yard fan)") for text in bench.events())
    for scope, number, own in (("bank", 1, 0), ("junction", ENTRY, 0), ("button", 5, 1)):
        bench.forget()
        assert bench.fleet.clear(scope, number)
        assert [values[2] for values in bench.sent(1, "clear")] == [own] and not bench.sent(0, "clear")
    assert not bench.fleet.clear("bank", 2)


def test_request_numbers_are_one_row_over_all_boards() -> None:
    bench = Bench().both()
    numbers = [bench.fleet.throw(THROAT, 1), bench.fleet.throw(ENTRY, 1), bench.fleet.route(SHUNT)]
    assert numbers == [1000, 1001, 1002]
    # A board that knows a larger number, from another program: everybody's next is larger still.
    bench.links[0].says(messages.EXPECT, id=5000, step=0, j=0, lie=1, by="host", st="waiting", due=800)
    bench.fleet.poll()
    assert bench.fleet.throw(SIDING, 1) == 5001


def test_a_route_of_one_board_is_that_boards_own() -> None:
    bench = Bench().both()
    number = bench.fleet.route(SHUNT, 4000)
    assert [values[1:] for values in bench.sent(1, "route")] == [[number, 0, 4000]] and not bench.sent(1, "throw")
    bench.links[1].says(messages.ROUTE_END, q=9, id=number, r=0, o="done", why="ok", done=2, of=2)
    bench.fleet.poll()
    assert outcome(bench, number) == ("done", "route Yard shunt done: 2 of 2 throws")
    ended = bench.fleet.outcome_of(number)
    assert ended is not None and ended.route == SHUNT


def test_losing_one_board_does_not_stop_the_others() -> None:
    bench = Bench().both()
    bench.links[1].says(messages.LIE, j=0, lie=1, src="seen")
    bench.goes(1)
    line = bench.model.go_line(bench.clock.now_s)
    assert (line.level, line.text) == ("lost", "board Yard not connected: 3 junctions unavailable; else ready")
    assert bench.model.connection.state == "connected" and bench.model.title == "Reedholme, 1 of 2 boards"
    entry = bench.model.junctions[ENTRY]
    assert entry.lost and (entry.word, entry.source) == ("to road 4", "seen"), "as last told"
    assert not bench.model.junctions[THROAT].lost
    assert [bank.lost for bank in bench.model.banks] == ["", "Yard"]
    bench.forget()
    done = bench.fleet.throw(BAY, 1)
    assert len(bench.sent(0, "throw")) == 1
    bench.ends(0, done, 2, 1)
    assert outcome(bench, done)[0] == "done"
    lost = bench.fleet.throw(ENTRY, 0)
    assert outcome(bench, lost) == ("unsent", "Yard entry, to roads 1-3: not sent: board Yard not connected")
    assert outcome(bench, bench.fleet.route(SHUNT))[0] == "unsent"
    bench.forget()
    bench.comes(1, YARD)
    bench.passes(3.0)
    assert not bench.sent(1, "throw", "route"), "coming back only reads"
    assert bench.model.title == "Reedholme, 2 of 2 boards"


def test_a_request_under_way_on_the_board_that_is_lost_is_unknown_when_it_comes_back_without_it() -> None:
    bench = Bench().both()
    number = bench.fleet.throw(ENTRY, 1, 5000)
    bench.goes(1)
    assert bench.fleet.outcome_of(number) is None
    bench.comes(1, YARD)
    assert outcome(bench, number)[0] == "unknown"
    assert len(bench.sent(1, "throw")) == 1


@pytest.mark.parametrize(
    ("stops", "level", "text"),
    [
        ((0, 0), "go", "ready"),
        ((1, 1), "stop", "stopped: press r to release"),
        ((0, 1), "stop", "stopped on Yard only: press r to release"),
    ],
)
def test_go_line_of_stops(stops: tuple[int, int], level: str, text: str) -> None:
    bench = Bench().both()
    for port, stop in enumerate(stops):
        bench.state(port, stop)
    line = bench.model.go_line(bench.clock.now_s)
    assert (line.level, line.text) == (level, text)
    assert bench.model.stopped is any(stops)


def test_go_line_names_the_longest_wait_and_what_is_out_before_it() -> None:
    bench = Bench().both()
    for port, ready in ((0, 1500), (1, 700)):
        bench.links[port].says(messages.BANK, b=0, mv=9000, age=1, state="charging", ready=ready)
    bench.fleet.poll()
    assert bench.model.go_line(bench.clock.now_s).text == "wait 1.5 s for bank Station"
    bench.links[1].says(messages.FAULT, q=1, scope="bank", i=0, code="supply_missing", e1=1, e2=2, near=-1)
    bench.fleet.poll()
    line = bench.model.go_line(bench.clock.now_s)
    assert line.level == "out" and line.text.startswith("Yard: bank Fan out: nothing charges it")


def test_go_line_before_anything_is_there_and_after_all_is_lost() -> None:
    bench = Bench()
    assert bench.model.go_line(bench.clock.now_s).text == "looking for the 2 boards"
    bench.both()
    bench.goes(0)
    bench.goes(1)
    line = bench.model.go_line(bench.clock.now_s)
    assert line.level == "lost" and line.text.startswith("no board is there: ")
    assert bench.model.connection.state == "lost"


def test_a_stop_goes_to_all_boards_and_is_one_answer() -> None:
    bench = Bench().both()
    assert bench.fleet.stop() and bench.fleet.unreached == ""
    assert [len(bench.sent(port, "stop")) for port in (0, 1)] == [1, 1]
    bench.answers(0, "stop")
    assert "stop" not in bench.model.answers, "one board has not answered yet"
    bench.answers(1, "stop")
    answer = bench.model.answers["stop"]
    assert answer.ok and answer.count == 1 and answer.text == "stop: done"
    assert bench.fleet.release()
    assert [len(bench.sent(port, "release")) for port in (0, 1)] == [1, 1]


def test_a_stop_that_does_not_reach_a_board_says_so() -> None:
    bench = Bench().both()
    bench.goes(1)
    assert bench.fleet.unreached == "board Yard not reached"
    assert bench.fleet.stop()
    bench.answers(0, "stop")
    answer = bench.model.answers["stop"]
    assert not answer.ok
    assert answer.text == ("stop: done; board Yard NOT reached: use its own stop, or switch its coil supply off")
    # A board that is lost before it has answered was not reached either.
    bench.comes(1, YARD)
    assert bench.fleet.stop()
    bench.answers(0, "stop")
    bench.goes(1)
    assert bench.model.answers["stop"].count == 2 and "Yard NOT reached" in bench.model.answers["stop"].text
    bench.goes(0)
    assert not bench.fleet.stop()


def test_a_stop_is_not_made_up_for_when_a_board_comes_back() -> None:
    bench = Bench().both()
    bench.goes(1)
    bench.fleet.stop()
    bench.comes(1, YARD)
    bench.passes(1.0)
    assert not bench.sent(1, "stop")
    assert bench.model.stopped is False and bench.sent(0, "stop")


def test_cancel_goes_to_whose_request_it_is_and_to_all_if_nobody_knows() -> None:
    bench = Bench().both()
    number = bench.fleet.throw(ENTRY, 1, 5000)
    assert bench.fleet.cancel(number)
    assert len(bench.sent(1, "cancel")) == 1 and not bench.sent(0, "cancel")
    bench.answers(1, "cancel")
    assert bench.model.answers["cancel"].ok
    bench.forget()
    assert bench.fleet.cancel(77)
    assert [values[1] for port in (0, 1) for values in bench.sent(port, "cancel")] == [77, 77]
    bench.answers(0, "cancel", 0, "no_such_throw")
    bench.answers(1, "cancel")
    assert bench.model.answers["cancel"].ok, "one of them knew it"
    bench.fleet.cancel(78)
    for port in (0, 1):
        bench.answers(port, "cancel", 0, "no_such_throw")
    assert not bench.model.answers["cancel"].ok


def test_a_board_with_the_settings_of_another_layout_is_not_thrown() -> None:
    """Its numbers mean other junctions than the layout file says."""
    bench = Bench()
    bench.comes(0, TERMINUS)
    other = bench.layout.boards[TERMINUS]
    bench.comes(1, YARD, crc=other.crc())
    number = bench.fleet.throw(ENTRY, 1)
    assert outcome(bench, number)[1].endswith("not sent: board Yard has other settings, which are being read")
    for message, values in other.records:
        bench.links[1].received.put(_received(message, values))
    bench.fleet.poll()
    bench.links[1].says(messages.END, what="settings")
    bench.fleet.poll()
    number = bench.fleet.throw(ENTRY, 1)
    assert outcome(bench, number)[1].endswith("not sent: board Yard has the settings of another layout: send them")
    assert not bench.sent(1, "throw", "route")
    assert bench.model.junctions[ENTRY].name == "Yard entry", "shown is the layout file"
    assert "board Yard has the settings of another layout: send them" in bench.model.go_line(bench.clock.now_s).text
    assert bench.model.settings_match is False


def test_a_board_that_was_tuned_is_thrown_as_ever() -> None:
    """Other figures, the same junctions."""
    bench = Bench()
    bench.comes(0, TERMINUS)
    tuned = [(message, list(values)) for message, values in bench.layout.boards[YARD].records]
    for message, values in tuned:
        if message.name == "set_lie":
            values[message.position("ready_mv")] = 11_100
    crc = _crc(tuned)
    bench.comes(1, YARD, crc=crc)
    for message, values in tuned:
        bench.links[1].received.put(_received(message, values))
    bench.fleet.poll()
    bench.links[1].says(messages.END, what="settings")
    bench.fleet.poll()
    bench.fleet.throw(ENTRY, 1)
    assert len(bench.sent(1, "throw")) == 1
    assert {lie.ready_mv for lie in bench.model.junctions[ENTRY].lies} == {11_100}, "shown is what the board holds"
    assert bench.model.go_line(bench.clock.now_s).level == "go" and bench.model.settings_match is False


def test_a_board_without_settings_is_not_thrown() -> None:
    bench = Bench().both()
    bench.goes(1)
    bench.links[1].connects(8, "", "virtual-2", "address 2")
    bench.quiet(1, YARD)
    number = bench.fleet.throw(ENTRY, 1)
    assert outcome(bench, number)[1].endswith("board Yard has no settings: send them")
    bench.fleet.throw(THROAT, 1)
    assert len(bench.sent(0, "throw")) == 1 and not bench.sent(1, "throw")


def test_routes_of_other_boards_are_not_touched_by_one_that_runs() -> None:
    bench = Bench().both()
    assert bench.fleet.route(RUN_ROUND) != bench.fleet.route(SHUNT)
    assert len(bench.sent(0, "route")) == len(bench.sent(1, "route")) == 1


def _received(message: Message, values: list[object]) -> Received:
    return Received(message, values, b"", "")


def _crc(records: list[tuple[Message, list[object]]]) -> str:
    codec = Codec(host_reads())
    return codec.crc_text(b"".join(codec.body(message, values) + b"\n" for message, values in records)).decode()
