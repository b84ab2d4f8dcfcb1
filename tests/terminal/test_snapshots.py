"""Screens against kept pictures. Everything that moves stands still: clock, curve, cursor; times are the bench's own.

A picture that changed for a good reason is taken anew with `pytest tests/terminal/test_snapshots.py --snapshot-update`,
after looking at it.
"""

import math
from collections.abc import Callable
from typing import Any

import pytest
from textual.pilot import Pilot

from tests.terminal.bench import Bench, CautionsOnce

SIZES = ((80, 24), (140, 45))


def ready(bench: Bench) -> None:
    """As the bench begins."""


def waiting(bench: Bench) -> None:
    """A route waits for a bank that charges."""
    bench.bank(0, 9800, "charging", 1200)
    for step, (junction, lie, due) in enumerate(((10, 1, 0), (9, 1, 900), (1, 1, 1600), (0, 1, 2500), (6, 0, 3300)), 1):
        bench.expects(1001, step, junction, lie, due)


def stopped(bench: Bench) -> None:
    """The operator's stop is on."""
    bench.stopped()


def bank_out(bench: Bench) -> None:
    """A bank is out, and a junction."""
    bench.fault(1, "bank", 1, "no_drop", 300, 7900, near=6)
    bench.fault(2, "junction", 4, "contacts_disagree", 1, 1, near=4)
    bench.bank(1, 15_000, "out", -1)


def lost(bench: Bench) -> None:
    """The cable is out for twelve seconds."""
    bench.link.breaks()
    bench.desk.passes(12.3)


def curve(bench: Bench) -> None:
    """Twenty seconds of a bank with one pulse."""
    for number in range(200):
        at_s = number / 10
        mv = 16_000 - (0 if at_s < 8 else int(9000 * math.exp(-(at_s - 8) / 0.6)))
        bench.app.desk.history.add(0, bench.desk.clock.now_s - 20 + at_s, mv)


SCENES: dict[str, tuple[Callable[[Bench], None], tuple[str, ...]]] = {
    "ready": (ready, ()),
    "typing": (ready, ("1", "1", "enter")),
    "waiting": (waiting, ()),
    "stopped": (stopped, ()),
    "bank-out": (bank_out, ()),
    "lost": (lost, ()),
    "tuning": (curve, ("t", "down", "down", "enter", *"13.8V")),
    "tuning-bank": (curve, ("t", *["down"] * 11)),
    "tuning-review": (curve, ("t", "down", "down", "enter", *"13.8V", "f2")),
    "faults": (bank_out, ("f", "down")),
    "log": (bank_out, ("l",)),
    "routes": (ready, ("o",)),
    "help": (ready, ("question_mark",)),
}


@pytest.mark.parametrize("size", SIZES, ids=lambda size: f"{size[0]}x{size[1]}")
@pytest.mark.parametrize("scene", SCENES)
def test_screens_look_as_kept(snap_compare: Any, scene: str, size: tuple[int, int]) -> None:
    prepare, keys = SCENES[scene]
    bench = Bench()
    prepare(bench)

    async def act(pilot: Pilot[int]) -> None:
        for key in keys:
            await pilot.press(key)
        bench.app.desk.poll()
        # Twice: the first drawing may move panels, the second fills them.
        for _ in range(2):
            bench.app.draw()
            await pilot.pause()

    assert snap_compare(bench.app, terminal_size=size, run_before=act)


def test_the_cautions_look_as_kept(snap_compare: Any) -> None:
    bench = Bench(cautions=CautionsOnce())
    assert snap_compare(bench.app, press=("7", "enter"), terminal_size=(80, 24))
