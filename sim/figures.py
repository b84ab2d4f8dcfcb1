"""Figures of the firmware on real MicroPython: heap in use, and instructions from one exchange to the next."""

import statistics
from dataclasses import dataclass
from pathlib import Path

from sim.micropython_board import FuelReport, Interpreter, MicroPythonBoard
from sim.rehearsal import load_scenario
from sim.rehearsal.running import Rehearsal, RehearsalEngine
from sim.rehearsal.scenario import Scenario

MOST_JUNCTIONS = 64
JUNCTIONS_A_BANK = 22


@dataclass(frozen=True)
class Figures:
    """heap_bytes: in use after a collection. fuel: instructions from one exchange to the next."""

    heap_bytes: int
    fuel_least: int
    fuel_median: int
    fuel_p99: int
    fuel_most: int
    ticks: int
    pulses: int


def measure(scenario: Scenario, interpreter: Interpreter | None = None) -> Figures:
    """Run a scenario on MicroPython and count. Raises what run_rehearsal raises, and InvariantBroken."""
    rehearsal = Rehearsal(scenario, False)
    engine = RehearsalEngine(rehearsal)
    fuel = FuelReport()
    with MicroPythonBoard({0: scenario.layout.slot_lines()}, fuel, interpreter) as board:
        board.run(engine)
    steps = sorted(fuel.ticks)
    return Figures(
        engine.heap_used, steps[0], round(statistics.median(steps)), steps[len(steps) * 99 // 100], steps[-1],
        engine.ticks, len(rehearsal.world.pulses),
    )  # fmt: skip


def large_layout_text(junctions: int = MOST_JUNCTIONS) -> str:
    """A layout of turnouts on three banks on the output chain, to see what a full board takes."""
    parts = [
        '[layout]\nname = "Large"\n\n[supply]\nvolts = 16.0\n\n[board]\nname = "Large"\n\n[timing]\n\n[io]\n'
        "inputs_on_chain = 48\ninput_chain_pins = [16, 17, 18]\noutput_chain_pins = [19, 20, 21]\n"
    ]
    for bank in range(3):
        parts.append(
            f'[[bank]]\nname = "bank {bank + 1}"\nchain_pins = [{2 * bank}, {2 * bank + 1}]\ncoils = 48\nadc = {bank}\n'
            'full_v = 16.0\ncapacitance_uf = 4700\ncharge_ohm = 47\nguard = "ptc"\n'
        )
    for number in range(junctions):
        bank, place = divmod(number, JUNCTIONS_A_BANK)
        contact = f', contact = "one", contact_inputs = ["{number}"]' if number < 48 else ""
        parts.append(
            f'[[junction]]\nname = "turnout {number + 1}"\nbank = "bank {bank + 1}"\nready_v = 12.0\n'
            f"motors = [{{ coils = [{2 * place}, {2 * place + 1}]{contact} }}]\n"
        )
    for number in range(8):
        throws = ", ".join(f'"turnout {8 * number + step + 1}: reverse"' for step in range(8))
        parts.append(f'[[route]]\nname = "route {number + 1}"\nthrows = [{throws}]\n')
    return "\n".join(parts)


def large_scenario(folder: Path) -> Scenario:
    """A route on the large layout; its files are put into `folder`."""
    (folder / "large.toml").write_text(large_layout_text())
    path = folder / "scenario.toml"
    path.write_text(
        'title = "A route on a full board"\nlayout = "large.toml"\nduration_s = 10.0\n\n'
        '[[at]]\ntime_s = 1.0\ndo = "route"\nroute = "route 3"\nwait_ms = 5000\nlabel = "all"\n\n'
        '[[expect]]\nwhat = "route"\nlabel = "all"\noutcome = "done"\ndone = 8\n'
    )
    return load_scenario(path)
