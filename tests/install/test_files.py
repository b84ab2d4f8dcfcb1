"""Which files go on a board: all that the firmware needs, nothing of the host's; mpy-cross takes every one."""

import ast
import shutil
from pathlib import Path

import pytest

from host.board import files as board_files
from host.board.errors import NoCompiler
from host.board.files import AT_TOP, FOR_HOSTS, OWN_MARKS, ROOT, compiled_files, plain_files, sources
from host.board.mip_index import INDEX, index_text


def test_what_goes_on_a_board() -> None:
    paths = [path for path, _ in sources()]
    assert len(paths) == len(set(paths))
    assert {"/boot.py", "/main.py", "/device/control/controller.py", "/shared_protocol/line.py"} <= set(paths)
    assert not {"/device/main.py", "/device/boot.py"} & set(paths)
    for path in paths:
        assert path in AT_TOP or path.startswith(("/device/", "/shared_protocol/"))
        assert "__pycache__" not in path and "test_" not in path
        assert path[1:] not in FOR_HOSTS


def test_nothing_on_the_board_imports_what_is_left_out() -> None:
    """At its top; inside a function it is for a host that runs the same code."""
    left_out = {name[: -len(".py")].replace("/", ".") for name in FOR_HOSTS}
    there = {path[1:].removesuffix(".py").removesuffix("/__init__").replace("/", ".") for path, _ in sources()}
    for path, source in sources():
        for node in ast.parse(source.read_text()).body:
            names = []
            if isinstance(node, ast.Import):
                names = [name.name for name in node.names]
            elif isinstance(node, ast.ImportFrom):
                names = [node.module or "", *(f"{node.module}.{name.name}" for name in node.names)]
            assert not left_out & set(names), path
            for name in names[:1]:
                assert name.split(".")[0] not in ("device", "shared_protocol") or name in there, (path, name)


@pytest.mark.parametrize("architecture", ["armv6m", "armv7emsp"])
def test_mpy_cross_takes_every_file(architecture: str) -> None:
    compiled = compiled_files(architecture)
    assert len(compiled) == len(sources())
    for file in compiled:
        if file.path in AT_TOP:
            assert file.path.endswith(".py")
        else:
            # M, version 6, no native code in it: any MicroPython of that version takes it.
            assert file.data[:3] == b"M\x06\x00", file.path
    assert compiled == compiled_files(architecture)


def test_compiled_files_are_smaller_than_source_files() -> None:
    plain = sum(len(file.data) for file in plain_files())
    assert sum(len(file.data) for file in compiled_files("armv6m")) < plain // 2


@pytest.mark.parametrize("path", AT_TOP)
def test_what_this_firmware_puts_at_the_top_is_known_again(path: str) -> None:
    """The board reads 2048 bytes at a time for it."""
    for at, source in sources():
        if at == path:
            assert OWN_MARKS[path] in source.read_bytes()[:2048]


def test_a_file_that_does_not_compile_is_named(tmp_path: Path) -> None:
    for room in ("device", "shared_protocol"):
        shutil.copytree(ROOT / room, tmp_path / room)
    (tmp_path / "device/control/broken.py").write_text("def f(:\n")
    with pytest.raises(NoCompiler, match=r"refuses device/control/broken.py"):
        compiled_files("armv6m", tmp_path)


def test_line_ends_of_another_system_change_nothing(tmp_path: Path) -> None:
    for room in ("device", "shared_protocol"):
        (tmp_path / room).mkdir()
    (tmp_path / "device/main.py").write_bytes(b"a\r\nb\r\n")
    assert [file.data for file in plain_files(tmp_path)] == [b"a\nb\n"]


def test_the_files_lie_beside_the_program_and_nobody_imports_them() -> None:
    assert (ROOT / "host/board/files.py").samefile(board_files.__file__)
    for source in (ROOT / "host/board").glob("*.py"):
        assert "import device" not in source.read_text() and "\nfrom device" not in source.read_text()


def test_the_mip_index_is_of_today() -> None:
    """`python -m host.board.mip_index` writes it anew."""
    assert (ROOT / INDEX).read_text() == index_text()
