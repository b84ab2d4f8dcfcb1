"""The firmware on an emulated RP2040: runs where COILWARDEN_UF2 names a MicroPython UF2 for that chip."""

import os

import pytest

from sim.layout import demo_layout_path, load_layout

UF2 = os.environ.get("COILWARDEN_UF2", "")
pytestmark = pytest.mark.skipif(not UF2, reason="COILWARDEN_UF2 does not name a MicroPython UF2 for RP2040")

if UF2:
    from tests.emulated.bench import EmulatedLayout


@pytest.fixture(scope="module")
def running(tmp_path_factory: pytest.TempPathFactory):
    """A board with the demo layout, greeted, its banks full."""
    bench = EmulatedLayout(UF2, load_layout(demo_layout_path()), tmp_path_factory.mktemp("flash"))
    answer = bench.connect()
    assert answer["kind"] == "rp2040"
    bench.run(lambda: False, 1.0)
    return bench


def test_a_throw_on_pins_sees_its_contact_and_keeps_its_width(running) -> None:
    done = running.throw(1, 0, 1)
    assert (done["o"], done["why"]) == ("done", "seen"), done
    _, pin, width_us = running.pulses()[-1]
    assert pin == 3
    assert abs(width_us - 40_000) <= 400


def test_a_throw_on_the_chain(running) -> None:
    done = running.throw(2, 6, 1)
    assert (done["o"], done["why"]) == ("done", "seen"), done
    _, pin, width_us = running.pulses()[-1]
    assert pin == 15
    assert abs(width_us - 40_000) <= 400


def test_no_pin_is_on_outside_a_pulse(running) -> None:
    asked = [fields for _, name, fields in running.messages if name == "pulse"]
    assert len(running.pulses()) == len(asked)


def test_a_throw_at_once_is_refused_and_passes_after_the_recharge(running) -> None:
    first = running.throw(3, 2, 1)
    assert first["o"] == "done"
    second = running.throw(4, 3, 1, wait=0)
    assert second["o"] == "refused" and second["ms"] > 0
    assert running.throw(5, 3, 1)["o"] == "done"
