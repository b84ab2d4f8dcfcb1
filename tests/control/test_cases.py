"""Runs the shared cases on both interpreters: each by itself on CPython, all of a file in one go on MicroPython."""

import importlib
from collections.abc import Callable
from pathlib import Path

import pytest

from tests.support.micropython import run_script

HERE = Path(__file__).parent
MODULES = ("cases_throws", "cases_faults", "cases_panel", "cases_settings")
SHARED = tuple(HERE / name for name in ("bench.py", "bench_board.py", "bench_layouts.py"))


def cases_of(module: str) -> list[Callable[[], None]]:
    loaded = importlib.import_module(module)
    return [getattr(loaded, name) for name in dir(loaded) if name.startswith("case_")]


@pytest.mark.parametrize(
    "case", [case for module in MODULES for case in cases_of(module)], ids=lambda case: case.__name__
)
def test_on_cpython(case: Callable[[], None]) -> None:
    case()


SCRIPT = """
import gc, sys
import micropython
import bench
import {module} as cases
kept = bench.Bench.__init__
def locked(self, *args, **more):
    self.before_tick = lock
    self.after_tick = unlock
    kept(self, *args, **more)
locked_now = [False]
def lock():
    locked_now[0] = True
    micropython.heap_lock()
def unlock():
    micropython.heap_unlock()
    locked_now[0] = False
bench.Bench.__init__ = locked
def one(name):
    try:
        getattr(cases, name)()
        print("passed", name)
    except BaseException as error:
        if locked_now[0]:
            unlock()
        print("failed", name)
        sys.print_exception(error, sys.stdout)
def collect():
    gc.collect()
def main():
    # Collected here only, with small frames on the stack: this build of MicroPython loses what the locals of a large
    # one hold (see docs/decisions).
    for name in NAMES:
        collect()
        one(name)
NAMES = [name for name in dir(cases) if name.startswith("case_")]
main()
"""


@pytest.mark.parametrize("module", MODULES)
def test_on_micropython_with_the_heap_locked(module: str) -> None:
    run = run_script(SCRIPT.format(module=module), (*SHARED, HERE / f"{module}.py"), heap_kb=65536)
    passed = [line.split()[1] for line in run.out.splitlines() if line.startswith("passed")]
    assert not [line for line in run.out.splitlines() if line.startswith("failed")], run.out
    assert sorted(passed) == sorted(case.__name__ for case in cases_of(module)), run.out + run.err
