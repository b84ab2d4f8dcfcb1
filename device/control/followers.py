"""Outputs that follow junctions: lamps, frog relays, and relays that make a frog dead while it must not be live."""

from device.control.plant import Plant
from shared_protocol.settings import FollowerSettings
from shared_protocol.settings_table import FROG, LAMP
from shared_protocol.words import SEEN

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board

# Lamps: steady = seen, slow flash = sent, fast flash = waiting or failed. The phases come from the clock.
SLOW_BIT_MS = 512
FAST_BIT_MS = 128
PERIOD_MS = 64


class Followers:
    """All follower outputs of one plant."""

    def __init__(self, plant: Plant, board: "Board") -> None:
        self._plant = plant
        self._board = board
        self._all = plant.settings.followers
        self._frogs = [False] * len(self._all)
        self._low = -1
        self._high = -1
        self.any = len(self._all) > 0

    def tick(self, now_ms: int) -> None:
        """Set all outputs."""
        if not self.any:
            return
        low = 0
        high = 0
        number = 0
        for follower in self._all:
            if self._on(number, follower, now_ms):
                if follower.output < 24:
                    low |= 1 << follower.output
                else:
                    high |= 1 << (follower.output - 24)
            number += 1
        if low != self._low:
            self._low = low
            self._board.followers(0, low)
        if high != self._high:
            self._high = high
            self._board.followers(1, high)

    def _on(self, number: int, follower: FollowerSettings, now_ms: int) -> bool:
        junction = self._plant.junctions[follower.j]
        if follower.kind == LAMP:
            if junction.waiting or junction.troubled:
                return junction.wanted == follower.lie and now_ms & FAST_BIT_MS != 0
            if junction.lie != follower.lie:
                return False
            return junction.source == SEEN or now_ms & SLOW_BIT_MS != 0
        if follower.kind == FROG:
            # Changed only after the pulse; while nothing is known it stays as it was.
            if not junction.moving and junction.lie >= 0:
                self._frogs[number] = junction.lie == follower.lie
            return self._frogs[number]
        return junction.moving or junction.lie < 0
