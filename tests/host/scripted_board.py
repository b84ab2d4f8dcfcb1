"""The other end of a pty: says what a test tells it to, keeps what the host said. Closing it is unplugging."""

import os
import pty
import threading
import time
import tty
from collections.abc import Callable

from shared_protocol import messages
from shared_protocol.codec import Codec, Received, values_from
from shared_protocol.fields import Message
from shared_protocol.registry import board_reads, host_reads

BOARD = {
    "v": messages.VERSION, "fw": "1.0.0", "kind": "test", "uid": "one", "boot": 7, "crc": "", "caps": "",
}  # fmt: skip


def line(message: Message, **plain: object) -> bytes:
    """A whole line as a board writes it."""
    return Codec(host_reads()).encode(message, values_from(message, plain))


def received(message: Message, **plain: object) -> Received:
    """A message as the link would hand it on."""
    return Received(message, values_from(message, plain), b"", "")


class Peer:
    """One pty. `answers(received)` gives the bytes to say to each message of the host."""

    def __init__(self, answers: Callable[[Received], bytes] | None = None, chunk: int = 0) -> None:
        self.master, slave = pty.openpty()
        tty.setraw(slave)
        self.path = os.ttyname(slave)
        self._slave = slave
        self.heard: list[Received] = []
        self._answers = answers or usual
        self._chunk = chunk
        self._codec = Codec(board_reads())
        self._ends = threading.Event()
        self._thread = threading.Thread(target=self._run, daemon=True)
        self._thread.start()

    def say(self, data: bytes) -> None:
        """Write, `chunk` bytes at a time (0: all at once)."""
        step = self._chunk or max(1, len(data))
        for place in range(0, len(data), step):
            os.write(self.master, data[place : place + step])

    def _run(self) -> None:
        os.set_blocking(self.master, False)
        while not self._ends.wait(0.002):
            try:
                data = os.read(self.master, 4096)
            except BlockingIOError:
                continue
            except OSError:
                return
            for each in self._codec.feed(data):
                self.heard.append(each)
                answer = self._answers(each)
                if answer:
                    self.say(answer)

    def names(self) -> list[str]:
        """The names of the messages that the host has said."""
        return [each.message.name for each in list(self.heard) if each.message is not None]

    def vanish(self) -> None:
        """Gone in the middle of an answer: may be called by `answers`."""
        self._ends.set()
        for end in (self.master, self._slave):
            os.close(end)
        self.master = self._slave = -1

    def unplug(self) -> None:
        """Both ends are gone."""
        self._ends.set()
        self._thread.join()
        for end in (self.master, self._slave):
            if end >= 0:
                os.close(end)
        self.master = self._slave = -1


def usual(heard: Received) -> bytes:
    """A board without settings: answers the first exchange and a status."""
    if heard.message is messages.HELLO:
        return line(messages.BOARD, **BOARD)
    if heard.message is messages.ASK:
        return line(messages.END, what=heard.word("what"))
    return b""


def wait_until(check: Callable[[], bool], limit_s: float = 5.0) -> bool:
    """True as soon as `check` holds; False if it does not within the limit."""
    until = time.monotonic() + limit_s
    while time.monotonic() < until:
        if check():
            return True
        time.sleep(0.002)
    return check()
