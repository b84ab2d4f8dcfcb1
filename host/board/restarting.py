"""Restarts a board and shakes hands with the firmware that comes up."""

import queue
import time

from host.board.errors import NotBack
from host.board.transport import RawPrompt
from host.link import Link, LinkChange
from host.link_errors import LinkError, WrongVersion
from host.news import board_of
from host.views import BoardView
from shared_protocol import messages

# USB comes back after about a second, the firmware reads its settings, and a computer may be slow to name the port.
BACK_S = 15.0
_TRIES_S = (0.2,)


def restart(prompt: RawPrompt, back_s: float = BACK_S) -> BoardView:
    """Restart the board's hardware; who answers within so many seconds. Raises NotBack, WrongVersion."""
    prompt.restart()
    return shake_hands(prompt.port, back_s)


def shake_hands(port: str, limit_s: float = BACK_S) -> BoardView:
    """Wait until a firmware answers at `port`: the port may be away for a while. Raises NotBack, WrongVersion."""
    with Link(port, back_off_s=_TRIES_S, refused_s=_TRIES_S[0]) as link:
        return greeted(link, limit_s)


def greeted(link: Link, limit_s: float) -> BoardView:
    """The first answer of the board at a link that is open. Raises NotBack, WrongVersion."""
    end_s = time.monotonic() + limit_s
    last: LinkError | None = None
    while time.monotonic() < end_s:
        try:
            item = link.received.get(timeout=0.1)
        except queue.Empty:
            continue
        if isinstance(item, LinkChange):
            if isinstance(item.error, WrongVersion):
                raise item.error
            last = item.error or last
        elif item.message is messages.BOARD and not item.fault:
            return board_of(item)
    raise NotBack(link.port, last.what if last is not None else "no answer")
