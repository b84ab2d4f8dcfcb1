"""The model against scripted messages: it never raises, never guesses, and takes a kept message once."""

import copy

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from host.model import LayoutModel
from shared_protocol import messages
from shared_protocol.codec import Codec, Received, values_from
from shared_protocol.fields import Message
from shared_protocol.registry import host_reads
from shared_protocol.settings_table import SETTINGS
from tests.control.bench_layouts import usual as usual_layout
from tests.host.benches import RecordLayout
from tests.protocol.strategies import messages as any_messages

NEWS = messages.TO_HOST + SETTINGS


def heard(message: Message, **plain: object) -> Received:
    values = values_from(message, plain)
    Codec(host_reads()).encode(message, values)
    return Received(message, values, b"", "")


def board(boot: int = 7, crc: str = "") -> Received:
    return heard(messages.BOARD, v=1, fw="1.0.0", kind="test", uid="one", boot=boot, crc=crc, caps="")


def connected(layout: RecordLayout | None = None, crc: str | None = None) -> LayoutModel:
    model = LayoutModel(layout)
    model.connection_is("connected", "connected", 0.0)
    model.apply(board(crc=layout.crc() if crc is None and layout else crc or ""), 0.0)
    return model


def state(**fields: object) -> Received:
    usual: dict[str, object] = {"stop": 0, "queue": 0, "up": 1, "dropped": 0, "bad": 0, "in1": 0, "in2": 0}
    return heard(messages.STATE, **(usual | fields))


def bank(number: int, what: str, mv: int = 16_000, ready: int = 0) -> Received:
    return heard(messages.BANK, b=number, mv=mv, age=2, state=what, ready=ready)


def fault(q: int, scope: str, number: int, code: str, near: int = -1) -> Received:
    return heard(messages.FAULT, q=q, scope=scope, i=number, code=code, e1=300, e2=7900, near=near)


def outcome(q: int, number: int, o: str = "done", why: str = "sent", **fields: object) -> Received:
    usual: dict[str, object] = {"step": 0, "j": 0, "lie": 1, "ms": 40, "i": -1, "mv": 15_000, "after": 8000}
    return heard(messages.OUTCOME, q=q, id=number, o=o, why=why, **(usual | fields))


def taken(number: int, j: int = 0, step: int = 0) -> Received:
    return heard(messages.TAKEN, id=number, step=step, j=j, lie=1, by="host", due=700)


def quiet(model: LayoutModel, at_s: float = 0.0) -> None:
    model.apply(state(), at_s)
    for number in range(len(model.banks)):
        model.apply(bank(number, "ready"), at_s)


def look(model: LayoutModel) -> object:
    """All that a screen could show."""
    return copy.deepcopy((
        model.connection, model.board, model.stopped, model.banks, model.junctions, model.queue, model.routes,
        model.faults, list(model.events), model.outcomes, model.go_line(1.0),
    ))  # fmt: skip


# ---- properties


@settings(max_examples=150, deadline=None)
@given(st.lists(any_messages(NEWS), max_size=25), st.booleans())
def test_any_valid_messages_never_raise(news: list[tuple[Message, list[object]]], with_layout: bool) -> None:
    model = connected(RecordLayout() if with_layout else None)
    at_s = 0.0
    for message, values in news:
        before = model.version
        model.apply(Received(message, values, b"", ""), at_s)
        assert model.go_line(at_s).text
        assert model.version >= before
        at_s += 0.3
    for junction in model.junctions:
        assert junction.word in [lie.word for lie in junction.lies] + ["unknown"]


KEPT = tuple(message for message in messages.TO_HOST if message.kept)


@settings(max_examples=150, deadline=None)
@given(st.lists(any_messages(KEPT), max_size=12))
def test_a_kept_message_again_changes_nothing(news: list[tuple[Message, list[object]]]) -> None:
    model = connected(RecordLayout())
    for message, values in news:
        model.apply(Received(message, values, b"", ""), 0.0)
    before, version = look(model), model.version
    for message, values in news:
        model.apply(Received(message, values, b"", ""), 1.0)
    assert look(model) == before and model.version == version


@settings(max_examples=60, deadline=None)
@given(st.lists(st.tuples(st.integers(0, 4), st.sampled_from(["none", "sent", "seen"])), max_size=12))
def test_a_lie_is_what_the_board_said_last(told: list[tuple[int, str]]) -> None:
    model = connected(RecordLayout())
    last: dict[int, str] = {}
    for number, source in told:
        model.apply(heard(messages.LIE, j=number, lie=-1 if source == "none" else 1, src=source), 0.0)
        last[number] = source
    for junction in model.junctions:
        assert junction.source == last.get(junction.number, "none")
        assert (junction.lie == 1) == (junction.source != "none")


# ---- boots, faults, queue


def test_another_boot_forgets_what_was_known() -> None:
    model = connected(RecordLayout())
    model.apply(heard(messages.LIE, j=0, lie=1, src="seen"), 0.0)
    model.apply(taken(1000), 0.0)
    model.apply(fault(1, "bank", 0, "no_drop", 0), 0.0)
    assert model.junctions[0].waiting and model.banks[0].fault
    model.apply(bank(0, "ready"), 0.0)
    model.apply(board(boot=8, crc=model.layout_crc), 1.0)
    assert model.banks[0].state == "unknown" and model.banks[0].heard_at_s is None and model.banks[0].mv == -1
    assert model.junctions[0].word == "unknown" and not model.queue and not model.faults
    model.apply(fault(1, "bank", 1, "no_drop", 0), 1.0)
    assert model.banks[1].fault is not None, "a new boot numbers its messages from 1 again"


def test_the_same_boot_again_forgets_nothing() -> None:
    model = connected(RecordLayout())
    model.apply(heard(messages.LIE, j=0, lie=1, src="seen"), 0.0)
    model.apply(fault(1, "bank", 0, "no_drop", 0), 0.0)
    model.apply(board(crc=model.layout_crc), 1.0)
    assert model.junctions[0].source == "seen" and model.banks[0].fault


def test_fault_and_cleared() -> None:
    model = connected(RecordLayout())
    quiet(model)
    model.apply(fault(1, "junction", 2, "no_drop", 2), 0.5)
    found = model.faults[0]
    assert (found.scope, found.number, found.code, found.near) == ("junction", 2, "no_drop", 2)
    assert found.evidence_text == "0.3 V dropped, 7.9 V expected" and found.blink == 3
    assert model.junctions[2].fault is found
    assert model.go_line(0.6).text == "junction2 out: coil open, move it by hand"
    model.apply(heard(messages.CLEARED, q=2, scope="junction", i=2), 1.0)
    assert not model.faults and model.junctions[2].fault is None
    quiet(model, 1.0)
    assert model.go_line(1.0).level == "go"


def test_a_whole_status_ends_what_it_does_not_tell() -> None:
    model = connected(RecordLayout())
    model.apply(fault(1, "bank", 0, "no_drop", 0), 0.0)
    model.apply(fault(2, "bank", 1, "supply_missing"), 0.0)
    model.apply(taken(1000, 0), 0.0)
    model.apply(taken(1001, 1), 0.0)
    model.status_asked()
    model.apply(heard(messages.EXPECT, id=1001, step=0, j=1, lie=1, by="host", st="waiting", due=300), 1.0)
    model.apply(fault(3, "bank", 1, "supply_missing"), 1.0)
    assert len(model.faults) == 2 and len(model.queue) == 2, "not before its end"
    model.apply(heard(messages.END, what="status"), 1.0)
    assert [each.number for each in model.faults] == [1] and [each.id for each in model.queue] == [1001]
    model.apply(heard(messages.END, what="status"), 1.0)
    assert len(model.faults) == 1, "an end that was not asked for ends nothing"


def test_queue_follows_taken_expect_and_outcome() -> None:
    model = connected(RecordLayout())
    model.apply(taken(1000, 3), 0.0)
    item = model.queue[0]
    assert (item.id, item.junction, item.state, item.due_ms) == (1000, 3, "waiting", 700)
    model.apply(heard(messages.EXPECT, id=1000, step=0, j=3, lie=1, by="host", st="pulse", due=0), 0.2)
    assert [(each.state, each.heard_at_s) for each in model.queue] == [("pulse", 0.2)]
    model.apply(outcome(1, 1000, j=3), 0.3)
    assert not model.queue and model.outcomes[(1000, 0)].outcome == "done"
    model.apply(taken(1000, 3), 0.4)
    assert not model.queue, "a late double of what has ended"


def test_an_empty_queue_is_believed() -> None:
    model = connected(RecordLayout())
    model.apply(taken(0, 3), 0.0)
    model.apply(state(queue=1), 0.1)
    assert len(model.queue) == 1
    model.apply(state(queue=0), 0.2)
    assert not model.queue and not model.junctions[3].waiting


def test_route_end_says_how_many() -> None:
    model = connected(RecordLayout())
    model.apply(heard(messages.ROUTE_END, q=1, id=9, r=0, o="failed", why="route_failed", done=2, of=4), 0.0)
    assert model.outcomes[(9, 0)].kind == "route"
    assert model.events[-1].level == "bad" and "2 of 4 throws" in model.events[-1].text


def test_text_and_bad_lines_are_passed_on() -> None:
    model = connected(RecordLayout())
    model.apply(Received(None, [], b"Traceback (most recent call last):\x1b", ""), 0.0)
    assert model.events[-1].text == "the board prints: Traceback (most recent call last):?"
    model.apply(Received(None, [], b"", ""), 0.0)
    model.apply(Received(None, [], b"{", "bad_crc"), 0.0)
    assert model.bad_lines == 1 and "Traceback" in model.events[-1].text


# ---- settings


def test_settings_match() -> None:
    layout = RecordLayout()
    assert LayoutModel(layout).settings_match is None
    assert connected(layout).settings_match is True
    assert connected(layout, "00000000").settings_match is False
    assert connected(None, "00000000").settings_match is None


def fetched(model: LayoutModel, records: list[tuple[Message, list[object]]]) -> None:
    model.settings_asked()
    for message, values in records:
        model.apply(Received(message, values, b"", ""), 0.0)
    model.apply(heard(messages.END, what="settings"), 0.0)


def test_model_from_the_boards_own_settings() -> None:
    layout = RecordLayout()
    model = connected(None, layout.crc())
    model.apply(heard(messages.LIE, j=4, lie=2, src="sent"), 0.0)
    assert not model.junctions and model.settings_source == "none"
    fetched(model, layout.records)
    assert [each.name for each in model.banks] == ["bank0", "bank1"]
    assert model.junctions[4].kind == "three_way" and model.junctions[4].word == "right"
    assert model.junctions[3].lies[0].ready_mv == 14_000 and model.junctions[3].bank_numbers == [1]
    assert model.routes[0].throws == [(0, 1), (1, 1), (2, 1), (3, 1)]
    assert model.settings_source == "board" and model.board_records == layout.records


@pytest.mark.parametrize("spoil", ["one missing", "one twice", "two swapped"])
def test_settings_that_did_not_come_whole_are_not_taken(spoil: str) -> None:
    layout = RecordLayout()
    records = list(layout.records)
    if spoil == "one missing":
        del records[5]
    elif spoil == "one twice":
        records.insert(5, records[5])
    else:
        records[5], records[6] = records[6], records[5]
    model = connected(None, layout.crc())
    fetched(model, records)
    assert model.board_records is None and not model.junctions


def test_records_with_another_crc_than_the_boards_are_not_taken() -> None:
    model = connected(None, "00000000")
    fetched(model, RecordLayout().records)
    assert model.board_records is None and not model.junctions


def test_the_board_is_believed_where_file_and_board_differ() -> None:
    tuned = usual_layout()
    for message, fields in tuned.records:
        if message.name == "set_lie" and fields["j"] == 0:
            fields["ready_mv"] = 13_300
    tuned_layout = RecordLayout(tuned)
    model = connected(RecordLayout(), tuned_layout.crc())
    assert model.settings_match is False and model.junctions[0].lies[0].ready_mv == 12_000
    fetched(model, tuned_layout.records)
    assert model.junctions[0].lies[0].ready_mv == 13_300 and model.settings_source == "board"
    model.apply(heard(messages.ACCEPTED, crc=model.layout_crc, seq=2), 1.0)
    assert model.settings_match is True and model.junctions[0].lies[0].ready_mv == 12_000
