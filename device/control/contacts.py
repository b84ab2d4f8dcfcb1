"""Samples the contacts of motors and draws the conclusions: points moved by hand, contacts that disagree."""

from device.control.firing import Firing
from device.control.motors import DISAGREE_MS, MotorState
from device.control.plant import Plant
from shared_protocol.words import CONTACTS_DISAGREE, SCOPE_JUNCTION


class Contacts:
    """All contacts of one plant."""

    def __init__(self, plant: Plant, firing: Firing) -> None:
        self._plant = plant
        self._firing = firing

    @property
    def sampling(self) -> bool:
        """True while more samples are wanted."""
        return self._plant.motors.sampling

    def tick(self, now_ms: int) -> bool:
        """Sample if it is time; True if any input has changed since the last tick."""
        motors = self._plant.motors
        changed = motors.inputs_changed()
        if changed:
            motors.sampling = True
        if motors.sampling and motors.due(now_ms):
            motors.sampling = False
            for motor in motors.with_contacts:
                self._sample(motor, now_ms)
        return changed

    def _sample(self, motor: MotorState, now_ms: int) -> None:
        motors = self._plant.motors
        if self._firing.too_early(motor, self._plant.timing.after_ms, now_ms):
            motors.sampling = True
            return
        changed = motors.sample(motor)
        if not motor.settled:
            motors.sampling = True
        junction = self._plant.junctions[motor.junction]
        if junction.moving:
            return
        if changed:
            motor.believe_contact()
            junction.troubled = False
            junction.refresh()
        if motor.disagree_ms == DISAGREE_MS:
            settings = motor.settings
            closed_1 = 1 if motors.closed(settings.c1) else 0
            closed_2 = 1 if motors.closed(settings.c2) else 0
            self._plant.faults.report(SCOPE_JUNCTION, motor.junction, CONTACTS_DISAGREE, closed_1, closed_2, settings.i)
