"""What outlives a reset: the boot's number, why it began, the note of a crash; and what the links say at the start.

The watchdog's scratch memory tells resets apart: this firmware writes there what it is about to do.
"""

from device.board.chip import WATCHDOG_SCRATCH, Chip

TYPE_CHECKING = False
if TYPE_CHECKING:
    from typing import Any

BOOT_FILE = "/boot.txt"
CRASH_FILE = "/crash.txt"
LINKS_FILE = "/links.txt"
# Linked to 3.3 V at the start: a plain prompt and no loop. Pulled down inside: nothing there means no link.
BOOT_PIN = 22
CRASH_TEXT = 150
# A board that crashes so often before it has run for a minute stays at the prompt.
MOST_CRASHES = 3

POWER, WATCHDOG, BROWN_OUT, REQUEST, CRASH, UNKNOWN = 0, 1, 2, 3, 4, 5

_RUNNING = 0x0C01_1001
_ASKED = 0x0C01_1002
_CRASHED = 0x0C01_1003
_LEFT = 0x0C01_1004
_LARGEST_BOOT = 999_999_998


class Notes:
    """Read once at the start. `boot` is larger at every start."""

    def __init__(self, machine: "Any", os: "Any", sys: "Any", chip: Chip) -> None:
        self._mem = machine.mem32
        self._sys = sys
        self._os = os
        self._word = chip.watchdog + WATCHDOG_SCRATCH
        self._count = chip.watchdog + WATCHDOG_SCRATCH + 4
        self.cause = self._read_cause(machine, chip)
        self.crashes = self._mem[self._count] & 255 if self.cause == CRASH else 0
        self._mem[self._count] = self.crashes
        self._mem[self._word] = 0
        self.boot = self._next_boot()
        self.crash = self._read_crash()
        pin = machine.Pin
        boot_pin, first, second = self._links()
        self.stay_at_prompt = pin(boot_pin, pin.IN, pin.PULL_DOWN).value() == 1 or self.crashes >= MOST_CRASHES
        pin(boot_pin, pin.OUT, value=0)
        self.address = 0
        if first >= 0:
            self.address = pin(first, pin.IN, pin.PULL_DOWN).value() + 2 * pin(second, pin.IN, pin.PULL_DOWN).value()

    def _read_cause(self, machine: "Any", chip: Chip) -> int:
        word = self._mem[self._word]
        if word == _CRASHED:
            return CRASH
        if word == _ASKED or word == _LEFT:
            return REQUEST
        if machine.reset_cause() == machine.WDT_RESET and word == _RUNNING:
            return WATCHDOG
        bits = self._mem[chip.reset_register]
        if bits & chip.brown_out_bit:
            return BROWN_OUT
        if bits & chip.power_bit and word != _RUNNING:
            return POWER
        return UNKNOWN

    def _next_boot(self) -> int:
        number = 0
        try:
            with open(BOOT_FILE) as file:
                text = file.read(12).strip()
            number = int(text) if text.isdigit() else 0
        except (OSError, ValueError):
            pass
        if not 0 < number <= _LARGEST_BOOT:
            # No file, or not a right one: any number does that is not likely to have been given before.
            number = int.from_bytes(self._os.urandom(3), "little") + 1
        number += 1
        try:
            # Written whole beside it, then put in its place: one of the two is always there.
            with open(BOOT_FILE + ".new", "w") as file:
                file.write(str(number))
            self._os.rename(BOOT_FILE + ".new", BOOT_FILE)
        except OSError:
            pass
        return number

    def _links(self) -> "tuple[int, int, int]":
        """Pins of the boot link and of the address links (-1 for none): `/links.txt` may say other than usual."""
        boot_pin, first, second = BOOT_PIN, -1, -1
        try:
            with open(LINKS_FILE) as file:
                for line in file.read(200).split("\n"):
                    words = line.split()
                    if len(words) == 2 and words[0] == "boot" and words[1].isdigit():
                        boot_pin = int(words[1])
                    if len(words) == 3 and words[0] == "address" and words[1].isdigit() and words[2].isdigit():
                        first, second = int(words[1]), int(words[2])
        except OSError:
            pass
        return boot_pin, first, second

    # ---- crashes

    def _read_crash(self) -> bytes:
        try:
            with open(CRASH_FILE) as file:
                text = file.read(2000)
        except OSError:
            return b""
        # The end tells most. Only what a message may carry.
        plain = "".join(
            [letter if " " <= letter <= "~" and letter != '"' and letter != "\\" else " " for letter in text]
        )
        return " ".join(plain.split())[-CRASH_TEXT:].encode()

    def crashed(self, error: BaseException) -> None:
        """Keep a note of an error. Never raises."""
        self._mem[self._word] = _CRASHED
        self._mem[self._count] = (self.crashes + 1) & 255
        try:
            with open(CRASH_FILE, "w") as file:
                self._sys.print_exception(error, file)
        except Exception:  # noqa: BLE001 - there may be no memory or no room: the restart matters more than the note
            pass

    def forget_crash(self) -> None:
        """The host has it."""
        self.crash = b""
        try:
            self._os.remove(CRASH_FILE)
        except OSError:
            pass

    # ---- what is about to be done

    def running(self) -> None:
        """The loop begins."""
        self._mem[self._word] = _RUNNING

    def runs_well(self) -> None:
        """It has run for a while: earlier crashes no longer count."""
        self.crashes = 0
        self._mem[self._count] = 0

    def asked(self) -> None:
        """A restart was asked for."""
        self._mem[self._word] = _ASKED

    def left(self) -> None:
        """The loop was left for the prompt."""
        self._mem[self._word] = _LEFT
