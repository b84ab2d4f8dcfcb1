"""An emulated board behind a pty: a thread lets it run and carries bytes both ways, as a USB cable does."""

import os
import pty
import threading
import tty

from tests.emulated.emulator import Board


class PtyBoard:
    """Use in a with; `port` is what mpremote opens. `sent`: bytes from the host so far."""

    def __init__(self, board: Board) -> None:
        self.board = board
        self._master, slave = pty.openpty()
        tty.setraw(slave)
        self.port = os.ttyname(slave)
        self._slave = slave
        os.set_blocking(self._master, False)
        self._stop = threading.Event()
        self._thread = threading.Thread(target=self._run, daemon=True)
        self.sent = 0
        self.failure: BaseException | None = None

    def __enter__(self) -> "PtyBoard":
        self._thread.start()
        return self

    def __exit__(self, *_: object) -> None:
        self._stop.set()
        self._thread.join(30)
        os.close(self._master)
        os.close(self._slave)

    def _run(self) -> None:
        seen = len(self.board.console)
        try:
            while not self._stop.is_set():
                try:
                    data = os.read(self._master, 200)
                except BlockingIOError:
                    data = b""
                self.sent += len(data)
                for byte in data:
                    self.board.cdc.send_serial_byte(byte)
                self.board.advance(500)
                new = bytes(self.board.console[seen:])
                seen += len(new)
                while new:
                    try:
                        new = new[os.write(self._master, new) :]
                    except BlockingIOError:
                        self._stop.wait(0.001)
        except BaseException as error:  # noqa: BLE001 - told by whoever waits
            self.failure = error
