"""A board's test of itself, at the prompt: nothing is fired. Each line is `check NAME ok|fail|skip TEXT`."""

from device.board import pulse_program
from device.board.pulser import Pulser
from device.board.sampler import CONVERSIONS_HZ, INPUTS, Sampler

TYPE_CHECKING = False
if TYPE_CHECKING:
    from collections.abc import Callable
    from typing import Any

    from device.board.chip import Chip

LEAST_FREE = 100_000
# Converter steps between the lowest and the highest of five samples of one input.
MOST_NOISE = 40
# Linked to each other (and to nothing else) these two pins time a pulse on a pin that drives no coil.
OUT_PIN, BACK_PIN = 0, 1
TEST_US = 20_000
TEST_FILE = "/test.new"


class SelfTest:
    """Gets the hardware's modules; `run` gets what writes a line."""

    def __init__(
        self,
        machine: "Any",
        rp2: "Any",
        uctypes: "Any",
        make_array: "Any",
        gc: "Any",
        os: "Any",
        time: "Any",
        chip: "Chip",
    ) -> None:
        self._machine = machine
        self._rp2 = rp2
        self._gc = gc
        self._os = os
        self._time = time
        self._sampler = Sampler(machine, rp2, uctypes, make_array, chip)
        self._failed = False

    def run(self, write: "Callable[[str], object]") -> None:
        """All tests, one after another."""
        self._write = write
        self._heap()
        self._adc()
        self._flash()
        self._pulse()
        self._say("end", "fail" if self._failed else "ok", "")

    def _say(self, name: str, result: str, text: str) -> None:
        self._failed = self._failed or result == "fail"
        self._write("check %s %s %s\n" % (name, result, text))

    def _heap(self) -> None:
        self._gc.collect()
        free = self._gc.mem_free()
        self._say("heap", "ok" if free >= LEAST_FREE else "fail", "%d bytes free" % free)

    def _adc(self) -> None:
        sampler = self._sampler
        sampler.start()
        self._time.sleep_ms(5)
        left = sampler.left()
        begun_us = self._time.ticks_us()
        self._time.sleep_ms(50)
        made = left - sampler.left()
        took_us = self._time.ticks_diff(self._time.ticks_us(), begun_us)
        rate = made * 100 // (took_us // 100) * 100 // INPUTS
        wanted = CONVERSIONS_HZ // INPUTS
        right = wanted * 98 // 100 <= rate <= wanted * 102 // 100
        self._say("adc_rate", "ok" if right else "fail", "%d samples a second of each input" % rate)
        worst = 0
        for channel in range(3):
            sampler.look(channel)
            worst = max(worst, sampler.high - sampler.low)
        self._say("adc_noise", "ok" if worst <= MOST_NOISE else "fail", "%d steps of 4096" % worst)
        sampler.close()

    def _flash(self) -> None:
        data = bytes(range(256)) * 8
        begun_us = self._time.ticks_us()
        try:
            with open(TEST_FILE, "wb") as file:
                file.write(data)
            took_us = self._time.ticks_diff(self._time.ticks_us(), begun_us)
            with open(TEST_FILE, "rb") as file:
                same = file.read() == data
            self._os.remove(TEST_FILE)
        except OSError as error:
            self._say("flash", "fail", "error %s" % error)
            return
        self._say("flash", "ok" if same else "fail", "2048 bytes in %d us" % took_us)

    def _pulse(self) -> None:
        """Only if the two pins are linked: a level on one is seen on the other."""
        pin = self._machine.Pin
        out = pin(OUT_PIN, pin.OUT, value=0)
        back = pin(BACK_PIN, pin.IN, pin.PULL_DOWN)
        low = back.value()
        out.value(1)
        high = back.value()
        out.value(0)
        if low or not high:
            self._say("pulse", "skip", "pins %d and %d are not linked" % (OUT_PIN, BACK_PIN))
            return
        program = pulse_program.assemble(self._rp2, 1)
        pulser = Pulser(self._machine, self._rp2, 0, program, OUT_PIN, 5000)
        pulser.send(1, TEST_US)
        got_us = self._machine.time_pulse_us(back, 1, 100_000)
        self._time.sleep_ms(30)
        pin(OUT_PIN, pin.OUT, value=0)
        self._rp2.PIO(0).remove_program(program)
        # Where the timing begins after the pulse did, it sees a little less.
        right = TEST_US - 100 <= got_us <= TEST_US + 10
        self._say("pulse", "ok" if right else "fail", "%d us for %d" % (got_us, TEST_US))
