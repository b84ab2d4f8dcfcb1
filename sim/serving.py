"""Serves a virtual board on a loopback socket, paced to real time while somebody is attached.

A terminal or the command line reaches it through pyserial's `socket://` exactly as it reaches a device. One client at
a time. With nobody attached the board's time stands still: a simulated layout does not age unseen.
"""

import contextlib
import queue
import socket
import threading
import time
from collections.abc import Callable

from device.control.controller import Controller
from device.main import step
from sim.cpython_board import CPythonBoard
from sim.engine import Engine, Finished
from sim.guest import exchange as at
from sim.guest.virtual_board import MemorySlots, VirtualBoard
from sim.layout import BoardLayout, Layout
from sim.slots import Slots
from sim.world import World

POLL_S = 0.02
# How far the board may lag behind real time before it gives up catching up.
LAG_S = 0.5
LONGEST_BACKLOG = 1 << 16
BOOT_NUMBERS = 900_000_000


class ServingError(Exception):
    """The socket can't be opened; says why."""


class SocketScript:
    """The script side of an engine whose host is a socket client (see engine.Script)."""

    def __init__(self, stop: threading.Event) -> None:
        self._stop = stop
        self._lock = threading.Lock()
        self._client: socket.socket | None = None
        # A client that has just come, until the board's thread takes it over.
        self._new: socket.socket | None = None
        self._in = b""
        self._out = b""
        self._deeds: queue.SimpleQueue[Callable[[], None]] = queue.SimpleQueue()
        self.attached = threading.Event()

    def attach(self, client: socket.socket) -> None:
        """A client has connected (called from the listening thread)."""
        with self._lock:
            self._new = client
        self.attached.set()

    def detach(self) -> None:
        """The client is gone."""
        with self._lock:
            for client in (self._client, self._new):
                if client is not None:
                    with contextlib.suppress(OSError):
                        client.close()
            self._client = None
            self._new = None
            self.attached.clear()

    def _take_over(self) -> None:
        """A new client finds an empty line: what was said to nobody is gone."""
        with self._lock:
            if self._new is not None:
                self._client, self._new = self._new, None
                self._in = b""
                self._out = b""

    def inject(self, deed: Callable[[], None]) -> None:
        """Have something done to the world between two ticks: a fault, a hand."""
        self._deeds.put(deed)

    # ---- the engine's script

    def from_board(self, data: bytes, now_us: int) -> None:
        """Bytes for the client."""
        self._out += data

    def to_board(self, now_us: int, room: int) -> bytes:
        """Bytes that the client has sent."""
        data, self._in = self._in[:room], self._in[room:]
        return data

    def room_for_board(self) -> int:
        """What the board may send: nothing while the client does not read."""
        return at.TX_BYTES if len(self._out) < LONGEST_BACKLOG else 0

    def next_due_us(self, now_us: int) -> int | None:
        """Bytes that wait are due at once."""
        return now_us if self._in else None

    def act(self, now_us: int) -> None:
        """Exchange bytes with the client; do what was asked. Raises Finished when told to stop."""
        if self._stop.is_set():
            raise Finished
        while True:
            try:
                deed = self._deeds.get_nowait()
            except queue.Empty:
                break
            deed()
        self._take_over()
        client = self._client
        if client is not None and not self._transfer(client):
            self.detach()

    def _transfer(self, client: socket.socket) -> bool:
        """Move what can be moved without waiting; False if the client is gone."""
        try:
            if self._out:
                sent = client.send(self._out)
                self._out = self._out[sent:]
        except BlockingIOError:
            pass
        except OSError:
            return False
        try:
            if len(self._in) < LONGEST_BACKLOG:
                data = client.recv(4096)
                if not data:
                    return False
                self._in += data
        except BlockingIOError:
            pass
        except OSError:
            return False
        return True


class Pace:
    """Holds virtual time to real time while a client is attached; time stands still while none is.

    real: False lets time run as fast as it can while a client is attached.
    """

    def __init__(self, script: SocketScript, stop: threading.Event, real: bool = True) -> None:
        self._script = script
        self._stop = stop
        self._real = real
        self._due_s = time.monotonic()

    def __call__(self, step_us: int) -> None:
        """Wait until `step_us` more may have passed."""
        while not self._script.attached.wait(POLL_S):
            self._due_s = time.monotonic()
            if self._stop.is_set():
                raise Finished
        if not self._real:
            return
        self._due_s += step_us / 1e6
        ahead_s = self._due_s - time.monotonic()
        if ahead_s > 0.001:
            # Bytes and stops should not wait for the end of a long step: it is at most 50 ms.
            self._stop.wait(ahead_s)
        elif ahead_s < -LAG_S:
            self._due_s = time.monotonic()


class AddressedBoard(CPythonBoard):
    """A board whose harness plug has address links: it tells the address as one of its abilities."""

    def __init__(self, slots: Slots, address: int) -> None:
        super().__init__(slots)
        self._address = address

    def _boot(self, engine: Engine) -> None:
        board = VirtualBoard(MemorySlots(self.slots), engine.uid.encode(), engine.boot)
        if self._address:
            board.caps = VirtualBoard.caps + b" address %d" % self._address
        board.exchange = lambda: engine.exchange(board.io, board.rx, board.tx)
        engine.begin()
        board.exchange()
        controller = Controller(board)
        controller.start()
        self.controller = controller
        while not controller.left:
            step(board, controller)


class VirtualServer:
    """A virtual board on 127.0.0.1. kind: 'cpython' or 'micropython'. port 0: any free one; `start` returns it.

    layout: of one board, or one board's part. Its banks are empty at first. pace: False lets time run as fast as it can
    while a client is attached. uid: what it says who it is; '': the id of the layout file, else `virtual-1`. Where the
    layout file gives an address, a board on CPython tells it too.
    """

    def __init__(
        self,
        layout: Layout | BoardLayout,
        kind: str = "cpython",
        port: int = 0,
        pace: bool = True,
        uid: str = "",
    ) -> None:
        self._real = pace
        self._layout = layout if isinstance(layout, BoardLayout) else layout.only
        self._uid = uid or self._layout.uid or uid_of(0)
        self._kind = kind
        self._wanted_port = port
        self._stop = threading.Event()
        self._listener: socket.socket | None = None
        self._threads: list[threading.Thread] = []
        self.script = SocketScript(self._stop)
        physics = layout.physics
        self.world = World(layout.settings, physics.supply, physics.banks, physics.make_motors(), seed=1)
        self.failure: BaseException | None = None

    def __enter__(self) -> "VirtualServer":
        self.start()
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    @property
    def running(self) -> bool:
        """False once it has ended, told to or not (see `failure`)."""
        return not self._stop.is_set()

    @property
    def port(self) -> int:
        """The port it listens on."""
        assert self._listener is not None
        port: int = self._listener.getsockname()[1]
        return port

    def start(self) -> int:
        """Begin to serve, in threads of its own; returns the port. Raises ServingError."""
        try:
            self._listener = socket.create_server(("127.0.0.1", self._wanted_port))
        except OSError as error:
            raise ServingError(f"port {self._wanted_port} can't be opened: {error.strerror}") from error
        self._listener.settimeout(POLL_S * 5)
        for target in (self._accept, self._run):
            thread = threading.Thread(target=target, name=f"virtual-board{target.__name__}", daemon=True)
            self._threads.append(thread)
            thread.start()
        return self.port

    def close(self) -> None:
        """Stop, and wait until all is stopped."""
        self._stop.set()
        for thread in self._threads:
            thread.join(timeout=10)
        self.script.detach()
        if self._listener is not None:
            self._listener.close()

    def wait(self) -> None:
        """Serve until interrupted, or until the board fails (see `failure`)."""
        while not self._stop.is_set():
            self._stop.wait(0.2)

    def inject(self, deed: Callable[[World], None]) -> None:
        """Have something done to the world: a fault, a hand."""
        self.script.inject(lambda: deed(self.world))

    def _accept(self) -> None:
        assert self._listener is not None
        while not self._stop.is_set():
            try:
                client, _ = self._listener.accept()
            except TimeoutError:
                continue
            except OSError:
                return
            if self.script.attached.is_set():
                # One host at a time: the board has one USB plug.
                client.close()
                continue
            client.setblocking(False)
            client.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
            self.script.attach(client)

    def _run(self) -> None:
        # A board that keeps its boot count in flash never gives a number twice; this one takes it from the clock, so
        # that a host that was connected to another run sees a restart.
        engine = Engine(self.world, self.script, self._uid, 1 + int(time.time()) % BOOT_NUMBERS)
        engine.pace = Pace(self.script, self._stop, self._real)
        slots = {0: self._layout.slot_lines()}
        try:
            if self._kind == "micropython":
                from sim.micropython_board import MicroPythonBoard

                with MicroPythonBoard(slots) as board:
                    board.run(engine)
            else:
                AddressedBoard(slots, self._layout.address).run(engine)
        except BaseException as error:  # noqa: BLE001 - a thread's end is told by whoever waits for it
            self.failure = error
        finally:
            self._stop.set()


def uid_of(board: int) -> str:
    """The id of a virtual board (from 0) that no layout file gives one."""
    return f"virtual-{board + 1}"


class VirtualBoards:
    """All boards of a layout, each on a port of its own: `port`, the next one, and so on. port 0: any free ones."""

    def __init__(self, layout: Layout, kind: str = "cpython", port: int = 0) -> None:
        self.servers = [
            VirtualServer(board, kind, port + number if port else 0, uid=board.uid or uid_of(number))
            for number, board in enumerate(layout.boards)
        ]

    def __enter__(self) -> "VirtualBoards":
        self.start()
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def start(self) -> list[int]:
        """Begin to serve; returns the ports. Raises ServingError: nothing is served then."""
        try:
            return [server.start() for server in self.servers]
        except ServingError:
            self.close()
            raise

    def close(self) -> None:
        """Stop, and wait until all is stopped."""
        for server in self.servers:
            server.close()

    def wait(self) -> None:
        """Serve until interrupted, or until one of the boards has ended."""
        while all(server.running for server in self.servers):
            time.sleep(POLL_S * 5)

    @property
    def urls(self) -> list[str]:
        """Where each board is, for pyserial."""
        return [f"socket://127.0.0.1:{server.port}" for server in self.servers]

    @property
    def failures(self) -> list[BaseException]:
        """Why boards have failed."""
        return [server.failure for server in self.servers if server.failure is not None]
