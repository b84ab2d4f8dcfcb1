"""An emulated RP2040 (rp2040py) that boots a MicroPython UF2, driven step by step: the same calls, the same history.

What was found wrong in version 0.3.6 is put right from outside, each with what it does otherwise. The processor's
instruction times have no flash wait states, so times here are too good; order and outcome are right.
"""

from rp2040py.boards import BoardSpec, FlashLayout
from rp2040py.device import MicroPythonDevice
from rp2040py.execute_batch import execute_batch
from rp2040py.gpio_pin import GPIOPinState
from rp2040py.memory_map import FLASH_START_ADDRESS

LAYOUT = FlashLayout(fs_start=0xA0000, fs_blockcount=352, fs_blocksize=4096)
CYCLE_NANOS = 8.0


class GuestError(RuntimeError):
    """What was run on the board raised."""


def quiet_usb(device):
    """NAK an armed OUT endpoint while the host has nothing to send (a real host does).

    Unpatched, the emulator completes the OUT transfer with a zero-length packet every 10 us; the
    guest spends ~2/3 of its time in the USB interrupt (3x slower than a real board)."""
    cdc, usb = device.cdc, device.cdc.usb
    serve = usb.on_endpoint_read
    push = cdc.send_serial_byte
    cleanup = usb.on_reset
    state = {"size": None, "armed": False}

    def fire():
        state["armed"] = False
        size, state["size"] = state["size"], None
        if size is not None:
            serve(cdc._out_endpoint, size)

    alarm = device.simulator.clock.create_alarm(fire)

    def on_read(endpoint, size):
        if endpoint == cdc._out_endpoint and endpoint > 0 and cdc.tx_fifo.empty:
            state["size"] = size
        else:
            serve(endpoint, size)

    def send(byte):
        push(byte)
        if state["size"] is not None and not state["armed"]:
            state["armed"] = True
            alarm.schedule(20_000)  # 20 us: lets a burst of bytes share one packet

    def on_reset():
        state["size"], state["armed"] = None, False
        alarm.cancel()
        if cleanup:
            cleanup()

    usb.on_endpoint_read = on_read
    cdc.send_serial_byte = send
    usb.on_reset = on_reset


def fix_adc(adc):
    """Correct round robin (0.3.6 masks the channel with 12 instead of 7: 1,2,3 become 0) and
    drive DREQ on FCS writes too."""
    import rp2040py.peripherals.adc as mod

    class FixedADC(mod.RPADC):
        @property
        def _active_channel(self):
            return (self.cs >> mod.CS_AINSEL_SHIFT) & mod.CS_AINSEL_MASK

        @_active_channel.setter
        def _active_channel(self, channel):
            self.cs = (self.cs & ~(7 << mod.CS_AINSEL_SHIFT)) | ((channel % self.num_channels) << mod.CS_AINSEL_SHIFT)

        def write_uint32(self, offset, value):
            super().write_uint32(offset, value)
            if offset == mod.FCS:
                if self.fcs & mod.FCS_DREQ_EN:
                    self._update_dma()
                else:
                    self.rp2040.dma.clear_dreq(self.dreq)

    adc.__class__ = FixedADC


class Pads:
    """Pads as on the chip: input enabled out of reset (0.3.6 resets them to 0x36, the chip to 0x56),
    an output read back by the guest shows its own level (0.3.6: always the outside level), and
    drive(pin, 0/1/None) for what is wired to the pin from outside."""

    def __init__(self, board):
        self.gpio = board.mcu.gpio
        self.outside = {}
        for number, pin in enumerate(self.gpio):
            pin.add_listener(lambda state, _old, number=number: self._settle(number, state))
        usb = board.cdc.usb
        after = usb.on_reset

        def on_reset():
            self._power_on()
            after()

        usb.on_reset = on_reset
        self._power_on()

    def _power_on(self):
        for number, pin in enumerate(self.gpio):
            pin.pad_value = 0x56
            self._settle(number, pin.value)

    def _settle(self, number, state):
        pin = self.gpio[number]
        if state == GPIOPinState.HIGH or state == GPIOPinState.LOW:
            pin.set_input_value(state == GPIOPinState.HIGH)
        elif self.outside.get(number) is None:
            pin.release_input()
        else:
            pin.set_input_value(bool(self.outside[number]))

    def drive(self, number, level):
        self.outside[number] = level
        self._settle(number, self.gpio[number].value)


class PioPacer:
    """Keeps PIO running at its own pace while the CPU sleeps (WFE/WFI).

    Unpatched, an idle jump goes straight to the next clock alarm (up to 1 ms and more) and every
    state machine executes ONE instruction for it. This wakes the clock at each PIO due time."""

    def __init__(self, device, poll_nanos=1000.0):
        self.clock = device.simulator.clock
        self.pios = device.mcu.pio
        self.poll = poll_nanos
        self.armed = self.settled = False
        self.alarm = self.clock.create_alarm(self._fire)
        peripherals = device.mcu.peripherals
        for key, item in list(peripherals.items()):
            for pio in self.pios:
                if item is pio:
                    peripherals[key] = _PioProxy(pio, self)

    def kick(self):
        if not self.armed and any(not pio.stopped for pio in self.pios):
            self.armed = True
            self.alarm.schedule(CYCLE_NANOS)

    def _fire(self):
        # Alarms fire inside clock.tick(), before the loop hands the jump's cycles to the PIO: cycle_fp
        # is behind by that jump. So each wake has two halves: one at the due time (the step runs right
        # after it), one a cycle later that reads the settled cycle_fp and plans the next wake.
        self.armed = False
        running = [pio for pio in self.pios if not pio.stopped]
        if not running:
            return
        self.armed = True
        self.settled = not self.settled
        if self.settled:
            self.alarm.schedule(CYCLE_NANOS)
            return
        ahead = min((pio.next_due_fp - pio.cycle_fp) / 32.0 - CYCLE_NANOS for pio in running)
        self.alarm.schedule(min(max(ahead, CYCLE_NANOS), self.poll))


class _PioProxy:
    def __init__(self, pio, pacer):
        self._pio, self._pacer = pio, pacer
        self.read_uint32 = pio.read_uint32

    def __getattr__(self, name):
        return getattr(self._pio, name)

    def write_uint32(self, offset, value):
        self._pio.write_uint32(offset, value)
        self._pacer.kick()

    def write_uint32_atomic(self, offset, value, kind):
        self._pio.write_uint32_atomic(offset, value, kind)
        self._pacer.kick()


def slow_flash(board, erase_micros=45_000.0, page_micros=400.0):
    """Make erase and page program take time (unpatched: none). The guest polls the status with
    interrupts off, as on a real board: about 1 s of wall time for each sector erased."""
    ssi, clock = board.mcu.ssi, board.clock
    apply, shift = ssi._apply_command, ssi._shift_byte
    until = [0.0]

    def apply_command():
        opcode = ssi._tx_buffer[0] if ssi._tx_buffer else None
        enabled = ssi._write_enabled
        apply()
        if enabled and opcode in (0x20, 0xD8, 0x02):
            until[0] = clock.nanos + 1000.0 * (page_micros if opcode == 0x02 else erase_micros)

    def shift_byte(byte):
        answer = shift(byte)
        if len(ssi._tx_buffer) > 1 and ssi._tx_buffer[0] == 0x05 and clock.nanos < until[0]:
            answer |= 1
        return answer

    ssi._apply_command, ssi._shift_byte = apply_command, shift_byte


class GpioTrace:
    """Level changes of chosen pins as (nanos, pin, level 0/1 or None for not driven)."""

    def __init__(self, board, pins):
        self.edges = []
        self.levels = {}
        clock = board.clock

        def note(number, state):
            level = {GPIOPinState.LOW: 0, GPIOPinState.HIGH: 1}.get(state)
            if self.levels.get(number) != level:
                self.levels[number] = level
                self.edges.append((clock.nanos, number, level))

        for number in pins:
            note(number, board.mcu.gpio[number].value)
            board.mcu.gpio[number].add_listener(lambda state, _old, number=number: note(number, state))

        # A chip reset releases the pads but the emulator tells no listener: look for ourselves.
        usb = board.cdc.usb
        after = usb.on_reset

        def on_reset():
            for number in pins:
                note(number, board.mcu.gpio[number].value)
            after()

        usb.on_reset = on_reset


class Board:
    """One board: `boot` it, `advance` it, `send` it bytes and read `console`."""

    def __init__(self, image, filesystem=None):
        self.device = MicroPythonDevice(board=BoardSpec(image=image, layout=LAYOUT), filesystem=filesystem)
        self.mcu, self.simulator = self.device.mcu, self.device.simulator
        self.cdc = self.device.cdc
        self.clock = self.simulator.clock
        self.console = bytearray()  # everything the guest printed
        self.cdc.on_serial_data = self.console.extend
        self.connections = 0
        self.cdc.on_device_connected = self._connected
        self._batch = execute_batch
        self._limit = self.clock.create_alarm(self._stop)
        quiet_usb(self.device)
        fix_adc(self.mcu.adc)
        self.pads = Pads(self)
        self.pacer = PioPacer(self.device)

    def _connected(self):
        self.connections += 1

    def _stop(self):
        self.simulator.stopped = True

    @property
    def micros(self):
        return self.clock.micros

    def advance(self, micros):
        """Run exactly this much emulated time (to the end of the instruction that crosses it)."""
        simulator, batch = self.simulator, self._batch
        simulator.stopped = False
        self._limit.schedule(micros * 1000.0)
        while not simulator.stopped:  # a native batch also ends after 5 ms of wall time: just go on
            batch(simulator, 1)

    def advance_until(self, condition, limit_micros=2e6, slice_micros=100.0):
        end = self.micros + limit_micros
        while not condition():
            if self.micros >= end:
                raise TimeoutError(
                    f"not within {limit_micros:.0f} us emulated; console tail {bytes(self.console[-200:])!r}"
                )
            self.advance(slice_micros)

    def at(self, delay_micros, callback):
        """Call back at emulated now + delay, exactly (inside advance)."""
        self.clock.create_alarm(callback).schedule(delay_micros * 1000.0)

    def boot(self, limit_micros=2e6):
        before = self.connections
        self.mcu.core.pc = FLASH_START_ADDRESS
        self.advance_until(lambda: self.connections > before, limit_micros)
        self.advance(2000)

    def reset(self, cause=None, limit_micros=2e6):
        """RUN-pin reset (or device.hard_reset(cause=ResetCause....)); flash kept."""
        before = self.connections
        self.device.hard_reset(**({"cause": cause} if cause else {}))
        self.advance_until(lambda: self.connections > before, limit_micros)
        self.advance(2000)

    def send(self, data, limit_micros=2e6):
        """Host to guest; the emulator's host FIFO holds 512 bytes, so wait for room."""
        for byte in data:
            self.advance_until(lambda: not self.cdc.tx_fifo.full, limit_micros)
            self.cdc.send_serial_byte(byte)

    def expect(self, text, start=0, limit_micros=2e6):
        self.advance_until(lambda: self.console.find(text, start) >= 0, limit_micros)
        return self.console.find(text, start) + len(text)

    def start(self, source, limit_micros=2e6):
        """Begin source in the raw REPL and return at once (once it is accepted and runs)."""
        mark = len(self.console)
        self.send(b"\r\x03\x03\x01")
        mark = self.expect(b"raw REPL; CTRL-B to exit\r\n>", mark)
        self.send(source.encode() + b"\x04")
        self._mark = self.expect(b"OK", mark, limit_micros)

    def finish(self, limit_micros=60e6):
        """Wait for the code begun by start(); return what it printed."""
        first = self.expect(b"\x04", self._mark, limit_micros)
        second = self.expect(b"\x04>", first)
        out, err = bytes(self.console[self._mark : first - 1]), bytes(self.console[first : second - 2])
        self.send(b"\x02")  # back to the friendly REPL
        if err:
            raise GuestError(err.decode())
        return out.decode().replace("\r\n", "\n")

    def run(self, source, limit_micros=60e6):
        self.start(source)
        return self.finish(limit_micros)
