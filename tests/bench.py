"""`make bench`: speeds, instruction counts and memory. Times are noisy: quote ratios of one run, and fuel.

Fuel is what wasmtime counts: about one a WebAssembly instruction, the same in every run.
"""

import statistics
import tempfile
from dataclasses import replace
from pathlib import Path

from sim.engine import Engine
from sim.layout import Layout, load_layout
from sim.micropython_board import FuelReport, Interpreter, MicroPythonBoard
from sim.rehearsal import Report, Scenario, load_scenario, run_rehearsal, shipped
from sim.rehearsal.running import Rehearsal, RehearsalEngine
from tests.layout.test_good_layouts import largest

IDLE_S = 20.0


def scenario_named(start: str) -> Scenario:
    """A shipped scenario by the beginning of its name."""
    return load_scenario(next(path for path in shipped() if path.stem.startswith(start)))


def idle(scenario: Scenario, host: bool, layout: Layout | None = None) -> Scenario:
    """A board that does nothing, with or without a host."""
    return replace(
        scenario, title="idle", duration_us=round(IDLE_S * 1e6), actions=[], expectations=[], host=host,
        layout=layout or scenario.layout,
    )  # fmt: skip


def speed_of(title: str, scenario: Scenario, interpreter: Interpreter) -> None:
    """Multiples of real time on both interpreters, from one run each, one after the other."""
    plain = run_rehearsal(scenario)
    real = run_rehearsal(scenario, on="micropython", interpreter=interpreter)
    print(f"  {title:44} {times(plain):>12} {times(real):>12}   {plain.ticks / plain.virtual_s:7.0f} ticks a second")


def times(report: Report) -> str:
    """Virtual against wall time."""
    return f"{report.virtual_s / report.wall_s:.0f} x"


def fuel_of(title: str, scenario: Scenario, interpreter: Interpreter) -> None:
    """Instructions from exchange to exchange, and the heap after the last collection."""
    fuel = FuelReport()
    rehearsal = Rehearsal(scenario, False)
    engine: Engine = RehearsalEngine(rehearsal)
    with MicroPythonBoard({0: scenario.layout.slot_lines()}, fuel, interpreter) as board:
        board.run(engine)
    ticks = sorted(fuel.ticks)
    median = statistics.median(ticks)
    high = ticks[int(len(ticks) * 0.99)]
    print(f"  {title:44} {min(ticks):>10,} {median:>12,.0f} {high:>12,} {max(ticks):>14,} {engine.heap_used:>10,}")


def main() -> None:
    """Print all figures."""
    interpreter = Interpreter()
    route = scenario_named("04")
    print("Rehearsal speed, multiples of real time:               CPython  MicroPython")
    speed_of("idle, no host", idle(route, False), interpreter)
    speed_of("idle, host with telemetry at 10 Hz", idle(route, True), interpreter)
    speed_of("ten-throw route over two banks", route, interpreter)
    speed_of("a long idle, clocks wrapping", scenario_named("09"), interpreter)
    print()
    print(
        "Fuel a step (tick and what follows it):              least       median       99th %           most  heap (B)"
    )
    fuel_of("idle, no host", idle(route, False), interpreter)
    fuel_of("idle, host with telemetry at 10 Hz", idle(route, True), interpreter)
    fuel_of("ten-throw route over two banks", route, interpreter)
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "largest.toml"
        path.write_text(largest())
        biggest = load_layout(path)
    fuel_of("idle, host, 64 junctions on 3 banks", idle(route, True, biggest), interpreter)


if __name__ == "__main__":
    main()
