"""The discharge of the last pulse of each bank, kept until it is asked for: a sample every half millisecond."""

from device.board.sampler import CONVERSIONS_HZ, PLACES, Sampler
from device.control.ticks import elapsed

TYPE_CHECKING = False
if TYPE_CHECKING:
    from typing import Any

STEP_US = 500
# 65 ms of the longest pulse and some of the recharge.
POINTS = 160
_STEP_PLACES = STEP_US * CONVERSIONS_HZ // 1_000_000
# Beyond this the ring has been written over.
_REACH_US = PLACES * 1_000_000 // CONVERSIONS_HZ - STEP_US


class Traces:
    """One trace a bank."""

    def __init__(self, sampler: Sampler, make_array: "Any", banks: int = 3) -> None:
        self._sampler = sampler
        self._points = [make_array("H", bytes(2 * POINTS)) for _ in range(banks)]
        self.counts = [0] * banks
        self._begun_us = [0] * banks
        self._place = [0] * banks
        self._going = [False] * banks
        self.going = False

    def begin(self, bank: int, now_us: int) -> None:
        """A pulse begins (steady)."""
        self.counts[bank] = 0
        self._begun_us[bank] = now_us
        self._place[bank] = self._sampler.place()
        self._going[bank] = True
        self.going = True

    def take(self, bank: int, channel: int, now_us: int) -> None:
        """Copy the points that have become due (steady)."""
        if not self._going[bank]:
            return
        count = self.counts[bank]
        place = self._place[bank]
        late_us = elapsed(now_us, self._begun_us[bank]) - count * STEP_US
        points = self._points[bank]
        while late_us >= STEP_US and count < POINTS:
            # What the ring no longer holds is a gap in the trace.
            points[count] = self._sampler.at(place, channel) if late_us < _REACH_US else 0xFFFF
            count += 1
            place = (place + _STEP_PLACES) & (PLACES - 1)
            late_us -= STEP_US
        self.counts[bank] = count
        self._place[bank] = place
        if count >= POINTS:
            self._going[bank] = False
            self.going = self._going[0] or self._going[1] or self._going[2]

    def raw(self, bank: int, point: int) -> int:
        """One point (12 bits), 0xFFFF for a gap (steady)."""
        return self._points[bank][point]  # type: ignore[no-any-return]
