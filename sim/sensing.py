"""The voltage sense of the banks: divider, 12-bit ADC with noise, and which samples are fresh."""

import random
from dataclasses import dataclass

SAMPLE_US = 100
FRESH_SAMPLES = 5
FRESH_US = 5000
ADC_BITS = 12
ADC_STEPS = 1 << ADC_BITS
# Standard deviation of the noise, in steps of the ADC (common for such a converter; from memory).
NOISE_STEPS = 0.7
# A true voltage this far below a ready voltage can't come from noise: the lowest of five samples would have to be
# wrong by more than three standard deviations in each of them.
MARGIN_STEPS = 3.0
# A power of two of noise values, drawn once: drawing each anew takes most of a tick's time.
NOISE_VALUES = 1 << 13


@dataclass
class Reading:
    """What the ADC's ring says of one bank, in millivolts; -1 where there are no fresh samples."""

    low_mv: int = -1
    mean_mv: int = -1
    last_mv: int = 0
    age_us: int = 0


class Noise:
    """The ADC's noise from one seed."""

    def __init__(self, rng: random.Random) -> None:
        self._values = [rng.gauss(0.0, NOISE_STEPS) for _ in range(NOISE_VALUES)]
        # Any odd stride goes through all of them.
        self._stride = rng.randrange(1, NOISE_VALUES, 2)
        self._place = 0

    def next(self) -> float:
        """The next value, in steps."""
        self._place = (self._place + self._stride) & (NOISE_VALUES - 1)
        return self._values[self._place]


@dataclass
class Sense:
    """One bank's divider. fault: 'none', 'upper_open' (reads nothing) or 'lower_open' (reads the most).

    range_mv is what the divider really makes of the highest reading, zero_mv what it really lacks at 0 V;
    believed_mv and believed_zero_mv are what the settings say of them.
    """

    range_mv: int
    believed_mv: int
    zero_mv: int = 0
    believed_zero_mv: int = 0
    fault: str = "none"

    @property
    def is_right(self) -> bool:
        """True if the divider is whole and as the settings say."""
        right = self.believed_mv == self.range_mv and self.believed_zero_mv == self.zero_mv
        return right and self.fault == "none"

    def steps(self, volts: float, noise: Noise) -> int:
        """One conversion."""
        if self.fault == "upper_open":
            reading = abs(noise.next())
        elif self.fault == "lower_open":
            return ADC_STEPS - 1
        else:
            reading = (volts * 1000 - self.zero_mv) / self.range_mv * ADC_STEPS + noise.next()
        return max(0, min(ADC_STEPS - 1, int(reading)))

    def read(self, volts: float, fresh_us: int, noise: Noise) -> Reading:
        """The newest sample, and the lowest and mean of the last ones if enough of them are fresh.

        fresh_us: how long the bank has been undisturbed, pulses of all banks and the settling after them counted.
        """
        newest = self.steps(volts, noise)
        if min(fresh_us, FRESH_US) < FRESH_SAMPLES * SAMPLE_US:
            return Reading(-1, -1, self._mv(newest), 0)
        lowest = newest
        total = newest
        for _ in range(FRESH_SAMPLES - 1):
            sample = self.steps(volts, noise)
            total += sample
            lowest = min(lowest, sample)
        return Reading(self._mv(lowest), self._mv(total) // FRESH_SAMPLES, self._mv(newest), 0)

    def _mv(self, steps: int) -> int:
        return max(0, (steps * self.believed_mv >> ADC_BITS) + self.believed_zero_mv)
