"""Knows, as an operator does, whether the stop is on: by what the wire says, not by what the firmware holds."""

from shared_protocol.settings import Settings
from shared_protocol.settings_table import BUTTON_RELEASE
from sim.rehearsal.expectations import Heard
from sim.world import World


class StopWatch:
    """Keeps `world.stopped`: True from when the board has confirmed a stop until somebody asks for its release."""

    def __init__(self, world: World, settings: Settings) -> None:
        self._world = world
        self._release_inputs = {button.input for button in settings.buttons if button.kind == BUTTON_RELEASE}
        # A release is on its way: what the board said before it took it must not count.
        self._releasing = False

    def release_asked(self) -> None:
        """The host has sent a release."""
        self._releasing = True
        self._world.stopped = False

    def touched(self, number: int) -> None:
        """A hand or a fault is at an input."""
        if number in self._release_inputs:
            self.release_asked()

    def heard(self, heard: Heard) -> None:
        """The board has said something."""
        if heard.name == "answer" and heard.fields["to"] == "release":
            self._releasing = False
        elif heard.name == "answer" and heard.fields["to"] == "stop":
            self._confirm(bool(heard.fields["ok"]))
        elif heard.name == "state":
            if not heard.fields["stop"]:
                self._releasing = False
            self._confirm(bool(heard.fields["stop"]))

    def _confirm(self, stopped: bool) -> None:
        self._world.stopped = stopped and not self._releasing

    def board_starts(self) -> None:
        """A stop does not outlive the board's start."""
        self._releasing = False
        self._world.stopped = False
