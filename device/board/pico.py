"""The board that the coils hang on: RP2040 or RP2350 with MicroPython. With boot.py the only file that knows `machine`.

It puts together what the modules beside it make: pulses by PIO, samples by DMA, chains, slots on flash, the USB link.
"""

import array
import gc
import os
import select
import sys
import time

import machine
import micropython
import rp2
import uctypes

from device.board.chip import CLEAR_ALIAS, WATCHDOG_ENABLE, Chip
from device.board.notes import Notes
from device.board.sampler import CONVERSIONS_HZ, INPUTS, WINDOW_US, Sampler
from device.board.seam import COLLECT_US, HEAP_FREE, LOOP_US, WORST_US, Board
from device.board.slots import FileSlots
from device.board.traces import STEP_US, Traces
from device.board.wiring import Wiring
from device.control.ticks import elapsed, later
from shared_protocol.settings import Settings

# A flash sector's erase may take 0.4 s; what a frozen pin could do before the reset is bounded by this.
WATCHDOG_MS = 2500
# A pulse counts as over so much later than its width says, in microseconds.
SLACK_US = 10
MOST_BANKS = 3
TICKS_MASK = 0x3FFF_FFFF
COIL_PINS = tuple(range(23)) + (26, 27, 28)
# Collecting takes some 10 ms: of the moments that control offers, every so many is used.
COLLECT_EACH = 4
RUNS_WELL_MS = 60_000


class PicoBoard(Board):
    """See the seam."""

    def __init__(self, chip: Chip, notes: Notes) -> None:
        self.chip = chip
        self.kind = chip.name.encode()
        self.uid = "".join(["%02x" % byte for byte in machine.unique_id()]).encode()
        self.boot = notes.boot
        self.cause = notes.cause
        self.crash = notes.crash
        self.stay_at_prompt = notes.stay_at_prompt
        self.caps = b"3 banks" + (b" address %d" % notes.address if notes.address else b"")
        self._notes = notes
        self._slots = FileSlots(open, "/", notes.address)
        # The clocks themselves: a call of our own around them would take as long again.
        self.ticks_us = time.ticks_us  # type: ignore[method-assign]
        self.ticks_ms = time.ticks_ms  # type: ignore[method-assign]
        self._sampler = Sampler(machine, rp2, uctypes, array.array, chip)
        self._traces = Traces(self._sampler, array.array)
        self._wiring: "Wiring | None" = None
        self._led = machine.Pin("LED", machine.Pin.OUT, value=0)
        # Which banks' pulses are on, and when each is over.
        self._on = [False] * MOST_BANKS
        self._end_us = [0] * MOST_BANKS
        self._any_on = False
        # Samples are not trusted until so long after the last disturbance.
        self._settled = False
        self._disturbed_us = 0
        self._settle_us = 5000
        self._in_ms = -1
        # For bank_reaches: which input a bank has, the voltage asked for last, the reading that it takes.
        self._channels: "list[int]" = []
        self._least_mv = [-1] * MOST_BANKS
        self._least = [0] * MOST_BANKS
        self._figures = _Figures(self._sampler)
        self._begun_ms = 0
        self._young = True
        self._asked = 0
        self._open_link()

    def _open_link(self) -> None:
        self._stdin = sys.stdin.buffer
        self._stdout = sys.stdout.buffer
        self._in = bytearray(1)
        self._out = bytearray(1)
        readable = select.poll()
        readable.register(sys.stdin, select.POLLIN)
        writable = select.poll()
        writable.register(sys.stdout, select.POLLOUT)
        self._readable = readable.ipoll
        self._writable = writable.ipoll
        # The first call of each makes what the later ones use again.
        for _ in self._readable(0):
            pass
        for _ in self._writable(0):
            pass

    # ---- start and end

    def begin(self) -> None:
        micropython.kbd_intr(-1)
        self._sampler.start()
        self._disturb()
        self._begun_ms = time.ticks_ms()
        self.feed_watchdog = machine.WDT(timeout=WATCHDOG_MS).feed  # type: ignore[method-assign]
        self._notes.running()
        self._figures.begin(time.ticks_us())

    def end(self) -> None:
        pins_low()
        self._sampler.close()
        machine.mem32[self.chip.watchdog + CLEAR_ALIAS] = WATCHDOG_ENABLE
        micropython.kbd_intr(3)
        self._notes.left()

    def reset(self) -> None:
        pins_low()
        self._notes.asked()
        machine.reset()

    def crashed(self, error: BaseException) -> None:
        pins_low()
        self._notes.crashed(error)
        machine.reset()

    def forget_crash(self) -> None:
        self.crash = b""
        self._notes.forget_crash()

    def feed_watchdog(self) -> None:
        """Nothing, until there is one."""

    def configure(self, settings: object) -> None:
        assert isinstance(settings, Settings)
        if self._wiring is not None:
            pins_low()
            rp2.PIO(0).remove_program()
        self._wiring = Wiring(machine, rp2, settings)
        self._settle_us = self._wiring.settle_us + WINDOW_US
        self._channels = self._wiring.channels
        self._least_mv = [-1] * MOST_BANKS
        self._disturb()

    # ---- the loop

    def before_tick(self, due_us: int) -> None:
        now_us = self.ticks_us()
        self._figures.round(now_us)
        if self._any_on:
            self._watch_pulses(now_us)

    def after_tick(self) -> None:
        """Nothing."""

    def _watch_pulses(self, now_us: int) -> None:
        """Which pulses are over? Copies their discharges."""
        wiring = self._wiring
        assert wiring is not None
        self._any_on = False
        for bank in range(len(wiring.pulsers)):
            if not self._on[bank]:
                continue
            self._any_on = True
            self._traces.take(bank, wiring.channels[bank], now_us)
            if elapsed(now_us, self._end_us[bank]) >= 0:
                self._on[bank] = False
                self._disturb()
                wiring.pulsers[bank].ended()
        if not self._any_on:
            wiring.flush()

    def _disturb(self) -> None:
        """Samples from before now are stale."""
        self._settled = False
        self._disturbed_us = self.ticks_us()

    def collect(self) -> None:
        self._asked += 1
        if self._asked >= COLLECT_EACH:
            self._asked = 0
            self._figures.collect()
        if self._young and elapsed(self.ticks_ms(), self._begun_ms) > RUNS_WELL_MS:
            self._young = False
            self._notes.runs_well()

    def figure(self, which: int) -> int:
        return self._figures.read(which)

    def led(self, on: bool) -> None:
        self._led.value(on)

    # ---- voltages

    def _fresh(self) -> bool:
        """True if no pulse and no writing of flash has disturbed the newest samples."""
        if self._settled:
            return True
        now_us = self.ticks_us()
        if self._any_on:
            # A pulse that is over by now still leaves its settling time.
            self._watch_pulses(now_us)
            if self._any_on:
                return False
        if elapsed(now_us, self._disturbed_us) < self._settle_us:
            return False
        if self._sampler.lost():
            self._sampler.start()
            self._disturb()
            return False
        self._settled = True
        return True

    def bank_low_mv(self, bank: int) -> int:
        wiring = self._wiring
        if wiring is None or not self._fresh():
            return -1
        sampler = self._sampler
        sampler.look(wiring.channels[bank])
        mv = (sampler.low * wiring.range_mv[bank] >> 12) + wiring.zero_mv[bank]
        return mv if mv > 0 else 0

    def bank_reaches(self, bank: int, mv: int) -> bool:
        if not self._settled and not self._fresh():
            return False
        if mv != self._least_mv[bank]:
            self._set_least(bank, mv)
        sampler = self._sampler
        if not sampler.reaches(self._channels[bank], self._least[bank]):
            return False
        # The mean that is asked for next is of now.
        sampler.channel = -1
        return True

    def _set_least(self, bank: int, mv: int) -> None:
        """The least reading that means `mv`: the same sum as in bank_low_mv, the other way round."""
        wiring = self._wiring
        assert wiring is not None
        range_mv = wiring.range_mv[bank]
        self._least_mv[bank] = mv
        self._least[bank] = (((mv - wiring.zero_mv[bank]) << 12) + range_mv - 1) // range_mv

    def bank_mean_mv(self, bank: int) -> int:
        wiring = self._wiring
        if wiring is None or not self._fresh():
            return -1
        sampler = self._sampler
        if sampler.channel != wiring.channels[bank]:
            sampler.look(wiring.channels[bank])
        # Without the lowest and the highest: a spike changes nothing.
        mean = (sampler.total - sampler.low - sampler.high) // 3
        mv = (mean * wiring.range_mv[bank] >> 12) + wiring.zero_mv[bank]
        return mv if mv > 0 else 0

    def bank_last_mv(self, bank: int) -> int:
        wiring = self._wiring
        if wiring is None:
            return -1
        sampler = self._sampler
        sampler.look(wiring.channels[bank])
        mean = (sampler.total - sampler.low - sampler.high) // 3
        mv = (mean * wiring.range_mv[bank] >> 12) + wiring.zero_mv[bank]
        return mv if mv > 0 else 0

    def bank_age_us(self, bank: int) -> int:
        return 1_000_000 * INPUTS // CONVERSIONS_HZ

    # ---- pulses, inputs, outputs

    def start_pulse(self, bank: int, group: int, mask: int, width_us: int) -> bool:
        wiring = self._wiring
        if wiring is None or self._on[bank] or not wiring.pulsers[bank].start(group, mask, width_us):
            return False
        now_us = self.ticks_us()
        self._on[bank] = True
        self._any_on = True
        self._end_us[bank] = later(now_us, width_us + SLACK_US)
        self._settled = False
        self._traces.begin(bank, now_us)
        return True

    def pulse_running(self, bank: int) -> bool:
        wiring = self._wiring
        return wiring is not None and (self._on[bank] or wiring.pulsers[bank].running())

    def charge(self, bank: int, on: bool) -> None:
        wiring = self._wiring
        if wiring is not None and wiring.cuts[bank] is not None:
            wiring.cuts[bank].value(on)

    def inputs(self, word: int) -> int:
        wiring = self._wiring
        if wiring is None:
            return 0
        now_ms = self.ticks_ms()
        if now_ms != self._in_ms:
            self._in_ms = now_ms
            wiring.read_inputs()
        return wiring.words[word]

    def followers(self, word: int, bits: int) -> None:
        if self._wiring is not None:
            self._wiring.followers(word, bits)

    def trace_points(self, bank: int) -> int:
        return self._traces.counts[bank]

    def trace_mv(self, bank: int, point: int) -> int:
        wiring = self._wiring
        raw = self._traces.raw(bank, point)
        if wiring is None or raw > 4095:
            return -1
        mv = (raw * wiring.range_mv[bank] >> 12) + wiring.zero_mv[bank]
        return mv if mv > 0 else 0

    def trace_step_us(self) -> int:
        return STEP_US

    # ---- the link

    def read_byte(self) -> int:
        for _ in self._readable(0):
            self._stdin.readinto(self._in)
            return self._in[0]
        return -1

    def write_byte(self, byte: int) -> bool:
        # Only when there is room: with a host that does not read, a write would wait for a second.
        for _ in self._writable(0):
            self._out[0] = byte
            self._stdout.write(self._out)
            return True
        return False

    # ---- flash

    def slot_rewind(self, slot: int) -> bool:
        return self._slots.rewind(slot)

    def slot_line(self) -> bytes:
        return self._slots.line()

    def slot_begin(self, slot: int) -> bool:
        done = self._slots.begin(slot)
        self._after_flash()
        return done

    def slot_write(self, line: bytes) -> bool:
        done = self._slots.write(line)
        self._after_flash()
        return done

    def slot_end(self) -> bool:
        done = self._slots.end()
        self._after_flash()
        return done

    def slot_append(self, slot: int, line: bytes) -> bool:
        done = self._slots.append(slot, line)
        self._after_flash()
        return done

    def _after_flash(self) -> None:
        """Interrupts were off: samples from before are stale, and the pause is not the loop's."""
        self._disturb()
        self._figures.begin(self.ticks_us())


class _Figures:
    """How the loop goes: see seam.LOOP_US and the rest."""

    def __init__(self, sampler: Sampler) -> None:
        self._sampler = sampler
        self._last_us = 0
        self._worst_us = 0
        self._rounds = 0
        self._begun_us = 0
        self._left = 0
        self._collect_us = 0
        self._heap_free = -1

    def begin(self, now_us: int) -> None:
        """What went before does not count as a round of the loop."""
        self._last_us = now_us
        self._begun_us = now_us
        self._rounds = 0
        self._left = self._sampler.left()

    def round(self, now_us: int) -> None:
        """Once round the loop (steady)."""
        took_us = (now_us - self._last_us) & TICKS_MASK
        self._last_us = now_us
        self._rounds += 1
        if took_us > self._worst_us:
            self._worst_us = took_us

    def collect(self) -> None:
        """Collect garbage and note how long that takes."""
        begun_us = time.ticks_us()
        gc.collect()
        took_us = elapsed(time.ticks_us(), begun_us)
        if took_us > self._collect_us:
            self._collect_us = took_us
        self._heap_free = gc.mem_free()
        self.begin(time.ticks_us())

    def read(self, which: int) -> int:
        """One figure; what is a longest time or a rate begins anew (steady)."""
        if which == HEAP_FREE:
            return self._heap_free
        if which == COLLECT_US:
            value = self._collect_us
            self._collect_us = 0
            return value
        if which == WORST_US:
            value = self._worst_us
            self._worst_us = 0
            return value
        window_us = elapsed(self._last_us, self._begun_us)
        if self._rounds == 0 or window_us < 1000:
            return -1
        if which == LOOP_US:
            return window_us // self._rounds
        # The rate is read last: then a new window begins.
        made = self._left - self._sampler.left()
        self.begin(self._last_us)
        if made < 0 or made > 1_000_000:
            return -1
        return made * 100 // (window_us // 100) * 100 // INPUTS


def pins_low() -> None:
    """Every pin that may drive a coil is taken from whatever had it, and driven low. Allocates."""
    for pin in COIL_PINS:
        machine.Pin(pin, machine.Pin.OUT, value=0)


def make_board() -> PicoBoard:
    """The board that this runs on."""
    chip = Chip(os.uname().machine)
    return PicoBoard(chip, Notes(machine, os, sys, chip))


def self_test() -> None:
    """At the prompt: tests the board without firing, and prints a line for each test (host: `board check`)."""
    from device.board.self_test import SelfTest

    SelfTest(machine, rp2, uctypes, array.array, gc, os, time, Chip(os.uname().machine)).run(sys.stdout.write)
