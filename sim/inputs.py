"""What the board's inputs see: contacts of motors, buttons, hands; all of them bounce."""

import random
from dataclasses import dataclass

from shared_protocol.settings import Settings
from shared_protocol.settings_table import CONTACT_INVERSE, CONTACT_TWO
from sim.motor import Motor

CONTACT_BOUNCE_US = 1500
BUTTON_BOUNCE_US = 3000


@dataclass
class Held:
    """An input that is held closed or open, until a time (None: until further notice)."""

    closed: bool
    until_us: int | None


class Inputs:
    """All inputs of one board. `update` once per exchange; `word` is what the board reads."""

    def __init__(self, settings: Settings, motors: list[Motor], rng: random.Random) -> None:
        self._settings = settings
        self._motors = motors
        self._rng = rng
        self._held: dict[int, Held] = {}
        # Contacts stuck as they are: input number and how.
        self.stuck: dict[int, bool] = {}
        count = settings.inputs
        self._true = [False] * count
        self._bounces_until_us = [0] * count
        self._words = [0, 0]
        self._contact_inputs = {number for motor in settings.motors for number in (motor.c1, motor.c2) if number >= 0}
        self._read_contacts()
        self.update(0)
        self._bounces_until_us = [0] * count
        self.update(0)

    def hold(self, number: int, closed: bool, now_us: int, for_us: int | None) -> None:
        """A button is pressed, a switch turned: closed or open for a time, or for good."""
        self._held[number] = Held(closed, None if for_us is None else now_us + for_us)

    def next_event_us(self, now_us: int) -> int | None:
        """When something changes by itself: a bounce ends, a button is let go."""
        times = [until for until in self._bounces_until_us if until > now_us]
        times += [held.until_us for held in self._held.values() if held.until_us is not None]
        # While something bounces the board should look often.
        return min(times) if times else None

    @property
    def bouncing(self) -> bool:
        """True while any input bounces."""
        return any(self._bounces_until_us)

    def word(self, number: int) -> int:
        """Inputs 24 * number and the 23 after it."""
        return self._words[number]

    def update(self, now_us: int) -> None:
        """Work out what the board would read now."""
        for number, held in list(self._held.items()):
            if held.until_us is not None and now_us >= held.until_us:
                del self._held[number]
        wanted = self._read_contacts()
        words = [0, 0]
        for number, closed in enumerate(wanted):
            if closed != self._true[number]:
                self._true[number] = closed
                bounce_us = CONTACT_BOUNCE_US if number in self._contact_inputs else BUTTON_BOUNCE_US
                self._bounces_until_us[number] = now_us + self._rng.randrange(bounce_us // 3, bounce_us)
            if now_us < self._bounces_until_us[number]:
                closed = self._rng.random() < 0.5
            else:
                self._bounces_until_us[number] = 0
            if closed:
                words[number // 24] |= 1 << (number % 24)
        self._words = words

    def _read_contacts(self) -> list[bool]:
        """What each input would read if nothing bounced."""
        states = [False] * self._settings.inputs
        for motor in self._settings.motors:
            if motor.c1 < 0:
                continue
            position = self._motors[motor.i].position()
            states[motor.c1] = position == "reverse"
            if motor.contact == CONTACT_TWO:
                states[motor.c2] = position == "normal"
            elif motor.contact == CONTACT_INVERSE:
                states[motor.c2] = position != "reverse"
        for number, held in self._held.items():
            states[number] = held.closed
        for number, closed in self.stuck.items():
            states[number] = closed
        return states
