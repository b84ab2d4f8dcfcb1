"""`board check` and `board console` on the bridge: the firmware's own words, the self-test's lines at the prompt."""

import json
import os
import pty
import re
import subprocess
import sys
import threading
from pathlib import Path

import pytest

from host.board import checking, console
from host.board.checking import Check
from host.board.console import END_KEY, TextView
from host.board.errors import BrokenOff, NotInstalled
from host.board.files import BoardFile
from host.cli.main import main
from host.link_errors import PortMissing, Unplugged
from shared_protocol import messages
from shared_protocol.codec import Codec
from shared_protocol.registry import host_reads
from sim.layout import demo_layout_path, load_layout
from tests.install import made_up
from tests.install.bridge import Board
from tests.install.conftest import Serve

GOOD = """
def self_test():
    print("check heap ok 150000 bytes free")
    print("some other line")
    print("check pulse skip no jumper from GP0 to GP1")
    print("check end ok")
"""


@pytest.fixture
def installed(files: Path, firmware: list[BoardFile]) -> Path:
    """The real firmware, with a self-test that needs no hardware in place of the board's own."""
    made_up.put(files, firmware)
    (files / "device/board/pico.mpy").unlink()
    return files


def self_test_is(files: Path, text: str) -> None:
    (files / "device/board/pico.py").write_text(text)


def test_a_board_in_order(
    serve: Serve, installed: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path))
    self_test_is(installed, GOOD)
    lines = load_layout(demo_layout_path()).slot_lines()
    (installed / "slot0.txt").write_bytes(b"".join(line + b"\n" for line in lines))
    board = Board()
    with serve(board) as bridge:
        assert main(["board", "check", "--port", bridge.port]) == 0
        shown = capsys.readouterr()
        assert "caution: " in shown.err
        rows = {line.split()[0]: line.split(None, 2)[1:] for line in shown.out.splitlines()[:-1]}
        assert list(rows) == ["link", "telemetry", "loop", "heap", "pulse", "restart"]
        assert [row[0] for row in rows.values()] == ["ok", "ok", rows["loop"][0], "ok", "skip", "ok"]
        assert rows["telemetry"][1].startswith("stop 0, queue 0, up ")
        assert rows["heap"][1] == "150000 bytes free"
        assert shown.out.splitlines()[-1] == "the board is in order; nothing was fired"
        assert main(["board", "check", "--json", "--port", bridge.port]) == 0
        told = json.loads(capsys.readouterr().out)
    assert told["ok"] is True and told["checks"][4]["result"] == "skip"
    assert board.resets == ["soft", "hard"] * 2 and board.writes == []


@pytest.mark.parametrize(
    ("text", "failed"),
    [
        (GOOD.replace("heap ok", "heap fail"), "heap"),
        (GOOD.replace('    print("check end ok")\n', ""), "self_test"),
        ("def self_test():\n    print('check heap ok fine')\n    raise ValueError('no clock')\n", "self_test"),
    ],
)
def test_what_fails_gives_exit_status_1(
    serve: Serve, installed: Path, capsys: pytest.CaptureFixture[str], text: str, failed: str
) -> None:
    self_test_is(installed, text)
    board = Board()
    with serve(board) as bridge:
        assert main(["board", "check", "--yes", "--port", bridge.port]) == 1
    shown = capsys.readouterr().out
    assert f"failed: {failed}\n" in shown and re.search(r"^telemetry +skip ", shown, re.MULTILINE)
    assert re.search(rf"^{failed} +fail ", shown, re.MULTILINE)
    # The firmware runs again, whatever was found.
    assert board.resets == ["soft", "hard"] and "restart      ok" in shown


def test_a_board_without_the_firmware(serve: Serve) -> None:
    checks: list[Check] = []
    with serve(Board()) as bridge:
        assert checking.check_link(bridge.port, checks.append, 0.3) is None
        with pytest.raises(NotInstalled) as raised:
            checking.check_board(bridge.port, checks.append)
    assert "board install" in str(raised.value)
    assert [(check.name, check.result) for check in checks] == [("link", "fail")]


def test_a_check_of_nothing(tmp_path: Path) -> None:
    with pytest.raises(PortMissing):
        checking.check_link(str(tmp_path / "none"), lambda check: None, 0.2)


def test_the_board_goes_away_in_the_self_test(serve: Serve, installed: Path) -> None:
    self_test_is(installed, "def self_test():\n    import os\n    os.mkdir('/x')\n")
    with serve(Board(cut_at_operation=1)) as bridge, pytest.raises(BrokenOff) as raised:
        checking.check_board(bridge.port, lambda check: None)
    assert raised.value.at == "the self-test" and not raised.value.changed


# ---- the console

STATE = Codec(host_reads()).encode(messages.STATE, [0, 2, 12, 0, 0, 0, 0])


@pytest.mark.parametrize("size", [1, 7, 1000])
@pytest.mark.parametrize("plain", [True, False])
def test_text_passes_at_once_and_messages_are_told_or_hidden(size: int, plain: bool) -> None:
    view = TextView(plain)
    sent = b"Traceback:\n  {odd\n" + STATE + b'{"m":"state"}*00000000\nend\r\n>>> {"'
    shown = b"".join(view.feed(sent[at : at + size]) for at in range(0, len(sent), size))
    told = b"" if plain else b"[state] stop 0, queue 2, up 12 s, dropped 0, bad 0, in1 0, in2 0\r\n"
    # A damaged message is text: somebody may want to see it. A prompt's line is never held back.
    assert shown == b"Traceback:\r\n  {odd\r\n" + told + b'{"m":"state"}*00000000\r\nend\r\n>>> {"'


class Script:
    """In place of a terminal: presses keys when it has seen what it waits for."""

    def __init__(self, *steps: tuple[bytes, bytes]) -> None:
        self.steps = list(steps)
        self.shown = b""

    def read(self) -> bytes:
        if self.steps and self.steps[0][0] in self.shown:
            return self.steps.pop(0)[1]
        return b""

    def write(self, data: bytes) -> None:
        self.shown += data


def test_a_console_talks_to_the_prompt(serve: Serve) -> None:
    script = Script((b">>> ", b"abc"), (b">>> abc", END_KEY))
    with serve(Board()) as bridge:
        assert console.talk(bridge.port, script, first=b"\r") is True
    assert b">>> abc" in script.shown


def test_a_console_that_is_unplugged(serve: Serve) -> None:
    with serve(Board(cut_after_bytes=3)) as bridge, pytest.raises(Unplugged):
        console.talk(bridge.port, Script((b">>> ", b"abc")), first=b"\r")


def test_a_console_needs_a_terminal(serve: Serve, capfd: pytest.CaptureFixture[str]) -> None:
    with serve(Board()) as bridge:
        done = subprocess.run(
            [sys.executable, "-m", "host", "board", "console", "--port", bridge.port],
            stdin=subprocess.DEVNULL, capture_output=True, text=True, timeout=30, check=False,
        )  # fmt: skip
    assert done.returncode == 2 and "there is no terminal" in done.stderr


def test_the_command_makes_the_firmware_leave_and_says_that_the_guard_is_off(serve: Serve, installed: Path) -> None:
    """The whole program on a terminal of its own: the prompt, a key, Ctrl-]."""
    with serve(Board()) as bridge:
        keys, screen = pty.openpty()
        run = subprocess.Popen(
            [sys.executable, "-m", "host", "board", "console", "--prompt", "--port", bridge.port],
            stdin=screen, stdout=screen, stderr=screen,
        )  # fmt: skip
        os.close(screen)
        shown = b""
        ending = threading.Timer(30, run.kill)
        ending.start()
        try:
            while b">>> " not in shown:
                shown += os.read(keys, 1000)
            os.write(keys, END_KEY)
            while True:
                shown += os.read(keys, 1000)
        except OSError:
            # The program has ended: its terminal is gone.
            assert run.wait(10) == 0
        finally:
            ending.cancel()
            run.kill()
            run.wait()
            os.close(keys)
    assert b"the firmware has left, the guard is off" in shown
    assert b"the board is still at its prompt" in shown
