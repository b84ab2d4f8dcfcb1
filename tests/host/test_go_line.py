"""The go line: the worst thing first, in one row."""

import pytest

from host.model import LayoutModel
from shared_protocol import messages
from tests.host.benches import RecordLayout
from tests.host.test_model import bank, board, connected, fault, heard, quiet, state


def ready_model() -> LayoutModel:
    model = connected(RecordLayout())
    quiet(model)
    return model


def test_before_there_is_a_board() -> None:
    model = LayoutModel(RecordLayout())
    assert model.go_line(0.0).level == "lost"
    model.connection_is("lost", "nothing answers there", 0.0)
    assert model.go_line(0.0).text == "nothing answers there", "what was never found is not lost"


def test_a_board_without_settings_stops() -> None:
    model = connected(None, "")
    assert model.go_line(0.0).level == "stop" and "no settings" in model.go_line(0.0).text


def test_ready() -> None:
    assert (ready_model().go_line(0.1).level, ready_model().go_line(0.1).text) == ("go", "ready")


@pytest.mark.parametrize(("ready_ms", "text"), [
    (1200, "wait 1.2 s for bank bank1"), (1, "wait 0.1 s for bank bank1"), (1201, "wait 1.3 s for bank bank1"),
])  # fmt: skip
def test_waits_for_the_slowest_bank(ready_ms: int, text: str) -> None:
    model = ready_model()
    model.apply(bank(1, "charging", 9800, ready_ms), 0.0)
    assert (model.go_line(0.1).level, model.go_line(0.1).text) == ("wait", text)
    model.apply(bank(0, "charging", 9800, ready_ms + 5000), 0.0)
    assert "bank0" in model.go_line(0.1).text


def test_stopped_comes_before_out_before_wait() -> None:
    model = ready_model()
    model.apply(bank(1, "charging", 9800, 500), 0.0)
    assert model.go_line(0.1).level == "wait"
    model.apply(fault(1, "bank", 1, "no_drop", 2), 0.0)
    assert model.go_line(0.1).text == "bank bank1 out: junction2 coil open, move it by hand"
    assert model.go_line(0.1).level == "out"
    model.apply(state(stop=1), 0.0)
    assert (model.go_line(0.1).level, model.go_line(0.1).text) == ("stop", "stopped: press r to release")


def test_a_stuck_button_does_not_stop_the_layout() -> None:
    model = ready_model()
    model.apply(fault(1, "button", 1, "button_stuck"), 0.0)
    assert model.go_line(0.1).level == "go" and model.faults[0].who == "button 2"


def test_old_telemetry_is_not_ready() -> None:
    model = ready_model()
    assert model.go_line(1.9).level == "go"
    assert model.go_line(2.5).level == "lost"
    model.apply(state(), 2.4)
    assert model.go_line(2.5).level == "wait", "the banks were not heard of"


def test_lost_says_since_when() -> None:
    model = ready_model()
    model.connection_is("lost", "the board is gone", 10.0)
    assert model.go_line(14.0).text == "lost 4 s ago: the board is gone"
    model.connection_is("lost", "there is no such port", 15.0)
    assert model.go_line(16.0).text == "lost 6 s ago: there is no such port", "another reason, the same loss"


@pytest.mark.parametrize("what", ["stale", "cut_off", "out", "pulse", "settling"])
def test_no_other_bank_state_is_ready(what: str) -> None:
    model = ready_model()
    model.apply(bank(0, what, -1, -1), 0.0)
    assert model.go_line(0.1).level in ("wait", "out") and "bank0" in model.go_line(0.1).text


def test_a_new_boot_is_not_stopped() -> None:
    model = ready_model()
    model.apply(state(stop=1), 0.0)
    model.apply(board(boot=8, crc=model.layout_crc), 0.0)
    model.apply(state(), 0.0)
    assert not model.stopped
    model.apply(heard(messages.END, what="status"), 0.0)
