"""The hardware that times a bank's pulses: width, then gap; words that come meanwhile are thrown away."""

from dataclasses import dataclass


@dataclass(frozen=True)
class PulseRecord:
    """A pulse that was given: when it began, which outputs, how long, and the bank's true voltage then."""

    at_us: int
    bank: int
    group: int
    mask: int
    width_us: int
    mv: int


class PulseHardware:
    """One bank's timer. `on_until_us` is None while no pulse runs; `free_us` is when the gap ends."""

    def __init__(self, bank: int, gap_us: int) -> None:
        self.number = bank
        self.gap_us = gap_us
        self.on_until_us: int | None = None
        self.free_us = 0
        self.thrown_away = 0

    def begin(self, now_us: int, width_us: int) -> bool:
        """A word arrives; False if it is thrown away."""
        if self.running(now_us):
            self.thrown_away += 1
            return False
        self.on_until_us = now_us + width_us
        self.free_us = self.on_until_us + self.gap_us
        return True

    def end_pulse(self) -> None:
        """The width is over; the gap begins."""
        self.on_until_us = None

    def running(self, now_us: int) -> bool:
        """True while the pulse or its gap runs."""
        return now_us < self.free_us

    def power_cut(self) -> None:
        """Everything off, nothing remembered."""
        self.on_until_us = None
        self.free_us = 0
