"""Old and new of settings, in the owner's names."""

from host.settings_diff import differences, label_of
from tests.control.bench_layouts import usual
from tests.host.benches import RecordLayout


def test_equal_settings_differ_in_nothing() -> None:
    assert differences(usual().rows(), usual().rows()) == []


def test_a_changed_field_shows_old_new_and_unit() -> None:
    tuned = usual()
    for message, fields in tuned.records:
        if message.name == "set_lie" and fields["j"] == 1 and fields["i"] == 1:
            fields["ready_mv"] = 12_600
        if message.name == "set_charge" and fields["i"] == 0:
            fields["kind"] = "switched"
    found = [str(each) for each in differences(usual().rows(), tuned.rows())]
    assert found == [
        "charge path of bank 1: kind: resistor -> switched",
        "junction1, lie reverse: ready_mv: 12000 mV -> 12600 mV",
    ]


def test_added_and_removed_records() -> None:
    short = usual().rows()
    gone = short.pop()
    assert [str(each) for each in differences(short, usual().rows())] == ["follower 3: added"]
    assert [str(each) for each in differences([*short, gone], short)] == ["follower 3: removed"]


def test_a_record_is_named_for_people() -> None:
    records = RecordLayout().records
    labels = [label_of(records, number) for number in range(len(records))]
    assert labels[0] == "board" and "bank bank1" in labels and "motor 7" in labels and "route all" in labels
    assert label_of(records, -1) == label_of(records, 999) == ""
    assert len(set(labels)) == len(labels)
