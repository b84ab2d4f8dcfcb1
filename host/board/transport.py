"""MicroPython's raw prompt through mpremote, with typed errors and no wait without an end."""

import contextlib
import io
import struct
import time
from collections.abc import Callable, Iterator
from typing import Any

from host.board.errors import BoardSays, BrokenOff, NoRawPrompt
from host.board.leaving import PORT_ERRORS
from host.board.on_board import RESTART
from host.link import close_device, open_port
from host.link_errors import PortBusy, error_of_open

# Between two characters of an answer: the slowest statement hashes one file or writes some flash blocks.
ANSWER_S = 15.0
_READ_S = 3.0
_WRITE_S = 10.0
_ENTER_S = 10.0
# The last statement before a restart is on its way when the port is closed.
ON_ITS_WAY_S = 0.2


class RawPrompt:
    """The raw prompt of the board at `port`. Use as a context manager: opening it restarts the interpreter (boot.py
    runs, main.py does not), leaving closes the port.

    `doing` and `changed` say in an error how far the work has come. patience: every wait is so many times longer.
    """

    def __init__(self, port: str, patience: float = 1.0) -> None:
        self.port = port
        self._patience = patience
        self.doing = "entering the raw prompt"
        self.changed = False
        self._transport: Any = None
        self._broken_off = False

    def __enter__(self) -> "RawPrompt":
        from mpremote.transport import TransportError
        from mpremote.transport_serial import SerialTransport

        # mpremote does not say why a port can't be opened.
        try:
            close_device(open_port(self.port))
        except PORT_ERRORS as error:
            raise error_of_open(self.port, error) from error
        entered = False
        with self._typed():
            try:
                self._transport = SerialTransport(self.port, timeout=_READ_S * self._patience)
                self._transport.serial.write_timeout = _WRITE_S * self._patience
                with _quiet():
                    self._transport.enter_raw_repl(soft_reset=True, timeout_overall=_ENTER_S * self._patience)
                entered = True
            except TransportError as error:
                if self._transport is None:
                    # A moment ago it could be opened.
                    raise PortBusy(self.port) from error
                raise NoRawPrompt(self.port, str(error)) from error
            finally:
                if not entered:
                    self.close()
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def close(self) -> None:
        """Close the port. May be called twice."""
        transport, self._transport = self._transport, None
        if transport is not None:
            with contextlib.suppress(*PORT_ERRORS):
                transport.close()
            close_device(transport.serial)

    def run(self, statement: str, on_line: Callable[[str], None] | None = None, limit_s: float = ANSWER_S) -> str:
        """Run a statement on the board; returns what it printed. on_line is told each whole line as it comes.

        limit_s: longest silence. Raises BoardSays if it ended in an exception, BrokenOff.
        """
        lines = _Lines(on_line)
        limit_s *= self._patience
        with self._typed():
            with _quiet():
                self._transport.exec_raw_no_follow(statement)
            _, error_text = self._transport.follow(limit_s, lines.take)
        if error_text:
            raise BoardSays(self.port, error_text.decode(errors="replace"))
        return lines.text.decode(errors="replace").replace("\r\n", "\n")

    def restart(self) -> None:
        """Restart the board's hardware, and close the port: it goes away. Only closes it if nobody answers any more."""
        if self._transport is not None and not self._broken_off:
            with contextlib.suppress(BrokenOff), self._typed(), _quiet():
                self._transport.exec_raw_no_follow(RESTART)
                time.sleep(ON_ITS_WAY_S)
        self.close()

    @contextlib.contextmanager
    def _typed(self) -> Iterator[None]:
        """mpremote lets pyserial's errors out, and its own without saying how far the work has come."""
        from mpremote.transport import TransportError

        try:
            yield
        except TransportError as error:
            raise self._broken(str(error)) from error
        except struct.error as error:
            raise self._broken("no answer") from error
        except PORT_ERRORS as error:
            raise self._broken("") from error

    def _broken(self, why: str) -> BrokenOff:
        self._broken_off = True
        what = f"the board fell silent ({why})" if why else "the board is gone"
        return BrokenOff(self.port, what, self.doing, self.changed)


def _quiet() -> contextlib.redirect_stdout[io.StringIO]:
    """mpremote prints what it did not expect, before it raises."""
    return contextlib.redirect_stdout(io.StringIO())


class _Lines:
    """What a statement prints: whole, and line by line."""

    def __init__(self, on_line: Callable[[str], None] | None) -> None:
        self.text = b""
        self._on_line = on_line
        self._begun = b""

    def take(self, data: bytes) -> None:
        """More of it. The byte that ends it is not part of it."""
        data = data.replace(b"\x04", b"")
        self.text += data
        if self._on_line is None:
            return
        *whole, self._begun = (self._begun + data).split(b"\n")
        for line in whole:
            self._on_line(line.decode(errors="replace").rstrip("\r"))
