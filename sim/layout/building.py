"""From a layout file's tables to settings records: reads every table and hands it to the builder of its part."""

from typing import Any

from shared_protocol import settings_table as wire
from shared_protocol.fields import NAME_MAX
from sim.layout import keys
from sim.layout.banks import BankBuilder, millivolts
from sim.layout.junctions import JunctionBuilder
from sim.layout.names import PinUses, plain_name
from sim.layout.panel import PanelBuilder
from sim.layout.reading import Document, Key, check_table, check_tables
from sim.layout.records import MOST_RECORDS, Records
from sim.layout.terminals import Terminals, check_chain_pins
from sim.layout.wire_keys import owner_keys


class LayoutBuilder:
    """Builds the records of one layout file. `build` leaves problems in the document."""

    def __init__(self, document: Document) -> None:
        self.document = document
        self.records = Records(document)
        self.pins = PinUses(document)
        self.inputs = Terminals(document, "input", wire.MOST_INPUTS)
        self.outputs = Terminals(document, "output", wire.MOST_OUTPUTS)
        self.banks = BankBuilder(document, self.records, self.pins)
        self.junctions = JunctionBuilder(document, self.records, self.banks, self.inputs)
        self.panel = PanelBuilder(self)
        self.name = ""
        self.board: dict[str, Any] = {}

    def build(self) -> None:
        """Read every table, in the order in which a board wants the records."""
        data = check_table(self.document, (), self.document.data, keys.FILE)
        for names, table in (
            (self.banks.names, "bank"), (self.junctions.names, "junction"), (self.panel.routes, "route"),
        ):  # fmt: skip
            names.complete = not self.document.is_wrong((table,))
        self.name = str(self._table(data, "layout", keys.LAYOUT).get("name", ""))
        supply = self._table(data, "supply", keys.SUPPLY)
        self.board = self._table(data, "board", keys.BOARD)
        self._board(self.board)
        self._timing(self._table(data, "timing", keys.TIMING))
        banks = self._tables(data, "bank", keys.BANK)
        self._io(self._table(data, "io", keys.IO), data, banks)
        self.banks.read(supply, banks)
        self.junctions.read(self._tables(data, "junction", keys.JUNCTION))
        self.panel.read_routes(self._tables(data, "route", keys.ROUTE))
        self.panel.read_buttons(self._tables(data, "button", keys.BUTTON))
        self.panel.read_followers(self._tables(data, "follower", keys.FOLLOWER))
        for uses in (self.pins, self.inputs.uses, self.outputs.uses, *self.banks.coils):
            uses.report()
        if len(self.records.rows) > MOST_RECORDS:
            self.document.wrong(
                ("junction",), f"the file makes {len(self.records.rows)} records, a board holds {MOST_RECORDS}: "
                "use a second board",
            )  # fmt: skip

    def _table(self, data: dict[str, Any], name: str, known: tuple[Key, ...]) -> dict[str, Any]:
        """A table that stands once; nothing in it if it is missing or no table, which is noted already."""
        if name not in data and self.document.is_wrong((name,)):
            return {}
        return check_table(self.document, (name,), data.get(name, {}), known)

    def _tables(self, data: dict[str, Any], name: str, known: tuple[Key, ...]) -> list[dict[str, Any]]:
        return check_tables(self.document, (name,), data.get(name, []), known)

    def _board(self, board: dict[str, Any]) -> None:
        name = board.get("name", self.name[:NAME_MAX]) or "board 1"
        self.records.add(
            wire.SET_BOARD, ("board",), name=plain_name(name), silence_ms=board.get("host_silence_ms", 3000),
            tell_ms=board.get("telemetry_ms", 100), restore="yes" if board.get("restore_lies") else "no",
            order=board.get("route_order", "as_listed"),
        )  # fmt: skip

    def _timing(self, timing: dict[str, Any]) -> None:
        fields = {field: timing[key] for field, key in owner_keys(wire.SET_TIMING).items() if key in timing}
        if "hysteresis_mv" in fields:
            fields["hysteresis_mv"] = millivolts(fields["hysteresis_mv"])
        self.records.add(wire.SET_TIMING, ("timing",), **fields)

    def _io(self, io: dict[str, Any], data: dict[str, Any], banks: list[dict[str, Any]]) -> None:
        for terminals in (self.inputs, self.outputs):
            terminals.read(io, data.get("inputs" if terminals is self.inputs else "outputs", {}))
        on_chain = self.outputs.on_chain > 0 or any(bank.get("chain_pins") for bank in banks)
        check_chain_pins(self.document, io, "input_chain_pins", self.inputs.on_chain > 0, "the input chain")
        check_chain_pins(self.document, io, "output_chain_pins", on_chain, "the output chain")
        self.inputs.claim_pins(self.pins, io.get("input_chain_pins", []), "input_chain_pins")
        self.outputs.claim_pins(self.pins, io.get("output_chain_pins", []), "output_chain_pins")
        if not self.document.is_wrong(("io",)):
            self.records.add(
                wire.SET_IO, ("io",), inputs=self.inputs.pins, in_chain=self.inputs.on_chain,
                in_pins=io.get("input_chain_pins", []), outputs=self.outputs.pins, out_chain=self.outputs.on_chain,
                out_pins=io.get("output_chain_pins", []),
            )  # fmt: skip
