"""The engine: one exchange after another between a virtual board and its world, the same for both interpreters.

A runner (sim.cpython_board, sim.micropython_board) calls `exchange` between two ticks. What the board wanted is carried
out, time passes until something is due, the script acts, and the board is told how things are.
"""

from collections.abc import Callable, MutableSequence
from typing import Protocol

from sim.guest import exchange as at
from sim.slots import Slots, settings_in_slots
from sim.world import World

# How often a busy board looks, and how long an idle one may sleep.
BUSY_STEP_US = 500
LONGEST_STEP_US = 50_000
# The board's watchdog resets a loop that has not fed it for so long.
WATCHDOG_US = 2_000_000


class Restart(Exception):
    """The board starts again: after a reset it asked for, or a power cut."""


class Finished(Exception):
    """The run is over."""


class Bytes(Protocol):
    """The board's transmit buffer, as far as it is needed."""

    def __getitem__(self, span: slice) -> bytes | bytearray:
        """Some of its bytes."""


class Script(Protocol):
    """What happens around the board: a rehearsal's host and hands, or a socket."""

    def from_board(self, data: bytes, now_us: int) -> None:
        """The board has sent these bytes."""

    def to_board(self, now_us: int, room: int) -> bytes:
        """The next bytes for the board, at most `room`."""

    def room_for_board(self) -> int:
        """How many bytes the board may send now: none while the host's port is open and nobody reads."""

    def next_due_us(self, now_us: int) -> int | None:
        """When the script next wants to act; None if never."""

    def act(self, now_us: int) -> None:
        """Do what is due. Raises Restart or Finished."""


class Engine:
    """One board's run. `ticks` counts the exchanges; `heap_used` is the guest's last figure, in bytes.

    read_slots: set by the runner; gives the board's slots, to know what settings it has put in force.
    pace: called with each step in microseconds before it passes; may wait.
    """

    def __init__(self, world: World, script: Script, uid: str = "virtual-1", boot: int = 1) -> None:
        self.world = world
        self.script = script
        self.uid = uid
        self.boot = boot
        self.ticks = 0
        self.heap_used = 0
        self.pace: Callable[[int], None] | None = None
        self.read_slots: Callable[[], Slots] = dict
        self._pending = b""
        self._given = b""
        self._first = True
        self._fed_us = 0

    def begin(self) -> None:
        """A board starts (again)."""
        self._first = True
        self._pending = b""
        self._given = b""
        self._fed_us = self.world.now_us

    def restarted(self, why: str = "") -> None:
        """Count a boot; the world's outputs are off. why: for the log."""
        self.boot += 1
        self.world.power_cut()

    def exchange(self, io: MutableSequence[int], rx: MutableSequence[int], tx: Bytes) -> None:
        """Between two ticks. Raises Restart, Finished or InvariantBroken."""
        if self._first:
            # Before the first tick: the firmware starts and reads its clock, nothing else.
            self._first = False
            self._fill(io)
            return
        self.ticks += 1
        self._take(io, tx)
        self._pass(io[at.DUE_US])
        self.script.act(self.world.now_us)
        self._fill(io)
        self._give_bytes(io, rx)

    # ---- what the board wanted

    def _take(self, io: MutableSequence[int], tx: Bytes) -> None:
        world = self.world
        for bank in range(at.BANKS):
            place = at.BANKS_OUT + bank * at.BANK_OUT_WORDS
            if io[place + at.MASK]:
                mask = io[place + at.MASK]
                io[place + at.MASK] = 0
                world.start_pulse(bank, io[place + at.GROUP], mask, io[place + at.WIDTH_US])
        for bank in range(len(world.hardware)):
            world.set_charge(bank, not (io[at.CHARGE] >> bank) & 1)
        world.follower_bits[0] = io[at.FOLLOWERS]
        world.follower_bits[1] = io[at.FOLLOWERS + 1]
        if io[at.TX_COUNT]:
            self.script.from_board(bytes(tx[: io[at.TX_COUNT]]), world.now_us)
            io[at.TX_COUNT] = 0
        self._pending = self._given[io[at.RX_TAKEN] :] + self._pending
        self._given = b""
        if io[at.HEAP_USED]:
            self.heap_used = io[at.HEAP_USED]
        self._take_rare(io)

    def _take_rare(self, io: MutableSequence[int]) -> None:
        """What does not happen in every tick: flash, new settings, the watchdog, a reset."""
        world = self.world
        if io[at.FLASHED] or io[at.WROTE]:
            world.write_flash(io[at.FLASHED])
            io[at.FLASHED] = 0
            io[at.WROTE] = 0
        if io[at.CONFIGURED]:
            io[at.CONFIGURED] = 0
            world.put_in_force(settings_in_slots(self.read_slots()))
        if io[at.FED]:
            io[at.FED] = 0
            self._fed_us = world.now_us
        if io[at.RESET]:
            io[at.RESET] = 0
            raise Restart("the board reset itself")

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
        if world.now_us - self._fed_us > WATCHDOG_US:
            raise Restart("the watchdog was not fed")

    # ---- how things are

    def _fill(self, io: MutableSequence[int]) -> None:
        world = self.world
        io[at.TICKS_US] = world.ticks_us()
        io[at.TICKS_MS] = world.ticks_ms()
        io[at.INPUTS] = world.inputs.word(0)
        io[at.INPUTS + 1] = world.inputs.word(1)
        io[at.TX_ROOM] = min(at.TX_BYTES, self.script.room_for_board())
        for bank in range(at.BANKS):
            place = at.BANKS_IN + bank * at.BANK_IN_WORDS
            if bank >= len(world.hardware):
                # A bank that the settings may speak of, but that is not there: nothing to read.
                io[place + at.LOW_MV] = io[place + at.MEAN_MV] = io[place + at.LAST_MV] = -1
                continue
            reading = world.read_bank(bank)
            io[place + at.LOW_MV] = reading.low_mv
            io[place + at.MEAN_MV] = reading.mean_mv
            io[place + at.LAST_MV] = reading.last_mv
            io[place + at.AGE_US] = reading.age_us
            io[place + at.RUNNING] = 1 if world.hardware[bank].running(world.now_us) else 0

    def _give_bytes(self, io: MutableSequence[int], rx: MutableSequence[int]) -> None:
        data = self._pending
        if len(data) < at.RX_BYTES:
            data += self.script.to_board(self.world.now_us, at.RX_BYTES - len(data))
        self._given, self._pending = data[: at.RX_BYTES], data[at.RX_BYTES :]
        for place, byte in enumerate(self._given):
            rx[place] = byte
        io[at.RX_COUNT] = len(self._given)
        io[at.RX_TAKEN] = 0
