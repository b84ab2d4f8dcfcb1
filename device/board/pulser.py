"""One bank's pulses: a state machine that times them, on the coils' pins or on the output enable of a chain.

Nothing here ever stops, restarts or rewrites a state machine that may hold a coil on: a stopped one freezes its pins.
The one early stop is to take a pin away from it and drive it low.
"""

from device.board import chip as registers
from device.board import pulse_program

TYPE_CHECKING = False
if TYPE_CHECKING:
    from typing import Any

    from device.board.chains import OutputChain


class Pulser:
    """One state machine. `first_pin` and the `coils - 1` after it are its own."""

    def __init__(self, machine: "Any", rp2: "Any", number: int, program: "Any", first_pin: int, gap_us: int) -> None:
        self._mem = machine.mem32
        self._address = registers.PIO0 + registers.PIO_SM_ADDRESS + registers.PIO_SM_STRIDE * number
        # A full start: the program's own first values put all its pins low.
        timer = rp2.StateMachine(number, program, freq=pulse_program.FREQUENCY_HZ, out_base=machine.Pin(first_pin))
        timer.put(gap_us // pulse_program.GAP_STEP_US)
        timer.exec("pull()")
        timer.exec("mov(y, osr)")
        timer.active(1)
        self._put = timer.put
        self._waiting = timer.tx_fifo
        # Where it stands while it waits for a word.
        self._idle = self._mem[self._address]

    def running(self) -> bool:
        """True while a pulse or the gap after it runs, or a word is still to be taken (steady)."""
        return bool(self._mem[self._address] != self._idle or self._waiting())

    def send(self, mask: int, width_us: int) -> bool:
        """Start a pulse; False for what it can't make, and while another or its gap runs (steady)."""
        if mask <= 0 or width_us < pulse_program.SHORTEST_US or width_us > pulse_program.LONGEST_US:
            return False
        if self.running():
            return False
        self._put((mask << pulse_program.MASK_SHIFT) | (width_us - pulse_program.EXTRA_US))
        return True


class PinPulser:
    """A bank whose coils are on pins."""

    def __init__(self, pulser: Pulser, coils: int) -> None:
        self.running = pulser.running
        self._send = pulser.send
        self._outside = ~((1 << coils) - 1)

    def start(self, group: int, mask: int, width_us: int) -> bool:
        """Start a pulse (steady)."""
        if group or mask & self._outside:
            return False
        return self._send(mask, width_us)

    def ended(self) -> None:
        """A pulse is over (steady)."""


class ChainPulser:
    """A bank whose coils are on the output chain: the pulse drives the output enable of its part."""

    def __init__(self, pulser: Pulser, chain: "OutputChain", part: int, coils: int) -> None:
        self.running = pulser.running
        self._send = pulser.send
        self._chain = chain
        self._part = part
        self._coils = coils

    def start(self, group: int, mask: int, width_us: int) -> bool:
        """Shift the mask, read it back, take it over, then start the pulse (steady)."""
        if mask <= 0 or mask >> (self._coils - 24 * group) or self.running():
            return False
        chain = self._chain
        chain.clear(self._part, self._coils)
        chain.put(self._part, group, mask, self._coils)
        if not chain.shift():
            chain.clear(self._part, self._coils)
            return False
        chain.take_over(self._part)
        if self._send(1, width_us):
            return True
        self.ended()
        return False

    def ended(self) -> None:
        """A pulse is over: the outputs are off; take the mask out as well, should the enable ever fail (steady)."""
        self._chain.clear(self._part, self._coils)
        if self._chain.shift():
            self._chain.take_over(self._part)
