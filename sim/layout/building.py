"""From a layout file's tables to settings records: every record remembers where in the file it came from."""

from typing import Any

from shared_protocol import settings_table as wire
from shared_protocol.codec import Codec, ValueOutOfTable, values_from
from shared_protocol.fields import NAME_MAX, Message
from shared_protocol.registry import board_reads
from sim.layout import keys
from sim.layout.junctions import JunctionBuilder
from sim.layout.reading import Document, Key, Where, check_table, check_tables, fault_of

AC_PEAK = 1.414 * 1.2  # unloaded transformers give about a fifth more than their rating (common practice, no source)
DC_PEAK = 1.05


class Records:
    """The records so far, in wire order, each with its origin."""

    def __init__(self, document: Document) -> None:
        self.document = document
        self.rows: list[tuple[Message, list[object]]] = []
        self.origins: list[tuple[Where, dict[str, str]]] = []
        self._codec = Codec(board_reads())

    def add(self, message: Message, where: Where, owner_keys: dict[str, str], **fields: object) -> None:
        """Add one record; `owner_keys` maps wire fields to the owner's keys. Problems go into the document."""
        try:
            values = values_from(message, fields)
            self._codec.body(message, values)
        except ValueOutOfTable as error:
            wrong = str(error).split(": ")[1]
            known = next((field for field in message.fields if field.key == wrong), None)
            reason = f"must lie in {known.low} to {known.high} {known.unit}".rstrip() if known else "is too long"
            self.document.wrong((*where, owner_keys.get(wrong, wrong)), f"{wrong} {reason}")
            return
        self.rows.append((message, values))
        self.origins.append((where, owner_keys))


def plain_name(text: str) -> str:
    """The owner's text as a board can keep it: ASCII, no quote or backslash, '?' for the rest."""
    kept = "".join(letter if 32 <= ord(letter) < 127 and letter not in '"\\' else "?" for letter in text)
    return kept[:NAME_MAX]


class LayoutBuilder:
    """Builds the records of one layout file. `build` leaves problems in the document."""

    def __init__(self, document: Document) -> None:
        self.document = document
        self.records = Records(document)
        self.supply: dict[str, Any] = {}
        self.banks: list[dict[str, Any]] = []
        self.bank_numbers: dict[str, int] = {}
        self.inputs: dict[str, int] = {}
        self.outputs: dict[str, int] = {}
        self.junctions = JunctionBuilder(self)
        self.routes: dict[str, int] = {}
        self.name = ""

    def build(self) -> None:
        """Read every table."""
        document = self.document
        data = check_table(document, (), document.data, keys.FILE)
        self.name = str(self._table(data, "layout", keys.LAYOUT).get("name", ""))
        self.supply = self._table(data, "supply", keys.SUPPLY)
        self._board(self._table(data, "board", keys.BOARD))
        self._timing(self._table(data, "timing", keys.TIMING))
        self._io(self._table(data, "io", keys.IO))
        self.inputs = self._names(data, "inputs", wire.MOST_INPUTS)
        self.outputs = self._names(data, "outputs", wire.MOST_OUTPUTS)
        self._banks(check_tables(document, ("bank",), data.get("bank", []), keys.BANK))
        self.junctions.build(check_tables(document, ("junction",), data.get("junction", []), keys.JUNCTION))
        self._routes(check_tables(document, ("route",), data.get("route", []), keys.ROUTE))
        self._buttons(check_tables(document, ("button",), data.get("button", []), keys.BUTTON))
        self._followers(check_tables(document, ("follower",), data.get("follower", []), keys.FOLLOWER))

    def _table(self, data: dict[str, Any], name: str, known: tuple[Key, ...]) -> dict[str, Any]:
        return check_table(self.document, (name,), data.get(name, {}), known)

    # ---- board, timing, pins

    def _board(self, board: dict[str, Any]) -> None:
        if not board:
            return
        self.records.add(
            wire.SET_BOARD, ("board",),
            {
                "silence_ms": "host_silence_ms", "tell_ms": "telemetry_ms", "restore": "restore_lies",
                "order": "route_order",
            },
            name=plain_name(board["name"]), silence_ms=board.get("host_silence_ms", 3000),
            tell_ms=board.get("telemetry_ms", 100), restore="yes" if board.get("restore_lies") else "no",
            order=board.get("route_order", "as_listed"),
        )  # fmt: skip

    def _timing(self, timing: dict[str, Any]) -> None:
        owner = {
            "settle_ms": "settle_ms", "wait_ms": "longest_wait_ms", "pause_ms": "route_pause_ms",
            "hysteresis_mv": "hysteresis_v", "steady_ms": "button_steady_ms", "stuck_ms": "button_stuck_ms",
            "equal": "contact_equal", "after_ms": "contact_after_ms", "pair_ms": "entrance_exit_ms",
        }  # fmt: skip
        fields = {wire_key: timing[key] for wire_key, key in owner.items() if key in timing}
        if "hysteresis_mv" in fields:
            fields["hysteresis_mv"] = millivolts(fields["hysteresis_mv"])
        self.records.add(wire.SET_TIMING, ("timing",), owner, **fields)

    def _io(self, io: dict[str, Any]) -> None:
        owner = {
            "inputs": "input_pins", "in_chain": "inputs_on_chain", "in_pins": "input_chain_pins",
            "outputs": "output_pins", "out_chain": "outputs_on_chain", "out_pins": "output_chain_pins",
        }  # fmt: skip
        self.records.add(wire.SET_IO, ("io",), owner, **{key: io[name] for key, name in owner.items() if name in io})

    def _names(self, data: dict[str, Any], table: str, most: int) -> dict[str, int]:
        """A table of names for inputs or outputs."""
        named = data.get(table, {})
        found: dict[str, int] = {}
        number = Key("", "whole", "", low=0, high=most - 1)
        for name, value in named.items() if isinstance(named, dict) else []:
            message = fault_of(number, value)
            if not message and value in found.values():
                message = f"input {value} has another name already" if table == "inputs" else "has another name already"
            if message:
                self.document.wrong((table, name), message)
            else:
                found[name] = value
        return found

    def input_number(self, where: Where, text: str) -> int:
        """An input by name or number; -1 (and noted) if there is none."""
        return self._numbered(where, text, self.inputs, "input")

    def _numbered(self, where: Where, text: str, names: dict[str, int], what: str) -> int:
        if text in names:
            return names[text]
        if text.isdigit() and int(text) < 48:
            return int(text)
        self.document.wrong(where, f"there is no {what} '{text}'; named are: {', '.join(names) or 'none'}")
        return -1

    # ---- banks

    def full_v(self, bank: dict[str, Any]) -> float:
        """The voltage of the full bank."""
        volts = float(self.supply.get("volts", 16.0))
        usual = volts if self.supply.get("kind") != "ac" else volts * 1.414 - 1.4
        return float(bank.get("full_v", usual))

    def full_supply_v(self) -> float:
        """What the supply gives to a bank that takes no more current."""
        return max([self.full_v(bank) for bank in self.banks], default=16.0)

    def peak_v(self) -> float:
        """The highest voltage that the supply can give, unloaded."""
        volts = float(self.supply.get("volts", 16.0))
        usual = volts * (AC_PEAK if self.supply.get("kind") == "ac" else DC_PEAK)
        return float(self.supply.get("peak_v", usual))

    def _banks(self, banks: list[dict[str, Any]]) -> None:
        if self.supply.get("kind") == "ac" and float(self.supply.get("volts", 0)) > 18:
            self.document.wrong(("supply", "volts"), "more than 18 V AC is refused: 24 V AC peaks at 42 V")
        self.banks = banks
        for number, bank in enumerate(banks):
            name = str(bank.get("name", ""))
            if name in self.bank_numbers:
                self.document.wrong(("bank", number, "name"), f"another bank is called '{name}'")
            self.bank_numbers.setdefault(name, number)
            if "first_pin" in bank and bank.get("chain_pins"):
                self.document.wrong(("bank", number, "first_pin"), "a bank is on pins or on the output chain, not both")
            if {"name", "coils", "adc"} <= bank.keys():
                self._bank(number, bank)
        for number, bank in enumerate(banks):
            self._charge(number, bank)

    def _bank(self, number: int, bank: dict[str, Any]) -> None:
        owner = {
            "pin": "first_pin", "chain": "chain_pins", "range_mv": "sense_range_v", "full_mv": "full_v",
            "peak_mv": "full_v",
        }  # fmt: skip
        self.records.add(
            wire.SET_BANK, ("bank", number), owner, i=number, name=plain_name(bank["name"])[:16],
            pin=bank.get("first_pin", -1), coils=bank["coils"], chain=bank.get("chain_pins", []), adc=bank["adc"],
            range_mv=millivolts(bank.get("sense_range_v", 33.0)), full_mv=millivolts(self.full_v(bank)),
            peak_mv=millivolts(self.peak_v()), gap_ms=bank.get("gap_ms", 20), switch=bank.get("switch", "low"),
        )  # fmt: skip

    def _charge(self, number: int, bank: dict[str, Any]) -> None:
        owner = {
            "kind": "charge", "cap_uf": "capacitance_uf", "charge_dohm": "charge_ohm", "rated_mw": "resistor_w",
            "cut_pin": "cut_off_pin",
        }  # fmt: skip
        self.records.add(
            wire.SET_CHARGE, ("bank", number), owner, i=number, kind=bank.get("charge", "resistor"),
            cap_uf=bank.get("capacitance_uf", 4700), charge_dohm=round(bank.get("charge_ohm", 47.0) * 10),
            limit_ma=bank.get("limit_ma", 0), guard=bank.get("guard", "none"),
            rated_mw=round(bank.get("resistor_w", 10.0) * 1000), stall_ms=bank.get("stall_ms", 5000),
            cut_pin=bank.get("cut_off_pin", -1),
        )  # fmt: skip

    # ---- routes, buttons, followers

    def _routes(self, routes: list[dict[str, Any]]) -> None:
        for number, route in enumerate(routes):
            where: Where = ("route", number)
            if str(route.get("name")) in self.routes:
                self.document.wrong((*where, "name"), f"another route is called '{route['name']}'")
            self.routes.setdefault(str(route.get("name")), number)
            throws: list[int] = []
            for place, text in enumerate(route.get("throws", [])):
                throws += self._throw_of((*where, "throws", place), text)
            if {"name", "throws"} <= route.keys() and len(throws) == 2 * len(route["throws"]):
                self.records.add(
                    wire.SET_ROUTE, where, {}, i=number, name=plain_name(route["name"]),
                    entrance=route.get("entrance", -1), exit=route.get("exit", -1), throws=throws,
                )  # fmt: skip

    def _throw_of(self, where: Where, text: str) -> list[int]:
        """`junction: lie` as two numbers; nothing (and noted) if it names what is not there."""
        junction, colon, lie = text.rpartition(":")
        if not colon:
            self.document.wrong(where, f"'{text}' must be written 'junction: lie'")
            return []
        number = self.junctions.number_of(where, junction.strip())
        lie_number = self.junctions.lie_of(where, number, lie.strip())
        return [number, lie_number] if number >= 0 and lie_number >= 0 else []

    def _buttons(self, buttons: list[dict[str, Any]]) -> None:
        for number, button in enumerate(buttons):
            where: Where = ("button", number)
            if not {"kind", "input"} <= button.keys():
                continue
            junction = lie = other = -1
            if "junction" in button:
                junction = self.junctions.number_of((*where, "junction"), button["junction"])
            if "lie" in button:
                lie = self.junctions.lie_of((*where, "lie"), junction, button["lie"])
            if "other_lie" in button:
                other = self.junctions.lie_of((*where, "other_lie"), junction, button["other_lie"])
            target = button.get("number", -1)
            if "route" in button:
                target = self._route_of((*where, "route"), button["route"])
            owner = {"j": "junction", "other": "other_lie", "read": "read_at_power_up"}
            owner["n"] = "number" if button["kind"] in ("entrance", "exit") else "route"
            self.records.add(
                wire.SET_BUTTON, where, owner, i=number, kind=button["kind"],
                input=self.input_number((*where, "input"), button["input"]), j=junction, lie=lie, other=other, n=target,
                read="yes" if button.get("read_at_power_up") else "no",
            )  # fmt: skip

    def _route_of(self, where: Where, text: str) -> int:
        if text in self.routes:
            return self.routes[text]
        self.document.wrong(where, f"there is no route '{text}'; there are: {', '.join(self.routes) or 'none'}")
        return -1

    def _followers(self, followers: list[dict[str, Any]]) -> None:
        for number, follower in enumerate(followers):
            where: Where = ("follower", number)
            if not {"kind", "output", "junction"} <= follower.keys():
                continue
            junction = self.junctions.number_of((*where, "junction"), follower["junction"])
            lie = 0
            if follower["kind"] != "dead_frog":
                if "lie" not in follower:
                    self.document.wrong((*where, "lie"), "is missing")
                lie = self.junctions.lie_of((*where, "lie"), junction, follower.get("lie", ""))
            output = self._numbered((*where, "output"), follower["output"], self.outputs, "output")
            if min(junction, lie, output) >= 0:
                self.records.add(
                    wire.SET_FOLLOWER, where, {"j": "junction"}, i=number, kind=follower["kind"], output=output,
                    j=junction, lie=lie,
                )  # fmt: skip


def millivolts(volts: Any) -> int:
    """Volts as whole millivolts."""
    return round(float(volts) * 1000)
