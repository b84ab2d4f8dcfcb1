"""`make bench`: speeds, instruction counts and memory. Times are noisy: quote ratios of one run, and fuel.

Fuel is what wasmtime counts: about one a WebAssembly instruction, the same in every run.
"""

import tempfile
from dataclasses import replace
from pathlib import Path

from sim.figures import large_scenario, measure
from sim.micropython_board import Interpreter
from sim.rehearsal import Report, Scenario, load_scenario, run_rehearsal, shipped

IDLE_S = 20.0


def scenario_named(start: str) -> Scenario:
    """A shipped scenario by the beginning of its name."""
    return load_scenario(next(path for path in shipped() if path.stem.startswith(start)))


def idle(scenario: Scenario, host: bool) -> Scenario:
    """A board that does nothing, with or without a host."""
    return replace(scenario, title="idle", duration_us=round(IDLE_S * 1e6), actions=[], expectations=[], host=host)


def speed_of(title: str, scenario: Scenario, interpreter: Interpreter) -> None:
    """Multiples of real time on both interpreters, from one run each, one after the other."""
    plain = run_rehearsal(scenario)
    real = run_rehearsal(scenario, on="micropython", interpreter=interpreter)
    ticks = f"{plain.ticks / plain.virtual_s:7.0f} ticks a second"
    print(f"  {title:40} {times(plain):>10} {times(real):>12}   {ticks}")


def times(report: Report) -> str:
    """Virtual against wall time, the start of the interpreter included."""
    return f"{report.virtual_s / report.wall_s:.0f} x"


def fuel_of(title: str, scenario: Scenario, interpreter: Interpreter) -> None:
    """Instructions from exchange to exchange, and the heap after the last collection."""
    found = measure(scenario, interpreter)
    print(
        f"  {title:40} {found.fuel_least:>9,} {found.fuel_median:>11,} {found.fuel_p99:>12,} "
        f"{found.fuel_most:>13,} {found.heap_bytes:>9,}"
    )


def main() -> None:
    """Print all figures."""
    interpreter = Interpreter()
    route = scenario_named("04")
    print("Rehearsals, multiples of real time:          CPython  MicroPython")
    speed_of("idle, no host", idle(route, False), interpreter)
    speed_of("idle, host with telemetry at 10 Hz", idle(route, True), interpreter)
    speed_of("ten-throw route over two banks", route, interpreter)
    speed_of("a long idle, clocks wrapping", scenario_named("09"), interpreter)
    print()
    print("Fuel from exchange to exchange:                least      median         99 %          most   heap (B)")
    fuel_of("idle, no host", idle(route, False), interpreter)
    fuel_of("idle, host with telemetry at 10 Hz", idle(route, True), interpreter)
    fuel_of("ten-throw route over two banks", route, interpreter)
    with tempfile.TemporaryDirectory() as folder:
        fuel_of("route of eight, 64 junctions", large_scenario(Path(folder)), interpreter)


if __name__ == "__main__":
    main()
