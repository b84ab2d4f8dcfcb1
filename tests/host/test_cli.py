"""The command line: exit statuses, what goes to stdout and stderr, stable JSON keys, no traceback for bad input."""

import json
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest

from host.cli import boards, cautions
from host.cli.main import main
from host.link import Link
from sim.layout import demo_layout_path, load_layout
from sim.serving import VirtualServer
from tests.host.scripted_board import wait_until

Run = Callable[..., tuple[int, str, str]]


@pytest.fixture(scope="module")
def server() -> Iterator[VirtualServer]:
    """A virtual board with the demo layout."""
    with VirtualServer(load_layout(demo_layout_path())) as virtual:
        yield virtual


@pytest.fixture
def on_board(server: VirtualServer, capsys: pytest.CaptureFixture[str]) -> Run:
    """Runs a command on the virtual board: status, stdout, stderr."""

    def run(*argv: str) -> tuple[int, str, str]:
        # One host at a time: the one before must be seen to have gone.
        assert wait_until(lambda: not server.script.attached.is_set())
        status = main([*argv, "--port", f"socket://127.0.0.1:{server.port}"])
        out, err = capsys.readouterr()
        assert server.failure is None
        return status, out, err

    return run


@pytest.fixture
def alone(capsys: pytest.CaptureFixture[str]) -> Run:
    """Runs a command without a board."""

    def run(*argv: str) -> tuple[int, str, str]:
        status = main(list(argv))
        out, err = capsys.readouterr()
        assert "Traceback" not in err
        return status, out, err

    return run


def changed_layout(tmp_path: Path, old: str, new: str) -> Path:
    text = demo_layout_path().read_text("utf-8")
    assert old in text
    path = tmp_path / "changed.toml"
    path.write_text(text.replace(old, new, 1), "utf-8")
    return path


def test_throw_both_ways_and_the_status_says_so(on_board: Run) -> None:
    for lie, word in (("reverse", "to platform 2"), ("to platform 1", "to platform 1"), ("2", "to platform 2")):
        status, out, _ = on_board("throw", "Throat", lie, "--json")
        said = json.loads(out)
        assert (status, said["outcome"], said["lie"]) == (0, "done", word)
        assert said["mv"] > said["after_mv"] > 0
        _, out, _ = on_board("status", "--json")
        throat = json.loads(out)["junctions"][0]
        assert (throat["name"], throat["word"], throat["source"]) == ("Throat", word, "seen")


def test_now_or_not_at_all_is_refused_then_waits_for_the_bank(capsys: pytest.CaptureFixture[str]) -> None:
    virtual = VirtualServer(load_layout(demo_layout_path()))
    # An empty bank that nothing charges yet: the answer to 'now' can only be no.
    virtual.world.circuit.supply_on = False
    with virtual:
        where = ("--port", f"socket://127.0.0.1:{virtual.port}", "--json")
        for _ in range(20):
            # For half a second after its start a board takes no coil to be rested.
            assert wait_until(lambda: not virtual.script.attached.is_set())
            status = main(["throw", "Throat", "reverse", "--wait", "0", *where])
            said = json.loads(capsys.readouterr().out)
            assert (status, said["outcome"]) == (1, "refused")
            if said["why"] != "resting":
                break
        assert said["why"] == "below_ready"
        virtual.inject(lambda world: setattr(world.circuit, "supply_on", True))
        assert wait_until(lambda: not virtual.script.attached.is_set())
        assert main(["throw", "Throat", "reverse", "--wait", "5000", *where]) == 0
        assert json.loads(capsys.readouterr().out)["mv"] >= 12_000


def test_throw_json_has_the_same_keys_whatever_happens(on_board: Run) -> None:
    keys = {
        "request", "id", "outcome", "why", "text", "junction", "lie", "ms", "concerns", "mv", "after_mv",
    }  # fmt: skip
    assert set(json.loads(on_board("throw", "Goods", "reverse", "--json")[1])) == keys
    assert on_board("stop")[0] == 0
    try:
        status, out, _ = on_board("throw", "Goods", "normal", "--json")
        assert status == 1 and set(json.loads(out)) == keys
        assert json.loads(out)["why"] == "stop"
    finally:
        assert on_board("release")[0] == 0


def test_stop_holds_over_hosts_until_released(on_board: Run) -> None:
    assert on_board("stop", "--json")[0] == 0
    status, out, _ = on_board("status", "--json")
    assert status == 1
    assert json.loads(out)["stopped"] is True and json.loads(out)["go"]["level"] == "stop"
    assert on_board("release")[0] == 0
    status, out, _ = on_board("status", "--json")
    assert status == 0 and json.loads(out)["stopped"] is False


def test_cancel_of_what_is_not_there_is_no(on_board: Run) -> None:
    status, out, _ = on_board("cancel", "999999999", "--json")
    said = json.loads(out)
    assert (status, said["ok"], said["why"]) == (1, False, "no_such_throw")


def test_clear_needs_something_out_and_a_name_that_is_there(on_board: Run) -> None:
    status, out, _ = on_board("clear", "bank", "East", "--json")
    assert (status, json.loads(out)["why"]) == (1, "not_out")
    for argv in (("clear", "bank"), ("clear", "all", "East"), ("clear", "bank", "North"), ("clear", "button", "x")):
        status, out, err = on_board(*argv)
        assert status == 2 and out == "" and len(err.splitlines()) == 1


def test_a_fault_is_told_and_cleared(capsys: pytest.CaptureFixture[str]) -> None:
    virtual = VirtualServer(load_layout(demo_layout_path()))
    # The Throat's motor, coil to reverse: open.
    virtual.world.circuit.coil_faults[0, 1].open = True
    with virtual:
        where = ("--port", f"socket://127.0.0.1:{virtual.port}", "--json")

        def run(*argv: str) -> tuple[int, Any]:
            assert wait_until(lambda: not virtual.script.attached.is_set())
            status = main([*argv, *where])
            return status, json.loads(capsys.readouterr().out)

        status, said = run("throw", "Throat", "reverse")
        assert (status, said["outcome"]) == (1, "failed")
        status, said = run("status")
        assert status == 1 and [fault["code"] for fault in said["faults"]] == ["no_drop"]
        assert said["go"]["level"] == "out" and said["junctions"][0]["out"]
        status, said = run("throw", "Throat", "normal")
        assert (status, said["why"]) == (1, "junction_out")
        assert run("clear", "junction", "Throat")[0] == 0
        status, said = run("status")
        assert said["faults"] == [] and not said["junctions"][0]["out"]


def test_a_route_tells_each_throw_and_its_end(on_board: Run) -> None:
    status, out, _ = on_board("route", "1", "--json")
    said = json.loads(out)
    assert (status, said["outcome"]) == (0, "done")
    assert said["done"] == said["of"] == len(said["throws"]) >= 2
    assert all(each["outcome"] == "done" for each in said["throws"])


def test_status_json_keys(on_board: Run) -> None:
    said = json.loads(on_board("status", "--json")[1])
    assert set(said) == {
        "go", "board", "boards", "settings_match", "stopped", "banks", "junctions", "queue", "faults",
    }  # fmt: skip
    assert len(said["banks"]) == 2 and all(bank["mv"] > 0 for bank in said["banks"])


@pytest.mark.parametrize(
    ("argv", "words"),
    [
        (("throw", "Nowhere", "normal"), ("Nowhere", "Throat")),
        (("throw", "0", "normal"), ("'0'",)),
        (("throw", "99", "normal"), ("99",)),
        (("throw", "Throat", "sideways"), ("sideways", "to platform 1")),
        (("route", "To the moon"), ("To the moon", "Arrival")),
    ],
)
def test_unknown_names_are_bad_input_and_tell_what_there_is(
    on_board: Run, argv: tuple[str, ...], words: tuple[str, ...]
) -> None:
    status, out, err = on_board(*argv)
    assert status == 2 and out == ""
    assert len(err.splitlines()) == 1
    for word in words:
        assert word in err


@pytest.mark.parametrize("wait", ["-1", "60001", "soon", "1.5", ""])
def test_a_wait_outside_its_range_is_bad_input(alone: Run, wait: str) -> None:
    status, _, err = alone("throw", "Throat", "normal", "--wait", wait)
    assert status == 2 and "wait" in err


def test_boards_and_its_json(on_board: Run, alone: Run) -> None:
    status, out, _ = on_board("boards", "--json")
    row = json.loads(out)["boards"][0]
    assert status == 0 and row["kind"] == "virtual" and row["error"] == "" and len(row["settings_crc"]) == 8
    status, out, _ = alone("boards", "--json", "--port", "socket://127.0.0.1:9")
    assert status == 2 and json.loads(out)["boards"][0]["error"]


def test_settings_compare_send_and_fetch(on_board: Run, tmp_path: Path) -> None:
    assert on_board("settings", "compare")[0] == 0
    changed = changed_layout(tmp_path, "ready_v = 12.0", "ready_v = 12.5")
    status, out, _ = on_board("settings", "compare", "--layout", str(changed), "--json")
    rows = json.loads(out)["differences"]
    assert status == 1 and {row["field"] for row in rows} == {"ready_mv"}
    assert {(row["board"], row["file"]) for row in rows} == {(12_000, 12_500)}
    status, out, _ = on_board("settings", "send", str(changed), "--json")
    said = json.loads(out)
    assert (status, said["state"]) == (0, "accepted") and len(said["differences"]) == len(rows)
    assert on_board("settings", "compare", "--layout", str(changed))[0] == 0
    target = tmp_path / "records"
    assert on_board("settings", "fetch", "--out", str(target))[0] == 0
    assert target.read_bytes().splitlines() == load_layout(changed).record_bodies()
    # Back to the demo layout for the tests that follow.
    assert on_board("settings", "send", str(demo_layout_path()))[0] == 0


def test_a_layout_that_does_not_fit_the_board_is_seen_in_the_status(on_board: Run, tmp_path: Path) -> None:
    changed = changed_layout(tmp_path, "ready_v = 12.0", "ready_v = 12.5")
    said = json.loads(on_board("status", "--layout", str(changed), "--json")[1])
    assert said["settings_match"] is False


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ("ready_v = 12.0", "ready_v = 99.0", (":", "ready")),
        ("ready_v = 12.0", "redy_v = 12.0", ("redy_v",)),
        ("[supply]", "[supply", ("changed.toml:",)),
        ("first_pin = 2 ", "first_pin = 200 ", ("first_pin",)),
    ],
)
def test_bad_layout_names_file_line_and_field(
    alone: Run, tmp_path: Path, old: str, new: str, words: tuple[str, ...]
) -> None:
    path = changed_layout(tmp_path, old, new)
    for argv in (("settings", "check", str(path)), ("virtual", "--listen", "0", "--layout", str(path))):
        status, out, err = alone(*argv)
        assert status == 2 and out == ""
        file, line, *_ = err.splitlines()[0].removeprefix(str(path.parent)).split(":")
        assert file.endswith("changed.toml") and line.isdigit()
        for word in words:
            assert word in err


def test_check_of_a_good_layout(alone: Run) -> None:
    status, out, _ = alone("settings", "check", str(demo_layout_path()), "--json")
    said = json.loads(out)
    layout = load_layout(demo_layout_path())
    assert status == 0 and said["crc"] == layout.crc()
    assert (said["pins_used"], said["pins_left"]) == layout.pins_used_and_left


def test_missing_files_are_one_sentence(alone: Run, tmp_path: Path) -> None:
    gone = str(tmp_path / "gone.toml")
    for argv in (("settings", "check", gone), ("rehearse", gone), ("settings", "show", "--layout", gone)):
        status, _, err = alone(*argv)
        assert status == 2 and "gone.toml" in err and len(err.splitlines()) == 1


def test_no_board_says_what_to_do(alone: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(boards, "likely_ports", lambda: [])
    status, _, err = alone("status")
    assert status == 2 and "coilwarden virtual --listen 7777" in err and "socket://127.0.0.1:7777" in err
    monkeypatch.setattr(boards, "likely_ports", lambda: ["/dev/a", "/dev/b"])
    status, _, err = alone("status")
    assert status == 2 and "/dev/a" in err and "--port" in err


@pytest.mark.parametrize("port", ["/dev/no-such-port", "socket://127.0.0.1:9", "nonsense://x", "socket://x"])
@pytest.mark.parametrize("command", [("status",), ("stop",), ("throw", "1", "1")])
def test_a_port_that_is_not_there(alone: Run, port: str, command: tuple[str, ...]) -> None:
    status, out, err = alone(*command, "--port", port)
    assert status == 2 and out == "" and port in err


@pytest.mark.parametrize(
    "argv",
    [("fly",), ("throw",), ("virtual",), ("virtual", "--listen", "70000"), ("settings",), ("rehearse",), ("--x",)],
)
def test_bad_usage_is_status_2(alone: Run, argv: tuple[str, ...]) -> None:
    status, _, err = alone(*argv)
    assert status == 2 and err


def test_card_fits_a_page_and_has_every_fault_and_lie(alone: Run) -> None:
    from shared_protocol.sentences import FAULT_TEXTS

    status, out, _ = alone("settings", "card", "--layout", str(demo_layout_path()))
    assert status == 0 and max(len(line) for line in out.splitlines()) <= 80
    flat = " ".join(out.split())
    for number, row in enumerate(FAULT_TEXTS[1:], 1):
        assert f"{number} {row[1]}:" in flat and row[2] in flat
    for junction in load_layout(demo_layout_path()).settings.junctions:
        assert junction.name.decode() in out
        for lie in junction.lies:
            assert f"{lie.ready_mv / 1000:.1f} V" in out


def test_cautions_once_for_each_real_board(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path))
    monkeypatch.setenv("LOCALAPPDATA", str(tmp_path))
    assert cautions.cautions_for("virtual", "one") == ()
    assert "Stop is not isolation" in " ".join(cautions.cautions_for("pico", "one"))
    assert cautions.cautions_for("pico", "one") == ()
    assert cautions.cautions_for("pico", "two") != ()


def test_cautions_are_shown_each_time_where_nothing_can_be_kept(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    blocked = tmp_path / "a-file"
    blocked.write_text("")
    monkeypatch.setenv("XDG_STATE_HOME", str(blocked))
    monkeypatch.setenv("LOCALAPPDATA", str(blocked))
    assert cautions.cautions_for("pico", "one") and cautions.cautions_for("pico", "one")


def test_rehearse_judges_and_writes_the_log(alone: Run, tmp_path: Path) -> None:
    from sim.rehearsal import shipped

    first = shipped()[0]
    log = tmp_path / "log"
    status, out, _ = alone("rehearse", str(first), "--json", "--log", str(log))
    said = json.loads(out)
    assert status == 0 and said["passed"] is True and log.read_text()
    assert said["scenarios"][0]["pulses"] >= 1 and all(each["ok"] for each in said["scenarios"][0]["results"])


def test_a_second_host_is_told_that_the_port_is_taken(server: VirtualServer, alone: Run) -> None:
    assert wait_until(lambda: not server.script.attached.is_set())
    port = f"socket://127.0.0.1:{server.port}"
    with Link(port) as first:
        assert wait_until(lambda: first.connected)
        status, out, err = alone("status", "--port", port)
        assert status == 2 and out == "" and "another program uses this port" in err
        assert first.connected


def test_interrupted_means_cancelled(capsys: pytest.CaptureFixture[str]) -> None:
    virtual = VirtualServer(load_layout(demo_layout_path()))
    virtual.world.circuit.supply_on = False
    with virtual:
        where = ("--port", f"socket://127.0.0.1:{virtual.port}")
        argv = [sys.executable, "-m", "host", "throw", "Throat", "reverse", "--wait", "60000", *where]
        # Where the tests run in the background the shell has them ignore this signal; a person's terminal does not.
        waiting = subprocess.Popen(
            argv, stderr=subprocess.PIPE, text=True, preexec_fn=lambda: signal.signal(signal.SIGINT, signal.SIG_DFL)
        )
        assert wait_until(virtual.script.attached.is_set)
        # Until the board has had the request and some time to fire it.
        time.sleep(1.0)
        assert waiting.poll() is None
        waiting.send_signal(signal.SIGINT)
        _, err = waiting.communicate(timeout=10)
        assert waiting.returncode == 1 and "interrupted" in err and "Traceback" not in err
        assert wait_until(lambda: not virtual.script.attached.is_set())
        assert main(["status", "--json", *where]) in (0, 1)
        said = json.loads(capsys.readouterr().out)
        assert said["queue"] == [] and not said["junctions"][0]["waiting"]


def test_help_imports_nothing_heavy() -> None:
    code = (
        "import sys\nfrom host.cli import main\nstatus = main(['--help'])\n"
        "heavy = [name for name in ('textual', 'numpy', 'scipy', 'wasmtime', 'serial') if name in sys.modules]\n"
        "print(heavy, file=sys.stderr)\nsys.exit(status)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=False)
    assert done.returncode == 0 and "rehearse" in done.stdout
    assert done.stderr.strip() == "[]"


def test_as_a_program_in_its_own_process() -> None:
    done = subprocess.run(
        [sys.executable, "-m", "host", "status", "--port", "/dev/no-such-port"],
        capture_output=True, text=True, timeout=60, check=False,
    )  # fmt: skip
    assert done.returncode == 2 and done.stdout == ""
    assert len(done.stderr.splitlines()) == 1 and "/dev/no-such-port" in done.stderr
