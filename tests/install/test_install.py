"""`board install` through the real mpremote, against MicroPython's prompts and real MicroPython on a folder."""

import json
import subprocess
import sys
from functools import partial
from pathlib import Path

import pytest

from host.board.errors import NotBack, OtherFirmwareBack
from host.board.files import ROOT, BoardFile, plain_files
from host.board.installing import Installer
from host.board.mip_index import INDEX
from host.cli.main import main
from host.link_errors import WrongVersion
from sim.layout import demo_layout_path, load_layout
from tests.install import made_up
from tests.install.bridge import Board
from tests.install.conftest import Serve, installer
from tests.install.made_up import NEW, OLD, answers, answers_too_old, as_dict, content

# A third more than the files for base64, and the words around it; an unchanged board is only asked.
MOST_BYTES_UNCHANGED = 2000


def test_the_real_firmware_starts_where_it_was_installed_and_is_not_copied_twice(
    serve: Serve, files: Path, firmware: list[BoardFile]
) -> None:
    layout = load_layout(demo_layout_path())
    slot = b"".join(line + b"\n" for line in layout.slot_lines())
    (files / "slot0.txt").write_bytes(slot)
    board = Board()
    with serve(board, away_s=0.3) as bridge:
        first = installer(bridge.port, firmware).install()
        assert first.before is None and first.after is not None
        assert (first.after.kind, first.after.firmware) == ("rp2040", "1.0.0")
        assert first.after.settings_crc
        assert first.copied[0] == "/boot.py" and first.copied[-1] == "/main.py"
        assert content(files) == as_dict(firmware)
        # Raw paste sends the statements as they are; mpremote's own words are few.
        assert board.bytes_in < sum(len(file.data) for file in firmware) * 1.34 + 250 * len(firmware)
        assert board.resets == ["soft", "hard"]
        board.writes.clear()
        sent = board.bytes_in
        second = installer(bridge.port, firmware).install()
        assert second.plan.nothing_to_do and second.copied == [] and board.writes == []
        assert second.settings_kept is True
        assert board.bytes_in - sent < MOST_BYTES_UNCHANGED
        assert board.resets == ["soft", "hard"] * 2
    assert (files / "slot0.txt").read_bytes() == slot
    assert (files / "notes/mine.txt").read_bytes() == b"mine\n"


@pytest.mark.parametrize("raw_paste", [True, False])
def test_an_update_copies_what_changed_and_removes_what_is_gone(serve: Serve, files: Path, raw_paste: bool) -> None:
    made_up.put(files, OLD)
    (files / "device/control/a.py").write_text("a source file beside the compiled one would win")
    (files / "shared_protocol/c.mpy.new").write_text("half a file")
    board = Board(raw_paste=raw_paste, responder=answers)
    with serve(board) as bridge:
        done = installer(bridge.port, NEW).install()
    assert done.copied == ["/boot.py", "/device/come/d.mpy", "/device/control/a.mpy", "/main.py"]
    assert set(done.removed) == {"/device/control/a.py", "/device/gone/b.mpy", "/shared_protocol/c.mpy.new"}
    assert content(files) == as_dict(NEW)
    assert not (files / "device/gone").exists()
    assert made_up.own_is_there(files)
    assert done.before is not None and done.settings_kept is True
    first_changes = [what for what in board.writes if not what.startswith(("write", "open"))]
    assert first_changes[0] == "remove /main.py"


def test_an_update_of_one_file_keeps_main_py(serve: Serve, files: Path) -> None:
    made_up.put(files, OLD)
    wanted = [*OLD[:-1], BoardFile("/shared_protocol/c.mpy", b"changed")]
    board = Board(responder=answers)
    with serve(board) as bridge:
        done = installer(bridge.port, wanted).install()
    assert done.copied == ["/shared_protocol/c.mpy"]
    renames = [what for what in board.writes if what.startswith("rename")]
    assert renames == [
        "rename /main.py /main.py.new",
        "rename /shared_protocol/c.mpy.new /shared_protocol/c.mpy",
        "rename /main.py.new /main.py",
    ]
    assert content(files) == as_dict(wanted)


def test_a_main_py_left_aside_is_cleared_away(serve: Serve, files: Path) -> None:
    made_up.put(files, OLD)
    (files / "main.py.new").write_text("half of it")
    with serve(Board(responder=answers)) as bridge:
        assert installer(bridge.port, OLD).install().copied == []
    assert content(files) == as_dict(OLD)


def test_source_files_and_compiled_files_take_each_others_place(serve: Serve, files: Path) -> None:
    made_up.put(files, OLD)
    sources = [
        file if file.path in ("/boot.py", "/main.py") else BoardFile(file.path.replace(".mpy", ".py"), b"x = 1\n")
        for file in OLD
    ]
    with serve(Board(responder=answers)) as bridge:
        installer(bridge.port, sources, uncompiled=True).install()
        assert content(files) == as_dict(sources)
        installer(bridge.port, OLD).install()
        assert content(files) == as_dict(OLD)


def test_a_dry_run_writes_nothing_and_lists_everything(
    serve: Serve, files: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    made_up.put(files, OLD)
    board = Board(responder=answers)
    before = content(files)
    with serve(board) as bridge:
        assert main(["board", "install", "--dry-run", "--port", bridge.port]) == 0
    assert board.writes == [] and content(files) == before
    # The firmware that was asked to leave was started again.
    assert board.resets == ["soft", "hard"]
    out = capsys.readouterr().out
    assert "would copy /boot.py" in out and "would copy /device/control/controller.mpy" in out
    assert "would remove /device/gone/b.mpy" in out
    assert "slot0.txt" not in out and "mine.txt" not in out


def test_the_command_installs_and_tells_it(serve: Serve, files: Path, capsys: pytest.CaptureFixture[str]) -> None:
    board = Board(responder=answers, mpy=6 | 3 << 8 | 7 << 10, machine="Raspberry Pi Pico 2 with RP2350")
    with serve(board) as bridge:
        assert main(["board", "install", "--port", bridge.port]) == 0
        told = capsys.readouterr().out
        assert "file 1 of" in told and "/boot.py" in told
        assert "firmware 1.0.0 runs on rp2040 made-up; settings 0A0B0C0D" in told
        assert main(["board", "install", "--json", "--port", bridge.port]) == 0
        answer = json.loads(capsys.readouterr().out)
        assert answer["copy"] == [] and answer["settings_kept"] is True
        assert answer["machine"] == "Raspberry Pi Pico 2 with RP2350"
    assert made_up.own_is_there(files)


def test_another_program_is_refused_or_set_aside(serve: Serve, files: Path) -> None:
    (files / "main.py").write_text("print('my signal lamps')\n")
    (files / "main.py.owner").write_text("an earlier one\n")
    with serve(Board(responder=answers)) as bridge:
        look = installer(bridge.port, NEW).look()
        assert look.plan.foreign == ["/main.py"]
        installer(bridge.port, NEW, replace=True).install()
    assert (files / "main.py.owner2").read_text() == "print('my signal lamps')\n"
    assert (files / "main.py.owner").read_text() == "an earlier one\n"
    assert {path: data for path, data in content(files).items() if "owner" not in path} == as_dict(NEW)


def test_a_firmware_of_another_version_is_replaced(serve: Serve, files: Path) -> None:
    made_up.put(files, OLD)
    board = Board(responder=answers_too_old)

    def progress(text: str) -> None:
        if text == "restarting the board":
            board.responder = answers

    with serve(board) as bridge:
        done = installer(bridge.port, NEW, progress=progress).install()
    assert done.after is not None and done.settings_kept is None
    assert content(files) == as_dict(NEW)


def test_what_comes_up_after_the_restart_is_looked_at(
    serve: Serve, files: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    with serve(Board(responder=partial(answers, firmware=b"0.9.0"))) as bridge, pytest.raises(OtherFirmwareBack):
        installer(bridge.port, NEW).install()
    with serve(Board(responder=answers_too_old)) as bridge, pytest.raises(WrongVersion):
        installer(bridge.port, NEW).install()
    said = iter([b"0A0B0C0D"])
    with serve(Board(responder=lambda line: answers(line) and answers(line, settings=next(said, b"")))) as bridge:
        assert main(["board", "install", "--port", bridge.port]) == 1
    assert "its settings were 0A0B0C0D and are none now" in capsys.readouterr().out


def test_with_the_boot_link_in_place_it_is_installed_but_does_not_answer(serve: Serve, files: Path) -> None:
    with serve(Board(boot_link=True)) as bridge, pytest.raises(NotBack) as raised:
        installer(bridge.port, NEW, patience=0.3).install()
    assert "boot link" in str(raised.value)
    assert content(files) == as_dict(NEW)


def test_mpremotes_own_installer_takes_the_mip_index(serve: Serve, files: Path) -> None:
    with serve(Board()) as bridge:
        subprocess.run(
            [sys.executable, "-m", "mpremote", "connect", bridge.port, "mip", "install", "--target", "/", ROOT / INDEX],
            check=True, capture_output=True, timeout=60,
        )  # fmt: skip
        assert content(files) == as_dict(plain_files())
        # What it put there is the firmware of `board install --uncompiled`, to the last byte.
        done = Installer(bridge.port, uncompiled=True).install()
    assert done.plan.nothing_to_do and done.after is not None and done.after.kind == "rp2040"


def test_a_prompt_left_in_raw_mode_is_found(serve: Serve, files: Path) -> None:
    import serial

    with serve(Board(responder=answers)) as bridge:
        with serial.Serial(bridge.port, timeout=2) as port:
            port.write(b"\x01x = 'half a statement")
            port.read_until(b"exit\r\n>")
        installer(bridge.port, NEW, patience=0.3).install()
    assert content(files) == as_dict(NEW)
