"""Junctions: which way each lies, from the positions of its motors."""

from device.control.motors import UNKNOWN, MotorState
from device.control.outbox import Outbox
from device.control.ticks import Changes
from shared_protocol import messages
from shared_protocol.settings import JunctionSettings
from shared_protocol.words import SEEN, SENT, SOURCE_NONE

LIE_UNKNOWN = -1


class JunctionState:
    """One junction."""

    def __init__(
        self, settings: JunctionSettings, motors: "list[MotorState]", outbox: Outbox, changes: Changes
    ) -> None:
        self.settings = settings
        self._changes = changes
        self.motors = motors
        for motor in motors:
            motor.junction = settings.i
        self._outbox = outbox
        self.lie = LIE_UNKNOWN
        self.source = SOURCE_NONE
        # Throws accepted and not finished; the lie of the newest; whether the last one ended badly.
        self.waiting = 0
        self.wanted = LIE_UNKNOWN
        self.moving = False
        self.troubled = False

    def refresh(self) -> bool:
        """Work the lie out again; tells the host and returns True if it has changed."""
        self._changes.happened = True
        lie = LIE_UNKNOWN
        source = SEEN
        at = 0
        place = 0
        for motor in self.motors:
            if motor.position == UNKNOWN:
                source = SOURCE_NONE
            elif motor.source == SENT and source == SEEN:
                source = SENT
            if motor.position == 1:
                at |= 1 << place
            place += 1
        if source != SOURCE_NONE:
            for row in self.settings.lies:
                if row.at == at:
                    lie = row.i
        if lie == LIE_UNKNOWN:
            source = SOURCE_NONE
        if lie == self.lie and source == self.source:
            return False
        self.lie = lie
        self.source = source
        self.tell()
        return True

    def tell(self) -> None:
        """Tell the host which way it lies."""
        values = self._outbox.plain(messages.LIE)
        values[0] = self.settings.i
        values[1] = self.lie
        values[2] = self.source

    def may_make(self, place: int, position: int) -> bool:
        """False if pulsing motor `place` to `position` could make a forbidden combination.

        A motor whose position is not known counts as being anywhere.
        """
        for combination in self.settings.forbid:
            possible = True
            number = 0
            for motor in self.motors:
                wanted = (combination >> number) & 1
                here = position if number == place else motor.position
                if here != UNKNOWN and here != wanted:
                    possible = False
                number += 1
            if possible:
                return False
        return True
