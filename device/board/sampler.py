"""The ADC runs by itself and DMA writes its samples into a ring; whoever wants a voltage reads the ring.

Four inputs are converted in turn (three banks, and one that the board uses itself), so that the place in the ring tells
the input: 200,000 conversions a second, 50,000 of each input. Two DMA channels take turns without end.
"""

from device.board import chip as registers

TYPE_CHECKING = False
if TYPE_CHECKING:
    from typing import Any

    from device.board.chip import Chip

INPUTS = 4
ADC_CLOCK_HZ = 48_000_000
CONVERSIONS_HZ = 200_000
# Places in the ring: 5.1 ms of each input. A power of two, and of four.
PLACES = 1024
_LAST = PLACES - 1
_RING_BITS = 11
# From a channel's write address to its count of what is left.
_COUNT_FROM_WRITE = 4
# Inputs 0 to 3.
_ROUND = 0b1111
# Conversions of one DMA run: whole rings, so that the next run goes on where this one ended.
_RUN = PLACES << 16
# The five newest samples of an input are younger than this.
WINDOW_US = 6 * INPUTS * 1_000_000 // CONVERSIONS_HZ


class Sampler:
    """The ring of samples. `low`, `high` and `total` are of the five newest samples that `look` found (12 bits)."""

    def __init__(self, machine: "Any", rp2: "Any", uctypes: "Any", make_array: "Any", chip: "Chip") -> None:
        self._mem = machine.mem32
        self._adc = chip.adc
        self._machine = machine
        # Twice as long as the ring: somewhere in it the ring begins at a multiple of its length, as DMA wants it.
        self._ring = make_array("H", bytes(4 * PLACES))
        address = uctypes.addressof(self._ring)
        self._base = (-address & (2 * PLACES - 1)) >> 1
        self._address = address + 2 * self._base
        self._first = rp2.DMA()
        self._second = rp2.DMA()
        self._dreq = chip.dreq_adc
        self._write = 0
        self._other_write = 0
        self._control = 0
        self._other_control = 0
        self.channel = -1
        self.low = 0
        self.high = 0
        self.total = 0

    def start(self) -> None:
        """Begin to sample. Allocates."""
        mem = self._mem
        adc = self._adc
        self.stop()
        # The machine's own ADC object brings the ADC's clock up.
        self._machine.ADC(self._machine.ADC.CORE_TEMP)
        mem[adc + registers.FCS] = registers.FCS_ENABLE | registers.FCS_DREQ | registers.FCS_ONE | registers.FCS_OVER
        mem[adc + registers.DIV] = (ADC_CLOCK_HZ // CONVERSIONS_HZ - 1) << 8
        # A conversion that is under way would be the first of the ring.
        while not mem[adc + registers.CS] & registers.CS_READY:
            pass
        while not mem[adc + registers.FCS] & registers.FCS_EMPTY:
            mem[adc + registers.FIFO]
        self._lay(self._second, self._first, False)
        self._lay(self._first, self._second, True)
        base = registers.DMA + registers.DMA_STRIDE * self._first.channel
        other = registers.DMA + registers.DMA_STRIDE * self._second.channel
        self._write = base + registers.DMA_WRITE_ADDRESS
        self._control = base + registers.DMA_CONTROL
        self._other_write = other + registers.DMA_WRITE_ADDRESS
        self._other_control = other + registers.DMA_CONTROL
        mem[adc + registers.CS] = registers.CS_ENABLE | registers.CS_MANY | (_ROUND << registers.CS_ROUND_SHIFT)

    def _lay(self, channel: "Any", then: "Any", trigger: bool) -> None:
        control = channel.pack_ctrl(
            size=1,
            inc_read=False,
            inc_write=True,
            ring_sel=True,
            ring_size=_RING_BITS,
            treq_sel=self._dreq,
            chain_to=then.channel,
            irq_quiet=True,
        )
        fifo = self._adc + registers.FIFO
        channel.config(read=fifo, write=self._address, count=_RUN, ctrl=control, trigger=trigger)

    def stop(self) -> None:
        """No more samples; the DMA no longer writes to memory."""
        mem = self._mem
        mem[self._adc + registers.CS] = registers.CS_ENABLE
        self._first.active(0)
        self._second.active(0)

    def close(self) -> None:
        """Stop, and give the DMA channels back."""
        self.stop()
        self._first.close()
        self._second.close()

    def lost(self) -> bool:
        """True if a conversion was lost: then the places no longer tell the inputs, and it must be started again."""
        return bool(self._mem[self._adc + registers.FCS] & registers.FCS_OVER)

    def place(self) -> int:
        """The place that is written next (steady)."""
        mem = self._mem
        if not mem[self._control] & registers.DMA_BUSY:
            self._change_over()
        return ((mem[self._write] - self._address) >> 1) & _LAST  # type: ignore[no-any-return]

    def _change_over(self) -> None:
        """The other channel has taken over: from now on it is the one to ask."""
        write = self._write
        control = self._control
        self._write = self._other_write
        self._control = self._other_control
        self._other_write = write
        self._other_control = control

    def left(self) -> int:
        """Conversions that the run still has to make (steady)."""
        return self._mem[self._write + _COUNT_FROM_WRITE]  # type: ignore[no-any-return]

    def reaches(self, channel: int, least: int) -> bool:
        """True if the five newest samples of an input are all at least `least` (steady)."""
        mem = self._mem
        if not mem[self._control] & registers.DMA_BUSY:
            self._change_over()
        ring = self._ring
        base = self._base
        place = ((mem[self._write] - self._address) >> 1) + _LAST
        place -= (place - channel) & 3
        return (  # type: ignore[no-any-return]
            ring[base + (place & _LAST)] >= least
            and ring[base + ((place - 4) & _LAST)] >= least
            and ring[base + ((place - 8) & _LAST)] >= least
            and ring[base + ((place - 12) & _LAST)] >= least
            and ring[base + ((place - 16) & _LAST)] >= least
        )

    def look(self, channel: int) -> None:
        """Find the five newest samples of an input (steady)."""
        ring = self._ring
        base = self._base
        place = self.place() + _LAST
        place -= (place - channel) & 3
        first = ring[base + (place & _LAST)]
        second = ring[base + ((place - 4) & _LAST)]
        third = ring[base + ((place - 8) & _LAST)]
        fourth = ring[base + ((place - 12) & _LAST)]
        fifth = ring[base + ((place - 16) & _LAST)]
        self.channel = channel
        self.low = min(first, second, third, fourth, fifth)
        self.high = max(first, second, third, fourth, fifth)
        self.total = first + second + third + fourth + fifth

    def at(self, place: int, channel: int) -> int:
        """The sample of an input at or just before a place (steady)."""
        place += PLACES
        place -= (place - channel) & 3
        return self._ring[self._base + (place & _LAST)]  # type: ignore[no-any-return]
