"""A board for tests of control alone: an ideal bank, contacts that obey, time that stands until it is moved.

Runs on CPython and MicroPython. Charging is a straight line; a pulse takes a fixed share of the bank.
"""

from device.board.seam import Board

MASK = (1 << 30) - 1
MOST_PULSES = 400


class BenchBank:
    """One bank: millivolts, and the pulse that runs."""

    def __init__(self) -> None:
        self.mv = 0
        self.full_mv = 16_000
        self.rise_mv_per_ms = 20
        self.charge_on = True
        self.left_us = 0
        self.gap_left_us = 0
        self.settle_left_us = 0
        self.mask = 0
        self.width_us = 0
        self.sense_mv = -1
        self.drop_percent = 80


class BenchBoard(Board):
    """See the seam. `pulses` lists (bank, group, mask, width_us, mv) of every pulse started."""

    kind = b"bench"
    uid = b"bench-1"
    caps = b""
    boot = 1

    def __init__(self, banks: int = 2, start_us: int = 0, start_ms: int = 0) -> None:
        self.banks = [BenchBank() for _ in range(banks)]
        self.us = start_us & MASK
        self.ms = start_ms & MASK
        self._part_us = 0
        self.in_bits = [0, 0]
        self.follower_bits = [0, 0]
        self._incoming = bytearray(8192)
        self._in_from = 0
        self._in_to = 0
        self._outgoing = bytearray(8192)
        self.out_count = 0
        # Every pulse started, in lists made beforehand: the tick that starts it may not allocate.
        self._pulse_log = [[0] * 5 for _ in range(MOST_PULSES)]
        self.pulse_count = 0
        self.slots: "dict[int, list[bytes]]" = {}
        self._open = -1
        self._reading: "list[bytes]" = []
        self.light = False
        self.figures = [-1, 0, 0, -1, -1]
        self.trace_count = 0
        self.settings: object = None
        self.settle_ms = 5
        self.gap_ms = 20
        self.was_reset = 0
        self.fed = 0
        self.flash_works = True

    # ---- what the test does

    def pass_us(self, us: int) -> None:
        """Let time pass; nothing else moves it."""
        self.us = (self.us + us) & MASK
        whole = self._part_us + us
        self.ms = (self.ms + whole // 1000) & MASK
        self._part_us = whole % 1000
        ms = whole // 1000
        pulsing = False
        for bank in self.banks:
            pulsing = pulsing or bank.left_us > 0
        for bank in self.banks:
            if bank.left_us > 0:
                bank.left_us -= us
                if bank.left_us <= 0:
                    bank.gap_left_us = self.gap_ms * 1000 + bank.left_us
                    bank.mv -= bank.mv * bank.drop_percent // 100
            elif bank.gap_left_us > 0:
                bank.gap_left_us -= us
            if pulsing:
                bank.settle_left_us = self.settle_ms * 1000
            elif bank.settle_left_us > 0:
                bank.settle_left_us -= us
            if bank.charge_on and bank.left_us <= 0 and bank.mv < bank.full_mv:
                bank.mv = min(bank.full_mv, bank.mv + bank.rise_mv_per_ms * ms)

    @property
    def pulses(self) -> "list[tuple[int, int, int, int, int]]":
        """Every pulse started: bank, group, mask, width_us, mv."""
        return [(log[0], log[1], log[2], log[3], log[4]) for log in self._pulse_log[: self.pulse_count]]

    def set_input(self, number: int, closed: bool) -> None:
        """Close or open one input."""
        bit = 1 << (number % 24)
        bits = self.in_bits[number // 24]
        self.in_bits[number // 24] = bits | bit if closed else bits & ~bit

    def say(self, line: bytes) -> None:
        """The host sends these bytes."""
        if self._in_from == self._in_to:
            self._in_from = 0
            self._in_to = 0
        for byte in line:
            self._incoming[self._in_to] = byte
            self._in_to += 1

    def unread(self) -> int:
        """How many bytes the board has not read yet."""
        return self._in_to - self._in_from

    def heard(self) -> bytes:
        """What the board has sent since the last call."""
        found = bytes(self._outgoing[: self.out_count])
        self.out_count = 0
        return found

    # ---- the seam

    def configure(self, settings: object) -> None:
        self.settings = settings

    def ticks_us(self) -> int:
        return self.us

    def ticks_ms(self) -> int:
        return self.ms

    def _sense(self, number: int) -> int:
        bank = self.banks[number]
        return bank.sense_mv if bank.sense_mv >= 0 else bank.mv

    def bank_low_mv(self, bank: int) -> int:
        if self.banks[bank].settle_left_us > 0 or self.banks[bank].left_us > 0:
            return -1
        return self._sense(bank)

    def bank_mean_mv(self, bank: int) -> int:
        return self.bank_low_mv(bank)

    def bank_last_mv(self, bank: int) -> int:
        return self._sense(bank)

    def bank_age_us(self, bank: int) -> int:
        return 0

    def start_pulse(self, bank: int, group: int, mask: int, width_us: int) -> bool:
        own = self.banks[bank]
        if own.left_us > 0 or own.gap_left_us > 0:
            return False
        own.left_us = width_us
        own.mask = mask
        own.width_us = width_us
        for other in self.banks:
            other.settle_left_us = self.settle_ms * 1000
        log = self._pulse_log[self.pulse_count % MOST_PULSES]
        log[0] = bank
        log[1] = group
        log[2] = mask
        log[3] = width_us
        log[4] = own.mv
        self.pulse_count += 1
        return True

    def pulse_running(self, bank: int) -> bool:
        return self.banks[bank].left_us > 0 or self.banks[bank].gap_left_us > 0

    def charge(self, bank: int, on: bool) -> None:
        self.banks[bank].charge_on = on

    def inputs(self, word: int) -> int:
        return self.in_bits[word]

    def followers(self, word: int, bits: int) -> None:
        self.follower_bits[word] = bits

    def read_byte(self) -> int:
        if self._in_from == self._in_to:
            return -1
        self._in_from += 1
        return self._incoming[self._in_from - 1]

    def write_byte(self, byte: int) -> bool:
        if self.out_count >= len(self._outgoing):
            return False
        self._outgoing[self.out_count] = byte
        self.out_count += 1
        return True

    def led(self, on: bool) -> None:
        self.light = on

    def figure(self, which: int) -> int:
        return self.figures[which]

    def trace_points(self, bank: int) -> int:
        return self.trace_count

    def trace_mv(self, bank: int, point: int) -> int:
        return 16_000 - 100 * point

    def trace_step_us(self) -> int:
        return 500

    def forget_crash(self) -> None:
        self.crash = b""

    def slot_rewind(self, slot: int) -> bool:
        self._reading = list(self.slots.get(slot, []))
        return slot in self.slots

    def slot_line(self) -> bytes:
        return self._reading.pop(0) if self._reading else b""

    def slot_begin(self, slot: int) -> bool:
        self._open = slot
        self.slots[slot] = []
        return self.flash_works

    def slot_write(self, line: bytes) -> bool:
        self.slots[self._open].append(line)
        return self.flash_works

    def slot_end(self) -> bool:
        return self.flash_works

    def slot_append(self, slot: int, line: bytes) -> bool:
        if self.flash_works:
            self.slots[slot].append(line)
        return self.flash_works

    def feed_watchdog(self) -> None:
        self.fed += 1

    def reset(self) -> None:
        self.was_reset += 1

    def before_tick(self, due_us: int) -> None:
        pass

    def after_tick(self) -> None:
        pass
