"""Everything that settings describe, as running objects: banks, motors, junctions, and the book of their faults."""

from device.control.faults import FaultBook
from device.control.gate import BankGate
from device.control.junctions import JunctionState
from device.control.motors import Motors
from device.control.outbox import Outbox
from device.control.pulses import AllowedPulses
from device.control.ticks import Changes
from device.control.watch import BankWatch
from shared_protocol.settings import Settings, TimingSettings
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

    def keep_positions(self, before: "Plant") -> None:
        """Take over the stop, and what was known of motors whose wiring has not changed."""
        self.stopped = before.stopped
        for motor in self.motors.all:
            number = motor.settings.i
            if number < len(before.motors.all):
                earlier = before.motors.all[number]
                if earlier.settings.same_wiring(motor.settings) and earlier.source != SOURCE_NONE:
                    motor.position = earlier.position
                    motor.source = earlier.source
        for junction in self.junctions:
            junction.refresh()
