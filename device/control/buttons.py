"""Buttons, switches and studs of the panel: the layout runs with no host.

A press counts when it is steady, once; edges during a pulse and shortly after it are not looked at. A button that is
held too long is put out of use by itself (the stop button never is: it must go on stopping).
"""

from device.control.plant import Plant
from device.control.queue import Queue
from device.control.ticks import QUARTER, elapsed
from shared_protocol.settings import ButtonSettings
from shared_protocol.settings_table import (
    BUTTON_ALTERNATE,
    BUTTON_CLEAR,
    BUTTON_ENTRANCE,
    BUTTON_EXIT,
    BUTTON_GO,
    BUTTON_RELEASE,
    BUTTON_ROTARY,
    BUTTON_ROUTE,
    BUTTON_SET,
    BUTTON_STOP,
    BUTTON_SWITCH,
)
from shared_protocol.words import BUTTON_STUCK, FROM_BUTTON, SCOPE_BUTTON

AFTER_PULSE_MS = 5
CLEAR_HOLD_MS = 3000


class ButtonState:
    """One button."""

    def __init__(self, settings: ButtonSettings) -> None:
        self.settings = settings
        self.closed = False
        self.steady = False
        self.edge_ms = 0
        self.pressed_ms = 0
        self.held = False
        self.acted = False
        self.spent = False


class Buttons:
    """All buttons of one plant. `watching` is True while one needs looking at each millisecond."""

    def __init__(self, plant: Plant, queue: Queue) -> None:
        self._plant = plant
        self._queue = queue
        self.all = [ButtonState(button) for button in plant.settings.buttons]
        self.watching = len(self.all) > 0
        self._entrance = -1
        self._entrance_ms = 0
        self._quiet_ms = 0
        self._quiet = True
        self._first = True
        # What the operator asked of the whole board; the controller takes it up.
        self.wants_stop = False
        self.wants_release = False
        self.wants_clear = False

    def tick(self, now_ms: int, changed: bool, firing: bool) -> None:
        """Look at the buttons if an input has changed or one is not steady."""
        if firing:
            self._quiet = False
            self._quiet_ms = now_ms
            return
        if not self._quiet:
            if elapsed(now_ms, self._quiet_ms) < AFTER_PULSE_MS:
                return
            self._quiet = True
            self.watching = len(self.all) > 0
        if not changed and not self.watching:
            return
        self.watching = False
        number = 0
        for button in self.all:
            self._look(number, button, now_ms)
            number += 1
        self._first = False

    def _look(self, number: int, button: ButtonState, now_ms: int) -> None:
        closed = self._plant.motors.closed(button.settings.input)
        if closed != button.closed or self._first:
            button.closed = closed
            button.edge_ms = now_ms
            button.steady = False
        if not button.steady:
            self.watching = True
            if elapsed(now_ms, button.edge_ms) >= self._plant.timing.steady_ms:
                button.steady = True
                self._settled(number, button, now_ms)
        if button.held:
            self._held(number, button, now_ms)

    def _settled(self, number: int, button: ButtonState, now_ms: int) -> None:
        """The button is steady: a press, a release, or no change at all."""
        was = button.held
        kind = button.settings.kind
        if button.closed == was:
            # A switch's first reading at power-up: taken as an order only if the settings ask for it.
            if kind == BUTTON_SWITCH and not button.acted and not button.closed and button.settings.read:
                self._throw(button.settings.j, button.settings.other, now_ms)
            button.acted = True
            return
        first = not button.acted
        button.acted = True
        button.held = button.closed
        if button.closed:
            button.pressed_ms = now_ms
            button.spent = False
        if self._plant.faults.button_out(number):
            return
        if kind == BUTTON_SWITCH:
            if first and not button.settings.read:
                return
            self._throw(button.settings.j, button.settings.lie if button.closed else button.settings.other, now_ms)
        elif button.closed and not (first and kind == BUTTON_ROTARY):
            self._pressed(button.settings, now_ms)

    def _held(self, number: int, button: ButtonState, now_ms: int) -> None:
        kind = button.settings.kind
        if kind == BUTTON_SWITCH or kind == BUTTON_ROTARY or kind == BUTTON_STOP:
            return
        held_ms = elapsed(now_ms, button.pressed_ms)
        if held_ms < 0 or held_ms > QUARTER:
            return
        if kind == BUTTON_CLEAR:
            if not button.spent:
                self.watching = True
                if held_ms >= CLEAR_HOLD_MS:
                    button.spent = True
                    self.wants_clear = True
            return
        if self._plant.faults.button_out(number):
            return
        self.watching = True
        if held_ms >= self._plant.timing.stuck_ms:
            self._plant.faults.report(SCOPE_BUTTON, number, BUTTON_STUCK, button.settings.input, held_ms, -1)

    def _pressed(self, settings: ButtonSettings, now_ms: int) -> None:
        kind = settings.kind
        if kind == BUTTON_SET:
            self._throw(settings.j, settings.lie, now_ms)
        elif kind == BUTTON_ALTERNATE:
            self._throw(settings.j, self._next_lie(settings.j), now_ms)
        elif kind == BUTTON_ROUTE:
            self._route(settings.n, now_ms)
        elif kind == BUTTON_ENTRANCE:
            self._entrance = settings.n
            self._entrance_ms = now_ms
        elif kind == BUTTON_EXIT:
            self._exit(settings.n, now_ms)
        elif kind == BUTTON_GO:
            for button in self.all:
                if button.settings.kind == BUTTON_ROTARY and button.held:
                    self._route(button.settings.n, now_ms)
        elif kind == BUTTON_STOP:
            self.wants_stop = True
        elif kind == BUTTON_RELEASE:
            self.wants_release = True

    def _throw(self, junction: int, lie: int, now_ms: int) -> None:
        # Pressed again it fires again, whatever is believed of the points.
        self._queue.throw(0, FROM_BUTTON, junction, lie, max(1, self._plant.timing.wait_ms), now_ms)

    def _route(self, route: int, now_ms: int) -> None:
        self._queue.route(0, FROM_BUTTON, route, max(1, self._plant.timing.wait_ms), now_ms)

    def _next_lie(self, junction: int) -> int:
        """The lie after the one that is set or on its way; the first if nothing is known."""
        state = self._plant.junctions[junction]
        lie = state.wanted if state.waiting else state.lie
        return (lie + 1) % len(state.settings.lies)

    def _exit(self, exit_number: int, now_ms: int) -> None:
        entrance = self._entrance
        self._entrance = -1
        if entrance < 0 or elapsed(now_ms, self._entrance_ms) > self._plant.timing.pair_ms:
            return
        for route in self._plant.settings.routes:
            if route.entrance == entrance and route.exit == exit_number:
                self._route(route.i, now_ms)
                return
