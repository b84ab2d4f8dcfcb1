"""Banks and their supply: figures left out are filled in, contradictions are found, records are made."""

import math
from typing import Any

from shared_protocol import settings_table as wire
from shared_protocol.settings_check import COIL_LIMIT_MW
from sim.layout.names import Names, PinUses, Uses, plain_name
from sim.layout.reading import Document, Where
from sim.layout.records import Records

# Common practice, no source: an unloaded transformer gives about a fifth more than its rating, a regulated
# supply stays within a twentieth; a bridge rectifier takes two diode drops.
AC_PEAK = 1.414 * 1.2
DC_PEAK = 1.05
BRIDGE_V = 1.4
MOST_AC_V = 18.0
# Common practice, no source: above this, smaller capacitors behind a larger resistor.
HIGH_V = 18.0
USUAL_STALL_MS = 5000
LATEST_STALL_MS = 60_000


def millivolts(volts: Any) -> int:
    """Volts as whole millivolts."""
    return round(float(volts) * 1000)


class BankBuilder:
    """The banks of one file. After `read`, `tables` holds each bank's figures with all defaults filled in."""

    def __init__(self, document: Document, records: Records, pins: PinUses) -> None:
        self._document = document
        self._records = records
        self._pins = pins
        self.supply: dict[str, Any] = {}
        self.tables: list[dict[str, Any]] = []
        self.names = Names(document, "bank")
        self.coils: list[Uses] = []

    # ---- voltages

    def supply_v(self) -> float:
        """What the supply gives behind its rectifier, unloaded and at its nominal voltage."""
        volts = float(self.supply.get("volts", 16.0))
        return volts * 1.414 - BRIDGE_V if self.supply.get("kind") == "ac" else volts

    def peak_v(self) -> float:
        """The highest voltage that the supply can give."""
        usual = float(self.supply.get("volts", 16.0)) * (AC_PEAK if self.supply.get("kind") == "ac" else DC_PEAK)
        return float(self.supply.get("peak_v", usual))

    def share_left_by_bleed(self, bank: dict[str, Any]) -> float:
        """Bleed and charge path divide the supply's voltage: the share that a full bank has of it."""
        bleed_ohm = float(bank["bleed_ohm"])
        return bleed_ohm / (bleed_ohm + float(bank["charge_ohm"]) + float(self.supply.get("source_ohm", 0.5)))

    def simulated_supply_v(self) -> float:
        """The supply of the simulator: what the owner states the banks are charged to, else the supply's voltage."""
        return max([bank["stated_v"] for bank in self.tables], default=16.0)

    # ---- reading

    def read(self, supply: dict[str, Any], banks: list[dict[str, Any]]) -> None:
        """Take the supply and all banks, and add their records."""
        self.supply = supply
        if supply.get("kind") == "ac" and float(supply.get("volts", 0)) > MOST_AC_V:
            self._document.wrong(("supply", "volts"), "more than 18 V AC is refused: 24 V AC peaks at 42 V")
        if "peak_v" in supply and "volts" in supply and supply["peak_v"] < self.supply_v():
            self._document.wrong(("supply", "peak_v"), f"is below the {self.supply_v():.1f} V that the supply gives")
        for number, given in enumerate(banks):
            where: Where = ("bank", number)
            self.names.add(given.get("name"), where)
            bank = self._filled_in(given)
            self.tables.append(bank)
            self.coils.append(Uses(self._document, f"output of bank '{given.get('name', number + 1)}'"))
            self._outputs(where, bank)
            self._voltages(where, bank)
            self._charge_path(where, bank)
            self._add_bank(number, bank)
        for number, bank in enumerate(self.tables):
            self._add_charge(number, bank)

    def _filled_in(self, given: dict[str, Any]) -> dict[str, Any]:
        """A bank with the usual figures where its owner gives none."""
        bank = dict(given)
        stated_v = float(bank.get("full_v", self.supply_v()))
        high = stated_v > HIGH_V
        bank["stated_v"] = stated_v
        bank.setdefault("capacitance_uf", 2200 if high else 4700)
        bank.setdefault("charge_ohm", 1.0 if bank.get("charge") == "limited" else 100.0 if high else 47.0)
        if "full_v" not in bank:
            bank["full_v"] = math.floor(stated_v * self.share_left_by_bleed(bank) * 10) / 10
        tau_ms = bank["charge_ohm"] * bank["capacitance_uf"] / 1000
        bank.setdefault("stall_ms", min(LATEST_STALL_MS, max(USUAL_STALL_MS, math.ceil(5 * tau_ms))))
        return bank

    def _outputs(self, where: Where, bank: dict[str, Any]) -> None:
        """A bank is on pins or on the output chain."""
        name = bank.get("name", "")
        coils = bank.get("coils", 0)
        if not self._document.is_wrong((*where, "first_pin"), (*where, "chain_pins")):
            if "first_pin" in bank and bank["chain_pins"]:
                self._document.wrong((*where, "first_pin"), "a bank is on pins or on the output chain, not both")
            elif "first_pin" not in bank and not bank["chain_pins"]:
                self._document.wrong((*where, "first_pin"), "is missing: give it, or chain_pins")
            elif "first_pin" in bank and coils > wire.COILS_ON_PINS:
                self._document.wrong(
                    (*where, "coils"), f"{coils} coils: at most {wire.COILS_ON_PINS} fit on pins; use the output chain"
                )
                coils = 0
        if "adc" in bank:
            self._pins.claim(26 + bank["adc"], f"voltage sense of bank '{name}'", (*where, "adc"))
        for coil in range(coils if "first_pin" in bank else 0):
            self._pins.claim(bank["first_pin"] + coil, f"output {coil} of bank '{name}'", (*where, "first_pin"))
        for pin in bank.get("chain_pins", []):
            self._pins.claim(pin, f"output chain of bank '{name}'", (*where, "chain_pins"))
        if "cut_off_pin" in bank:
            self._pins.claim(bank["cut_off_pin"], f"charge cut-off of bank '{name}'", (*where, "cut_off_pin"))

    def _voltages(self, where: Where, bank: dict[str, Any]) -> None:
        if self._document.is_wrong(("supply",), where):
            return
        if bank["full_v"] > self.peak_v():
            self._document.wrong(
                (*where, "full_v"),
                f"{bank['full_v']:g} V is never reached: the supply gives {self.peak_v():.1f} V at most",
            )
        if self.peak_v() > bank["sense_range_v"]:
            self._document.wrong(
                (*where, "sense_range_v"),
                f"the supply gives up to {self.peak_v():.1f} V unloaded, the board can read "
                f"{bank['sense_range_v']:g} V: lower the supply or change the divider",
            )

    def _charge_path(self, where: Where, bank: dict[str, Any]) -> None:
        if self._document.is_wrong(where):
            return
        if bank["charge"] == "limited" and not bank["limit_ma"]:
            self._document.wrong((*where, "limit_ma"), "is missing: a limited source needs it")
        if bank["limit_ma"] and bank["charge"] != "limited":
            self._document.wrong((*where, "limit_ma"), 'belongs to charge = "limited"')
        if bank["guard"] == "cutoff" and "cut_off_pin" not in bank:
            self._document.wrong((*where, "cut_off_pin"), 'is missing: guard = "cutoff" needs it')
        if "cut_off_pin" in bank and bank["guard"] != "cutoff" and bank["charge"] != "switched":
            self._document.wrong((*where, "cut_off_pin"), "nothing uses it: neither guard nor charge is a cut-off")
        tau_ms = bank["charge_ohm"] * bank["capacitance_uf"] / 1000
        if bank["stall_ms"] < 2 * tau_ms:
            self._document.wrong(
                (*where, "stall_ms"),
                f"{bank['stall_ms']} ms is under two time constants of its charge path ({2 * tau_ms:.0f} ms)",
            )

    # ---- a driver failed short

    def check_stuck_driver(self, number: int, coils: list[tuple[float, str]]) -> None:
        """With no guard, the charge path alone must keep each coil (ohm, whose) and its resistor from burning.

        Ohm's law on the highest supply voltage; motors in parallel are judged as one coil, the hotter case.
        """
        bank = self.tables[number]
        where: Where = ("bank", number)
        if bank.get("guard") != "none" or not coils or self._document.is_wrong(("supply",), where):
            return
        worst_w, whose = max((self._coil_w(bank, ohm), whose) for ohm, whose in coils)
        if worst_w >= COIL_LIMIT_MW / 1000:
            self._document.wrong(
                (*where, "guard"),
                f"a driver failed short would burn a coil of {whose}: {worst_w:.1f} W, under {COIL_LIMIT_MW // 1000} W "
                "is survived; larger charge_ohm, or a cutoff, ptc or fuse",
            )
        elif bank["charge"] != "limited":
            most_w = max(self._stuck_a(bank, ohm) ** 2 * bank["charge_ohm"] for ohm, _ in coils)
            if most_w > bank["resistor_w"]:
                self._document.wrong(
                    (*where, "resistor_w"),
                    f"a driver failed short would put {most_w:.1f} W into the charge resistor, rated "
                    f"{bank['resistor_w']:g} W; larger charge_ohm or resistor_w, or a cutoff, ptc or fuse",
                )

    def _stuck_a(self, bank: dict[str, Any], coil_ohm: float) -> float:
        current_a = self.peak_v() / (float(bank["charge_ohm"]) + coil_ohm)
        limit_a = float(bank["limit_ma"]) / 1000
        return min(current_a, limit_a) if limit_a else current_a

    def _coil_w(self, bank: dict[str, Any], coil_ohm: float) -> float:
        return self._stuck_a(bank, coil_ohm) ** 2 * coil_ohm

    # ---- records

    def _add_bank(self, number: int, bank: dict[str, Any]) -> None:
        if not {"name", "coils", "adc"} <= bank.keys():
            return
        self._records.add(
            wire.SET_BANK, ("bank", number), i=number, name=plain_name(bank["name"], 16),
            pin=bank.get("first_pin", -1), coils=bank["coils"], chain=bank.get("chain_pins", []), adc=bank["adc"],
            range_mv=millivolts(bank.get("sense_range_v", 33.0)), zero_mv=millivolts(bank.get("sense_zero_v", 0.0)),
            full_mv=millivolts(bank["full_v"]),
            peak_mv=millivolts(self.peak_v()), gap_ms=bank.get("gap_ms", 20), switch=bank.get("switch", "low"),
        )  # fmt: skip

    def _add_charge(self, number: int, bank: dict[str, Any]) -> None:
        self._records.add(
            wire.SET_CHARGE, ("bank", number), i=number, kind=bank.get("charge", "resistor"),
            cap_uf=bank["capacitance_uf"], charge_dohm=round(bank["charge_ohm"] * 10),
            limit_ma=bank.get("limit_ma", 0), guard=bank.get("guard", "none"),
            rated_mw=round(bank.get("resistor_w", 10.0) * 1000), stall_ms=bank["stall_ms"],
            cut_pin=bank.get("cut_off_pin", -1),
        )  # fmt: skip
