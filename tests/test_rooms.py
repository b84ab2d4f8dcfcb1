"""The rooms of the house: imports go one way, device code imports nothing it must not, names of pages exist."""

import ast
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]

# What each room may import from the others.
MAY_IMPORT = {
    "shared_protocol": set(),
    "device/control": {"shared_protocol"},
    "device/board": {"shared_protocol", "device.control", "device.board"},
    "device": {"shared_protocol", "device"},
    "sim": {"shared_protocol", "device", "sim"},
    "host": {"shared_protocol", "sim", "host"},
}  # type: dict[str, set[str]]
ROOMS = {"shared_protocol", "device", "sim", "host", "tests", "docs"}

# What may be imported from outside: the rooms that run on a board know almost nothing.
OUTSIDE = {
    "shared_protocol": {"json", "binascii"},
    "device/control": set(),
    "device/board": set(),
}  # type: dict[str, set[str]]


# Files of these rooms that know more: the hardware's own, and one that no board loads.
KNOW_MORE = {
    "pico.py": {"machine", "rp2", "array", "gc", "micropython", "os", "select", "sys", "time", "uctypes"},
    "sentences.py": {"re"},
}  # type: dict[str, set[str]]


def files_of(room: str) -> list[Path]:
    found = sorted((ROOT / room).rglob("*.py"))
    if room == "device":
        found = [path for path in found if path.parent == ROOT / "device"]
    return found


def imports_of(path: Path) -> list[tuple[str, int]]:
    """Every module imported, with its line; not what is only for the type checker."""
    tree = ast.parse(path.read_text())
    found: list[tuple[str, int]] = []
    for node in tree.body:
        if isinstance(node, ast.If) and isinstance(node.test, ast.Name) and node.test.id == "TYPE_CHECKING":
            tree.body.remove(node)
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            found += [(name.name, node.lineno) for name in node.names]
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}:{node.lineno}: import by full name"
            found.append((node.module or "", node.lineno))
    return found


@pytest.mark.parametrize("room", MAY_IMPORT)
def test_imports_go_one_way(room: str) -> None:
    for path in files_of(room):
        for module, line in imports_of(path):
            top = module.split(".")[0]
            if top not in ROOMS or (top == "host" and path.name == "board_choice.py"):
                # On a MicroPython that runs in process, `host` is its door to this process.
                continue
            own = module.startswith(room.replace("/", "."))
            allowed = own or any(module == name or module.startswith(name + ".") for name in MAY_IMPORT[room])
            assert allowed, f"{path.relative_to(ROOT)}:{line}: {room} must not import {module}"


@pytest.mark.parametrize("room", OUTSIDE)
def test_rooms_on_the_board_import_little_from_outside(room: str) -> None:
    for path in files_of(room):
        for module, line in imports_of(path):
            top = module.split(".")[0]
            known = OUTSIDE[room] | KNOW_MORE.get(path.name, set())
            assert top in ROOMS or top in known, f"{path.relative_to(ROOT)}:{line}: {module}"


def test_the_hardware_is_known_to_two_files() -> None:
    knows = {
        path.name
        for path in sorted((ROOT / "device").rglob("*.py"))
        for module, _ in imports_of(path)
        if module in ("machine", "rp2")
    }
    assert knows == {"pico.py", "boot.py"}


def test_nobody_imports_the_host() -> None:
    for room in ("shared_protocol", "device", "sim"):
        for path in sorted((ROOT / room).rglob("*.py")):
            if path.name != "board_choice.py":
                assert not [module for module, _ in imports_of(path) if module.split(".")[0] == "host"], path


@pytest.mark.parametrize("room", ["shared_protocol", "device"])
def test_device_code_prints_nothing_and_uses_no_floats(room: str) -> None:
    for path in sorted((ROOT / room).rglob("*.py")):
        for node in ast.walk(ast.parse(path.read_text())):
            if isinstance(node, ast.Call) and isinstance(node.func, ast.Name):
                assert node.func.id not in ("print", "float", "divmod", "sorted", "enumerate") or (
                    node.func.id == "sorted" and path.name == "settings_check.py"
                ), f"{path}:{node.lineno}: {node.func.id}"
            if isinstance(node, ast.Constant):
                assert not isinstance(node.value, float), f"{path}:{node.lineno}: a float"
            if isinstance(node, ast.BinOp):
                assert not isinstance(node.op, ast.Div), f"{path}:{node.lineno}: true division"


def test_files_stay_readable() -> None:
    for room in ("shared_protocol", "device", "sim", "host"):
        for path in sorted((ROOT / room).rglob("*.py")):
            lines = len(path.read_text().splitlines())
            assert lines <= 450, f"{path.relative_to(ROOT)} has {lines} lines"
