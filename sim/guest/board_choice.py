"""Put beside main.py in a MicroPython that runs in process: makes it choose the virtual board."""

import uctypes  # type: ignore[import-not-found,unused-ignore]

from device.board.slots import FileSlots
from host import call  # type: ignore[attr-defined]
from sim.guest.virtual_board import VirtualBoard


def make_board() -> VirtualBoard:
    """The virtual board, its buffers' addresses told to the process around this interpreter."""
    boot, uid = call("begin", "").split(" ")
    board = VirtualBoard(FileSlots(open), uid.encode(), int(boot))
    places = []
    for buffer in (board.io, board.rx, board.tx):
        places.append(str(uctypes.addressof(buffer)))
    call("buffers", " ".join(places))

    def exchange() -> None:
        call("step", "")

    board.exchange = exchange
    return board
