"""Power cuts at every program and erase of real littlefs: afterwards there is one whole set, the old or the new."""

import hashlib
from pathlib import Path

import pytest

from device.board.seam import Board
from device.board.slots import FileSlots
from device.control.store import SettingsStore
from shared_protocol import registry
from shared_protocol.line import LineDecoder
from sim.layout import load_layout
from tests.flash.cut_flash import WAYS, CutFlash, mounted

LAYOUTS = Path(__file__).parents[2] / "sim" / "layouts"


class SlotBoard(Board):
    """As much of a board as the store asks for, on a file system."""

    def __init__(self, flash: CutFlash, fresh: bool = False) -> None:
        slots = FileSlots(mounted(flash, fresh).open)
        self.slot_rewind = slots.rewind
        self.slot_line = slots.line
        self.slot_begin = slots.begin
        self.slot_write = slots.write
        self.slot_end = slots.end
        self.slot_append = slots.append
        self.fired = 0

    def feed_watchdog(self) -> None:
        """Nobody waits."""

    def start_pulse(self, bank: int, group: int, mask: int, width_us: int) -> bool:
        self.fired += 1
        return True


def store_on(flash: CutFlash, fresh: bool = False) -> tuple[SettingsStore, SlotBoard]:
    """A store as after a start; nothing is loaded yet."""
    board = SlotBoard(flash, fresh)
    return SettingsStore(board, LineDecoder(registry.board_reads())), board


def sets() -> list[tuple[list[bytes], bytes]]:
    """Bodies and sum of three different sets."""
    found = []
    lines = load_layout(LAYOUTS / "small_bank.toml").slot_lines()
    for name in (b"One", b"Two", b"Three"):
        bodies = [lines[0].replace(lines[0].split(b'"name":"')[1].split(b'"')[0], name), *lines[1:-1]]
        found.append((bodies, crc_of(bodies)))
    return found


def crc_of(bodies: list[bytes]) -> bytes:
    """The sum that a transfer ends with."""
    import zlib

    return b"%08X" % zlib.crc32(b"".join(body + b"\n" for body in bodies))


def transfer(store: SettingsStore, bodies: list[bytes], crc: bytes) -> None:
    """Stage and commit one set."""
    assert store.begin(len(bodies))
    for body in bodies:
        assert store.stage(body)
    assert store.commit(crc).problem is None


def in_force(flash: CutFlash) -> bytes:
    """The sum of the set that a board finds after a start, which fires nothing."""
    store, board = store_on(flash)
    settings = store.load()
    assert board.fired == 0
    assert settings is not None, "no whole set"
    return bytes(store.crc)


def begun(count: int) -> tuple[bytes, int]:
    """A chip with so many sets sent one after another; and its erases."""
    flash = CutFlash()
    store, _ = store_on(flash, True)
    for bodies, crc in sets()[:count]:
        transfer(store, bodies, crc)
    return bytes(flash.data), flash.erases


@pytest.mark.parametrize("way", WAYS)
@pytest.mark.parametrize("before", [1, 2])
def test_a_transfer_cut_anywhere_leaves_the_old_set_or_the_new(before: int, way: str) -> None:
    """before 1: the other slot is empty; 2: it holds an older set, which the new one takes the place of."""
    start, _ = begun(before)
    old = sets()[before - 1][1]
    bodies, new = sets()[before]
    whole = CutFlash(start)
    store, _ = store_on(whole)
    store.load()
    transfer(store, bodies, new)
    assert whole.steps > 5
    ends: dict[str, bytes] = {}
    for cut_at in range(1, whole.steps + 1):
        flash = CutFlash(start, cut_at, way)
        store, _ = store_on(flash)
        store.load()
        transfer(store, bodies, new)
        assert flash.dead
        after = CutFlash(bytes(flash.data))
        found = in_force(after)
        assert found in (old, new), (cut_at, way)
        ends[hashlib.sha256(bytes(flash.data)).hexdigest()] = found
        # And the next transfer works as ever.
        store, _ = store_on(after)
        store.load()
        transfer(store, bodies, new)
        assert in_force(CutFlash(bytes(after.data))) == new
    assert old in ends.values() and len(ends) > 3
    olds = sum(found == old for found in ends.values())
    print(f"{way}, {before} before: {whole.steps} cuts, {len(ends)} end states, {olds} old, {len(ends) - olds} new")


def test_a_slot_that_is_spoilt_leaves_the_other() -> None:
    start, _ = begun(2)
    flash = CutFlash(start)
    fs = mounted(flash)
    with fs.open("/slot1.txt", "rb") as file:
        text = file.read()
    for spoilt in (b"", text[:100], text[:-3], text.replace(b'"Two"', b'"Twp"'), b"\x00\xff" * 4000, b"x" * 60_000):
        with fs.open("/slot1.txt", "wb") as file:
            file.write(spoilt)
        assert in_force(CutFlash(bytes(flash.data))) == sets()[0][1]


def test_with_both_slots_spoilt_there_are_no_settings_and_nothing_fires() -> None:
    start, _ = begun(2)
    flash = CutFlash(start)
    fs = mounted(flash)
    for name in ("/slot0.txt", "/slot1.txt"):
        with fs.open(name, "wb") as file:
            file.write(b"nothing of ours\n")
    store, board = store_on(CutFlash(bytes(flash.data)))
    assert store.load() is None and board.fired == 0
