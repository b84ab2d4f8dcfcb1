"""Scenario files: what is wrong is said once, with file, line and field; what is right is read as it stands."""

from pathlib import Path

import pytest

from sim.layout import BadFile, demo_layout_path
from sim.rehearsal import load_scenario, run_rehearsal
from sim.rehearsal.reference import scenario_keys, scenario_page

ROOT = Path(__file__).parents[2]

HEAD = 'title = "A test"\nduration_s = 2.0\n'
THROW = '[[at]]\ntime_s = 1.0\ndo = "throw"\njunction = "Throat"\nlie = "to platform 2"\nlabel = "one"\n'

# ruff: noqa: E501
# What is written, the line and field that must be named, and a part of the sentence.
BAD = {
    "no title": ("duration_s = 1.0\n", 1, "title", "is missing"),
    "no duration": ('title = "x"\n', 1, "duration_s", "is missing"),
    "not TOML": ('title = "x\n', 1, "file", "is not TOML"),
    "a key that is none": (HEAD + "lenght = 3\n", 3, "lenght", "is not a key here"),
    "a text for a number": ('title = "x"\nduration_s = "long"\n', 2, "duration_s", "must be a number"),
    "a negative duration": ('title = "x"\nduration_s = -1.0\n', 2, "duration_s", "0.1 to"),
    "a huge duration": ('title = "x"\nduration_s = 1e9\n', 2, "duration_s", "0.1 to"),
    "a duration that is no number": ('title = "x"\nduration_s = nan\n', 2, "duration_s", ""),
    "a seed that is no whole number": (HEAD + "seed = 1.5\n", 3, "seed", "must be a whole number"),
    "a layout that is not there": (HEAD + 'layout = "nowhere.toml"\n', 3, "layout", "there is no layout file"),
    "a layout outside": (HEAD + 'layout = "../../secret.toml"\n', 3, "layout", "there is no layout file"),
    "clock beyond its wrap": (HEAD + "[clock]\nus_ticks = 1073741824\n", 4, "clock.us_ticks", "0 to"),
    "clock that is no table": (HEAD + "clock = 3\n", 3, "clock", "must be a table"),
    "an action that is none": (HEAD + '[[at]]\ntime_s = 1.0\ndo = "explode"\n', 5, "at 1.do", "must be one of"),
    "an action without time": (HEAD + '[[at]]\ndo = "stop"\n', 3, "at 1.time_s", "is missing"),
    "an action with no word": (HEAD + "[[at]]\ntime_s = 1.0\n", 3, "at 1.do", "is missing"),
    "an action with a number for a word": (HEAD + "[[at]]\ntime_s = 1.0\ndo = 3\n", 5, "at 1.do", "must be"),
    "an action after the end": (HEAD + '[[at]]\ntime_s = 5.0\ndo = "stop"\n', 4, "at 1.time_s", "after the end"),
    "an action before the start": (HEAD + '[[at]]\ntime_s = -1.0\ndo = "stop"\n', 4, "at 1.time_s", "0 to"),
    "at that is a table": (HEAD + '[at]\ntime_s = 1.0\ndo = "stop"\n', 3, "at", "must be a list"),
    "a key of another action": (HEAD + '[[at]]\ntime_s = 1.0\ndo = "stop"\nohm = 3.0\n', 6, "at 1.ohm", "is not a key"),
    "a throw of no junction": (HEAD + '[[at]]\ntime_s = 1.0\ndo = "throw"\nlie = "normal"\n', 3, "at 1.junction", "missing"),
    "a junction that is not there": (HEAD + THROW.replace("Throat", "Moon"), 6, "at 1.junction", "there is no junction"),
    "a lie that is not there": (HEAD + THROW.replace("to platform 2", "up"), 7, "at 1.lie", "there is no lie"),
    "a motor too many": (
        HEAD + '[[at]]\ntime_s = 1.0\ndo = "jammed"\njunction = "Throat"\nmotor = 2\n', 7, "at 1.motor", "has 1 motor",
    ),
    "a side that is none": (
        HEAD + '[[at]]\ntime_s = 1.0\ndo = "coil_open"\njunction = "Throat"\nside = "left"\n', 7, "at 1.side", "must be one of",
    ),
    "a bank that is not there": (
        HEAD + '[[at]]\ntime_s = 1.0\ndo = "bank_mended"\nbank = "North"\n', 6, "at 1.bank", "there is no bank",
    ),
    "an input that is not there": (
        HEAD + '[[at]]\ntime_s = 1.0\ndo = "press"\ninput = "bell"\n', 6, "at 1.input", "there is no input",
    ),
    "an input beyond the last": (HEAD + '[[at]]\ntime_s = 1.0\ndo = "press"\ninput = "48"\n', 6, "at 1.input", "no input"),
    "a fault out of range": (
        HEAD + '[[at]]\ntime_s = 1.0\ndo = "leakage_high"\nbank = "West"\nohm = 0\n', 7, "at 1.ohm", "1 to",
    ),
    "a route that is not there": (
        HEAD + '[[at]]\ntime_s = 1.0\ndo = "route"\nroute = "Home"\n', 6, "at 1.route", "there is no route",
    ),
    "a wait too long": (HEAD + THROW + "wait_ms = 60001\n", 9, "at 1.wait_ms", "0 to"),
    "clear of two things": (
        HEAD + '[[at]]\ntime_s = 1.0\ndo = "clear"\nbank = "West"\njunction = "Bay"\n', 3, "at 1", "names one of",
    ),
    "a label used twice": (HEAD + THROW + THROW, 14, "at 2.label", "another request is called"),
    "a repeat of nothing": (HEAD + '[[at]]\ntime_s = 1.0\ndo = "repeat"\nlabel = "x"\n', 6, "at 1.label", "no request"),
    "a repeat before its request": (
        HEAD + THROW + '[[at]]\ntime_s = 0.5\ndo = "repeat"\nlabel = "one"\n', 12, "at 2.label", "before",
    ),
    "a cancel before its request": (
        HEAD + THROW + '[[at]]\ntime_s = 0.5\ndo = "cancel"\nlabel = "one"\n', 12, "at 2.label", "before",
    ),
    "an expectation that is none": (HEAD + '[[expect]]\nwhat = "luck"\n', 4, "expect 1.what", "must be one of"),
    "an outcome of nothing": (
        HEAD + '[[expect]]\nwhat = "outcome"\nlabel = "x"\noutcome = "done"\n', 5, "expect 1.label", "no request",
    ),
    "an outcome that is none": (
        HEAD + THROW + '[[expect]]\nwhat = "outcome"\nlabel = "one"\noutcome = "fine"\n', 12, "expect 1.outcome", "must be one of",
    ),
    "a reason that is none": (
        HEAD + THROW + '[[expect]]\nwhat = "outcome"\nlabel = "one"\noutcome = "done"\nwhy = "luck"\n', 13,
        "expect 1.why", "must be one of",
    ),
    "a throw expected to be a route": (
        HEAD + THROW + '[[expect]]\nwhat = "route"\nlabel = "one"\noutcome = "done"\n', 11, "expect 1.label", "not a route",
    ),
    "a time that ends before it begins": (
        HEAD + '[[expect]]\nwhat = "pulses"\nfrom_s = 1.5\nto_s = 1.0\n', 6, "expect 1.to_s", "before",
    ),
    "a look after the end": (
        HEAD + '[[expect]]\nwhat = "voltage"\nbank = "West"\nat_s = 3.0\n', 6, "expect 1.at_s", "after the end",
    ),
    "low above high": (
        HEAD + '[[expect]]\nwhat = "voltage"\nbank = "West"\nlow_v = 9.0\nhigh_v = 8.0\n', 6, "expect 1.low_v", "above",
    ),
    "least above most": (HEAD + '[[expect]]\nwhat = "pulses"\nleast = 3\nmost = 2\n', 5, "expect 1.least", "above"),
    "a fault of two things": (
        HEAD + '[[expect]]\nwhat = "fault"\nbank = "West"\nbutton = 1\ncode = "no_drop"\n', 3, "expect 1", "names one of",
    ),
    "a fault that is none": (
        HEAD + '[[expect]]\nwhat = "fault"\nbank = "West"\ncode = "tired"\n', 6, "expect 1.code", "must be one of",
    ),
    "an output that is not there": (
        HEAD + '[[expect]]\nwhat = "follower"\noutput = "bell"\non = true\n', 5, "expect 1.output", "there is no output",
    ),
    "an override that is none": (HEAD + "[settings.weather]\nrain = 1\n", 3, "settings.weather", "is not a key here"),
    "an override out of range": (
        HEAD + "[settings.timing]\nsettle_ms = 900\n", 4, "settings.timing.settle_ms", "2 to 200",
    ),
    "an override of no junction": (
        HEAD + '[[settings.junction]]\nname = "Moon"\nready_v = 12.0\n', 4, "settings.junction 1.name", "no junction 'Moon'",
    ),
    "an override that the layout can't bear": (
        HEAD + '[[settings.junction]]\nname = "Bay"\nready_v = 25.0\n', 5, "settings.junction 1.ready_v", "",
    ),
    "an override that burns": (
        HEAD + '[[settings.bank]]\nname = "West"\nguard = "none"\ncharge_ohm = 5.0\n', 5, "settings.bank 1.guard", "burn",
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", BAD)
def test_what_is_wrong_is_said_with_file_line_and_field(name: str, tmp_path: Path) -> None:
    text, line, field, part = BAD[name]
    path = tmp_path / "bad.toml"
    path.write_text(text)
    with pytest.raises(BadFile) as caught:
        load_scenario(path)
    problem = caught.value.problems[0]
    assert (problem.file, problem.line, problem.field) == (str(path), line, field), caught.value
    assert part in problem.message, problem
    assert len(caught.value.problems) == 1, caught.value


def test_there_are_enough_of_them() -> None:
    assert len(BAD) >= 40


@pytest.mark.parametrize("text", [b"\xff\xfe\x00", b"x" * (2 << 20), b"[" * 100_000, b"a = " + b"[" * 5000])
def test_files_that_are_no_text_or_too_large(text: bytes, tmp_path: Path) -> None:
    path = tmp_path / "bad.toml"
    path.write_bytes(text)
    with pytest.raises(BadFile):
        load_scenario(path)
    with pytest.raises(BadFile):
        load_scenario(tmp_path / "nothing.toml")
    with pytest.raises(BadFile):
        load_scenario(tmp_path)


def test_a_bad_layout_is_named_by_its_own_file_and_line(tmp_path: Path) -> None:
    text = demo_layout_path().read_text("utf-8").replace('name = "West"\n', 'name = "West"\nvolts = 3\n', 1)
    (tmp_path / "other.toml").write_text(text, "utf-8")
    path = tmp_path / "scenario.toml"
    path.write_text(HEAD + 'layout = "other.toml"\n')
    with pytest.raises(BadFile) as caught:
        load_scenario(path)
    assert caught.value.problems[0].file == str(tmp_path / "other.toml")
    assert text.splitlines()[caught.value.problems[0].line - 1] == "volts = 3"


def test_overrides_change_the_layout_of_this_scenario_only(tmp_path: Path) -> None:
    path = tmp_path / "scenario.toml"
    path.write_text(
        HEAD + '[settings.board]\nhost_silence_ms = 700\n[[settings.junction]]\nname = "Bay"\nready_v = 10.0\n'
        '[[settings.bank]]\nname = "East"\ncapacitance_uf = 2200\n'
    )
    layout = load_scenario(path).layout
    assert layout.settings.board is not None and layout.settings.board.silence_ms == 700
    bay = layout.settings.junctions[layout.junction_number("Bay")]
    assert [lie.ready_mv for lie in bay.lies] == [10_000, 10_000] and bay.lies[0].pulse_us == 30_000
    assert layout.settings.banks[1].charge.cap_uf == 2200 and round(layout.physics.banks[1].capacitance_f * 1e6) == 2200
    path.write_text(HEAD)
    before = load_scenario(path).layout
    assert before.settings.banks[1].charge.cap_uf == 6800


def test_every_key_stands_in_the_reference_page() -> None:
    page = (ROOT / "docs" / "reference" / "scenario-file.md").read_text("utf-8")
    assert page == scenario_page(), "make it again: the tables have changed"
    for table in scenario_keys().values():
        for key in table:
            assert f"| `{key.name}` |" in page


WRONG = (
    HEAD
    + THROW
    + """
[[expect]]
what = "outcome"
label = "one"
outcome = "refused"
[[expect]]
what = "points"
junction = "Throat"
lie = "to platform 1"
[[expect]]
what = "pulses"
most = 0
[[expect]]
what = "voltage"
bank = "West"
high_v = 1.0
[[expect]]
what = "lie"
junction = "Throat"
lie = "unknown"
[[expect]]
what = "fault"
bank = "West"
code = "held_down"
[[expect]]
what = "follower"
output = "lamp throat normal"
on = true
[[expect]]
what = "boots"
count = 2
[[expect]]
what = "settings"
accepted = true
[[expect]]
what = "outcome"
label = "one"
outcome = "done"
"""
)


def test_expectations_that_do_not_hold_are_told_with_what_was_found(tmp_path: Path) -> None:
    path = tmp_path / "scenario.toml"
    path.write_text(WRONG)
    said: list[str] = []
    report = run_rehearsal(load_scenario(path), tell=said.append)
    assert not report.passed and said == report.timeline
    assert [each.ok for each in report.results] == [False] * 9 + [True], [each.text for each in report.results]
    first = report.results[0]
    assert "one done (seen) at 1.0" in first.text and "expected refused" in first.text
    assert WRONG.splitlines()[first.line - 1] == "[[expect]]"


def test_another_seed_gives_another_log_and_the_same_seed_the_same(tmp_path: Path) -> None:
    path = tmp_path / "scenario.toml"
    logs = []
    for seed in (1, 2, 1):
        path.write_text(HEAD + f"seed = {seed}\n" + THROW)
        logs.append(run_rehearsal(load_scenario(path)).log)
    assert logs[0] == logs[2] != logs[1]
