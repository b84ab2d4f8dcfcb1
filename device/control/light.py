"""The board's status light: its blinks are the number of the first fault, so that no computer is needed to read it."""

from device.control.plant import Plant

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board

# A fault: so many blinks of this length, each followed by as long a pause; then a long pause.
BLINK_MS = 200
PAUSE_MS = 1200
# The stop is on: quick and even. All well: a short blink now and then. No settings: slow and even.
STOP_BIT_MS = 64
WELL_EACH_MS, WELL_MS = 2048, 60
EMPTY_BIT_MS = 1024


class Light:
    """Works out from the clock whether the light is on."""

    def __init__(self, board: "Board") -> None:
        self._board = board
        self._on = False

    def tick(self, plant: "Plant | None", now_ms: int) -> None:
        """Switch the light if that is due."""
        on = self._wanted(plant, now_ms)
        if on != self._on:
            self._on = on
            self._board.led(on)

    def _wanted(self, plant: "Plant | None", now_ms: int) -> bool:
        if plant is None:
            return now_ms & EMPTY_BIT_MS != 0
        code = first_fault(plant)
        if code:
            blinks_ms = code * 2 * BLINK_MS
            phase = now_ms % (blinks_ms + PAUSE_MS)
            return phase < blinks_ms and phase % (2 * BLINK_MS) < BLINK_MS
        if plant.stopped:
            return now_ms & STOP_BIT_MS != 0
        return now_ms & (WELL_EACH_MS - 1) < WELL_MS


def first_fault(plant: Plant) -> int:
    """The number of the fault that is shown: of the banks first, then junctions, then buttons; 0 for none."""
    for codes in plant.faults.codes:
        for code in codes:
            if code:
                return code
    return 0
