"""The tuning form without a screen: entries from the table, validation, old and new, one transaction."""

from itertools import pairwise

import pytest

from host.terminal.curve_view import curve_of, ticks
from host.terminal.tuning import Entry, Tuning, change_text
from host.terminal.tuning_table import TUNABLE, limits_text, parse, shown_value, units_text
from host.terminal.voltage_history import VoltageHistory
from shared_protocol import settings_table as table
from shared_protocol.fields import INT, WORD, word
from tests.terminal.bench import Bench


@pytest.fixture(name="bench")
def _bench() -> Bench:
    return Bench()


@pytest.fixture(name="tuning")
def _tuning(bench: Bench) -> Tuning:
    tuning = Tuning()
    assert tuning.take(bench.model)
    return tuning


def entry(tuning: Tuning, subject: str, label: str) -> Entry:
    """An entry by its subject's title and its label."""
    found = next(each for each in tuning.subjects() if each.title.strip() == subject)
    return next(each for each in found.entries if each.label == label)


# ---- the table


def test_every_tunable_key_is_a_number_or_word_of_the_settings_table() -> None:
    by_name = {message.name: message for message in table.SETTINGS}
    for name, keys in TUNABLE.items():
        for key in keys:
            field = by_name[name].fields[by_name[name].position(key)]
            assert field.kind in (INT, WORD), f"{name}.{key}"
            assert field.text, f"{name}.{key}"


READY = table.SET_LIE.fields[table.SET_LIE.position("ready_mv")]
PULSE = table.SET_LIE.fields[table.SET_LIE.position("pulse_us")]
COIL = table.SET_MOTOR.fields[table.SET_MOTOR.position("coil_cohm")]


@pytest.mark.parametrize(
    ("field", "text", "value"),
    [
        (READY, "12400", 12_400),
        (READY, " 12400 mV", 12_400),
        (READY, "12.4V", 12_400),
        (READY, "12.4v", 12_400),
        (PULSE, "37.5ms", 37_500),
        (COIL, "4.5ohm", 450),
        (READY, "999", "must be from 1000 to 33000 mV, not 999"),
        (READY, "33001", "must be from 1000 to 33000 mV, not 33001"),
        (READY, "", "is a number of mV"),
        (READY, "12,4", "is a number of mV"),
        (READY, "12400 us", "is a number of mV, not in us"),
        (READY, "12400.5", "is a whole number of mV"),
        (READY, "9" * 40, "is a number of mV"),
        (word("w", ("no", "yes"), 0), "Yes", 1),
        (word("w", ("no", "yes"), 0), "maybe", "is one of: no, yes"),
    ],
)
def test_values_are_read_exactly_or_refused_with_a_sentence(field: object, text: str, value: object) -> None:
    assert parse(field, text) == value  # type: ignore[arg-type]


@pytest.mark.parametrize("name", TUNABLE)
def test_what_is_shown_can_be_read_back(name: str, tuning: Tuning) -> None:
    entries = [each for subject in tuning.subjects() for each in subject.entries]
    of_this = [each for each in entries if tuning.base[each.record][0].name == name]
    assert of_this
    for each in of_this:
        kept = tuning.base[each.record][1][each.position]
        assert parse(each.field, shown_value(each.field, kept)) == kept


def test_limits_name_range_and_unit() -> None:
    assert limits_text(READY) == "1000 to 33000 mV"
    assert limits_text(COIL) == "100 to 4000 (0.01 ohm)"
    assert units_text(COIL) == "May be typed in ohm."
    assert units_text(table.SET_CHARGE.fields[2]) == ""
    assert limits_text(table.SET_MOTOR.fields[table.SET_MOTOR.position("ends")]) == "no | yes"


# ---- the form


def test_subjects_are_junctions_banks_timing_board(tuning: Tuning) -> None:
    titles = [subject.title.strip() for subject in tuning.subjects()]
    assert titles[0] == "1 Throat" and titles[10] == "11 Yard fan"
    assert titles[11:] == ["Bank West", "Bank East", "Timing", "Board"]


def test_a_junction_has_its_lies_its_own_fields_and_its_motors(tuning: Tuning) -> None:
    labels = [each.label for each in tuning.subjects()[9].entries]
    assert labels[:3] == ["straight: ready", "straight: pulse", "straight: full"]
    assert "retry" in labels and "motor 1: coil" in labels and "motor 2: answer" in labels
    assert tuning.subjects()[9].bank == 1
    assert entry(tuning, "1 Throat", "to platform 1: ready").sentence == (
        "to platform 1: ready - Ready voltage: below it a pulse is refused. May be typed in mV or V."
    )


def test_nothing_changed_nothing_to_send(tuning: Tuning) -> None:
    assert tuning.change_count == 0
    assert tuning.changes() == []
    assert tuning.problem() == ("", None)


def test_a_change_is_shown_as_old_and_new(tuning: Tuning) -> None:
    ready = entry(tuning, "2 Loop", "loop: ready")
    tuning.write(ready, "13V")
    assert tuning.changed(ready)
    changes = tuning.changes()
    assert [(each.field, each.old, each.new, each.unit) for each in changes] == [("ready_mv", 12_400, 13_000, "mV")]
    assert change_text(changes[0], 70) == ["Loop, lie reverse, ready", "    old 12400 mV   new 13000 mV"]
    tuning.write(ready, "12.4V")
    assert not tuning.changed(ready)
    assert tuning.change_count == 0


def test_a_wrong_entry_is_a_problem_with_its_place(tuning: Tuning) -> None:
    ready = entry(tuning, "2 Loop", "loop: ready")
    tuning.write(ready, "5")
    assert tuning.wrong(ready) == "loop: ready must be from 1000 to 33000 mV, not 5"
    text, place = tuning.problem()
    assert "Loop, lie reverse" in text and "not 5" in text
    assert place == ready.place


def test_the_whole_is_checked_against_the_settings_check(tuning: Tuning) -> None:
    ready = entry(tuning, "2 Loop", "loop: ready")
    tuning.write(ready, "16000")
    text, place = tuning.problem()
    assert "the supply can never bring the bank to this ready voltage" in text
    assert place == ready.place
    tuning.revert()
    tuning.write(entry(tuning, "Bank West", "charge: guard"), "none")
    text, _ = tuning.problem()
    assert "burn" in text


def test_changes_stay_when_other_settings_come(bench: Bench, tuning: Tuning) -> None:
    tuning.write(entry(tuning, "2 Loop", "loop: ready"), "13V")
    tuning.write(entry(tuning, "2 Loop", "main: ready"), "13.5V")
    records = tuning.new_records()
    main = entry(tuning, "2 Loop", "main: ready")
    records[entry(tuning, "2 Loop", "loop: ready").record][1][main.position] = 12_400
    bench.model.board_records = records
    assert tuning.take(bench.model)
    assert not tuning.changed(entry(tuning, "2 Loop", "main: ready"))
    assert tuning.text(entry(tuning, "2 Loop", "loop: ready")) == "13V"
    assert not tuning.take(bench.model)


def test_without_known_settings_there_is_no_form() -> None:
    bench = Bench(ready=False)
    tuning = Tuning()
    assert not tuning.take(bench.model)
    assert tuning.subjects() == []


def test_all_records_go_as_one_transaction_and_the_answer_is_told_once(bench: Bench, tuning: Tuning) -> None:
    bench.link.sent.clear()
    tuning.write(entry(tuning, "2 Loop", "loop: ready"), "13V")
    tuning.send(bench.session)
    assert tuning.answer(bench.model) is None
    for _ in range(40):
        bench.board_gets_new_settings()
        if not tuning.sending:
            break
    assert len(bench.sent("stage")) == len(bench.sent("commit")) == 1
    assert bench.sent("stage")[0][1] == len(bench.layout.records)
    assert [values[7] for values in bench.sent("set_lie")].count(13_000) == 1
    level, text = tuning.answer(bench.model) or ("", "")
    assert level == "good" and text.startswith("accepted") and "layout file still has the old values" in text
    assert tuning.answer(bench.model) is None


def test_what_fails_is_told_as_bad(bench: Bench, tuning: Tuning) -> None:
    tuning.write(entry(tuning, "2 Loop", "loop: ready"), "13V")
    tuning.send(bench.session)
    bench.link.breaks()
    bench.session.poll()
    level, text = tuning.answer(bench.model) or ("", "")
    assert level == "bad" and "link was lost" in text


# ---- the curve


def history() -> VoltageHistory:
    """Twenty seconds of bank 0, with a dip."""
    kept = VoltageHistory()
    for number in range(200):
        kept.add(0, 80.0 + number / 10, 7000 if number == 100 else 16_000)
    return kept


def test_the_curve_has_the_last_seconds_and_a_line_for_each_ready_voltage(bench: Bench) -> None:
    curve = curve_of(bench.model, history(), 0, 100.0, 100)
    assert curve is not None
    assert curve.times_s[0] == -20.0 and len(curve.volts) == 200
    assert curve.low_v <= 7.0 and curve.high_v >= 16.0
    assert [(line.levels_v, line.label) for line in curve.lines] == [
        ((11.0,), "11.0 V 4 Bay"),
        ((12.0,), "12.0 V 1 Throat"),
        ((12.4,), "12.4 V 2 Loop"),
        ((12.6,), "12.6 V 6 Signal box"),
        ((12.8,), "12.8 V 5 Shed"),
        ((13.4,), "13.4 V 3 Goods"),
    ]


def test_lines_too_close_for_the_plot_share_a_label(bench: Bench) -> None:
    curve = curve_of(bench.model, history(), 0, 100.0, 6)
    assert curve is not None
    assert sum(len(line.levels_v) for line in curve.lines) == 6
    highest = [line.levels_v[-1] for line in curve.lines]
    pitch = (curve.high_v - curve.low_v) / 6
    lowest = [line.levels_v[0] for line in curve.lines]
    assert all(low - before >= pitch for before, low in pairwise(lowest))
    assert len(highest) < 6


def test_a_new_ready_voltage_is_drawn_beside_the_old(bench: Bench) -> None:
    curve = curve_of(bench.model, history(), 0, 100.0, 100, {(1, 0): 13_000}, only=1)
    assert curve is not None
    assert [line.label for line in curve.lines] == ["12.4 V 2 Loop", "13.0 V 2 Loop main NEW"]


def test_no_bank_no_curve(bench: Bench) -> None:
    assert curve_of(bench.model, history(), 3, 100.0, 10) is None


def test_ticks_are_whole_volts() -> None:
    assert ticks(9.0, 17.0, 8) == (10.0, 12.0, 14.0, 16.0)
    assert ticks(0.0, 17.0, 4) == (0.0, 10.0)
