"""Gets MicroPython's prompt from whatever runs on a board: the firmware is asked, so that it ends its pulse first."""

import time
from collections.abc import Callable

from host.board.errors import DoesNotLeave, NoPrompt, OtherProgram, VirtualBoard
from host.link import close_device, open_port, readable
from host.link_errors import LinkError, Unplugged, error_of_open, terminal_errors
from host.news import board_of
from host.views import BoardView
from shared_protocol import messages
from shared_protocol.codec import Codec, Received
from shared_protocol.registry import board_reads, host_reads

PROMPT = b">>> "
LEAVE = b"\x03"
# To the friendly prompt, if the raw one was left behind.
FRIENDLY = b"\x02"
PROMPT_S = 0.3
HELLO_S = 1.5
# Running pulse, queue, pins: about a second.
LEAVE_S = 4.0
AGAIN_S = 1.0
_KEPT = 4096
PORT_ERRORS: tuple[type[Exception], ...] = (OSError, TypeError, ValueError, *terminal_errors())


class Conversation:
    """An open port, what came from it, and the messages in that. patience: every wait is so many times longer."""

    def __init__(self, port: str, patience: float = 1.0) -> None:
        self.port = port
        self._patience = patience
        self.text = b""
        self.board: BoardView | None = None
        self.other_version = ""
        self._codec = Codec(host_reads())
        try:
            self._device = open_port(port)
        except PORT_ERRORS as error:
            raise error_of_open(port, error) from error

    def close(self) -> None:
        """Close the port."""
        close_device(self._device)

    def write(self, data: bytes) -> None:
        """Raises Unplugged."""
        try:
            self._device.write(data)
        except PORT_ERRORS as error:
            raise Unplugged(self.port) from error

    def read(self) -> bytes:
        """What comes within a moment. Raises Unplugged."""
        try:
            data = bytes(self._device.read(1024))
        except PORT_ERRORS as error:
            raise Unplugged(self.port) from error
        self.text = (self.text + data)[-_KEPT:]
        for received in self._codec.feed(data):
            self._take(received)
        return data

    def _take(self, received: Received) -> None:
        if received.message is messages.BOARD:
            self.board = board_of(received)
        elif received.message is messages.WRONG_VERSION:
            self.other_version = received.name("fw")

    def wait(self, until: Callable[[], bool], limit_s: float) -> bool:
        """Read until something is so; False if it never was. Raises Unplugged."""
        end_s = time.monotonic() + limit_s * self._patience
        while not until():
            if time.monotonic() >= end_s:
                return False
            self.read()
        return True

    @property
    def at_prompt(self) -> bool:
        """True if MicroPython waits for a line."""
        return self.text.endswith(PROMPT)

    @property
    def greeted(self) -> bool:
        """True if Coilwarden's firmware has answered, whatever its version."""
        return self.board is not None or bool(self.other_version)

    def greet(self) -> bool:
        """Is a prompt there (then nothing more is said), or a firmware that says who it is? Raises Unplugged."""
        # The return is for the prompt; the newline ends whatever half line is in the firmware's reader.
        self.write(b"\r\n")
        if self.wait(lambda: self.at_prompt, PROMPT_S):
            return True
        self.write(Codec(board_reads()).encode(messages.HELLO, [messages.VERSION]))
        return self.wait(lambda: self.greeted or self.at_prompt, HELLO_S)

    def said(self) -> str:
        """The last line that was no message, for people."""
        lines = [line for line in self.text.splitlines() if line.strip() and not line.startswith(b'{"m":')]
        return readable(lines[-1]) if lines else ""


def leave(port: str, patience: float = 1.0) -> BoardView | None:
    """Get MicroPython's prompt at `port`; the port is closed again. Returns who the firmware said that it is, if any.

    Raises VirtualBoard, DoesNotLeave, OtherProgram, NoPrompt, or a LinkError of the port.
    """
    talk = Conversation(port, patience)
    try:
        _leave(talk)
        return talk.board
    finally:
        talk.close()


def _leave(talk: Conversation) -> None:
    talk.greet()
    if talk.board is not None and talk.board.kind.startswith("virtual"):
        raise VirtualBoard(talk.port)
    if talk.at_prompt:
        return
    talk.write(LEAVE)
    if talk.wait(lambda: talk.at_prompt, LEAVE_S if talk.greeted else AGAIN_S):
        return
    if talk.greeted:
        raise DoesNotLeave(talk.port)
    for byte in (LEAVE, FRIENDLY):
        talk.write(byte)
        if talk.wait(lambda: talk.at_prompt, AGAIN_S):
            return
    raise _nobody(talk)


def _nobody(talk: Conversation) -> LinkError:
    said = talk.said()
    return OtherProgram(talk.port, said) if said else NoPrompt(talk.port)
