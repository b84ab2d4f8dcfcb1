"""Put beside main.py in a MicroPython that runs in process: makes it choose the virtual board."""

import host  # type: ignore[import-not-found,unused-ignore]
import uctypes  # type: ignore[import-not-found,unused-ignore]

from sim.guest.virtual_board import FileSlots, VirtualBoard


def make_board() -> VirtualBoard:
    """The virtual board, its buffers' addresses told to the process around this interpreter."""
    boot, uid = host.call("begin", "").split(" ")
    board = VirtualBoard(FileSlots(), uid.encode(), int(boot))
    places = []
    for buffer in (board.io, board.rx, board.tx):
        places.append(str(uctypes.addressof(buffer)))
    host.call("buffers", " ".join(places))

    def exchange() -> None:
        host.call("step", "")

    board.exchange = exchange
    return board
