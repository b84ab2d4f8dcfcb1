"""Settings for tests of control: made from plain dictionaries, checked as a board would."""

from shared_protocol import settings_table as table
from shared_protocol.codec import Codec, values_from
from shared_protocol.fields import Message
from shared_protocol.registry import board_reads
from shared_protocol.settings import Settings
from shared_protocol.settings_check import check


class BenchLayout:
    """Collects records; keyword arguments override what a test cares about."""

    def __init__(self) -> None:
        self.records: "list[tuple[Message, dict[str, object]]]" = []

    def add(self, message: Message, **fields: object) -> "BenchLayout":
        """Append one record."""
        self.records.append((message, fields))
        return self

    def rows(self) -> "list[tuple[Message, list[object]]]":
        """The records with their values in table order."""
        return [(message, values_from(message, fields)) for message, fields in self.records]

    def bodies(self) -> "list[bytes]":
        """The records as the wire writes them."""
        codec = Codec(board_reads())
        return [codec.body(message, values) for message, values in self.rows()]

    def slot(self, sequence: int = 1) -> "list[bytes]":
        """The lines of a settings slot."""
        bodies = self.bodies()
        crc = Codec(board_reads()).crc_text(b"".join([body + b"\n" for body in bodies]))
        return bodies + [b"slot " + str(sequence).encode() + b" " + str(len(bodies)).encode() + b" " + crc]

    def settings(self) -> Settings:
        """Checked settings. Raises AssertionError if they are wrong."""
        made = Settings()
        for message, values in self.rows():
            problem = made.add(message, values)
            assert problem is None, (problem.field, problem.why)
        found = check(made)
        assert found is None, (found.record, found.field, found.why)
        return made


def board_records(layout: BenchLayout, **fields: object) -> None:
    """Board, timing, and 24 inputs on a chain, 24 follower outputs on a chain."""
    board = {"name": "bench"}  # type: dict[str, object]
    timing = {}  # type: dict[str, object]
    for key in fields:
        if table.SET_TIMING.has(key):
            timing[key] = fields[key]
        else:
            board[key] = fields[key]
    layout.add(table.SET_BOARD, **board)
    layout.add(table.SET_TIMING, **timing)
    layout.add(
        table.SET_IO, inputs=[], in_chain=24, in_pins=[17, 18, 19], outputs=[], out_chain=24, out_pins=[20, 21, 28]
    )


def bank_records(layout: BenchLayout, banks: int = 2, **fields: object) -> None:
    """Banks of 8 coils on pins, 16 V, 4700 uF through 47 ohm."""
    charge = {"cap_uf": 4700, "charge_dohm": 470, "rated_mw": 10_000}  # type: dict[str, object]
    own = {"full_mv": 16_000, "peak_mv": 17_000}  # type: dict[str, object]
    for key in fields:
        if table.SET_CHARGE.has(key):
            charge[key] = fields[key]
        else:
            own[key] = fields[key]
    for number in range(banks):
        layout.add(
            table.SET_BANK, i=number, name="bank" + str(number), pin=8 * number, coils=8, chain=[], adc=number, **own
        )
    for number in range(banks):
        layout.add(table.SET_CHARGE, i=number, cut_pin=-1, **charge)


def motor_record(layout: BenchLayout, number: int, bank: int, place: int, **fields: object) -> None:
    """Motor `number`, the `place`th of its bank."""
    own = {"c1": -1, "c2": -1}  # type: dict[str, object]
    own.update(fields)
    layout.add(table.SET_MOTOR, i=number, bank=bank, normal=2 * place, reverse=2 * place + 1, **own)


def junction_records(
    layout: BenchLayout, number: int, kind: str, motors: "list[int]", lies: "list[dict[str, object]]", **fields: object
) -> None:
    """A junction and its lies."""
    own = {"forbid": [], "bar": -1}  # type: dict[str, object]
    own.update(fields)
    layout.add(table.SET_JUNCTION, i=number, name="junction" + str(number), kind=kind, motors=motors, **own)
    place = 0
    for lie in lies:
        row = {"ready_mv": 12_000, "order": list(range(len(motors))), "name": "lie" + str(place), "word": ""}
        row.update(lie)
        layout.add(table.SET_LIE, j=number, i=place, **row)
        place += 1


def two_lies(**fields: object) -> "list[dict[str, object]]":
    """Normal and reverse of a turnout."""
    lies = [{"name": "normal", "at": 0}, {"name": "reverse", "at": 1}]  # type: list[dict[str, object]]
    for lie in lies:
        lie.update(fields)
    return lies


def usual(**fields: object) -> BenchLayout:
    """Two banks; turnouts 0, 1 on bank 0, turnout 2 (contact on input 0) on bank 1, crossover 3, three-way 4."""
    layout = BenchLayout()
    board_records(layout, **fields)
    bank_records(layout)
    motor_record(layout, 0, 0, 0)
    motor_record(layout, 1, 0, 1)
    motor_record(layout, 2, 1, 0, contact="one", c1=0)
    motor_record(layout, 3, 1, 1)
    motor_record(layout, 4, 1, 2)
    motor_record(layout, 5, 0, 2)
    motor_record(layout, 6, 0, 3)
    junction_records(layout, 0, "turnout", [0], two_lies())
    junction_records(layout, 1, "turnout", [1], two_lies())
    junction_records(layout, 2, "turnout", [2], two_lies())
    cross = [{"at": 0, "together": "yes", "ready_mv": 14_000}, {"at": 3, "together": "yes", "ready_mv": 14_000}]
    junction_records(layout, 3, "crossover", [3, 4], cross)
    three = [
        {"name": "middle", "at": 0},
        {"name": "left", "at": 1, "order": [1, 0]},
        {"name": "right", "at": 2, "order": [0, 1]},
    ]  # type: list[dict[str, object]]
    junction_records(layout, 4, "three_way", [5, 6], three, forbid=[3])
    layout.add(table.SET_ROUTE, i=0, name="all", entrance=-1, exit=-1, throws=[0, 1, 1, 1, 2, 1, 3, 1])
    layout.add(table.SET_BUTTON, i=0, kind="alternate", input=10, j=0, lie=-1, other=-1, n=-1)
    layout.add(table.SET_BUTTON, i=1, kind="stop", input=11, j=-1, lie=-1, other=-1, n=-1)
    layout.add(table.SET_BUTTON, i=2, kind="release", input=12, j=-1, lie=-1, other=-1, n=-1)
    layout.add(table.SET_BUTTON, i=3, kind="route", input=13, j=-1, lie=-1, other=-1, n=0)
    layout.add(table.SET_FOLLOWER, i=0, kind="lamp", output=0, j=0, lie=1)
    layout.add(table.SET_FOLLOWER, i=1, kind="frog", output=1, j=0, lie=1)
    layout.add(table.SET_FOLLOWER, i=2, kind="dead_frog", output=2, j=0, lie=1)
    return layout
