"""`board install` puts the firmware on an emulated board through its port; a second time there is nothing to do."""

import json
import os

import pytest

from host.cli.main import main

UF2 = os.environ.get("COILWARDEN_UF2", "")
pytestmark = pytest.mark.skipif(not UF2, reason="COILWARDEN_UF2 does not name a MicroPython UF2 for RP2040")

if UF2:
    from tests.emulated.emulator import Board
    from tests.emulated.pty_board import PtyBoard


def test_install_and_install_again(capsys: pytest.CaptureFixture[str]) -> None:
    board = Board(UF2)
    board.boot()
    sent = []
    with PtyBoard(board) as port:
        for _ in range(2):
            before = port.sent
            # A busy emulated board takes some twenty times its own time.
            assert main(["board", "install", "--json", "--port", port.port, "--patience", "20"]) == 0, port.failure
            sent.append(port.sent - before)
            assert json.loads(capsys.readouterr().out)
    assert sent[0] > 100_000 and sent[1] < 10_000
