"""Everything that settings describe, as running objects: banks, motors, junctions, and the book of their faults."""

from device.control.faults import FaultBook
from device.control.gate import BankGate
from device.control.junctions import JunctionState
from device.control.motors import Motors, MotorState
from device.control.outbox import Outbox
from device.control.pulses import AllowedPulses
from device.control.ticks import Changes
from device.control.watch import BankWatch
from shared_protocol.settings import MotorSettings, Settings, TimingSettings
from shared_protocol.words import SOURCE_NONE

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.board.seam import Board


class Plant:
    """Built whole from checked settings, in one go, and replaced as a whole."""

    def __init__(self, settings: Settings, board: "Board", outbox: Outbox) -> None:
        assert settings.board is not None and settings.timing is not None
        self.settings = settings
        self.timing: "TimingSettings" = settings.timing
        self.silence_ms = settings.board.silence_ms
        self.tell_ms = settings.board.tell_ms
        self.route_order = settings.board.order
        self.restore = settings.board.restore
        self.stopped = False
        self.changes = Changes()
        self.faults = FaultBook(
            len(settings.banks), len(settings.junctions), len(settings.buttons), outbox, self.changes
        )
        self.banks = [BankGate(number, settings, board, self.changes) for number in range(len(settings.banks))]
        self.watches = [BankWatch(gate, self.faults) for gate in self.banks]
        self.motors = Motors(settings, board)
        self.junctions = [
            JunctionState(junction, [self.motors.all[motor] for motor in junction.motors], outbox, self.changes)
            for junction in settings.junctions
        ]
        self.allowed = [AllowedPulses(settings, number) for number in range(len(settings.banks))]

    def known(self) -> "Known":
        """What is known of motors and the stop, in little memory: for `keep`, when this plant is gone."""
        return Known(self)

    def keep(self, known: "Known", same_settings: bool) -> None:
        """Take over the stop, and what was known of motors whose wiring has not changed.

        same_settings: they are the ones that were in force; then what is out stays out, and coils go on resting.
        """
        self.stopped = known.stopped
        if same_settings:
            self.faults.take_over(known.faults)
            self.motors.rest = known.rest
        for motor in self.motors.all:
            known.give(motor)
        for junction in self.junctions:
            junction.refresh()


class Known:
    """Where the motors of a plant were, with their wiring, eight bytes each; its faults, and how its coils rest."""

    def __init__(self, plant: Plant) -> None:
        self.stopped = plant.stopped
        self.faults = plant.faults
        self.rest = plant.motors.rest
        self._rows = bytearray(_ROW * len(plant.motors.all))
        for motor in plant.motors.all:
            at = _ROW * motor.settings.i
            for value in _wiring(motor.settings):
                self._rows[at] = value
                at += 1
            self._rows[at] = motor.position
            self._rows[at + 1] = motor.source

    def give(self, motor: MotorState) -> None:
        """Tell a motor where it was, if it is the same one on the same outputs and contacts."""
        at = _ROW * motor.settings.i
        rows = self._rows
        if at >= len(rows) or rows[at + 7] == SOURCE_NONE:
            return
        for value in _wiring(motor.settings):
            if rows[at] != value:
                return
            at += 1
        motor.position = rows[at]
        motor.source = rows[at + 1]


_ROW = 8


def _wiring(motor: MotorSettings) -> "tuple[int, ...]":
    return motor.bank, motor.normal, motor.reverse, motor.contact, motor.c1 + 1, motor.c2 + 1
