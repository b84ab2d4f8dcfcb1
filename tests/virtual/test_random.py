"""Random scenarios with faults: the same event log on both interpreters, and what must hold of any run."""

from pathlib import Path

import pytest
from audit import audit

from sim.micropython_board import Interpreter
from sim.rehearsal import load_scenario, run_rehearsal
from sim.rehearsal.random_scenarios import random_scenario_text

CHUNK = 10
CHUNKS = 30


@pytest.mark.parametrize("chunk", range(CHUNKS))
def test_same_log_and_nothing_broken(chunk: int, tmp_path: Path) -> None:
    interpreter = Interpreter()
    for number in range(chunk * CHUNK, (chunk + 1) * CHUNK):
        path = tmp_path / f"random_{number}.toml"
        path.write_text(random_scenario_text(number))
        scenario = load_scenario(path)
        plain = run_rehearsal(scenario)
        assert not plain.broken, (number, plain.broken)
        real = run_rehearsal(scenario, on="micropython", interpreter=interpreter)
        assert real.log == plain.log, f"scenario {number}: the logs differ"
        audit(scenario, plain.log)


def test_they_are_worth_running(tmp_path: Path) -> None:
    """Pulses, refusals, faults and restarts do happen in them."""
    seen = ""
    pulses = 0
    for number in range(1000, 1025):
        path = tmp_path / f"random_{number}.toml"
        path.write_text(random_scenario_text(number))
        report = run_rehearsal(load_scenario(path))
        seen += report.log
        pulses += report.pulses
    assert pulses >= 50
    for word in ("done", "refused", "failed", "cancelled", "expired"):
        assert f'"o":"{word}"' in seen, word
    for part in ('"m":"fault"', '"m":"accepted"', "; boot 2"):
        assert part in seen, part


def test_one_number_gives_one_scenario() -> None:
    assert random_scenario_text(7) == random_scenario_text(7) != random_scenario_text(8)
