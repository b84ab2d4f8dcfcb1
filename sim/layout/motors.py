"""Motors of a layout file: their bank, coils and contacts."""

from typing import Any

from shared_protocol import settings_table as wire
from sim.layout import keys
from sim.layout.banks import BankBuilder
from sim.layout.reading import Document, Where, check_tables, shown
from sim.layout.records import Records
from sim.layout.terminals import Terminals

USUAL_OHM = 4.5
ENDS_OWN_OHM = 15.0
CONTACTS_OF_KINDS = {"none": 0, "one": 1, "two": 2, "inverse": 2}


class MotorBuilder:
    """Builds motors; after `finish`, `tables` holds each motor's figures with all defaults filled in."""

    def __init__(self, document: Document, records: Records, banks: BankBuilder, inputs: Terminals) -> None:
        self._document = document
        self._records = records
        self._banks = banks
        self._inputs = inputs
        self.tables: list[dict[str, Any]] = []
        # For each motor, where it stands and what people call it.
        self._places: list[tuple[Where, str]] = []

    def read(self, junction: int, table: dict[str, Any]) -> list[int]:
        """Take the motors of one junction; returns their numbers."""
        where: Where = ("junction", junction)
        motors = check_tables(self._document, (*where, "motors"), table.get("motors", []), keys.MOTOR)
        numbers = []
        usual_bank = self._banks.names.find((*where, "bank"), table["bank"]) if "bank" in table else -1
        for place, motor in enumerate(motors):
            at: Where = (*where, "motors", place)
            numbers.append(len(self.tables))
            name = str(table.get("name", junction + 1))
            self._places.append((at, f"'{name}'" if len(motors) == 1 else f"motor {place + 1} of '{name}'"))
            self.tables.append(self._filled_in(at, motor, usual_bank))
        return numbers

    def _filled_in(self, where: Where, given: dict[str, Any], usual_bank: int) -> dict[str, Any]:
        motor = dict(given)
        ends = motor.get("ends_own_pulse", False)
        motor["bank_number"] = usual_bank
        if "bank" in motor:
            motor["bank_number"] = self._banks.names.find((*where, "bank"), motor["bank"])
        motor.setdefault("ohm", ENDS_OWN_OHM if ends else USUAL_OHM)
        if motor.get("simulated") == "self_ending" and not ends:
            self._document.wrong((*where, "simulated"), "self_ending belongs to a motor with ends_own_pulse = true")
        motor.setdefault("simulated", "self_ending" if ends else "usual")
        self._contacts(where, motor)
        self._coils(where, motor)
        return motor

    def _contacts(self, where: Where, motor: dict[str, Any]) -> None:
        given = motor.get("contact_inputs", [])
        if "contact" not in motor and len(given) == 2 and not self._document.is_wrong((*where, "contact")):
            self._document.wrong((*where, "contact"), "is missing: two contact inputs are of kind two or inverse")
        motor.setdefault("contact", "one" if len(given) == 1 else "none")
        wanted = CONTACTS_OF_KINDS[motor["contact"]]
        if len(given) != wanted and not self._document.is_wrong((*where, "contact"), (*where, "contact_inputs")):
            self._document.wrong(
                (*where, "contact_inputs"),
                f"a contact of kind {motor['contact']} has {wanted} inputs, not {len(given)}",
            )
        what = self._places[-1][1]
        motor["input_numbers"] = []
        for place, text in enumerate(given):
            at: Where = (*where, "contact_inputs", place)
            number = self._inputs.find(at, text)
            motor["input_numbers"].append(number)
            if number >= 0:
                self._inputs.uses.claim(number, f"contact of {what}", at)

    def _coils(self, where: Where, motor: dict[str, Any]) -> None:
        """Each coil has an output of its bank to itself."""
        number = motor["bank_number"]
        count = self._banks.tables[number].get("coils") if number >= 0 else None
        if "coils" not in motor or count is None:
            return
        for coil, side in zip(motor["coils"], ("normal", "reverse"), strict=True):
            if not 0 <= coil < count:
                name = self._banks.names.all[number]
                self._document.wrong(
                    (*where, "coils"), f"there is no output {shown(coil)}: bank '{name}' has outputs 0 to {count - 1}"
                )
                return
            self._banks.coils[number].claim(coil, f"{side} coil of {self._places[-1][1]}", (*where, "coils"))

    def finish(self) -> None:
        """Look at each bank's drivers, and add the records of all motors."""
        for bank in range(len(self._banks.tables)):
            coils = [
                (motor["ohm"], what)
                for motor, (where, what) in zip(self.tables, self._places, strict=True)
                if motor["bank_number"] == bank and not self._document.is_wrong(where)
            ]
            self._banks.check_stuck_driver(bank, coils)
        for number, motor in enumerate(self.tables):
            where = self._places[number][0]
            if not self._document.is_wrong(where) and motor["bank_number"] >= 0:
                self._add(number, where, motor)

    def _add(self, number: int, where: Where, motor: dict[str, Any]) -> None:
        first, second = (*motor["input_numbers"], -1, -1)[:2]
        self._records.add(
            wire.SET_MOTOR, where, i=number, bank=motor["bank_number"], normal=motor["coils"][0],
            reverse=motor["coils"][1], coil_cohm=round(motor["ohm"] * 100), parallel=motor["parallel"],
            ends="yes" if motor["ends_own_pulse"] else "no", rest_ms=motor["rest_ms"], contact=motor["contact"],
            c1=first, c2=second, answer_ms=motor["answer_ms"],
        )  # fmt: skip
