"""The link to one board: opens the port, shakes hands, reads in a thread, and connects again by itself.

A request that could not be sent is never kept: what is written while the link is down is refused (`send` says so), so
coming back can only read. The first words after every opening are `hello`; asking for the status is the session's.
"""

import contextlib
import queue
import threading
import time
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, TypeAlias

import serial

from host.link_errors import (
    LinkError,
    NoAnswer,
    NotOurBoard,
    PortBusy,
    Unplugged,
    WrongVersion,
    error_of_open,
    terminal_errors,
)
from shared_protocol import messages
from shared_protocol.codec import Codec, Received
from shared_protocol.fields import Message
from shared_protocol.registry import board_reads, host_reads

READ_S = 0.02
ALIVE_S = 0.4
HELLO_AGAIN_S = 0.5
HELLO_LIMIT_S = 3.0
WRITE_LIMIT_S = 2.0
REFUSED_S = 10.0
BACK_OFF_S = (0.2, 0.5, 1.0, 2.0, 4.0)
_CHUNK = 1024
_REFUSALS = (WrongVersion, NotOurBoard)
_PORT_ERRORS: tuple[type[Exception], ...] = (serial.SerialException, OSError, TypeError, ValueError, *terminal_errors())


@dataclass(frozen=True)
class LinkChange:
    """The link has changed. state: 'connected', 'lost' or 'refused' (a person must act); `text` is a sentence."""

    state: str
    text: str
    error: LinkError | None = None


News: TypeAlias = Received | LinkChange


def open_port(port: str) -> Any:
    """Open a device path or any pyserial URL. Raises what pyserial raises."""
    alone = None if "://" in port else True
    return serial.serial_for_url(port, baudrate=115_200, timeout=READ_S, write_timeout=WRITE_LIMIT_S, exclusive=alone)


class Link:
    """One board at `port`. `open` it, take what comes from the queue `received`, `close` it (or use it in a with).

    opener makes the port object (tests give their own). clock: seconds, monotonic. back_off_s: pauses between tries;
    refused_s: pause after a refusal.
    `error` is why there is no connection now; None while there is one, or none was tried.
    """

    def __init__(
        self,
        port: str,
        opener: Callable[[str], Any] = open_port,
        clock: Callable[[], float] = time.monotonic,
        back_off_s: tuple[float, ...] = BACK_OFF_S,
        hello_limit_s: float = HELLO_LIMIT_S,
        refused_s: float = REFUSED_S,
    ) -> None:
        self.port = port
        self.received: queue.Queue[News] = queue.Queue()
        self.error: LinkError | None = None
        self._opener = opener
        self._clock = clock
        self._back_off_s = back_off_s
        self._hello_limit_s = hello_limit_s
        self._refused_s = refused_s
        self._writer = Codec(board_reads())
        self._lock = threading.Lock()
        self._closing = threading.Event()
        self._device: Any = None
        self._up = False
        self._wrote_s = 0.0
        self._thread: threading.Thread | None = None

    # ---- for the session

    @property
    def connected(self) -> bool:
        """True between the first exchange and the loss of the link."""
        return self._up

    def open(self) -> None:
        """Begin to connect, in a thread. Does nothing if it has begun, or is closed."""
        if self._thread is None and not self._closing.is_set():
            self._thread = threading.Thread(target=self._run, name=f"link {self.port}", daemon=True)
            self._thread.start()

    def close(self) -> None:
        """End the thread and close the port, for good. May be called twice."""
        self._closing.set()
        if self._thread is not None:
            self._thread.join()
            self._thread = None

    def __enter__(self) -> "Link":
        self.open()
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def send(self, message: Message, values: list[object]) -> bool:
        """Write one message now; False if the link is down: nothing is kept for later. Raises ValueOutOfTable."""
        with self._lock:
            line = self._writer.encode(message, values)
            return self._up and self._write(line)

    # ---- the thread

    def _write(self, line: bytes) -> bool:
        """Write whole; the lock is held. False if the port is gone: the reader then drops the link."""
        if self._device is None:
            return False
        try:
            self._device.write(line)
        except _PORT_ERRORS:
            self._up = False
            return False
        self._wrote_s = self._clock()
        return True

    def _say(self, message: Message, values: list[object]) -> None:
        """Write, connected or not. Raises Unplugged."""
        with self._lock:
            done = self._write(self._writer.encode(message, values))
        if not done:
            raise Unplugged(self.port)

    def _run(self) -> None:
        tries = 0
        while not self._closing.is_set():
            try:
                self._open_device()
                codec = Codec(host_reads())
                if self._greet(codec):
                    tries = 0
                    self._listen(codec)
            except LinkError as error:
                self._lost(error)
            pause_s = self._back_off_s[min(tries, len(self._back_off_s) - 1)]
            if isinstance(self.error, _REFUSALS):
                # It is somebody else's port, or needs a person: do not keep writing hello to it.
                pause_s = max(pause_s, self._refused_s)
            if self._closing.wait(pause_s):
                break
            tries += 1
        self._drop()

    def _open_device(self) -> None:
        try:
            device = self._opener(self.port)
        except _PORT_ERRORS as error:
            raise error_of_open(self.port, error) from error
        with self._lock:
            self._device = device

    def _drop(self, discard: bool = False) -> None:
        with self._lock:
            self._up = False
            device, self._device = self._device, None
        if device is not None:
            if discard:
                with contextlib.suppress(*_PORT_ERRORS):
                    device.reset_output_buffer()
            close_device(device)

    def _lost(self, error: LinkError) -> None:
        """The link is down. Told once for each reason, not at every try."""
        # What the operating system still holds for the board must not reach it later.
        self._drop(discard=True)
        before, self.error = self.error, error
        if before is None or str(before) != str(error):
            state = "refused" if isinstance(error, _REFUSALS) else "lost"
            self.received.put(LinkChange(state, str(error), error))

    def _read(self) -> bytes:
        """What comes within READ_S. Raises Unplugged."""
        try:
            return bytes(self._device.read(_CHUNK))
        except _PORT_ERRORS as error:
            raise Unplugged(self.port) from error

    def _greet(self, codec: Codec) -> bool:
        """As `_shake_hands`. Raises LinkError."""
        try:
            return self._shake_hands(codec)
        except Unplugged as error:
            if "://" in self.port:
                # A served board takes one host at a time: it hangs up on a second one before a word is said.
                raise PortBusy(self.port) from error
            raise

    def _shake_hands(self, codec: Codec) -> bool:
        """Say hello until the board answers; False if closed first. Raises LinkError."""
        began_s = self._clock()
        said_s = began_s - HELLO_AGAIN_S
        said = ""
        with self._lock:
            # Ends whatever half line an earlier program has left in the board's reader.
            self._write(b"\n")
        while not self._closing.is_set():
            now_s = self._clock()
            if now_s - began_s > self._hello_limit_s:
                raise NotOurBoard(self.port, said) if said else NoAnswer(self.port)
            if now_s - said_s >= HELLO_AGAIN_S:
                said_s = now_s
                self._say(messages.HELLO, [messages.VERSION])
            found = codec.feed(self._read())
            for place, received in enumerate(found):
                if received.message in (messages.BOARD, messages.WRONG_VERSION):
                    self._check_version(received)
                    self._connected(found[place:])
                    return True
                if received.message is None and received.text.strip():
                    said = readable(received.text)
        return False

    def _check_version(self, received: Received) -> None:
        if received.message is messages.WRONG_VERSION or received.number("v") != messages.VERSION:
            raise WrongVersion(self.port, messages.VERSION, received.number("v"), received.name("fw"))

    def _connected(self, news: list[Received]) -> None:
        self.error = None
        self._up = True
        self.received.put(LinkChange("connected", f"connected to the board at {self.port}"))
        for received in news:
            self.received.put(received)

    def _listen(self, codec: Codec) -> None:
        """Pass on what comes in; say that the host is there. Raises Unplugged."""
        while not self._closing.is_set():
            for received in codec.feed(self._read()):
                self.received.put(received)
            if not self._up:
                raise Unplugged(self.port)
            if self._clock() - self._wrote_s >= ALIVE_S:
                self._say(messages.ALIVE, [])


def close_device(device: Any) -> None:
    """Close a port object, whatever state it is in."""
    # pyserial's socket:// leaves its socket open when the other side is gone first: its shutdown then raises.
    left = getattr(device, "_socket", None)
    for each in (device, left):
        if each is not None:
            with contextlib.suppress(*_PORT_ERRORS):
                each.close()


def readable(text: bytes, most: int = 60) -> str:
    """Printable text of what was no message, cut at `most` characters."""
    shown = "".join(chr(byte) if 32 <= byte < 127 else "?" for byte in text.strip())
    return shown if len(shown) <= most else shown[: most - 3] + "..."
