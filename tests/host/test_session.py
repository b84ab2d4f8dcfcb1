"""The session: it reads by itself, acknowledges, and sends each request once."""

import pytest

from host.link_errors import NoAnswer, PortMissing
from host.session import first_id
from shared_protocol import messages
from shared_protocol.codec import ValueOutOfTable
from tests.host.benches import RecordLayout
from tests.host.fake_link import Desk


def desk_with_layout() -> Desk:
    layout = RecordLayout()
    desk = Desk(layout)
    desk.ready(crc=layout.crc())
    return desk


def test_connecting_asks_for_the_status_and_nothing_else() -> None:
    layout = RecordLayout()
    desk = Desk(layout)
    desk.link.connects(crc=layout.crc())
    desk.session.poll()
    assert desk.link.sent == [("ask", [messages.ASK_STATUS])]
    desk.state()
    desk.end_status()
    desk.passes(0.5)
    assert len(desk.link.sent) == 1 and desk.session.status_whole


def test_a_board_with_other_settings_is_asked_for_them() -> None:
    desk = Desk(RecordLayout())
    desk.link.connects(crc="00000000")
    desk.end_status()
    desk.session.poll()
    assert [name for name, _ in desk.link.sent] == ["ask", "ask"]
    assert desk.link.sent[1][1] == [messages.ASK_SETTINGS]


def test_settings_that_come_damaged_are_asked_for_again_but_not_for_ever() -> None:
    layout = RecordLayout()
    desk = Desk()
    desk.ready(crc=layout.crc())
    for _ in range(10):
        desk.link.says(messages.END, what="settings")
        desk.session.poll()
    assert len([1 for name, _ in desk.link.sent if name == "ask"]) < 6
    assert desk.session.fetch_settings()
    for message, values in layout.records:
        desk.link.received.put(_received(message, values))
    desk.link.says(messages.END, what="settings")
    desk.session.poll()
    assert desk.model.board_records == layout.records and desk.model.junctions


def _received(message: object, values: list[object]) -> object:
    from shared_protocol.codec import Received

    return Received(message, values, b"", "")  # type: ignore[arg-type]


def test_a_status_without_an_end_is_asked_for_again() -> None:
    desk = Desk(RecordLayout())
    desk.link.connects()
    desk.passes(1.0)
    assert desk.link.names() == ["ask"]
    desk.state()
    desk.passes(1.0)
    assert desk.link.names() == ["ask"]


def test_kept_messages_are_acknowledged_every_time() -> None:
    desk = desk_with_layout()
    desk.outcome(5, 0)
    desk.outcome(5, 0)
    desk.session.poll()
    assert desk.link.sent == [("ack", [5]), ("ack", [5])]
    assert len([each for each in desk.model.events if "done" in each.text]) == 1


def test_a_throw_is_sent_once_with_boot_and_a_growing_number() -> None:
    desk = desk_with_layout()
    one, two = desk.session.throw(2, 1, 300), desk.session.route(0, 5000)
    assert desk.link.sent == [("throw", [7, one, 2, 1, 300]), ("route", [7, two, 0, 5000])]
    assert two > one and desk.session.outcome_of(one) is None and desk.session.in_flight == 2
    desk.outcome(1, one, j=2)
    desk.link.says(messages.ROUTE_END, q=2, id=two, r=0, o="done", why="ok", done=4, of=4)
    desk.session.poll()
    assert desk.session.outcome_of(one).outcome == "done"  # type: ignore[union-attr]
    assert desk.session.route_end_of(two).done == 4 and desk.session.route_end_of(one) is None  # type: ignore[union-attr]
    assert desk.session.in_flight == 0


def test_numbers_stay_above_those_that_the_board_mentions() -> None:
    desk = desk_with_layout()
    desk.link.says(messages.EXPECT, id=5000, step=0, j=1, lie=1, by="host", st="waiting", due=300)
    desk.session.poll()
    assert desk.session.throw(0, 1) == 5001


def test_first_numbers_grow_with_the_clock_and_stay_in_range() -> None:
    assert first_id(1_790_000_000.3) > first_id(1_790_000_000.1) >= 1
    assert all(1 <= first_id(wall_s) < 900_000_001 for wall_s in (0.0, 9e7, 1.79e9, 4.2e9))


def test_without_a_connection_nothing_is_sent_now_or_later() -> None:
    desk = desk_with_layout()
    desk.link.breaks()
    desk.session.poll()
    number = desk.session.throw(0, 1)
    assert desk.session.outcome_of(number).outcome == "unsent"  # type: ignore[union-attr]
    assert not desk.session.stop() and not desk.session.release() and not desk.session.clear("bank", 0)
    desk.link.connects(crc=desk.model.layout_crc)
    desk.end_status()
    desk.passes(1.0)
    assert set(desk.link.names()) <= {"ask", "hello"}


def test_a_request_that_nothing_is_heard_of_becomes_unknown_after_a_whole_status() -> None:
    desk = desk_with_layout()
    number = desk.session.throw(0, 1)
    desk.link.sent.clear()
    desk.passes(1.0)
    desk.state()
    desk.passes(1.2)
    assert desk.link.names() == ["ask"], "asked after by a status, not sent again"
    assert desk.session.outcome_of(number) is None
    desk.state()
    desk.end_status()
    desk.session.poll()
    found = desk.session.outcome_of(number)
    assert found is not None and found.outcome == "unknown" and "look at the points" in found.text


def test_a_doubtful_request_that_the_board_has_in_its_queue_goes_on() -> None:
    desk = desk_with_layout()
    number = desk.session.throw(0, 1, 5000)
    desk.link.breaks()
    desk.link.connects(crc=desk.model.layout_crc)
    desk.session.poll()
    desk.link.says(messages.EXPECT, id=number, step=0, j=0, lie=1, by="host", st="waiting", due=300)
    desk.end_status()
    desk.session.poll()
    assert desk.session.outcome_of(number) is None and desk.session.in_flight == 1
    desk.outcome(1, number)
    desk.session.poll()
    assert desk.session.outcome_of(number).outcome == "done"  # type: ignore[union-attr]


def test_after_a_restart_what_was_in_flight_is_unknown() -> None:
    desk = desk_with_layout()
    number = desk.session.throw(0, 1)
    desk.link.breaks()
    desk.link.connects(boot=8, crc=desk.model.layout_crc)
    desk.session.poll()
    assert desk.session.outcome_of(number).outcome == "unknown"  # type: ignore[union-attr]
    desk.link.sent.clear()
    desk.session.throw(0, 1)
    assert desk.link.sent[0][1][0] == 8, "the new boot's number"


def test_after_a_loss_the_first_whole_status_decides() -> None:
    desk = desk_with_layout()
    number = desk.session.throw(0, 1)
    desk.link.breaks()
    desk.link.connects(crc=desk.model.layout_crc)
    desk.state()
    desk.end_status()
    desk.session.poll()
    assert desk.session.outcome_of(number).outcome == "unknown"  # type: ignore[union-attr]
    desk.outcome(1, number)
    desk.session.poll()
    assert desk.session.outcome_of(number).outcome == "done", "a kept outcome that comes later is the truth"  # type: ignore[union-attr]


def test_an_outcome_that_came_just_before_a_restart_stands() -> None:
    desk = desk_with_layout()
    number = desk.session.throw(0, 1)
    desk.outcome(1, number)
    desk.link.greets(boot=8, crc=desk.model.layout_crc)
    desk.session.poll()
    assert desk.session.outcome_of(number).outcome == "done"  # type: ignore[union-attr]
    assert desk.session.in_flight == 0


def test_a_silent_board_is_greeted_then_lost_then_found() -> None:
    desk = desk_with_layout()
    desk.passes(1.5)
    assert desk.link.names() == ["hello"] and desk.model.connection.state == "connected"
    desk.passes(2.0)
    assert desk.model.connection.state == "lost"
    assert set(desk.link.names()) == {"hello"}
    assert desk.session.outcome_of(desk.session.throw(0, 1)).outcome == "unsent"  # type: ignore[union-attr]
    desk.link.greets(boot=8, crc=desk.model.layout_crc)
    desk.session.poll()
    assert desk.model.connection.state == "connected" and desk.link.names() == ["ask"]


def test_stop_needs_no_boot_number_and_clear_names_its_scope() -> None:
    desk = desk_with_layout()
    assert desk.session.stop() and desk.session.release() and desk.session.clear("junction", 3)
    assert desk.session.cancel(77)
    assert desk.link.sent == [("stop", []), ("release", [7]), ("clear", [7, 1, 3]), ("cancel", [7, 77])]
    with pytest.raises(ValueError):
        desk.session.clear("yard", 1)
    desk.link.says(messages.ANSWER, to="clear", ok=0, why="not_out", i=3)
    desk.session.poll()
    assert desk.model.answers["clear"].text == "clear refused: nothing is out there"


def test_values_out_of_the_table_are_not_sent() -> None:
    desk = desk_with_layout()
    with pytest.raises(ValueOutOfTable):
        desk.session.throw(99, 0)
    assert desk.link.sent == [] and desk.session.in_flight == 0


def test_wait_for_gives_up_in_time() -> None:
    from time import monotonic

    from host.session import Session

    desk = desk_with_layout()
    session = Session(desk.link, desk.model, monotonic, 1)  # type: ignore[arg-type]
    began = monotonic()
    assert not session.wait_for(lambda: False, 0.15)
    assert 0.1 < monotonic() - began < 1.5


def test_connect_raises_why_there_is_no_board() -> None:
    desk = Desk()
    desk.link.error = PortMissing("fake")
    with pytest.raises(PortMissing):
        desk.session.connect(5.0)
    assert isinstance(NoAnswer("fake"), Exception)


# ---- settings transfer


def test_settings_go_as_one_transaction() -> None:
    desk = desk_with_layout()
    records = desk.model.layout.records  # type: ignore[union-attr]
    transfer = desk.session.send_settings(records)
    assert desk.link.sent == [("stage", [7, len(records)])] and transfer.state == "staging"
    desk.passes(0.5)
    assert len(desk.link.sent) == 1, "no record before the board agrees"
    desk.link.says(messages.ANSWER, to="stage", ok=1, why="ok", i=len(records))
    desk.passes(0.2)
    assert transfer.state == "sending" and 0 < transfer.progress < 1
    desk.passes(1.0)
    assert transfer.state == "waiting"
    assert [values for _, values in desk.link.sent[1:-1]] == [values for _, values in records]
    assert desk.link.sent[-1] == ("commit", [7, desk.model.layout_crc.encode()])
    desk.link.says(messages.ANSWER, to="stage", ok=1, why="ok", i=len(records))
    desk.passes(0.2)
    assert transfer.state == "waiting"
    assert [name for name, _ in desk.link.sent].count("commit") == 1, "a late double starts nothing again"
    desk.link.says(messages.ACCEPTED, crc=desk.model.layout_crc, seq=4)
    desk.session.poll()
    assert transfer.state == "accepted" and transfer.sequence == 4 and not transfer.open


def sending(desk: Desk) -> object:
    transfer = desk.session.send_settings(desk.model.layout.records)  # type: ignore[union-attr]
    desk.link.says(messages.ANSWER, to="stage", ok=1, why="ok", i=1)
    return transfer


def test_a_rejection_names_record_and_field_in_the_owners_words() -> None:
    desk = desk_with_layout()
    transfer = sending(desk)
    desk.passes(1.5)
    names = [message.name for message, _ in desk.model.layout.records]  # type: ignore[union-attr]
    desk.link.says(messages.REJECTED, n=names.index("set_lie"), field="ready_mv", why="never_reached")
    desk.session.poll()
    assert (transfer.state, transfer.field, transfer.why) == ("rejected", "ready_mv", "never_reached")  # type: ignore[attr-defined]
    assert "junction0, lie normal, field ready_mv" in transfer.text  # type: ignore[attr-defined]


@pytest.mark.parametrize(("after_s", "words"), [(0.2, "before stay in force"), (1.5, "fetch the settings")])
def test_a_loss_in_the_middle_is_said(after_s: float, words: str) -> None:
    desk = desk_with_layout()
    transfer = sending(desk)
    desk.passes(after_s)
    desk.link.breaks()
    desk.session.poll()
    assert transfer.state == "failed" and words in transfer.text  # type: ignore[attr-defined]
    desk.link.connects(crc=desk.model.layout_crc)
    desk.link.sent.clear()
    desk.passes(1.0)
    assert set(desk.link.names()) == {"ask"}, "it is not taken up again by itself"


def test_a_transfer_can_be_cancelled_and_refused_and_times_out() -> None:
    desk = desk_with_layout()
    transfer = sending(desk)
    desk.passes(0.2)
    transfer.cancel()  # type: ignore[attr-defined]
    assert transfer.state == "cancelled" and desk.link.sent[-1] == ("abandon", [7])  # type: ignore[attr-defined]
    other = desk.session.send_settings(desk.model.layout.records)  # type: ignore[union-attr]
    desk.link.says(messages.ANSWER, to="stage", ok=0, why="busy", i=1)
    desk.session.poll()
    assert other.state == "rejected" and "queue is empty" in other.text
    third = desk.session.send_settings(desk.model.layout.records)  # type: ignore[union-attr]
    for _ in range(10):
        desk.state()
        desk.passes(1.0)
    assert third.state == "failed"
