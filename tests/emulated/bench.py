"""The simulated layout around an emulated board: what its pins do moves the motors, what the banks hold feeds its ADC.

Chains are there as chips: what is shifted, latched and enabled is what drives the coils, and what is read back.
"""

import random
from pathlib import Path

from shared_protocol import registry
from shared_protocol.codec import Codec, plain, values_from
from shared_protocol.messages import TO_BOARD
from shared_protocol.settings import Settings
from sim.circuit import Circuit
from sim.inputs import Inputs
from sim.layout import Layout
from tests.emulated.emulator import Board, GpioTrace
from tests.emulated.image import build

MESSAGES = {message.name: message for message in TO_BOARD}
USEFUL_STEP_US = 2000


class ShiftOut:
    """74HC595s in a row: `bits` place by place, nearest first."""

    def __init__(self, board: Board, pins: list[int], places: int) -> None:
        self.bits = [False] * places
        self._data, clock, self._back = pins
        self._board = board
        listen(board, clock, self._clocked)

    def _clocked(self, level: int) -> None:
        if level:
            self.bits.insert(0, self._level())
            self.bits.pop()
            self._board.pads.drive(self._back, int(self.bits[-1]))

    def _level(self) -> bool:
        return level_of(self._board, self._data)


class ShiftIn:
    """74HC165s in a row."""

    def __init__(self, board: Board, pins: list[int], inputs: Inputs, places: int) -> None:
        self._board = board
        self._data, clock, load = pins
        self._inputs = inputs
        self._places = (places + 7) // 8 * 8
        self._left: list[int] = []
        listen(board, clock, self._clocked)
        listen(board, load, self._loaded)
        board.pads.drive(self._data, 1)

    def _loaded(self, level: int) -> None:
        if level:
            return
        self._inputs.update(int(self._board.micros))
        word = self._inputs.word(0) | (self._inputs.word(1) << 24)
        bits = []
        for chip in range(self._places // 8):
            bits += [0 if (word >> (8 * chip + place)) & 1 else 1 for place in range(7, -1, -1)]
        self._left = bits
        self._board.pads.drive(self._data, self._left[0])

    def _clocked(self, level: int) -> None:
        if level and self._left:
            self._left.pop(0)
            self._board.pads.drive(self._data, self._left[0] if self._left else 1)


def level_of(board: Board, pin: int) -> bool:
    """What a pin drives."""
    return board.mcu.gpio[pin].value.name == "HIGH"


def listen(board: Board, pin: int, hear) -> None:
    """Call `hear(level)` whenever the pin changes between low and high."""
    last = [level_of(board, pin)]

    def changed(_state, _old) -> None:
        level = level_of(board, pin)
        if level != last[0]:
            last[0] = level
            hear(int(level))

    board.mcu.gpio[pin].add_listener(changed)


class EmulatedLayout:
    """A board with the firmware, wired to a simulated layout. `messages` are (microseconds, name, fields)."""

    def __init__(self, image: str, layout: Layout, folder: Path, seed: int = 0, files: dict[str, bytes] | None = None):
        settings = layout.settings
        self.settings: Settings = settings
        physics = layout.physics
        self.motors = physics.make_motors()
        bank_of = [(motor.bank, self.motors[motor.i]) for motor in settings.motors]
        self.circuit = Circuit(physics.supply, physics.banks, bank_of, random.Random(seed))
        path = folder / "flash.img"
        slot = b"".join(line + b"\n" for line in layout.slot_lines())
        self.firmware_bytes = build(path, {"slot0.txt": slot} | (files or {}))
        self.board = Board(image, str(path))
        self.inputs = Inputs(settings, self.motors, random.Random(seed + 1))
        self.messages: list[tuple[float, str, dict[str, object]]] = []
        self.text: list[bytes] = []
        self._seen = 0
        self._writer = Codec(registry.board_reads())
        self._reader = Codec(registry.host_reads())
        self._wire()
        self.boot_number = 0

    def _wire(self) -> None:
        board, settings = self.board, self.settings
        io = settings.io
        assert io is not None
        self._wired = {}
        for motor in settings.motors:
            self._wired[motor.bank, motor.normal] = (motor.i, 0)
            self._wired[motor.bank, motor.reverse] = (motor.i, 1)
        chained = [bank for bank in settings.banks if bank.pin < 0]
        if io.in_chain:
            ShiftIn(board, io.in_pins, self.inputs, io.in_chain)
        places = sum((bank.coils + 7) // 8 * 8 for bank in chained) + (io.out_chain + 7) // 8 * 8
        chain = ShiftOut(board, io.out_pins, places) if chained else None
        self.coil_pins = []
        first = 0
        for bank in settings.banks:
            if bank.pin >= 0:
                pins = list(range(bank.pin, bank.pin + bank.coils))
                self.coil_pins += pins
                for pin in pins:
                    listen(board, pin, lambda _level, bank=bank, pins=pins: self._pins_moved(bank.i, pins))
            else:
                self.coil_pins.append(bank.chain[1])
                self._wire_part(bank, chain, first)
                first += (bank.coils + 7) // 8 * 8
        self.trace = GpioTrace(board, self.coil_pins)
        adc = board.mcu.adc
        ranges = {bank.adc: (bank.i, bank.range_mv) for bank in settings.banks}

        def sampled(channel: int) -> None:
            value = 0
            if channel in ranges:
                bank, range_mv = ranges[channel]
                self.circuit.advance(board.micros / 1e6)
                value = int(self.circuit.bank_v(bank) * 1000 / range_mv * 4096)
            adc.channel_values[channel] = max(0, min(4095, value))
            adc._default_on_adc_read(channel)

        adc.on_adc_read = sampled

    def _wire_part(self, bank, chain: ShiftOut, first: int) -> None:
        latched = [False] * bank.coils

        def take_over(level: int) -> None:
            if level:
                latched[:] = chain.bits[first : first + bank.coils]

        def enable(level: int) -> None:
            self._drive(bank.i, [place for place in range(bank.coils) if latched[place]] if level else [])

        listen(self.board, bank.chain[0], take_over)
        listen(self.board, bank.chain[1], enable)

    def _pins_moved(self, bank: int, pins: list[int]) -> None:
        self._drive(bank, [place for place, pin in enumerate(pins) if level_of(self.board, pin)])

    def _drive(self, bank: int, outputs: list[int]) -> None:
        self.circuit.advance(self.board.micros / 1e6)
        self.circuit.set_drivers(bank, {self._wired[bank, place] for place in outputs if (bank, place) in self._wired})

    # ---- the host

    def run(self, until, limit_s: float = 10.0) -> bool:
        """Let time pass until `until()`; False if it does not come to that."""
        end = self.board.micros + limit_s * 1e6
        while self.board.micros < end:
            self.board.advance(USEFUL_STEP_US)
            self._hear()
            if until():
                return True
        return False

    def _hear(self) -> None:
        new = bytes(self.board.console[self._seen :])
        self._seen += len(new)
        for received in self._reader.feed(new):
            if received.message is None:
                self.text.append(received.text)
                continue
            fields = plain(received.message, received.values)
            self.messages.append((self.board.micros, received.message.name, fields))
            if received.message.kept:
                self.send("ack", q=fields["q"])

    def send(self, name: str, **fields: object) -> None:
        """The host sends one message."""
        message = MESSAGES[name]
        if message.has("boot"):
            fields.setdefault("boot", self.boot_number)
        self.board.send(self._writer.encode(message, values_from(message, fields)))

    def all(self, name: str, **wanted: object) -> list[dict[str, object]]:
        """All messages of a name with these fields."""
        found = [fields for _, heard, fields in self.messages if heard == name]
        return [fields for fields in found if all(fields[key] == value for key, value in wanted.items())]

    def connect(self) -> dict[str, object]:
        """Boot, and greet until the board answers."""
        self.board.boot(4e6)
        return self.greet()

    def greet(self) -> dict[str, object]:
        """Greet until the board answers; its answer."""
        count = len(self.all("board"))
        for _ in range(30):
            self.send("hello", v=1)
            if self.run(lambda: len(self.all("board")) > count, 0.5):
                answer = self.all("board")[-1]
                self.boot_number = answer["boot"]
                return answer
        raise TimeoutError(b"\n".join(self.text[-20:]).decode(errors="replace"))

    def throw(self, number: int, junction: int, lie: int, wait: int = 5000) -> dict[str, object]:
        """Ask for a throw, wait for its outcome."""
        self.send("throw", id=number, j=junction, lie=lie, wait=wait)
        assert self.run(lambda: bool(self.all("outcome", id=number)), 8.0), self.messages[-5:]
        return self.all("outcome", id=number)[0]

    def pulses(self) -> list[tuple[float, int, float]]:
        """(microseconds of the beginning, pin, width in microseconds) of every pulse on a coil pin or enable."""
        begun: dict[int, float] = {}
        found = []
        for nanos, pin, level in self.trace.edges:
            if level == 1:
                begun[pin] = nanos
            elif pin in begun:
                start = begun.pop(pin)
                found.append((start / 1000, pin, (nanos - start) / 1000))
        return found
