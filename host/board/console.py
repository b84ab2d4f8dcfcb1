"""`board console`: the port's text on the screen, keys to the port. Messages are told briefly, or hidden."""

import contextlib
from collections.abc import Callable
from typing import Any, Protocol

from host.board.checking import brief
from host.board.leaving import PORT_ERRORS, PROMPT
from host.link import close_device, open_port
from host.link_errors import Unplugged, error_of_open
from shared_protocol.codec import Codec
from shared_protocol.registry import host_reads

END_KEY = b"\x1d"
_MESSAGE = b'{"m":'
_LINE = 256


class Terminal(Protocol):
    """Keys and screen."""

    def read(self) -> bytes:
        """Keys that were pressed, perhaps none; does not wait."""

    def write(self, data: bytes) -> None:
        """Show it."""


class TextView:
    """Bytes of the port in, bytes for the screen out. plain: messages are hidden instead of told."""

    def __init__(self, plain: bool) -> None:
        self._plain = plain
        self._codec = Codec(host_reads())
        # What may become a message: the start of a line that looks like one.
        self._held = b""
        self._at_start = True
        self._line = b""

    @property
    def at_prompt(self) -> bool:
        """True if the line that is being written begins as MicroPython's prompt does."""
        return self._line.startswith(PROMPT)

    def feed(self, data: bytes) -> bytes:
        """Text goes on at once, letter by letter; a line that begins as a message does is kept until its end."""
        shown = b""
        self._line = (self._line + data).rpartition(b"\n")[2][:_LINE]
        for place in range(len(data)):
            shown += self._byte(data[place : place + 1])
        return shown

    def _byte(self, byte: bytes) -> bytes:
        if byte == b"\r":
            return b""
        if self._at_start:
            self._held += byte
            if _MESSAGE.startswith(self._held):
                return b""
            if self._held.startswith(_MESSAGE):
                return self._message() if byte == b"\n" else b""
            shown, self._held = self._held, b""
        else:
            shown = byte
        self._at_start = shown.endswith(b"\n")
        return shown.replace(b"\n", b"\r\n")

    def _message(self) -> bytes:
        line, self._held = self._held, b""
        for received in self._codec.feed(line):
            if received.message is not None and not received.fault:
                return b"" if self._plain else f"[{received.message.name}] {brief(received)}\r\n".encode()
        return line.replace(b"\n", b"\r\n")


class KeyboardAndScreen:
    """The terminal that this program runs in, through mpremote's console. Use as a context manager.

    Raises OSError where keys can't be read one by one: there is no terminal.
    """

    def __init__(self) -> None:
        from mpremote.console import Console

        try:
            self._console: Any = Console()
        except PORT_ERRORS as error:
            raise OSError("there is no terminal") from error

    def __enter__(self) -> "KeyboardAndScreen":
        self._console.enter()
        return self

    def __exit__(self, *_: object) -> None:
        self._console.exit()

    def read(self) -> bytes:
        """Keys that were pressed."""
        return bytes(self._console.readchar() or b"")

    def write(self, data: bytes) -> None:
        """Show it."""
        self._console.write(data)


def talk(port: str, terminal: Terminal, plain: bool = False, first: bytes = b"") -> bool:
    """Carry text and keys until Ctrl-]. first: sent at the beginning. True if the board was at its prompt at the end.

    Raises LinkError.
    """
    try:
        device = open_port(port)
    except PORT_ERRORS as error:
        raise error_of_open(port, error) from error
    view = TextView(plain)
    try:
        _carry(device, terminal, view, first)
    except PORT_ERRORS as error:
        raise Unplugged(port) from error
    finally:
        with contextlib.suppress(*PORT_ERRORS):
            close_device(device)
    return view.at_prompt


def _carry(device: Any, terminal: Terminal, view: TextView, first: bytes) -> None:
    read: Callable[[int], bytes] = device.read
    if first:
        device.write(first)
    while True:
        # Waits for a moment: keys are not kept waiting longer.
        data = read(256)
        if data:
            terminal.write(view.feed(data))
        keys = terminal.read()
        if END_KEY in keys:
            return
        if keys:
            device.write(keys)
