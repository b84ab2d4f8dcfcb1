"""Saves the lies in a slot of their own, and throws the junctions back to them at power-up if the settings ask.

Saving is for restoring only: what was saved is never taken for what is.
"""

from device.control.plant import Plant
from device.control.queue import Queue
from device.control.store import LIES_SLOT
from device.control.ticks import Marks
from shared_protocol.words import FROM_POWER_UP

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board

# Seldom enough for the flash: at most one write in this time, and only with nothing under way.
SAVE_MS = 60_000
_HEAD = b"lies"
_SAVED = 0


class LieKeeper:
    """The saved lies of one board."""

    def __init__(self, board: "Board") -> None:
        self._board = board
        self._marks = Marks(1)
        self._saved: "list[int]" = []
        self._restore: "list[int]" = []
        self._place = 0
        self.wants_work = False

    def begin_restore(self, plant: Plant) -> None:
        """Read the saved lies; `tick` asks for them one after another."""
        if not self._board.slot_rewind(LIES_SLOT):
            return
        parts = self._board.slot_line().split(b" ")
        if parts[0] != _HEAD or len(parts) != len(plant.junctions) + 1:
            return
        for part in parts[1:]:
            self._restore.append(int(part) if part.isdigit() and len(part) == 1 else -1)

    def tick(self, plant: Plant, queue: Queue, now_ms: int, leaving: bool) -> None:
        """Ask for the next saved lie once its bank can be judged; see whether a save is due."""
        self._marks.sweep(now_ms)
        if self._place < len(self._restore):
            if not leaving and not plant.stopped and queue.throws.count == 0 and _all_fresh(plant):
                self._restore_next(plant, queue, now_ms)
            return
        self.wants_work = (
            plant.restore == 1
            and queue.throws.count == 0
            and self._marks.since(_SAVED, now_ms) >= SAVE_MS
            and self._changed(plant)
        )

    def _restore_next(self, plant: Plant, queue: Queue, now_ms: int) -> None:
        junction = self._place
        lie = self._restore[junction]
        self._place += 1
        if 0 <= lie < len(plant.junctions[junction].settings.lies):
            queue.throw(0, FROM_POWER_UP, junction, lie, max(1, plant.timing.wait_ms), now_ms)

    def _changed(self, plant: Plant) -> bool:
        if len(self._saved) != len(plant.junctions):
            return True
        for junction in plant.junctions:
            if junction.lie >= 0 and junction.lie != self._saved[junction.settings.i]:
                return True
        return False

    def work(self, plant: Plant, now_ms: int) -> None:
        """Write them. Allocates."""
        self.wants_work = False
        self._marks.set(_SAVED, now_ms)
        self._saved = [junction.lie for junction in plant.junctions]
        line = _HEAD
        for lie in self._saved:
            line += b" " + (str(lie).encode() if lie >= 0 else b"-")
        if self._board.slot_begin(LIES_SLOT):
            self._board.slot_write(line)
            self._board.slot_end()


def _all_fresh(plant: Plant) -> bool:
    for gate in plant.banks:
        if not gate.fresh:
            return False
    return True
