"""Junctions of a layout file: names, kinds, forbidden combinations, lies and their ready voltages."""

from dataclasses import dataclass
from itertools import permutations
from typing import Any

from shared_protocol import settings_table as wire
from shared_protocol.settings import JunctionSettings, LieSettings
from shared_protocol.settings_check import passes_forbidden
from sim.layout import keys
from sim.layout.banks import BankBuilder, millivolts
from sim.layout.motors import MotorBuilder
from sim.layout.names import Names, no_such, plain_name
from sim.layout.reading import Document, Where, check_tables, shown
from sim.layout.records import Records
from sim.layout.terminals import Terminals

READY_SHARE = 0.80
READY_SHARE_TOGETHER = 0.85
ENDS = ("normal", "reverse")
RESERVED_WORDS = ("unknown", "between")
MOTORS_OF_KINDS = {"turnout": (1, 1), "crossover": (1, 2), "three_way": (2, 2), "slip": (1, 4)}


@dataclass
class _Junction:
    """One junction while it is built."""

    number: int
    where: Where
    table: dict[str, Any]
    lies: list[dict[str, Any]]
    listed: bool  # its lies are listed in the file, not made from normal and reverse
    motors: list[int]
    together: bool
    forbidden: list[int]

    def where_of_lie(self, place: int) -> Where:
        """Where a lie stands: the junction itself if it is made from normal and reverse."""
        return (*self.where, "lie", place) if self.listed else self.where

    def given_by_lie(self, place: int, key: str) -> Where:
        """Where a figure of a lie stands: with the lie, else with the junction."""
        return (*self.where_of_lie(place), key) if key in self.lies[place] else (*self.where, key)

    def figure(self, place: int, key: str, usual: float) -> float:
        """A figure of a lie: its own, the junction's, or the usual one."""
        return float(self.lies[place].get(key, self.table.get(key, usual)))


class JunctionBuilder:
    """Builds motors, junctions and lies; knows their names for everything that refers to them."""

    def __init__(self, document: Document, records: Records, banks: BankBuilder, inputs: Terminals) -> None:
        self._document = document
        self._records = records
        self._banks = banks
        self._inputs = inputs
        self.names = Names(document, "junction")
        self.motors = MotorBuilder(document, records, banks, inputs)
        self.words: list[list[str]] = []
        self.lie_names: list[list[str]] = []

    def lie_of(self, where: Where, junction: int, text: str) -> int:
        """A lie by the owner's words or its name; -1 (and noted) if there is none."""
        if not 0 <= junction < len(self.words):
            return -1
        for known in (self.words[junction], self.lie_names[junction]):
            if text in known:
                return known.index(text)
        if not self._document.is_wrong(("junction", junction)):
            there = list(dict.fromkeys(self.words[junction] + self.lie_names[junction]))
            self._document.wrong(where, no_such(text, there, f"lie of '{self.names.all[junction]}'"))
        return -1

    # ---- reading

    def read(self, tables: list[dict[str, Any]]) -> None:
        """Check all, then add motors first and junctions after them, as the wire has them."""
        found = []
        for number, table in enumerate(tables):
            where: Where = ("junction", number)
            self.names.add(table.get("name"), where)
            motors = self.motors.read(number, table)
            found.append(self._understood(number, where, table, motors))
        self.motors.finish()
        for junction in found:
            if not self._document.is_wrong(junction.where):
                self._checked(junction)
            if not self._document.problems:
                self._add(junction)

    def _understood(self, number: int, where: Where, table: dict[str, Any], motors: list[int]) -> _Junction:
        kind = table.get("kind", "turnout")
        fewest, most = MOTORS_OF_KINDS[kind]
        if motors and not fewest <= len(motors) <= most and not self._document.is_wrong((*where, "kind")):
            wanted = str(fewest) if fewest == most else f"{fewest} to {most}"
            self._document.wrong((*where, "motors"), f"a {kind} has {wanted} motors, not {len(motors)}")
        lies = check_tables(self._document, (*where, "lie"), table.get("lie", []), keys.LIE)
        listed = "lie" in table
        if not listed:
            if len(motors) > 1 and kind in ("three_way", "slip") and not self._document.is_wrong((*where, "lie")):
                self._document.wrong((*where, "lie"), "is missing: write a [[junction.lie]] for each lie")
            lies = [{"name": end, "word": table.get(end, end), "motors": [end] * len(motors)} for end in ENDS]
        for end in ENDS if listed else ():
            if end in table:
                self._document.wrong((*where, end), "has no use where lies are listed: give each lie its word")
        together = bool(table.get("together", kind == "crossover")) and len(motors) > 1
        forbidden = self._forbidden(where, table, len(motors))
        junction = _Junction(number, where, table, lies, listed, motors, together, forbidden)
        self._name_lies(junction)
        return junction

    def _name_lies(self, junction: _Junction) -> None:
        """The names and words of its lies; nobody must be able to mistake one for another."""
        names = [str(lie.get("name", "")) for lie in junction.lies]
        words = [str(lie.get("word", lie.get("name", ""))) for lie in junction.lies]
        for place in range(len(words)):
            key = "word" if "word" in junction.lies[place] else "name"
            where = (*junction.where_of_lie(place), key) if junction.listed else (*junction.where, ENDS[place])
            others = [other for other in range(len(words)) if other != place]
            if words[place] in RESERVED_WORDS:
                self._document.wrong(where, f"'{words[place]}' has a meaning of its own: use another word")
            elif any(words[place] == words[other] for other in others if other < place):
                self._document.wrong(where, f"another lie is called '{words[place]}'")
            elif words[place] and any(words[place] == names[other] != words[other] for other in others):
                self._document.wrong(where, f"'{words[place]}' is the name of another lie")
            elif junction.listed and names[place] and names[place] in names[:place]:
                self._document.wrong((*where[:-1], "name"), f"another lie is called '{names[place]}'")
        self.lie_names.append(names)
        self.words.append(words)

    def _forbidden(self, where: Where, table: dict[str, Any], motors: int) -> list[int]:
        rows = table.get("forbidden", [])
        at: Where = (*where, "forbidden")
        if not isinstance(rows, list) or not all(isinstance(row, list) for row in rows) or len(rows) > 8:
            self._document.wrong(at, "must be a list of at most 8 lists of normal and reverse")
            return []
        found = [self._combination((*at, place), row, motors) for place, row in enumerate(rows)]
        return [combination for combination in found if combination >= 0]

    def _combination(self, where: Where, positions: list[Any], motors: int) -> int:
        """normal and reverse, one a motor, as bits; -1 (and noted) if it is something else."""
        if motors and len(positions) != motors:
            self._document.wrong(where, f"names {len(positions)} positions, the junction has {motors} motors")
            return -1
        at = 0
        for place, position in enumerate(positions):
            if position not in ENDS:
                self._document.wrong(where, f"'{shown(position)}' must be normal or reverse")
                return -1
            at |= (position == "reverse") << place
        return at

    # ---- what only the whole junction tells

    def _checked(self, junction: _Junction) -> None:
        rows: dict[int, str] = {}
        for place, lie in enumerate(junction.lies):
            where = junction.where_of_lie(place)
            at = self._combination((*where, "motors"), lie["motors"], len(junction.motors))
            lie["at"] = at
            if at < 0:
                continue
            if at in rows:
                self._document.wrong((*where, "motors"), f"sets the motors as lie '{rows[at]}' does")
            rows.setdefault(at, str(lie["name"]))
            if at in junction.forbidden:
                self._document.wrong((*where, "motors"), "sets a forbidden combination")
            else:
                lie["found_order"] = self._order(junction, where, lie)
            self._pulses(junction, place)
        self._ready_voltages(junction)
        if junction.together and not self._document.is_wrong(junction.where):
            self._one_run(junction)

    def _order(self, junction: _Junction, where: Where, lie: dict[str, Any]) -> list[int]:
        """The order of the motors: as given, or the first that passes no forbidden combination."""
        count = len(junction.motors)
        if "order" in lie:
            order = [number - 1 for number in lie["order"]]
            if sorted(order) != list(range(count)):
                self._document.wrong((*where, "order"), f"must name each motor once: 1 to {count}")
            elif passes(junction, lie["at"], order):
                self._document.wrong((*where, "order"), "passes a forbidden combination from some other lie")
            return order
        for found in permutations(range(count)):
            if not passes(junction, lie["at"], list(found)):
                return list(found)
        self._document.wrong((*where, "motors"), "no order of its motors avoids passing a forbidden combination")
        return list(range(count))

    def _pulses(self, junction: _Junction, place: int) -> None:
        pulse_ms = junction.figure(place, "pulse_ms", 40.0)
        full_ms = junction.figure(place, "full_pulse_ms", pulse_ms)
        if full_ms > pulse_ms:
            self._document.wrong(
                junction.given_by_lie(place, "full_pulse_ms"),
                f"{full_ms:g} ms at full bank is longer than {pulse_ms:g} ms at the ready voltage",
            )

    def _full_v(self, junction: _Junction) -> tuple[float, str]:
        """The lowest full bank of its motors, and that bank's name."""
        banks = [self._banks.tables[self.motors.tables[motor]["bank_number"]] for motor in junction.motors]
        return min((float(bank["full_v"]), str(bank["name"])) for bank in banks)

    def _banks_of(self, junction: _Junction) -> list[int]:
        return sorted({self.motors.tables[motor]["bank_number"] for motor in junction.motors})

    def _usual_ready_v(self, junction: _Junction) -> float:
        """An untried junction: 80 % of the full bank; more where two motors share it."""
        return round(self._full_v(junction)[0] * (READY_SHARE_TOGETHER if junction.together else READY_SHARE), 1)

    def _ready_voltages(self, junction: _Junction) -> None:
        banks = self._banks_of(junction)
        if banks[0] < 0 or self._document.is_wrong(("supply",), *[("bank", bank) for bank in banks]):
            return
        full_v, bank = self._full_v(junction)
        retry_v = junction.table["retry_v"]
        for place in range(len(junction.lies)):
            ready_v = junction.figure(place, "ready_v", self._usual_ready_v(junction))
            if ready_v >= full_v:
                self._document.wrong(
                    junction.given_by_lie(place, "ready_v"),
                    f"{ready_v:g} V is never reached: bank '{bank}' is full at {full_v:g} V",
                )
            elif retry_v and ready_v + retry_v >= full_v:
                self._document.wrong(
                    (*junction.where, "retry_v"),
                    f"{ready_v:g} + {retry_v:g} V is never reached: bank '{bank}' is full at {full_v:g} V",
                )

    def _one_run(self, junction: _Junction) -> None:
        """Motors pulsed at once are on one bank, and within one run of outputs that one pulse can switch."""
        where: Where = (*junction.where, "together")
        motors = [self.motors.tables[motor] for motor in junction.motors]
        if len(self._banks_of(junction)) > 1:
            self._document.wrong(where, "motors on different banks can't be pulsed at once: use together = false")
            return
        for lie in junction.lies:
            runs = {motor["coils"][lie["at"] >> place & 1] // wire.GROUP_COILS for place, motor in enumerate(motors)}
            if len(runs) > 1:
                self._document.wrong(
                    where, f"its coils must be within one run of {wire.GROUP_COILS} outputs (0 to 23 or 24 to 47)"
                )
                return

    # ---- records

    def _add(self, junction: _Junction) -> None:
        table = junction.table
        bar = -1
        if "not_while" in table:
            bar = self._inputs.find((*junction.where, "not_while"), table["not_while"])
        self._records.add(
            wire.SET_JUNCTION, junction.where, i=junction.number, name=plain_name(table["name"]), kind=table["kind"],
            motors=junction.motors, forbid=junction.forbidden, retry_mv=millivolts(table["retry_v"]),
            pulses=table["pulses"], bar=bar,
        )  # fmt: skip
        for place, lie in enumerate(junction.lies):
            ready_v = junction.figure(place, "ready_v", self._usual_ready_v(junction))
            pulse_ms = junction.figure(place, "pulse_ms", 40.0)
            full_ms = junction.figure(place, "full_pulse_ms", pulse_ms)
            self._records.add(
                wire.SET_LIE, junction.where_of_lie(place), j=junction.number, i=place,
                name=plain_name(lie["name"], keys.SHORT_NAME), word=plain_name(self.words[junction.number][place]),
                at=lie["at"], order=lie["found_order"], together="yes" if junction.together else "no",
                ready_mv=millivolts(ready_v), pulse_us=round(pulse_ms * 1000), full_us=round(full_ms * 1000),
            )  # fmt: skip


def passes(junction: _Junction, at: int, order: list[int]) -> bool:
    """True if from some allowed combination this order makes a forbidden one in passing: the board's own rule."""
    whole = JunctionSettings()
    whole.motors = junction.motors
    whole.forbid = junction.forbidden
    row = LieSettings()
    row.at = at
    row.order = order
    row.together = int(junction.together)
    return passes_forbidden(whole, row)
