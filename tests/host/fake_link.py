"""A link without a port: keeps what the session sends; a test puts in what the board says. Time stands still."""

import queue

from host.link import LinkChange
from host.link_errors import LinkError, Unplugged
from host.model import LayoutModel
from host.session import Session
from shared_protocol import messages
from shared_protocol.codec import Codec, Received, values_from
from shared_protocol.fields import Message
from shared_protocol.registry import board_reads, host_reads

CRC = "0123ABCD"


class Clock:
    """Seconds that a test moves."""

    def __init__(self) -> None:
        self.now_s = 100.0

    def __call__(self) -> float:
        return self.now_s


class FakeLink:
    """What Session needs of host.link.Link."""

    def __init__(self) -> None:
        self.port = "fake"
        self.received: queue.Queue[Received | LinkChange] = queue.Queue()
        self.error: LinkError | None = None
        self.connected = False
        self.sent: list[tuple[str, list[object]]] = []
        self._codec = Codec(board_reads())

    def open(self) -> None:
        """Nothing to start."""

    def send(self, message: Message, values: list[object]) -> bool:
        """As the real one: refuses while there is no connection; raises what does not fit the table."""
        self._codec.encode(message, values)
        if self.connected:
            self.sent.append((message.name, values))
        return self.connected

    def names(self) -> list[str]:
        """Names of what was sent since the last call."""
        names = [name for name, _ in self.sent]
        self.sent.clear()
        return names

    # ---- what the test does

    def says(self, message: Message, **plain: object) -> None:
        """The board says this."""
        values = values_from(message, plain)
        Codec(host_reads()).encode(message, values)
        self.received.put(Received(message, values, b"", ""))

    def connects(self, boot: int = 7, crc: str = CRC, uid: str = "one", caps: str = "", kind: str = "test") -> None:
        """The first exchange."""
        self.connected = True
        self.error = None
        self.received.put(LinkChange("connected", "connected to fake"))
        self.greets(boot, crc, uid, caps, kind)

    def greets(self, boot: int = 7, crc: str = CRC, uid: str = "one", caps: str = "", kind: str = "test") -> None:
        """The board answers hello."""
        self.says(messages.BOARD, v=1, fw="1.0.0", kind=kind, uid=uid, boot=boot, crc=crc, caps=caps)

    def breaks(self) -> None:
        """The cable is out."""
        self.connected = False
        self.error = Unplugged("fake")
        self.received.put(LinkChange("lost", "the board is gone", self.error))


class Desk:
    """Link, model, session and clock for one test."""

    def __init__(self, layout: object = None, first: int = 1000) -> None:
        self.link = FakeLink()
        self.clock = Clock()
        self.model = LayoutModel(layout)  # type: ignore[arg-type]
        self.session = Session(self.link, self.model, self.clock, first)  # type: ignore[arg-type]

    def passes(self, seconds: float) -> None:
        """Time passes, in steps small enough for every timer."""
        until = self.clock.now_s + seconds
        while self.clock.now_s < until - 1e-9:
            self.clock.now_s = min(until, self.clock.now_s + 0.1)
            self.session.poll()

    def ready(self, **board: object) -> None:
        """Connected, with a whole status of a quiet board."""
        self.link.connects(**board)  # type: ignore[arg-type]
        self.state()
        for number in range(len(self.model.banks)):
            self.link.says(messages.BANK, b=number, mv=16_000, age=1, state="ready", ready=0)
        self.end_status()
        self.session.poll()
        self.link.sent.clear()

    def state(self, **fields: object) -> None:
        """The board's own telemetry."""
        usual: dict[str, object] = {"stop": 0, "queue": 0, "up": 1, "dropped": 0, "bad": 0, "in1": 0, "in2": 0}
        self.link.says(messages.STATE, **(usual | fields))

    def end_status(self) -> None:
        """The status is told."""
        self.session.poll()
        self.link.says(messages.END, what="status")

    def outcome(self, q: int, number: int, **fields: object) -> None:
        """A throw ends."""
        usual: dict[str, object] = {
            "step": 0, "j": 0, "lie": 1, "o": "done", "why": "sent", "ms": 40, "i": -1, "mv": 16_000, "after": 9000,
        }  # fmt: skip
        self.link.says(messages.OUTCOME, q=q, id=number, **(usual | fields))
