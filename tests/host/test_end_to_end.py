"""The command line and a session against a virtual board in another process, over pyserial's socket://, both kinds."""

import json
import re
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

from host.cli import main
from host.link import Link
from host.model import LayoutModel
from host.session import Session
from sim.layout import demo_layout_path, load_layout

ROOT = Path(__file__).parent.parent.parent
Command = Callable[..., tuple[int, dict[str, object]]]


class Served:
    """A `coilwarden virtual` of its own process."""

    def __init__(self, kind: str) -> None:
        self.kind = kind
        self._process = subprocess.Popen(
            [sys.executable, "-m", "host", "virtual", "--listen", "0", "--kind", kind],
            cwd=ROOT, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True,
        )  # fmt: skip
        assert self._process.stdout is not None
        line = self._process.stdout.readline()
        found = re.search(r"socket://127\.0\.0\.1:\d+", line)
        assert found is not None, (line, self._process.poll())
        self.port = found.group()

    def check(self) -> None:
        """It still runs."""
        assert self._process.poll() is None, self._process.communicate()[1]

    def end(self) -> None:
        """Stop it, as ctrl-c would."""
        self._process.terminate()
        self._process.communicate(timeout=10)


@pytest.fixture(scope="module", params=["cpython", "micropython"])
def served(request: pytest.FixtureRequest) -> Iterator[Served]:
    board = Served(request.param)
    yield board
    board.end()


@pytest.fixture
def command(served: Served, capsys: pytest.CaptureFixture[str]) -> Command:
    def run(*words: str) -> tuple[int, dict[str, object]]:
        served.check()
        status = main([*words, "--json", "--port", served.port])
        out, err = capsys.readouterr()
        assert "Traceback" not in err
        served.check()
        return status, json.loads(out) if out else {}

    return run


def test_throw_is_done_and_its_contact_has_seen_it(command: Command) -> None:
    status, found = command("throw", "Throat", "to platform 2", "--wait", "8000")
    assert status == 0 and (found["outcome"], found["why"]) == ("done", "seen"), found
    status, found = command("status")
    throat = found["junctions"][0]  # type: ignore[index]
    assert (throat["name"], throat["word"], throat["source"]) == ("Throat", "to platform 2", "seen")
    assert found["settings_match"] is None and found["board"] is not None


def test_bad_names_are_told_and_nothing_is_thrown(command: Command) -> None:
    assert command("throw", "Nowhere", "main")[0] == 2
    assert command("throw", "Throat", "sideways")[0] == 2
    assert command("route", "Nowhere")[0] == 2


def test_a_throw_straight_after_another_is_refused_with_its_time(served: Served) -> None:
    layout = load_layout(demo_layout_path())
    with Link(served.port) as link:
        session = Session(link, LayoutModel(layout))
        session.connect()
        first = session.throw(layout.junction_number("Loop"), 1, 8000)
        assert session.wait_for(lambda: session.outcome_of(first) is not None, 12.0)
        done = session.outcome_of(first)
        assert done is not None and done.outcome == "done", done
        second = session.throw(layout.junction_number("Goods"), 1, 0)
        assert session.wait_for(lambda: session.outcome_of(second) is not None, 3.0)
        refused = session.outcome_of(second)
        assert refused is not None and refused.outcome == "refused", refused
        assert refused.why == "below_ready" and refused.ms > 0 and "bank West is at" in refused.text, refused
        assert f"would pass in {refused.ms}" in refused.text or refused.ms >= 1000
        third = session.throw(layout.junction_number("Goods"), 1, 5000)
        assert session.wait_for(lambda: session.outcome_of(third) is not None, 8.0)
        found = session.outcome_of(third)
        assert found is not None and found.outcome == "done", found
        assert session.model.junctions[layout.junction_number("Goods")].source == "sent"
        assert session.model.settings_match is True


def test_stop_refuses_until_release(command: Command) -> None:
    assert command("stop")[0] == 0
    status, found = command("status")
    assert found["stopped"] is True and found["go"] == {"level": "stop", "text": "stopped: press r to release"}, found
    status, found = command("throw", "Throat", "to platform 1", "--wait", "0")
    assert status == 1 and (found["outcome"], found["why"]) == ("refused", "stop"), found
    assert command("release")[0] == 0
    status, found = command("throw", "Throat", "to platform 1", "--wait", "8000")
    assert status == 0 and found["outcome"] == "done", found


def test_route(command: Command) -> None:
    status, found = command("route", "Arrival platform 1", "--wait", "8000")
    assert status == 0 and found["outcome"] == "done" and (found["done"], found["of"]) == (3, 3), found
    status, found = command("status")
    lies = {each["name"]: each["word"] for each in found["junctions"]}  # type: ignore[attr-defined]
    assert (lies["Yard lead"], lies["Crossover"], lies["Throat"]) == ("to the yard", "straight", "to platform 1")


def test_settings_send_changes_what_is_refused_and_compare_tells(command: Command, tmp_path: Path) -> None:
    demo = str(demo_layout_path())
    assert command("settings", "compare", "--layout", demo)[0] == 0
    text = demo_layout_path().read_text("utf-8")
    tuned = tmp_path / "tuned.toml"
    tuned.write_text(text.replace("ready_v = 11.0\n", "ready_v = 13.1\n"), "utf-8")
    status, found = command("settings", "compare", "--layout", str(tuned))
    assert status == 1 and found["same"] is False, found
    rows = found["differences"]
    assert {(row["field"], row["board"], row["file"]) for row in rows} == {("ready_mv", 11_000, 13_100)}  # type: ignore[attr-defined,index]
    status, found = command("settings", "send", "--layout", str(tuned))
    assert status == 0 and found["state"] == "accepted", found
    assert command("settings", "compare", "--layout", str(tuned))[0] == 0
    assert command("settings", "compare", "--layout", demo)[0] == 1
    assert command("settings", "send", "--layout", demo)[0] == 0


def test_requests_in_flight_when_the_link_goes_have_an_end_and_are_not_repeated(served: Served) -> None:
    layout = load_layout(demo_layout_path())
    with Link(served.port) as link:
        session = Session(link, LayoutModel(layout))
        session.connect()
        number = session.throw(layout.junction_number("Crane"), 1, 8000)
        # The socket is broken under the link: it finds the board again by itself.
        device = link._device
        device._socket.shutdown(2)
        assert session.wait_for(lambda: session.model.connection.state == "lost", 3.0)
        assert session.wait_for(lambda: session.outcome_of(number) is not None, 15.0)
        ended = session.outcome_of(number)
        assert ended is not None and ended.outcome in ("done", "unknown", "cancelled"), ended
        assert session.model.connection.state == "connected"
        pulses = [event for event in session.model.events if event.text.startswith("pulse for Crane")]
        assert len(pulses) <= 1


def test_a_second_host_is_turned_away_and_the_first_goes_on(served: Served) -> None:
    with Link(served.port) as link:
        session = Session(link, LayoutModel())
        session.connect()
        assert main(["status", "--port", served.port]) == 2
        began_s = time.monotonic()
        assert session.wait_for(lambda: session.model.telemetry.up_s >= 0, 3.0)
        assert session.model.connection.state == "connected" and time.monotonic() - began_s < 3.5
        assert session.wait_for(lambda: bool(session.model.junctions), 8.0), "built from the board's own settings"
        assert [bank.name for bank in session.model.banks] == ["West", "East"]
