"""What the settings say of pins, as running objects: pulsers, inputs, followers, cut-offs. Made and dropped whole."""

from device.board import chip as registers
from device.board import pulse_program
from device.board.chains import FollowerChain, InputChain, OutputChain
from device.board.pulser import ChainPulser, PinPulser, Pulser
from shared_protocol.settings import BankSettings, Settings

TYPE_CHECKING = False
if TYPE_CHECKING:
    from typing import Any

ADC_PIN_0 = 26
_WORD = (1 << 24) - 1


class Wiring:
    """One board's wiring. No pulse is running when one is made or dropped."""

    def __init__(self, machine: "Any", rp2: "Any", settings: Settings) -> None:
        assert settings.io is not None and settings.timing is not None
        io = settings.io
        self._machine = machine
        self._rp2 = rp2
        self.settle_us = settings.timing.settle_ms * 1000
        chained = [bank for bank in settings.banks if bank.pin < 0]
        self._follower_part = -1
        self._output_chain: "OutputChain | None" = None
        self._follower_chain: "FollowerChain | None" = None
        self._chained_bank = -1
        if chained:
            parts = [bank.coils for bank in chained]
            if io.out_chain:
                # The followers are taken over with the first bank's part.
                self._follower_part = len(parts)
                parts.append(io.out_chain)
            self._output_chain = OutputChain(machine, io.out_pins, parts, [bank.chain[0] for bank in chained])
            self._chained_bank = chained[0].i
        elif io.out_chain:
            self._follower_chain = FollowerChain(machine, io.out_pins, io.out_chain)
        self.pulsers: "list[PinPulser | ChainPulser]" = []
        self.channels: "list[int]" = []
        self.range_mv: "list[int]" = []
        self.zero_mv: "list[int]" = []
        self.cuts: "list[Any]" = []
        programs: "dict[int, Any]" = {}
        for bank in settings.banks:
            self._add_bank(bank, programs, chained)
        self._add_inputs(settings)
        pin = machine.Pin
        self._outputs = [pin(number, pin.OUT, value=0) for number in io.outputs]
        self._places = io.out_chain
        # What the followers should be, and whether that is still to be shifted out.
        self._bits = [0, 0]
        self._late = False

    def _add_bank(self, bank: BankSettings, programs: "dict[int, Any]", chained: "list[BankSettings]") -> None:
        machine = self._machine
        machine.ADC(machine.Pin(ADC_PIN_0 + bank.adc))
        on_pins = bank.pin >= 0
        pins = bank.coils if on_pins else 1
        if pins not in programs:
            programs[pins] = pulse_program.assemble(self._rp2, pins)
        first = bank.pin if on_pins else bank.chain[1]
        pulser = Pulser(machine, self._rp2, bank.i, programs[pins], first, bank.gap_ms * 1000)
        if on_pins:
            self.pulsers.append(PinPulser(pulser, bank.coils))
        else:
            assert self._output_chain is not None
            part = 0
            while chained[part] is not bank:
                part += 1
            self.pulsers.append(ChainPulser(pulser, self._output_chain, part, bank.coils))
        self.channels.append(bank.adc)
        self.range_mv.append(bank.range_mv)
        self.zero_mv.append(bank.zero_mv)
        cut = bank.charge.cut_pin
        self.cuts.append(machine.Pin(cut, machine.Pin.OUT, value=0) if cut >= 0 else None)

    # ---- inputs

    def _add_inputs(self, settings: Settings) -> None:
        assert settings.io is not None
        pin = self._machine.Pin
        self._pins = settings.io.inputs
        for number in self._pins:
            pin(number, pin.IN, pin.PULL_UP)
        self._mem = self._machine.mem32
        self._all_pins = registers.SIO_GPIO_IN
        self._input_chain: "InputChain | None" = None
        if settings.io.in_chain:
            self._input_chain = InputChain(self._machine, settings.io.in_pins, settings.io.in_chain)
        self._chain_places = settings.io.in_chain
        self.words = [0, 0]

    def read_inputs(self) -> None:
        """Take all inputs into `words` (steady): a contact that is closed pulls its input low."""
        levels = self._mem[self._all_pins]
        low = 0
        high = 0
        place = 0
        for pin in self._pins:
            if not (levels >> pin) & 1:
                low |= 1 << place
            place += 1
        chain = self._input_chain
        if chain is not None:
            chain.read()
            left = self._chain_places
            first = 0
            while left > 0:
                bits = chain.closed(first)
                if left < 24:
                    bits &= (1 << left) - 1
                # A chain may begin anywhere in the first word.
                low |= (bits << place) & _WORD if place < 24 else 0
                high |= (bits >> (24 - place)) if place < 24 else (bits << (place - 24)) & _WORD
                place += 24
                first += 24
                left -= 24
        self.words[0] = low
        self.words[1] = high

    # ---- followers

    def followers(self, word: int, bits: int) -> None:
        """Set followers 24 * word and the 23 after it (steady)."""
        self._bits[word] = bits
        place = 24 * word
        on_pins = len(self._outputs)
        while place < on_pins and place < 24 * word + 24:
            self._outputs[place].value((bits >> (place - 24 * word)) & 1)
            place += 1
        self._late = self._places > 0
        self.flush()

    def flush(self) -> None:
        """Shift out what the followers on the chain should be, unless a pulse runs on their part (steady)."""
        if not self._late:
            return
        skipped = len(self._outputs)
        low = (self._bits[0] >> skipped) | ((self._bits[1] << (24 - skipped)) & _WORD)
        high = self._bits[1] >> skipped
        if self._follower_chain is not None:
            self._follower_chain.write(low, high)
            self._late = False
            return
        chain = self._output_chain
        if chain is None or self.pulsers[self._chained_bank].running():
            return
        chain.put(self._follower_part, 0, low, self._places)
        chain.put(self._follower_part, 1, high, self._places)
        if chain.shift():
            chain.take_over(0)
            self._late = False
