"""The engine: one exchange after another between a virtual board and its world, the same for both interpreters.

A runner (sim.cpython_board, sim.micropython_board) calls `exchange` between two ticks. What the board wanted is carried
out, time passes until something is due, the script acts, and the board is told how things are.
"""

from collections.abc import Callable, MutableSequence
from typing import Protocol

from sim.guest import exchange as at
from sim.world import World, fitted_switch

# How often a busy board looks, and how long an idle one may sleep.
BUSY_STEP_US = 500
LONGEST_STEP_US = 50_000


class Restart(Exception):
    """The board starts again: after a reset it asked for, or a power cut."""


class Finished(Exception):
    """The run is over."""


class Script(Protocol):
    """What happens around the board: a rehearsal's host and hands, or a socket."""

    def from_board(self, data: bytes, now_us: int) -> None:
        """The board has sent these bytes."""

    def to_board(self, now_us: int, room: int) -> bytes:
        """The next bytes for the board, at most `room`."""

    def next_due_us(self, now_us: int) -> int | None:
        """When the script next wants to act; None if never."""

    def act(self, now_us: int) -> None:
        """Do what is due. Raises Restart or Finished."""


class Engine:
    """One board's run. `ticks` counts the exchanges; `heap_used` is the guest's last figure, in bytes."""

    def __init__(self, world: World, script: Script, uid: str = "virtual-1", boot: int = 1) -> None:
        self.world = world
        self.script = script
        self.uid = uid
        self.boot = boot
        self.ticks = 0
        self.heap_used = 0
        self.pace: Callable[[int], None] | None = None
        self._pending = b""
        self._first = True
        self._fed = 0
        self._starved_us = 0

    def begin(self) -> None:
        """A board starts (again)."""
        self._first = True
        self._pending = b""
        self._starved_us = self.world.now_us

    def restarted(self) -> None:
        """Count a boot; the world's outputs are off."""
        self.boot += 1
        self.world.power_cut()

    def exchange(self, io: MutableSequence[int], rx: MutableSequence[int], tx: bytearray) -> None:
        """Between two ticks. Raises Restart or Finished."""
        now_us = self.world.now_us
        if self._first:
            # Before the first tick: the firmware starts and reads its clock, nothing else.
            self._first = False
            self._fill(io)
            return
        self.ticks += 1
        self._take(io, tx, now_us)
        self._pass(io[at.DUE_US])
        self.script.act(self.world.now_us)
        self._fill(io)
        self._give_bytes(io, rx)

    # ---- what the board wanted

    def _take(self, io: MutableSequence[int], tx: bytearray, now_us: int) -> None:
        for bank in range(len(self.world.hardware)):
            place = at.BANKS_OUT + bank * at.BANK_OUT_WORDS
            if io[place + at.MASK]:
                self.world.start_pulse(bank, io[place + at.GROUP], io[place + at.MASK], io[place + at.WIDTH_US])
                io[place + at.MASK] = 0
            if fitted_switch(self.world.settings, bank):
                on = not (io[at.CHARGE] >> bank) & 1
                if self.world.circuit.charge_on[bank] != on:
                    self.world.circuit.charge_on[bank] = on
        self.world.follower_bits[0] = io[at.FOLLOWERS]
        self.world.follower_bits[1] = io[at.FOLLOWERS + 1]
        if io[at.TX_COUNT]:
            self.script.from_board(bytes(tx[: io[at.TX_COUNT]]), now_us)
            io[at.TX_COUNT] = 0
        if io[at.HEAP_USED]:
            self.heap_used = io[at.HEAP_USED]
        if io[at.RESET]:
            io[at.RESET] = 0
            raise Restart

    def _pass(self, due_us: int) -> None:
        """Skip to the next moment at which anything is due: the same rule on both interpreters."""
        world = self.world
        now_us = world.now_us
        step_us = min(due_us, LONGEST_STEP_US)
        for moment in (world.next_event_us(), self.script.next_due_us(now_us)):
            if moment is not None:
                step_us = min(step_us, moment - now_us)
        if self._pending:
            step_us = BUSY_STEP_US
        step_us = max(step_us, BUSY_STEP_US)
        if self.pace is not None:
            self.pace(step_us)
        world.advance(now_us + step_us)

    # ---- how things are

    def _fill(self, io: MutableSequence[int]) -> None:
        world = self.world
        io[at.TICKS_US] = world.ticks_us()
        io[at.TICKS_MS] = world.ticks_ms()
        io[at.INPUTS] = world.inputs.word(0)
        io[at.INPUTS + 1] = world.inputs.word(1)
        io[at.TX_ROOM] = at.TX_BYTES
        for bank, unit in enumerate(world.hardware):
            reading = world.read_bank(bank)
            place = at.BANKS_IN + bank * at.BANK_IN_WORDS
            io[place + at.LOW_MV] = reading.low_mv
            io[place + at.MEAN_MV] = reading.mean_mv
            io[place + at.LAST_MV] = reading.last_mv
            io[place + at.AGE_US] = reading.age_us
            io[place + at.RUNNING] = 1 if unit.running(world.now_us) else 0

    def _give_bytes(self, io: MutableSequence[int], rx: MutableSequence[int]) -> None:
        # The board reads at most 64 bytes a tick, and stops at the end of a line: give it one line's worth at a time.
        data = self._pending or self.script.to_board(self.world.now_us, 64)
        end = data.find(b"\n") + 1 or len(data)
        chunk = data[: min(end, 64)]
        self._pending = data[len(chunk) :]
        for place, byte in enumerate(chunk):
            rx[place] = byte
        io[at.RX_COUNT] = len(chunk)
