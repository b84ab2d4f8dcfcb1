"""The shipped scenarios: as expected on both interpreters, with the same event log to the byte."""

from pathlib import Path

import pytest

from sim.rehearsal import load_scenario, run_rehearsal, shipped


@pytest.mark.parametrize("path", shipped(), ids=lambda path: path.stem)
def test_as_expected_and_same_log_on_both_interpreters(path: Path) -> None:
    scenario = load_scenario(path)
    assert scenario.expectations
    plain = run_rehearsal(scenario)
    assert plain.passed, "\n".join([plain.broken, *(each.text for each in plain.results if not each.ok)])
    # On MicroPython every tick runs with the heap locked.
    real = run_rehearsal(scenario, on="micropython")
    assert real.log == plain.log
    assert real.passed and real.ticks == plain.ticks and real.timeline == plain.timeline
    plain.log.encode("ascii")


def test_the_full_log_with_telemetry_is_the_same_too() -> None:
    scenario = load_scenario(next(path for path in shipped() if path.stem.startswith("05")))
    plain = run_rehearsal(scenario, full_log=True)
    real = run_rehearsal(scenario, on="micropython", full_log=True)
    assert '"m":"bank"' in plain.log and plain.log == real.log
    assert '"m":"bank"' not in run_rehearsal(scenario).log


def test_at_least_a_dozen_are_shipped() -> None:
    assert len(shipped()) >= 12
