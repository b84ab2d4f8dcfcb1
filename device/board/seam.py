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

# What `figure` is asked for: mean and longest time once round the loop, longest collection (microseconds), conversions
# a second of one ADC input, free heap (bytes).
LOOP_US, WORST_US, COLLECT_US, ADC_HZ, HEAP_FREE = 0, 1, 2, 3, 4


TYPE_CHECKING = False


class Board:
    """What control asks of a board. `boot` differs at every start; `caps` says what the board can do."""

    kind: bytes
    uid: bytes
    caps: bytes
    boot: int
    # Why it started (words.CAUSES); what the crash before it left (empty: no crash).
    cause = 0
    crash = b""
    # A link says: no loop, a plain prompt.
    stay_at_prompt = False

    def begin(self) -> None:
        """The loop is about to begin: from here on a loop that stalls is reset."""

    def end(self) -> None:
        """The loop was left: outputs off, everything given back to the prompt. No pulse is running."""

    def crashed(self, error: BaseException) -> None:
        """The loop ended with an error: outputs off, keep a note, start again. Returns where that can't be done."""

    def forget_crash(self) -> None:
        """The host has the note of the crash."""

    def bank_reaches(self, bank: int, mv: int) -> bool:
        """True if the lowest of the newest fresh samples is at or above `mv` (steady). A board may know a quick way."""
        return self.bank_low_mv(bank) >= mv

    def figure(self, which: int) -> int:
        """One of the figures above, -1 if it is not known; reading WORST_US or COLLECT_US begins it anew (steady)."""
        return -1

    def led(self, on: bool) -> None:
        """Switch the status light (steady)."""

    def trace_points(self, bank: int) -> int:
        """How many points the discharge of that bank's last pulse has so far (steady)."""
        return 0

    def trace_mv(self, bank: int, point: int) -> int:
        """One point of it in millivolts, -1 for a gap (steady)."""
        return -1

    def trace_step_us(self) -> int:
        """Time from point to point; the first is at the beginning of the pulse (steady)."""
        return 0

    def collect(self) -> None:
        """Collect garbage if that is worth while: nothing is due for 50 ms. A board without need does nothing."""

    if TYPE_CHECKING:
        # What every board has to give; a board's memory is not spent on it.

        def configure(self, settings: object) -> None:
            """Take pins, chains, ranges and settling time from the Settings given. No pulse is running."""
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
            """The mean of the samples that bank_low_mv, called just before, has found (steady)."""
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

        def slot_rewind(self, slot: int) -> bool:
            """Begin to read a slot: 0 and 1 are settings, 2 is lies. False if there is none, or it can't be read."""
            raise NotImplementedError

        def slot_line(self) -> bytes:
            """Its next line without the newline, empty at the end. What is longer than a line can be ends it too."""
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

        def before_tick(self, due_us: int) -> None:
            """Called by the loop before each tick: due_us is how long control has nothing to do."""
            raise NotImplementedError

        def after_tick(self) -> None:
            """Called by the loop after each tick."""
            raise NotImplementedError
