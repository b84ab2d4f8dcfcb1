"""Settings in memory: one object a record, made from the values of the settings table.

Attribute names are the field keys of the table. The board runs on these; the host checks layouts with them.
"""

from shared_protocol import settings_table as table
from shared_protocol.fields import INTS, KEEPS_FIELDS, NAME, Message


class Record:
    """What all records share: `fill` copies a record's values into attributes of the same names."""

    def fill(self, message: Message, values: "list[object]", lists: "list[list[int]]") -> None:
        """Take the values of one record (in table order). Equal lists are kept once, in `lists`.

        A board leaves the names out: it decides nothing by them, and its slot keeps them for whoever asks.
        """
        for position in range(len(message.keys)):
            value = values[position]
            kind = message.kinds[position]
            if kind == INTS:
                if value not in lists:
                    lists.append(value)  # type: ignore[arg-type]
                value = lists[lists.index(value)]  # type: ignore[arg-type]
            if kind != NAME or KEEPS_FIELDS:
                setattr(self, message.keys[position], value)


class BoardSettings(Record):
    """See settings_table.SET_BOARD."""

    name: bytes
    silence_ms: int
    tell_ms: int
    restore: int
    order: int


class TimingSettings(Record):
    """See settings_table.SET_TIMING."""

    settle_ms: int
    wait_ms: int
    pause_ms: int
    hysteresis_mv: int
    steady_ms: int
    stuck_ms: int
    equal: int
    after_ms: int
    pair_ms: int


class IoSettings(Record):
    """See settings_table.SET_IO."""

    inputs: "list[int]"
    in_chain: int
    in_pins: "list[int]"
    outputs: "list[int]"
    out_chain: int
    out_pins: "list[int]"


class BankSettings(Record):
    """See settings_table.SET_BANK; `charge` is the record of its charge path."""

    i: int
    name: bytes
    pin: int
    coils: int
    chain: "list[int]"
    adc: int
    range_mv: int
    zero_mv: int
    full_mv: int
    peak_mv: int
    gap_ms: int
    switch: int
    charge: "ChargeSettings"


class ChargeSettings(Record):
    """See settings_table.SET_CHARGE."""

    i: int
    kind: int
    cap_uf: int
    charge_dohm: int
    limit_ma: int
    guard: int
    rated_mw: int
    stall_ms: int
    cut_pin: int


class MotorSettings(Record):
    """See settings_table.SET_MOTOR."""

    i: int
    bank: int
    normal: int
    reverse: int
    coil_cohm: int
    parallel: int
    ends: int
    rest_ms: int
    contact: int
    c1: int
    c2: int
    answer_ms: int

    def same_wiring(self, other: "MotorSettings") -> bool:
        """True if `other` is the same motor on the same outputs and contacts."""
        return (
            self.bank == other.bank
            and self.normal == other.normal
            and self.reverse == other.reverse
            and self.contact == other.contact
            and self.c1 == other.c1
            and self.c2 == other.c2
        )


class LieSettings(Record):
    """See settings_table.SET_LIE."""

    j: int
    i: int
    name: bytes
    word: bytes
    at: int
    order: "list[int]"
    together: int
    ready_mv: int
    pulse_us: int
    full_us: int


class JunctionSettings(Record):
    """See settings_table.SET_JUNCTION; `lies` are the records of its lies."""

    i: int
    name: bytes
    kind: int
    motors: "list[int]"
    forbid: "list[int]"
    retry_mv: int
    pulses: int
    bar: int
    lies: "list[LieSettings]"


class RouteSettings(Record):
    """See settings_table.SET_ROUTE."""

    i: int
    name: bytes
    entrance: int
    exit: int
    throws: "list[int]"


class ButtonSettings(Record):
    """See settings_table.SET_BUTTON."""

    i: int
    kind: int
    input: int
    j: int
    lie: int
    other: int
    n: int
    read: int


class FollowerSettings(Record):
    """See settings_table.SET_FOLLOWER."""

    i: int
    kind: int
    output: int
    j: int
    lie: int


class Problem:
    """What is wrong with settings: record number (-1: the whole), field, reason word."""

    def __init__(self, record: int, field: str, why: str) -> None:
        self.record = record
        self.field = field
        self.why = why


class Settings:
    """All records of one board. `add` them in the order of the table, then see settings_check.check."""

    def __init__(self) -> None:
        self.board: "BoardSettings | None" = None
        self.timing: "TimingSettings | None" = None
        self.io: "IoSettings | None" = None
        self.banks: "list[BankSettings]" = []
        self.motors: "list[MotorSettings]" = []
        self.junctions: "list[JunctionSettings]" = []
        self.routes: "list[RouteSettings]" = []
        self.buttons: "list[ButtonSettings]" = []
        self.followers: "list[FollowerSettings]" = []
        self.count = 0
        self._lists: "list[list[int]]" = []
        # Number of the record that each object came from, to name it in a problem.
        self.record_of: "dict[int, int]" = {}
        self.charges = 0

    @property
    def inputs(self) -> int:
        """How many inputs there are."""
        return len(self.io.inputs) + self.io.in_chain if self.io else 0

    @property
    def outputs(self) -> int:
        """How many follower outputs there are."""
        return len(self.io.outputs) + self.io.out_chain if self.io else 0

    def add(self, message: Message, values: "list[object]") -> "Problem | None":
        """Take one record. Returns what is wrong with its place or number, else None."""
        number = self.count
        self.count += 1
        record = self._make(message)
        if record is None:
            return Problem(number, "m", "not_a_setting")
        record.fill(message, values, self._lists)
        field = self._place(record)
        if field:
            return Problem(number, field, "twice" if field == "m" else "wrong_place")
        self.record_of[id(record)] = number
        return None

    def _make(self, message: Message) -> "Record | None":
        kinds = (
            BoardSettings,
            TimingSettings,
            IoSettings,
            BankSettings,
            ChargeSettings,
            MotorSettings,
            JunctionSettings,
            LieSettings,
            RouteSettings,
            ButtonSettings,
            FollowerSettings,
        )
        for place in range(len(kinds)):
            if table.SETTINGS[place] is message:
                return kinds[place]()
        return None

    def _place(self, record: Record) -> str:
        """Put a record where it belongs; returns the field that does not fit, or nothing."""
        if isinstance(record, BoardSettings):
            taken, self.board = self.board, record
            return "m" if taken else ""
        if isinstance(record, TimingSettings):
            earlier, self.timing = self.timing, record
            return "m" if earlier else ""
        if isinstance(record, IoSettings):
            before, self.io = self.io, record
            return "m" if before else ""
        if isinstance(record, ChargeSettings):
            if record.i >= len(self.banks) or record.i != self.charges:
                return "i"
            self.charges += 1
            self.banks[record.i].charge = record
            return ""
        if isinstance(record, LieSettings):
            if record.j >= len(self.junctions):
                return "j"
            lies = self.junctions[record.j].lies
            if record.i != len(lies):
                return "i"
            lies.append(record)
            return ""
        return self._append(record)

    def _append(self, record: Record) -> str:
        """A record of a kind that is numbered: its number is its place in its list."""
        if isinstance(record, BankSettings) and record.i == len(self.banks):
            self.banks.append(record)
        elif isinstance(record, MotorSettings) and record.i == len(self.motors):
            self.motors.append(record)
        elif isinstance(record, JunctionSettings) and record.i == len(self.junctions):
            record.lies = []
            self.junctions.append(record)
        elif isinstance(record, RouteSettings) and record.i == len(self.routes):
            self.routes.append(record)
        elif isinstance(record, ButtonSettings) and record.i == len(self.buttons):
            self.buttons.append(record)
        elif isinstance(record, FollowerSettings) and record.i == len(self.followers):
            self.followers.append(record)
        else:
            return "i"
        return ""
