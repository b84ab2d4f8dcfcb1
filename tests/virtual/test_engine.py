"""The rule for passing time, bytes that wait, flash, watchdog and resets, with a board of plain buffers."""

import array

import pytest

from sim.engine import BUSY_STEP_US, LONGEST_STEP_US, Engine, Restart
from sim.guest import exchange as at
from sim.layout import demo_layout_path, load_layout
from sim.world import FLASH_US, InvariantBroken, World


class Quiet:
    """A script that gives bytes and has a moment at which it wants to act."""

    def __init__(self) -> None:
        self.out = b""
        self.heard = b""
        self.due_us: int | None = None
        self.room = at.TX_BYTES
        self.acted: list[int] = []

    def from_board(self, data: bytes, now_us: int) -> None:
        self.heard += data

    def to_board(self, now_us: int, room: int) -> bytes:
        data, self.out = self.out[:room], self.out[room:]
        return data

    def room_for_board(self) -> int:
        return self.room

    def next_due_us(self, now_us: int) -> int | None:
        return self.due_us

    def act(self, now_us: int) -> None:
        self.acted.append(now_us)


class Plain:
    """A board that is nothing but its buffers."""

    def __init__(self, charged: bool = True) -> None:
        self.layout = load_layout(demo_layout_path())
        physics = self.layout.physics
        self.world = World(self.layout.settings, physics.supply, physics.banks, physics.make_motors(), seed=1)
        if charged:
            for bank in (0, 1):
                self.world.circuit.set_bank_v(bank, 15.8)
        self.script = Quiet()
        self.engine = Engine(self.world, self.script)
        self.engine.read_slots = lambda: {0: self.layout.slot_lines()}
        self.io = array.array("i", [0] * at.WORDS)
        self.rx = bytearray(at.RX_BYTES)
        self.tx = bytearray(at.TX_BYTES)
        self.engine.begin()
        self.exchange(0)
        self.io[at.CONFIGURED] = 1

    def exchange(self, due_us: int, taken: int = 0) -> int:
        """One exchange; returns how much time passed."""
        before_us = self.world.now_us
        self.io[at.DUE_US] = due_us
        self.io[at.RX_TAKEN] = taken
        self.io[at.FED] = 1
        self.engine.exchange(self.io, self.rx, self.tx)
        return self.world.now_us - before_us

    def given(self) -> bytes:
        return bytes(self.rx[: self.io[at.RX_COUNT]])


@pytest.mark.parametrize(
    ("due_us", "passes_us"),
    [(0, BUSY_STEP_US), (1, BUSY_STEP_US), (3000, 3000), (20_000, 20_000), (10_000_000, LONGEST_STEP_US)],
)
def test_time_passes_until_something_is_due(due_us: int, passes_us: int) -> None:
    assert Plain().exchange(due_us) == passes_us


def test_the_script_and_the_world_are_waited_for_not_overslept() -> None:
    board = Plain()
    board.exchange(0)
    board.script.due_us = board.world.now_us + 7000
    assert board.exchange(50_000) == 7000
    board.script.due_us = None
    board.world.inputs.hold(9, True, board.world.now_us, 12_000)
    assert board.exchange(50_000) == 12_000


def test_bytes_that_are_not_read_are_given_again() -> None:
    board = Plain()
    board.script.out = b"first line\nsecond line\n"
    board.exchange(20_000)
    assert board.given() == b"first line\nsecond line\n"
    assert board.exchange(20_000, taken=11) == BUSY_STEP_US, "the rest waits"
    assert board.given() == b"second line\n"
    board.exchange(20_000, taken=12)
    assert board.given() == b""


def test_a_long_input_comes_whole_and_in_order() -> None:
    board = Plain()
    sent = bytes(range(1, 251)) * 9
    board.script.out = sent
    got = b""
    board.exchange(0)
    for turn in range(400):
        part = board.given()[: 1 + turn % 64]
        got += part
        board.exchange(0, taken=len(part))
    assert got == sent


def test_what_the_board_sends_arrives_and_a_deaf_host_leaves_no_room() -> None:
    board = Plain()
    board.tx[:5] = b"hello"
    board.io[at.TX_COUNT] = 5
    board.script.room = 0
    board.exchange(0)
    assert board.script.heard == b"hello" and board.io[at.TX_COUNT] == 0
    assert board.io[at.TX_ROOM] == 0


def test_a_pulse_is_carried_out_and_shown_as_running_with_its_gap() -> None:
    board = Plain()
    board.exchange(0)
    place = at.BANKS_OUT
    board.io[place + at.GROUP], board.io[place + at.MASK], board.io[place + at.WIDTH_US] = 0, 2, 40_000
    board.exchange(10_000)
    assert board.io[place + at.MASK] == 0 and len(board.world.pulses) == 1
    running = at.BANKS_IN + at.RUNNING
    assert board.io[running] == 1 and board.io[at.BANKS_IN + at.LOW_MV] == -1
    shown = 10_000
    while board.io[running]:
        shown += board.exchange(5000)
    assert shown == 60_000, "40 ms and a gap of 20 ms"


def test_flash_takes_time_and_spoils_the_samples_before_it() -> None:
    board = Plain()
    board.exchange(0)
    board.io[at.FLASHED] = 2
    assert board.exchange(0) == 2 * FLASH_US + BUSY_STEP_US
    board.io[at.FLASHED] = 1
    board.world.start_pulse(0, 0, 2, 40_000)
    with pytest.raises(InvariantBroken, match="flash"):
        board.exchange(0)


def test_a_watchdog_that_is_not_fed_and_a_reset_restart_the_board() -> None:
    board = Plain()
    with pytest.raises(Restart, match="watchdog"):
        for _ in range(100):
            board.io[at.DUE_US] = 50_000
            board.engine.exchange(board.io, board.rx, board.tx)
    assert 1_900_000 < board.world.now_us < 2_200_000
    board = Plain()
    board.io[at.RESET] = 1
    with pytest.raises(Restart, match="reset itself"):
        board.exchange(0)
    board.engine.restarted()
    assert board.engine.boot == 2
    with pytest.raises(InvariantBroken, match="without settings"):
        board.world.start_pulse(0, 0, 2, 40_000)


def test_a_bank_that_is_not_there_reads_nothing() -> None:
    board = Plain()
    board.exchange(0)
    place = at.BANKS_IN + 2 * at.BANK_IN_WORDS
    assert [board.io[place + part] for part in (at.LOW_MV, at.MEAN_MV, at.LAST_MV)] == [-1, -1, -1]
