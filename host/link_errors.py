"""What can go wrong between this computer and a board: typed, each a plain sentence with its remedy."""

import errno


class LinkError(Exception):
    """The board can't be reached. `str()` is a sentence for people; `port`, `what` and `remedy` are its parts."""

    def __init__(self, port: str, what: str, remedy: str) -> None:
        super().__init__(f"{port}: {what}; {remedy}")
        self.port = port
        self.what = what
        self.remedy = remedy


class PortMissing(LinkError):
    """There is no such port."""

    def __init__(self, port: str) -> None:
        if "://" in port:
            remedy = "start a virtual board with 'coilwarden virtual --listen 7777', or correct the port"
            super().__init__(port, "nothing answers there", remedy)
        else:
            super().__init__(port, "there is no such port", "look at the cable, or see 'coilwarden boards'")


class PermissionDenied(LinkError):
    """The operating system does not let this user open the port."""

    def __init__(self, port: str) -> None:
        remedy = "on Linux join the group dialout (sudo usermod -aG dialout $USER), then log in again"
        super().__init__(port, "you may not open this port", remedy)


class PortBusy(LinkError):
    """Another program has the port."""

    def __init__(self, port: str) -> None:
        super().__init__(port, "another program uses this port", "close it first")


class NotOurBoard(LinkError):
    """Something is there, and it says other things than a board does. `said`: the last of what it printed."""

    def __init__(self, port: str, said: str) -> None:
        what = f"this is not a Coilwarden board: it says '{said}'"
        super().__init__(port, what, "put the firmware on it, or choose another port")
        self.said = said


class NoAnswer(LinkError):
    """Something is there and says nothing: it may still be starting."""

    def __init__(self, port: str) -> None:
        super().__init__(port, "no answer from the board", "reset it, and see whether the firmware is on it")


class WrongVersion(LinkError):
    """The board speaks another version of the protocol. `ours` and `boards` are the two."""

    def __init__(self, port: str, ours: int, boards: int, firmware: str) -> None:
        what = f"this program speaks version {ours} of the protocol, the board (firmware {firmware}) version {boards}"
        older = "put this program's firmware on the board" if boards < ours else "update this program"
        super().__init__(port, what, older)
        self.ours = ours
        self.boards = boards


class Unplugged(LinkError):
    """The port was open and went away."""

    def __init__(self, port: str) -> None:
        super().__init__(port, "the board is gone", "look at the cable and the board's supply")


def error_of_open(port: str, error: BaseException) -> LinkError:
    """The typed error for what pyserial raised while it opened `port`."""
    number = _errno_of(error)
    if number in (errno.EACCES, errno.EPERM):
        # Windows says 'access denied' for a port that another program holds.
        return PortBusy(port) if port.upper().startswith("COM") else PermissionDenied(port)
    if number in (errno.EBUSY, errno.EAGAIN, errno.EWOULDBLOCK):
        return PortBusy(port)
    return PortMissing(port)


def terminal_errors() -> tuple[type[Exception], ...]:
    """What the terminal driver raises when a device goes away under it: no OSError, and not there on Windows."""
    try:
        import termios
    except ImportError:
        return ()
    return (termios.error,)


def _errno_of(error: BaseException | None) -> int:
    """The first error number in a chain of errors; 0 if there is none."""
    while error is not None:
        number = getattr(error, "errno", None)
        if isinstance(number, int):
            return number
        error = error.__context__
    return 0
