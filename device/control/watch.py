"""Faults of a bank and its charge path, from millivolts and times only.

What is told apart, and by what:
- sense out of range: more than the supply can give; or nothing at all, faster than any coil could empty the bank;
- held down: without a pulse the bank falls faster than its bleed could; or it stays at a low, steady voltage;
- supply missing: it does not rise, or falls slowly from where it was;
- recharge stalled: it rises, but does not reach its highest ready voltage in the time allowed.
"""

from device.control import recharge
from device.control.faults import FaultBook
from device.control.gate import BankGate, most_plausible_mv
from device.control.ticks import LONG_AGO, Marks
from shared_protocol.settings_check import charge_time_constant_ms
from shared_protocol.words import HELD_DOWN, RECHARGE_STALLED, SCOPE_BANK, SENSE_RANGE, SUPPLY_MISSING

WINDOW_MS = 100
# A collapse: from above FALLEN_FROM to below NOTHING between two looks no further apart than LOOK_MS.
_FALLEN_FROM_MV = 2000
_NOTHING_MV = 100
_LOOK_MS = 25
_OVER_COUNT = 5
# Readings closer than this are the same: noise and the divider's steps.
_SAME_MV = 60

# Below full, a bank that gains nothing in this time and sinks is not being charged.
SINK_MS = 500

_RISE, _WINDOW, _LOOK, _SINK = 0, 1, 2, 3


class BankWatch:
    """Watches one bank whenever its samples are fresh."""

    def __init__(self, gate: BankGate, faults: FaultBook) -> None:
        self._gate = gate
        self._faults = faults
        self._marks = Marks(4)
        self._tau_ms = charge_time_constant_ms(gate.settings.charge)
        self._most_mv = most_plausible_mv(gate.settings)
        self._begun = False
        self._after_pulse = False
        self._rise_mv = 0
        self._window_mv = 0
        self._sink_mv = 0
        self._look_mv = -1
        self._peak_mv = 0
        self._reached = False
        self._over = 0

    def begin(self, after_pulse: bool) -> None:
        """Start over with the next fresh reading: after a pulse, a clear, a return of the charge."""
        self._begun = False
        self._after_pulse = after_pulse
        self._over = 0

    def update(self, now_ms: int) -> None:
        """Look at the bank; reports a fault to the book."""
        gate = self._gate
        if gate.running:
            self.begin(True)
            return
        if not gate.fresh or self._faults.bank_out(gate.number):
            return
        mv = gate.mean_mv
        if not self._begun:
            if not self._after_pulse or mv > _NOTHING_MV:
                self._look_mv = -1
            self._start(mv, now_ms)
            return
        if self._impossible(mv, now_ms):
            return
        if not gate.charge_on:
            self._start(mv, now_ms)
            return
        if self._marks.since(_WINDOW, now_ms) >= WINDOW_MS and self._falls(mv, now_ms):
            return
        self._rises(mv, now_ms)

    def _start(self, mv: int, now_ms: int) -> None:
        self._begun = True
        self._reached = False
        self._rise_mv = mv
        self._window_mv = mv
        self._sink_mv = mv
        self._peak_mv = mv
        self._marks.set(_RISE, now_ms)
        self._marks.set(_WINDOW, now_ms)
        self._marks.set(_SINK, now_ms)

    def _report(self, code: int, first: int, second: int) -> bool:
        self._faults.report(SCOPE_BANK, self._gate.number, code, first, second, self._gate.last_junction)
        return True

    def _impossible(self, mv: int, now_ms: int) -> bool:
        settings = self._gate.settings
        if mv > self._most_mv:
            self._over += 1
            if self._over >= _OVER_COUNT:
                return self._report(SENSE_RANGE, mv, settings.peak_mv)
            return True
        self._over = 0
        before_mv = self._look_mv
        soon = self._marks.since(_LOOK, now_ms) <= _LOOK_MS
        self._look_mv = mv
        self._marks.set(_LOOK, now_ms)
        if soon and before_mv > _FALLEN_FROM_MV and mv < _NOTHING_MV:
            return self._report(SENSE_RANGE, mv, before_mv)
        return False

    def _falls(self, mv: int, now_ms: int) -> bool:
        """Once a window: has it fallen without a pulse?"""
        full_mv = self._gate.settings.full_mv
        fell_mv = self._window_mv - mv
        if fell_mv > full_mv // 10:
            return self._report(HELD_DOWN, mv, self._window_mv)
        if mv > self._peak_mv:
            self._peak_mv = mv
        if self._peak_mv - mv > full_mv // 8 + _SAME_MV:
            return self._report(SUPPLY_MISSING, mv, self._peak_mv)
        self._window_mv = mv
        self._marks.set(_WINDOW, now_ms)
        return self._marks.since(_SINK, now_ms) >= SINK_MS and self._sinks(mv, now_ms)

    def _sinks(self, mv: int, now_ms: int) -> bool:
        """It should be charging, and sinks through its bleed instead."""
        settings = self._gate.settings
        due_mv = recharge.charged_mv(settings, self._sink_mv, SINK_MS) - self._sink_mv
        if due_mv > settings.full_mv // 16 and self._sink_mv - mv > _SAME_MV:
            return self._report(SUPPLY_MISSING, mv, self._sink_mv)
        self._sink_mv = mv
        self._marks.set(_SINK, now_ms)
        return False

    def _rises(self, mv: int, now_ms: int) -> None:
        gate = self._gate
        if self._reached:
            return
        if mv >= gate.top_ready_mv:
            self._reached = True
            return
        passed_ms = self._marks.since(_RISE, now_ms)
        if passed_ms == LONG_AGO:
            return
        charge = gate.settings.charge
        look_ms = max(self._tau_ms, 2 * WINDOW_MS) if self._after_pulse else charge.stall_ms // 2
        if passed_ms < look_ms:
            return
        gain_mv = recharge.charged_mv(gate.settings, self._rise_mv, passed_ms) - self._rise_mv
        if gain_mv > 500 and mv - self._rise_mv < gain_mv // 5:
            self._no_rise(mv, passed_ms)
        elif passed_ms >= charge.stall_ms:
            self._report(RECHARGE_STALLED, mv, passed_ms)

    def _no_rise(self, mv: int, passed_ms: int) -> None:
        """It does not charge at all: emptied by a coil, or nothing charges it?"""
        fell_mv = self._rise_mv - mv
        full_mv = self._gate.settings.full_mv
        if fell_mv > self._rise_mv // 8 + _SAME_MV:
            self._report(HELD_DOWN, mv, self._rise_mv)
        elif not self._after_pulse and full_mv // 64 < mv < full_mv // 3 and fell_mv < mv // 32:
            # Steady at what a coil and the charge resistor divide: a bank left alone would sink through its bleed.
            self._report(HELD_DOWN, mv, self._rise_mv)
        elif mv > full_mv // 3 and fell_mv < mv // 32:
            # Something charges it, or it would have sunk; but it does not get there.
            if passed_ms >= self._gate.settings.charge.stall_ms:
                self._report(RECHARGE_STALLED, mv, passed_ms)
        else:
            self._report(SUPPLY_MISSING, mv, self._rise_mv)
