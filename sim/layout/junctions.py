"""Junctions of a layout file: their motors, their lies, the order that avoids a forbidden combination."""

from itertools import permutations
from typing import TYPE_CHECKING, Any

from shared_protocol import settings_table as wire
from sim.layout import keys
from sim.layout.reading import Where, check_tables

if TYPE_CHECKING:
    from sim.layout.building import LayoutBuilder

OUT_OF_SCOPE = {
    "two_wire": "two-wire motors (one coil, reversed polarity) are not driven by this board",
    "slow_motor": "slow motor drives are not driven by this board",
    "servo": "servos are not driven by this board",
}
USUAL_OHM = 4.5
ENDS_OWN_OHM = 15.0
READY_SHARE = 0.80
READY_SHARE_TOGETHER = 0.85


class JunctionBuilder:
    """Builds motors, junctions and lies; knows their names for everything that refers to them."""

    def __init__(self, builder: "LayoutBuilder") -> None:
        self._builder = builder
        self._document = builder.document
        self.motors: list[dict[str, Any]] = []
        self.words: list[list[str]] = []
        self.names: list[list[str]] = []
        self.numbers: dict[str, int] = {}

    # ---- names

    def number_of(self, where: Where, text: str) -> int:
        """A junction by name; -1 (and noted) if there is none."""
        if text in self.numbers:
            return self.numbers[text]
        self._document.wrong(where, f"there is no junction '{text}'")
        return -1

    def lie_of(self, where: Where, junction: int, text: str) -> int:
        """A lie by name or the owner's words; -1 (and noted) if there is none."""
        if junction < 0 or junction >= len(self.words):
            return -1
        for known in (self.words[junction], self.names[junction]):
            if text in known:
                return known.index(text)
        there = ", ".join(dict.fromkeys(self.words[junction]))
        self._document.wrong(where, f"its junction has no lie '{text}'; it has: {there}")
        return -1

    # ---- building

    def build(self, junctions: list[dict[str, Any]]) -> None:
        """Check all, then add motors first and junctions after them, as the wire has them."""
        ready: list[tuple[int, dict[str, Any], list[int]]] = []
        for number, junction in enumerate(junctions):
            where: Where = ("junction", number)
            name = str(junction.get("name", ""))
            if name in self.numbers:
                self._document.wrong((*where, "name"), f"another junction is called '{name}'")
            self.numbers.setdefault(name, number)
            if junction.get("kind") in OUT_OF_SCOPE:
                self._document.wrong((*where, "kind"), OUT_OF_SCOPE[junction["kind"]])
                junction["kind"] = "turnout"
            motors = check_tables(self._document, (*where, "motors"), junction.get("motors", []), keys.MOTOR)
            lies = check_tables(self._document, (*where, "lie"), junction.get("lie", []), keys.LIE)
            self._name_lies(junction, lies)
            first = len(self.motors)
            for place, motor in enumerate(motors):
                self._motor((*where, "motors", place), junction, motor)
            ready.append((number, junction | {"lie": lies}, list(range(first, first + len(motors)))))
        for number, junction, numbers in ready:
            if {"name", "bank", "motors"} <= junction.keys():
                self._junction(number, junction, numbers)

    def _name_lies(self, junction: dict[str, Any], lies: list[dict[str, Any]]) -> None:
        if lies:
            self.names.append([str(lie.get("name", "")) for lie in lies])
            self.words.append([str(lie.get("word", lie.get("name", ""))) for lie in lies])
        else:
            self.names.append(["normal", "reverse"])
            self.words.append([str(junction.get("normal", "normal")), str(junction.get("reverse", "reverse"))])

    def _motor(self, where: Where, junction: dict[str, Any], motor: dict[str, Any]) -> None:
        builder = self._builder
        number = len(self.motors)
        bank_name = str(motor.get("bank", junction.get("bank", "")))
        bank_where = (*where, "bank") if "bank" in motor else ("junction", where[1], "bank")
        if bank_name not in builder.bank_numbers and ("bank" in motor or "bank" in junction):
            there = ", ".join(builder.bank_numbers)
            builder.document.wrong(bank_where, f"there is no bank '{bank_name}'; there are: {there}")
        bank = builder.bank_numbers.get(bank_name, -1)
        ends = bool(motor.get("ends_own_pulse"))
        ohm = float(motor.get("ohm", ENDS_OWN_OHM if ends else USUAL_OHM))
        motor = motor | {"bank_number": bank, "ohm": ohm}
        self.motors.append(motor)
        inputs = [builder.input_number((*where, "contact_inputs"), text) for text in motor.get("contact_inputs", [])]
        coils = motor.get("coils")
        if bank < 0 or not coils:
            return
        owner = {
            "normal": "coils", "reverse": "coils", "coil_cohm": "ohm", "ends": "ends_own_pulse",
            "c1": "contact_inputs", "c2": "contact_inputs",
        }  # fmt: skip
        builder.records.add(
            wire.SET_MOTOR, where, owner, i=number, bank=bank, normal=coils[0], reverse=coils[1],
            coil_cohm=round(ohm * 100), parallel=motor.get("parallel", 1), ends="yes" if ends else "no",
            rest_ms=motor.get("rest_ms", 500), contact=motor.get("contact", "none"),
            c1=inputs[0] if inputs else -1, c2=inputs[1] if len(inputs) > 1 else -1,
            answer_ms=motor.get("answer_ms", 250),
        )  # fmt: skip

    def _junction(self, number: int, junction: dict[str, Any], motors: list[int]) -> None:
        where: Where = ("junction", number)
        from sim.layout.building import millivolts, plain_name

        forbidden = self._forbidden(where, junction, len(motors))
        bar = -1
        if "not_while" in junction:
            bar = self._builder.input_number((*where, "not_while"), junction["not_while"])
        owner = {"retry_mv": "retry_v", "forbid": "forbidden", "bar": "not_while", "i": "lie"}
        self._builder.records.add(
            wire.SET_JUNCTION, where, owner, i=number, name=plain_name(junction["name"]),
            kind=junction.get("kind", "turnout"),
            motors=motors, forbid=forbidden, retry_mv=millivolts(junction.get("retry_v", 0)),
            pulses=junction.get("pulses", 1), bar=bar,
        )  # fmt: skip
        lies = junction["lie"]
        if not lies:
            if junction.get("kind") in ("three_way", "slip") and len(motors) > 1:
                self._document.wrong((*where, "lie"), "is missing: write a [[junction.lie]] for each lie")
            ends = ("normal", "reverse")
            lies = [{"name": end, "motors": [end] * len(motors)} for end in ends]
        for place, lie in enumerate(lies):
            lie_where = (*where, "lie", place) if junction["lie"] else where
            if {"name", "motors"} <= lie.keys():
                self._lie(number, place, junction, lie, lie_where, forbidden, motors)

    def _lie(
        self, number: int, place: int, junction: dict[str, Any], lie: dict[str, Any], where: Where,
        forbidden: list[int], motors: list[int],
    ) -> None:  # fmt: skip
        from sim.layout.building import millivolts, plain_name

        at = self._combination((*where, "motors"), lie["motors"], len(motors))
        if at is None:
            return
        together = bool(junction.get("together", junction.get("kind") == "crossover"))
        order = self._order(where, lie, at, forbidden, len(motors), together)
        ready_v = lie.get("ready_v", junction.get("ready_v", self._usual_ready_v(motors, together)))
        pulse_ms = lie.get("pulse_ms", junction.get("pulse_ms", 40.0))
        full_ms = lie.get("full_pulse_ms", junction.get("full_pulse_ms", pulse_ms))
        owner = {"at": "motors", "ready_mv": "ready_v", "pulse_us": "pulse_ms", "full_us": "full_pulse_ms"}
        self._builder.records.add(
            wire.SET_LIE, where, owner, j=number, i=place, name=plain_name(lie["name"])[:16] or "?",
            word=plain_name(self.words[number][place]), at=at, order=order, together="yes" if together else "no",
            ready_mv=millivolts(ready_v), pulse_us=round(pulse_ms * 1000), full_us=round(full_ms * 1000),
        )  # fmt: skip

    def _usual_ready_v(self, motors: list[int], together: bool) -> float:
        """An untried junction: 80 % of the full bank; more where two motors share it."""
        banks = [
            self._builder.banks[self.motors[motor]["bank_number"]]
            for motor in motors
            if self.motors[motor]["bank_number"] >= 0
        ]
        full_v = min((self._builder.full_v(bank) for bank in banks), default=16.0)
        return round(full_v * (READY_SHARE_TOGETHER if together and len(motors) > 1 else READY_SHARE), 1)

    def _forbidden(self, where: Where, junction: dict[str, Any], motors: int) -> list[int]:
        rows = junction.get("forbidden", [])
        if not isinstance(rows, list) or not all(isinstance(row, list) for row in rows) or len(rows) > 8:
            self._document.wrong((*where, "forbidden"), "must be a list of at most 8 lists of normal and reverse")
            return []
        found = [self._combination((*where, "forbidden"), row, motors) for row in rows]
        return [combination for combination in found if combination is not None]

    def _combination(self, where: Where, positions: list[Any], motors: int) -> int | None:
        """normal and reverse, one a motor, as bits."""
        if len(positions) != motors:
            self._document.wrong(where, f"names {len(positions)} positions, the junction has {motors} motors")
            return None
        at = 0
        for place, position in enumerate(positions):
            if position not in ("normal", "reverse"):
                self._document.wrong(where, f"'{position}' must be normal or reverse")
                return None
            at |= (position == "reverse") << place
        return at

    def _order(
        self, where: Where, lie: dict[str, Any], at: int, forbidden: list[int], motors: int, together: bool
    ) -> list[int]:
        """The order of the motors: as given, or the first one that passes no forbidden combination."""
        if "order" in lie:
            return [place - 1 for place in lie["order"]]
        for order in permutations(range(motors)):
            if together or not passes(order, at, forbidden, motors):
                return list(order)
        self._document.wrong(where, "no order of its motors avoids passing a forbidden combination")
        return list(range(motors))


def passes(order: tuple[int, ...], at: int, forbidden: list[int], motors: int) -> bool:
    """True if from some allowed combination this order makes a forbidden one in passing."""
    for start in range(1 << motors):
        now = start
        for place in order if start not in forbidden else ():
            now = (now & ~(1 << place)) | (at & (1 << place))
            if now in forbidden:
                return True
    return False
