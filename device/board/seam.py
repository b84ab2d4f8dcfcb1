"""The seam between control and hardware: everything that control may ask of a board.

A board implements these members; control gets the board through its constructor and imports no hardware module.
All numbers are whole and below 2**30. Members marked (steady) must not allocate: the loop calls them with the heap
locked in tests.
"""

# Ticks count up and wrap to 0 here (both microseconds and milliseconds).
TICKS_PERIOD_BITS = 30

# Fresh: at least this many samples younger than this, none taken during any bank's pulse or the settling after it.
FRESH_SAMPLES = 5
FRESH_US = 5000


class Board:
    """What control asks of a board. `boot` differs at every start; `caps` says what the board can do."""

    kind: bytes
    uid: bytes
    caps: bytes
    boot: int

    def configure(self, settings: object) -> None:
        """Take pins, chains, ranges and settling time from shared_protocol.settings.Settings. No pulse is running."""
        raise NotImplementedError

    def ticks_us(self) -> int:
        """Microseconds, wrapping (steady)."""
        raise NotImplementedError

    def ticks_ms(self) -> int:
        """Milliseconds, wrapping (steady)."""
        raise NotImplementedError

    def bank_low_mv(self, bank: int) -> int:
        """The lowest of the newest fresh samples in millivolts, -1 if there are not enough fresh ones (steady)."""
        raise NotImplementedError

    def bank_mean_mv(self, bank: int) -> int:
        """The mean of those samples, -1 if there are not enough (steady)."""
        raise NotImplementedError

    def bank_last_mv(self, bank: int) -> int:
        """The newest sample, fresh or not, -1 if there is none yet (steady)."""
        raise NotImplementedError

    def bank_age_us(self, bank: int) -> int:
        """Age of the newest sample in microseconds (steady)."""
        raise NotImplementedError

    def start_pulse(self, bank: int, group: int, mask: int, width_us: int) -> bool:
        """Switch the outputs of `mask` (bit 0 is output 24 * group) on for `width_us`; False if refused (steady).

        The hardware ends the pulse, keeps the bank's gap after it, and throws away what comes meanwhile.
        """
        raise NotImplementedError

    def pulse_running(self, bank: int) -> bool:
        """True while a pulse of that bank, or the hardware's gap after it, is running (steady)."""
        raise NotImplementedError

    def charge(self, bank: int, on: bool) -> None:
        """Switch the bank's charge path, where a cut-off is fitted (steady)."""
        raise NotImplementedError

    def inputs(self, word: int) -> int:
        """Inputs 24 * word and the 23 after it, one bit each, 1 = closed (steady)."""
        raise NotImplementedError

    def followers(self, word: int, bits: int) -> None:
        """Set follower outputs 24 * word and the 23 after it (steady)."""
        raise NotImplementedError

    def read_byte(self) -> int:
        """The next byte from the host, -1 if there is none (steady)."""
        raise NotImplementedError

    def write_byte(self, byte: int) -> bool:
        """Give one byte to the host; False if it can't be taken now (steady)."""
        raise NotImplementedError

    def slot_lines(self, slot: int) -> "list[bytes]":
        """The lines of a slot, without newlines; none if there is no such slot. Slots 0 and 1: settings, 2: lies."""
        raise NotImplementedError

    def slot_begin(self, slot: int) -> bool:
        """Empty a slot and open it for writing."""
        raise NotImplementedError

    def slot_write(self, line: bytes) -> bool:
        """Append one line to the slot that is open."""
        raise NotImplementedError

    def slot_end(self) -> bool:
        """Close the slot that is open; True if all of it is stored."""
        raise NotImplementedError

    def slot_append(self, slot: int, line: bytes) -> bool:
        """Append one line to a closed slot, in one step: after a power cut it is there whole or not at all."""
        raise NotImplementedError

    def feed_watchdog(self) -> None:
        """The loop is alive (steady)."""
        raise NotImplementedError

    def reset(self) -> None:
        """Start again, everything off. May return; then the reset comes before the next tick."""
        raise NotImplementedError

    def collect(self) -> None:
        """Collect garbage if that is worth while: nothing is due for 50 ms. A board without need does nothing."""

    def before_tick(self, due_us: int) -> None:
        """Called by the loop before each tick: due_us is how long control has nothing to do."""
        raise NotImplementedError

    def after_tick(self) -> None:
        """Called by the loop after each tick."""
        raise NotImplementedError
