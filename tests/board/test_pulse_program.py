"""The PIO program that times pulses, run in rp2040-pio-emulator at one instruction a microsecond."""

import random
from collections.abc import Iterator

import pytest
from pioemu import State, emulate

from device.board import pulse_program
from tests.board import small_assembler

GAP_US = 20_000
FOREIGN_PINS = 0b1010_0000_0000_0000


def opcodes_of(coils: int) -> list[int]:
    """What is loaded for a bank of so many coils."""
    return pulse_program.assemble(small_assembler, coils).opcodes  # type: ignore[no-any-return]


def word(mask: int, width_us: int) -> int:
    """As the driver makes it."""
    return (mask << pulse_program.MASK_SHIFT) | (width_us - pulse_program.EXTRA_US)


class Run:
    """One state machine; `feed` says which words arrive when (microseconds)."""

    def __init__(self, coils: int, feed: list[tuple[int, int]], first_pin: int = 0, gap_us: int = GAP_US) -> None:
        self.feed = sorted(feed)
        self.levels: list[tuple[int, int]] = [(0, 0)]
        self.state = State(y_register=gap_us // pulse_program.GAP_STEP_US)
        self._steps = self._go(coils, first_pin)

    def _go(self, coils: int, first_pin: int) -> Iterator[State]:
        for before, after in emulate(
            opcodes_of(coils), stop_when=lambda *_: False, initial_state=self.state, out_base=first_pin, out_count=coils
        ):
            # The new values are there from the clock at which the instruction begins.
            if after.pin_values != self.levels[-1][1]:
                self.levels.append((after.clock, after.pin_values))
            assert before.clock <= after.clock
            while self.feed and self.feed[0][0] <= after.clock and len(after.transmit_fifo) < 4:
                after.transmit_fifo.append(self.feed.pop(0)[1])
            yield after

    def until(self, clock: int) -> "Run":
        """Run to this microsecond."""
        for state in self._steps:
            if state.clock >= clock:
                break
        return self

    @property
    def pulses(self) -> list[tuple[int, int]]:
        """(mask, width in microseconds) of each pulse that has ended."""
        found = []
        for (begin, mask), (end, off) in zip(self.levels[1:], self.levels[2:], strict=False):
            if mask:
                assert off == 0, "from one mask to another without a rest"
                found.append((mask, end - begin))
        return found


WIDTHS = (3, 1000, 20_000, 65_535)


@pytest.mark.parametrize("width_us", WIDTHS)
@pytest.mark.parametrize("mask", range(1, 16))
def test_every_mask_of_four_coils(mask: int, width_us: int) -> None:
    assert Run(4, [(5, word(mask, width_us))]).until(width_us + 50).pulses == [(mask, width_us)]


@pytest.mark.parametrize("width_us", WIDTHS)
@pytest.mark.parametrize("coils", range(1, 14))
def test_masks_of_every_size(coils: int, width_us: int) -> None:
    every = (1 << coils) - 1
    draw = random.Random(coils * 70_000 + width_us)
    for mask in {1, every, 1 << (coils - 1), draw.randint(1, every)}:
        assert Run(coils, [(5, word(mask, width_us))]).until(width_us + 50).pulses == [(mask, width_us)]


def test_a_bank_switches_no_pin_but_its_own() -> None:
    run = Run(3, [(5, word(0b111_1111, 1000))], first_pin=4)
    assert run.until(1100).pulses == [(0b111 << 4, 1000)]


@pytest.mark.parametrize("at", [20, 500, 999, 1003])
def test_words_that_come_during_the_pulse_are_thrown_away(at: int) -> None:
    run = Run(4, [(5, word(1, 1000)), (at, word(2, 1000)), (at, word(4, 3)), (at, word(8, 65_535))])
    assert run.until(100_000).pulses == [(1, 1000)]


@pytest.mark.parametrize("at", [1008, 1500, 10_000, 20_900])
def test_words_that_come_during_the_gap_are_thrown_away(at: int) -> None:
    run = Run(4, [(5, word(1, 1000)), (at, word(2, 1000)), (at + 7, word(4, 3))])
    assert run.until(100_000).pulses == [(1, 1000)]


def test_a_word_after_the_gap_makes_its_pulse() -> None:
    run = Run(4, [(5, word(1, 1000)), (5 + 1000 + GAP_US + 20, word(2, 500))])
    assert run.until(50_000).pulses == [(1, 1000), (2, 500)]


def test_a_flood_makes_no_more_pulses_than_gaps_allow() -> None:
    draw = random.Random(3)
    flood = [(at, word(draw.randint(1, 15), draw.randint(3, 2000))) for at in range(5, 200_000, 40)]
    run = Run(4, flood).until(210_000)
    begins = [at for at, mask in run.levels if mask]
    ends = [at for at, mask in run.levels[1:] if not mask]
    assert 8 <= len(begins) <= 11
    assert all(begin - end >= GAP_US for begin, end in zip(begins[1:], ends, strict=False))
    assert all(3 <= width <= 2000 for _, width in run.pulses)


@pytest.mark.parametrize("gap_us", [5000, 20_000, 60_000])
def test_the_gap_is_kept(gap_us: int) -> None:
    flood = [(at, word(1, 100)) for at in range(5, 2 * gap_us + 2000, 10)]
    levels = Run(1, flood, gap_us=gap_us).until(2 * gap_us + 1000).levels
    off, on = levels[2][0], levels[3][0]
    assert gap_us <= on - off <= gap_us + 20


def test_four_sizes_fill_the_memory_of_a_block() -> None:
    assert [len(opcodes_of(coils)) for coils in (1, 4, 12, 13)] == [pulse_program.WORDS] * 4
    assert 4 * pulse_program.WORDS == 32
