"""An install broken off anywhere: the board starts a whole firmware or only boot.py, and can be installed again."""

from pathlib import Path

import pytest

from host.board import leaving, transport
from host.board.errors import BrokenOff, NoRawPrompt, NotBack
from host.link_errors import LinkError, Unplugged
from tests.install import made_up
from tests.install.bridge import Board, Bridge
from tests.install.conftest import Serve, installer
from tests.install.made_up import NEW, OLD, answers, as_dict, content, startable

STARTS = {"first": None, "update": OLD}


@pytest.fixture(autouse=True)
def quick(monkeypatch: pytest.MonkeyPatch) -> None:
    """Many installs: the two pauses that a pty does not need are short."""
    monkeypatch.setattr(leaving, "PROMPT_S", 0.05)
    monkeypatch.setattr(transport, "ON_ITS_WAY_S", 0.01)


class Watch:
    """Told of every change of a file: what could be started then."""

    def __init__(self) -> None:
        self.seen: list[str] = []

    def __call__(self, files: Path) -> None:
        self.seen.append(startable(files))

    def check(self) -> None:
        assert set(self.seen) <= {"old", "new", "prompt"}, self.seen


def install_with(serve: Serve, board: Board, watch: Watch) -> tuple[Bridge, LinkError | None]:
    with serve(board, on_change=watch) as bridge:
        try:
            installer(bridge.port, NEW).install()
        except LinkError as error:
            return bridge, error
    return bridge, None


def afresh(files: Path, start: str) -> None:
    """The folder as it is before the install."""
    for path in sorted(files.rglob("*"), reverse=True):
        path.rmdir() if path.is_dir() else path.unlink()
    made_up.put_own(files)
    firmware = STARTS[start]
    if firmware is not None:
        made_up.put(files, firmware)


class EndStates:
    """Whatever an install left behind is installed again, once for each distinct state of the files."""

    def __init__(self) -> None:
        self.seen: dict[tuple[tuple[str, bytes], ...], str] = {}

    def install_again(self, serve: Serve, files: Path) -> None:
        state = tuple(content(files).items())
        if state in self.seen:
            return
        self.seen[state] = startable(files)
        watch = Watch()
        _, error = install_with(serve, Board(responder=answers), watch)
        assert error is None, error
        watch.check()
        assert content(files) == as_dict(NEW)
        assert made_up.own_is_there(files)


@pytest.mark.parametrize(("start", "states"), [("first", 18), ("update", 10)])
def test_power_fails_at_every_change_of_a_file(serve: Serve, files: Path, start: str, states: int) -> None:
    watch, ends = Watch(), EndStates()
    for cut in range(1, 100):
        afresh(files, start)
        board = Board(responder=answers, cut_at_operation=cut)
        _, error = install_with(serve, board, watch)
        if error is None:
            break
        assert isinstance(error, BrokenOff) and error.changed
        assert "install again" in str(error)
        ends.install_again(serve, files)
    watch.check()
    assert cut > 15 and startable(files) == "new"
    assert len(ends.seen) >= states
    assert set(ends.seen.values()) == ({"prompt"} if start == "first" else {"old", "prompt"})


def byte_counts() -> list[int]:
    """Each byte of the greeting and of the way into the raw prompt is a step of its own; then some of the rest."""
    return [1, 2, 20, 45, 46, 47, 48, 49, 50, 51, 52, 54, 60, 400, *range(700, 4800, 225)]


def test_the_cable_is_pulled_after_any_number_of_bytes(serve: Serve, files: Path) -> None:
    watch, ends = Watch(), EndStates()
    for count in byte_counts():
        afresh(files, "update")
        bridge, error = install_with(
            serve, Board(responder=answers, cut_after_bytes=count, raw_paste=count % 2 == 0), watch
        )
        assert bridge.cut
        assert isinstance(error, (BrokenOff, Unplugged)), (count, error)
        ends.install_again(serve, files)
    watch.check()
    assert set(ends.seen.values()) == {"old", "prompt"}


@pytest.mark.parametrize("count", [52, 400, 3000])
def test_the_board_falls_silent(serve: Serve, files: Path, count: int) -> None:
    made_up.put(files, OLD)
    with serve(Board(responder=answers, silent_after_bytes=count)) as bridge, pytest.raises(LinkError) as raised:
        installer(bridge.port, NEW, patience=0.05).install()
    assert isinstance(raised.value, (BrokenOff, NoRawPrompt))
    assert startable(files) in ("old", "prompt")


def test_the_board_does_not_come_back(serve: Serve, files: Path) -> None:
    with serve(Board(responder=answers), away_s=60.0) as bridge, pytest.raises(NotBack):
        installer(bridge.port, NEW, patience=0.1).install()
    assert content(files) == as_dict(NEW)


def test_ctrl_c_at_the_computer_leaves_a_board_that_can_be_installed(serve: Serve, files: Path) -> None:
    made_up.put(files, OLD)

    def progress(text: str) -> None:
        if "d.mpy" in text:
            raise KeyboardInterrupt

    board = Board(responder=answers)
    with serve(board) as bridge:
        with pytest.raises(KeyboardInterrupt):
            installer(bridge.port, NEW, progress=progress).install()
        assert startable(files) == "prompt"
        # The board was started anew: boot.py has made the pins low.
        assert board.resets == ["soft", "hard"]
        installer(bridge.port, NEW).install()
    assert content(files) == as_dict(NEW)
