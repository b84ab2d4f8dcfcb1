"""What the install tests share."""

from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

from host.board.files import BoardFile, compiled_files
from host.board.installing import Installer
from host.board.on_board import Survey
from sim.micropython_board import Interpreter
from tests.install import made_up
from tests.install.bridge import Board, Bridge


@pytest.fixture(scope="session")
def interpreter() -> Interpreter:
    return Interpreter()


@pytest.fixture(scope="session")
def firmware() -> list[BoardFile]:
    """The real one, compiled for the smaller chip."""
    return compiled_files("armv6m")


@pytest.fixture
def files(tmp_path: Path) -> Path:
    """The board's file system."""
    folder = tmp_path / "board"
    folder.mkdir()
    made_up.put_own(folder)
    return folder


Serve = Callable[..., Bridge]


@pytest.fixture
def serve(interpreter: Interpreter, files: Path, tmp_path: Path) -> Iterator[Serve]:
    """Makes bridges on the folder; at the end none of them may have failed."""
    made: list[Bridge] = []

    def make(board: Board, **more: object) -> Bridge:
        bridge = Bridge(files, board, interpreter, tmp_path / "port", **more)  # type: ignore[arg-type]
        made.append(bridge)
        return bridge

    yield make
    for bridge in made:
        if bridge.failure is not None:
            raise bridge.failure


def installer(port: str, wanted: list[BoardFile], **more: object) -> Installer:
    """An installer of these files."""

    def files_for(survey: Survey, port: str, uncompiled: bool) -> list[BoardFile]:
        return wanted

    return Installer(port, files=files_for, **more)  # type: ignore[arg-type]
