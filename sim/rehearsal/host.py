"""The host of a rehearsal: speaks the wire as a real one does, acknowledges, and remembers what it heard."""

import random
from collections.abc import Callable

from shared_protocol import messages
from shared_protocol import settings_table as table
from shared_protocol.codec import Codec, Received, values_from
from shared_protocol.fields import Message
from shared_protocol.registry import board_reads, host_reads
from sim.layout import Layout

ALIVE_US = 400_000
RECORDS_AHEAD = 4


class ScriptedHost:
    """One host program. `hear` is called with every message from the board, and its time in microseconds."""

    def __init__(self, layout: Layout, seed: int, hear: Callable[[Received, int], None]) -> None:
        self._layout = layout
        self._rng = random.Random(seed + 3)
        self._hear = hear
        self._writer = Codec(board_reads())
        self._reader = Codec(host_reads())
        self._out = b""
        self._next_alive_us = 0
        self._next_id = 1
        self._settings: list[bytes] = []
        self.there = False
        # False while its port is open and it does not read: the board can send nothing then.
        self.reads = True
        self.boot = 0
        self.sent: list[bytes] = []
        self.requests: dict[str, tuple[int, bytes]] = {}
        self.damage = 0
        self.double = 0
        self.lose = 0
        # Settings as they were sent last.
        self.records: list[tuple[Message, list[object]]] = [(m, list(v)) for m, v in layout.records]

    # ---- the link

    def connect(self, now_us: int) -> None:
        """Open the link: the first exchange, then read everything. Nothing is fired."""
        self.there = True
        self.reads = True
        self._out = b""
        self.sent.clear()
        self._reader = Codec(host_reads())
        self._settings = []
        self._next_alive_us = now_us + ALIVE_US
        self.say(messages.HELLO, v=messages.VERSION)
        self.say(messages.ASK, what="status")

    def lose_link(self) -> None:
        """Fall silent and deaf."""
        self.there = False
        self.reads = True
        self._out = b""
        self.sent.clear()

    def next_due_us(self) -> int | None:
        """When it next has to say that it is there."""
        if not self.there:
            return None
        # Bytes that wait to go out are due at once.
        return 0 if self._out or self._settings else self._next_alive_us

    def act(self, now_us: int) -> None:
        """Say that it is there, if that is due."""
        if self.there and now_us >= self._next_alive_us:
            self._next_alive_us = now_us + ALIVE_US
            self.say(messages.ALIVE)

    def take(self, room: int) -> bytes:
        """The next bytes for the board."""
        data, self._out = self._out[:room], self._out[room:]
        if not self._out and self._settings:
            for body in self._settings[:RECORDS_AHEAD]:
                self._send(body)
            self._settings = self._settings[RECORDS_AHEAD:]
        return data

    def feed(self, data: bytes, now_us: int) -> None:
        """Bytes from the board."""
        if not self.there:
            return
        for received in self._reader.feed(data):
            message = received.message
            if message is messages.BOARD:
                self.boot = received.number("boot")
            if message is not None and message.kept:
                self.say(messages.ACK, q=received.number("q"))
            self._hear(received, now_us)

    # ---- saying

    def say(self, message: Message, **fields: object) -> bytes:
        """Send one message; returns its body."""
        body = self._writer.body(message, values_from(message, fields))
        self._send(body)
        return body

    def _send(self, body: bytes) -> None:
        line = body + b"*" + self._writer.crc_text(body) + b"\n"
        if not self.there:
            return
        if self.lose:
            self.lose -= 1
            return
        if self.damage:
            self.damage -= 1
            place = self._rng.randrange(len(line) - 1)
            line = line[:place] + bytes([line[place] ^ (1 << self._rng.randrange(7))]) + line[place + 1 :]
        elif self.double:
            self.double -= 1
            line += line
        self._out += line
        self.sent.append(body)

    def request(self, label: str, message: Message, **fields: object) -> None:
        """A throw or route under a new id, kept under its label."""
        number = self._next_id
        self._next_id += 1
        body = self.say(message, boot=max(1, self.boot), id=number, **fields)
        self.requests[label or f"request {number}"] = (number, body)

    def repeat(self, label: str) -> None:
        """Send an earlier request again, to the letter."""
        self._send(self.requests[label][1])

    def tune(self, junction: int, lie: int | None, ready_mv: int) -> None:
        """Send the settings with another ready voltage."""
        for message, values in self.records:
            if message is not table.SET_LIE or values[message.position("j")] != junction:
                continue
            if lie is None or values[message.position("i")] == lie:
                values[message.position("ready_mv")] = ready_mv
        bodies = [self._writer.body(message, values) for message, values in self.records]
        crc = self._writer.crc_text(b"".join(body + b"\n" for body in bodies)).decode()
        self.say(messages.STAGE, boot=max(1, self.boot), n=len(bodies))
        commit = self._writer.body(
            messages.COMMIT, values_from(messages.COMMIT, {"boot": max(1, self.boot), "crc": crc})
        )
        self._settings = [*bodies, commit]
