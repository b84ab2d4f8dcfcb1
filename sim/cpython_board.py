"""Runs the firmware's control in this interpreter, in virtual time."""

from device.control.controller import Controller
from device.main import step
from sim.engine import Engine, Finished, Restart
from sim.guest.virtual_board import MemorySlots, VirtualBoard
from sim.slots import Slots


class CPythonBoard:
    """A virtual board whose control runs on CPython. `slots` is its flash: it outlives restarts."""

    def __init__(self, slots: Slots) -> None:
        self.slots = slots
        self.controller: Controller | None = None

    def run(self, engine: Engine) -> None:
        """Run until the engine says that it is finished, or the firmware leaves. Raises what the firmware raises."""
        engine.read_slots = lambda: self.slots
        try:
            while True:
                try:
                    self._boot(engine)
                    return
                except Restart as restart:
                    engine.restarted(str(restart))
        except Finished:
            return

    def _boot(self, engine: Engine) -> None:
        board = VirtualBoard(MemorySlots(self.slots), engine.uid.encode(), engine.boot)
        board.exchange = lambda: engine.exchange(board.io, board.rx, board.tx)
        engine.begin()
        board.exchange()
        controller = Controller(board)
        controller.start()
        self.controller = controller
        while not controller.left:
            step(board, controller)
