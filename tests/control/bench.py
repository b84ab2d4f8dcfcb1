"""A controller on a bench board, with a host that speaks the wire: runs on CPython and MicroPython."""

from bench_board import BenchBoard
from bench_layouts import BenchLayout, usual

from device.control.controller import Controller
from shared_protocol import messages, registry
from shared_protocol.codec import Codec, Received, plain, values_from


class Bench:
    """Steps time and ticks; keeps what the board said. `before_tick` and `after_tick` go around every tick."""

    def before_tick(self) -> None:
        """Nothing; a test on MicroPython locks the heap here."""

    def after_tick(self) -> None:
        """Nothing; a test on MicroPython unlocks the heap here."""

    def __init__(
        self,
        layout: "BenchLayout | None" = None,
        board: "BenchBoard | None" = None,
        full: bool = True,
        rest: bool = True,
    ) -> None:
        self.board = board if board is not None else BenchBoard()
        if layout is not None or 0 not in self.board.slots:
            self.board.slots[0] = (layout if layout is not None else usual()).slot()
        self.controller = Controller(self.board)
        self.controller.start()
        self._to_board = registry.by_name(messages.TO_BOARD)
        self._writer = Codec(registry.board_reads())
        self._reader = Codec(registry.host_reads())
        self.said: "list[Received]" = []
        self.next_id = 1
        self.acknowledge = True
        self.on_pulse = nothing_with_pulse
        self._pulses_seen = self.board.pulse_count
        if full:
            for bank in self.board.banks:
                bank.mv = bank.full_mv
        if rest:
            # Coils rest after a start, as nobody knows what was pulsed before it.
            self.run(510, 5000)

    def send(self, name: str, **fields: object) -> None:
        """The host sends one message."""
        message = self._to_board[name]
        if message.has("boot") and "boot" not in fields:
            fields["boot"] = self.board.boot
        self.board.say(self._writer.encode(message, values_from(message, fields)))

    def hello(self) -> None:
        """The first exchange."""
        self.send("hello", v=1)
        self.run(20)

    def throw(self, junction: int, lie: int, wait: int = 0) -> int:
        """Ask for a throw; returns its id."""
        number = self.next_id
        self.next_id += 1
        self.send("throw", id=number, j=junction, lie=lie, wait=wait)
        return number

    def route(self, route: int, wait: int = 5000) -> int:
        """Ask for a route; returns its id."""
        number = self.next_id
        self.next_id += 1
        self.send("route", id=number, r=route, wait=wait)
        return number

    def run(self, ms: int, step_us: int = 1000) -> None:
        """Let time pass, a tick every `step_us`."""
        for _ in range(ms * 1000 // step_us):
            self.board.pass_us(step_us)
            self.tick()

    def tick(self) -> None:
        """One tick, and what follows it."""
        self.before_tick()
        self.controller.tick()
        self.after_tick()
        if self.controller.has_work:
            self.controller.work()
        if self.board.pulse_count > self._pulses_seen:
            self._pulses_seen = self.board.pulse_count
            self.on_pulse(self.board.pulses[-1])
        if self.board.out_count:
            self._hear()

    def _hear(self) -> None:
        for received in self._reader.feed(self.board.heard()):
            self.said.append(received)
            if received.message is not None and received.message.kept and self.acknowledge:
                self.send("ack", q=received.number("q"))

    def keep_alive(self, ms: int, step_us: int = 1000) -> None:
        """Like `run`, with a host that is there."""
        for _ in range(ms // 100):
            self.send("alive")
            self.run(100, step_us)

    def all(self, name: str) -> "list[dict[str, object]]":
        """Every message of that name so far."""
        return [plain(r.message, r.values) for r in self.said if r.message is not None and r.message.name == name]

    def outcome(self, number: int) -> "dict[str, object] | None":
        """The outcome under that id (of a single throw)."""
        for found in self.all("outcome"):
            if found["id"] == number and found["step"] == 0:
                return found
        return None

    def route_end(self, number: int) -> "dict[str, object] | None":
        """The end of the route under that id."""
        for found in self.all("route_end"):
            if found["id"] == number:
                return found
        return None

    def last(self, name: str, **where: object) -> "dict[str, object] | None":
        """The newest message of that name with these fields."""
        for found in reversed(self.all(name)):
            if all([found[key] == where[key] for key in where]):
                return found
        return None


def nothing_with_pulse(pulse: "tuple[int, int, int, int, int]") -> None:
    """On a pulse: nothing."""
