"""The command line against a scripted board on a pty: cautions, rejections, a link lost in mid-request; and `desk`."""

import json
import sys
import types
from pathlib import Path
from typing import Any

import pytest

from host.cli import throwing
from host.cli.main import main
from host.session import Session
from shared_protocol import messages
from shared_protocol.codec import Received
from sim.layout import demo_layout_path, load_layout
from tests.host.scripted_board import BOARD, Peer, line

DEMO = ("--layout", str(demo_layout_path()))


class Board:
    """A board that holds the demo layout; `firing` says what it answers to a throw."""

    def __init__(self, firing: bytes | None = None) -> None:
        self.crc = load_layout(demo_layout_path()).crc()
        self.firing = firing

    def __call__(self, heard: Received) -> bytes:
        message = heard.message
        if message is messages.HELLO:
            return line(messages.BOARD, **{**BOARD, "crc": self.crc})
        if message is messages.ASK:
            state = line(messages.STATE, stop=0, queue=0, up=1, dropped=0, bad=0, in1=0, in2=0)
            return state + line(messages.END, what=heard.word("what"))
        if message is messages.THROW:
            return self.outcome(heard) if self.firing is None else self.firing
        return self.settings(heard)

    def outcome(self, heard: Received) -> bytes:
        return line(
            messages.OUTCOME, q=1, id=heard.number("id"), step=0, j=heard.number("j"), lie=heard.number("lie"),
            o="done", why="sent", ms=40, i=0, mv=15_000, after=9_000,
        )  # fmt: skip

    def settings(self, heard: Received) -> bytes:
        if heard.message is messages.STAGE:
            return line(messages.ANSWER, to="stage", ok=1, why="ok", i=heard.number("n"))
        if heard.message is messages.COMMIT:
            return line(messages.REJECTED, n=3, field="full_mv", why="over_range")
        return b""


@pytest.fixture
def home(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path))
    monkeypatch.setenv("LOCALAPPDATA", str(tmp_path))
    return tmp_path


def run(capsys: pytest.CaptureFixture[str], peer: Peer, *argv: str) -> tuple[int, str, str]:
    status = main([*argv, "--port", peer.path, *DEMO])
    out, err = capsys.readouterr()
    assert "Traceback" not in err
    return status, out, err


def test_a_real_board_shows_the_cautions_before_its_first_pulse(home: Path, capsys: pytest.CaptureFixture[str]) -> None:
    peer = Peer(Board())
    status, out, err = run(capsys, peer, "throw", "Goods", "reverse", "--yes")
    assert (status, "caution" in err) == (0, False)
    status, out, err = run(capsys, peer, "throw", "Goods", "reverse")
    assert status == 0 and "caution: Stop is not isolation" in err and "caution" not in out
    status, out, err = run(capsys, peer, "throw", "Goods", "reverse")
    assert (status, "caution" in err) == (0, False)
    assert peer.names().count("throw") == 3
    assert [each.number("j") for each in peer.heard if each.message is messages.THROW] == [2, 2, 2]
    peer.unplug()


def test_request_numbers_grow_from_one_program_to_the_next(home: Path, capsys: pytest.CaptureFixture[str]) -> None:
    peer = Peer(Board())
    for _ in range(2):
        assert run(capsys, peer, "throw", "Goods", "reverse", "--yes")[0] == 0
    numbers = [each.number("id") for each in peer.heard if each.message is messages.THROW]
    assert 0 < numbers[0] < numbers[1]
    peer.unplug()


def test_nothing_is_thrown_for_a_name_that_is_not_there(home: Path, capsys: pytest.CaptureFixture[str]) -> None:
    peer = Peer(Board())
    assert run(capsys, peer, "throw", "Nowhere", "reverse")[0] == 2
    assert "throw" not in peer.names()
    peer.unplug()


def test_no_outcome_is_not_known_and_is_cancelled(
    home: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(throwing, "ANSWER_S", 0.3)
    monkeypatch.setattr(throwing, "CANCEL_S", 0.1)
    peer = Peer(Board(firing=b"\n"))
    status, out, err = run(capsys, peer, "throw", "Goods", "reverse", "--wait", "0", "--yes")
    assert (status, out) == (2, "") and "not known whether it fired" in err
    assert peer.names().count("throw") == 1 and peer.names().count("cancel") == 1
    peer.unplug()


def test_unplugged_after_a_throw_is_not_known(
    home: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(throwing, "ANSWER_S", 0.6)
    peers: list[Peer] = []

    class Vanishing(Board):
        def __call__(self, heard: Received) -> bytes:
            if heard.message is messages.THROW:
                peers[0].vanish()
                return b""
            return super().__call__(heard)

    peers.append(Peer(Vanishing()))
    status, out, err = run(capsys, peers[0], "throw", "Goods", "reverse", "--wait", "0", "--yes")
    assert (status, out) == (2, "") and "not known whether it fired" in err
    peers[0].unplug()


def test_settings_that_the_board_rejects_are_a_no_with_the_field(
    home: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    peer = Peer(Board())
    status, out, _ = run(capsys, peer, "settings", "send", "--json")
    said = json.loads(out)
    assert (status, said["state"], said["record"]) == (1, "rejected", 3)
    assert (said["field"], said["why"]) == ("full_mv", "over_range")
    sent = [each for each in peer.names() if each.startswith("set_")]
    assert len(sent) == len(load_layout(demo_layout_path()).records)
    peer.unplug()


def test_desk_alone_is_the_demo_layout_on_a_virtual_board(monkeypatch: pytest.MonkeyPatch) -> None:
    seen: dict[str, Any] = {}

    def run_desk(session: Session, layout: Any, picture: Path | None) -> int:
        session.connect(8)
        assert session.model.board is not None
        seen.update(
            kind=session.model.board.kind, name=layout.name, picture=picture, match=session.model.settings_match
        )
        return 0

    app = types.ModuleType("host.terminal.app")
    app.run_desk = run_desk  # type: ignore[attr-defined]
    monkeypatch.setitem(sys.modules, "host.terminal.app", app)
    assert main([]) == 0
    assert seen == {"kind": "virtual", "name": "Saltmarsh Quay", "picture": None, "match": True}
    assert main(["desk", "--picture", "out.svg"]) == 0
    assert seen["picture"] == Path("out.svg")
