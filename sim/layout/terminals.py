"""Inputs and follower outputs of a layout file: on pins or on a chain, named once, referred to by name or number."""

import re
from typing import Any

from sim.layout.keys import LONGEST_INPUT_NAME
from sim.layout.names import PinUses, Uses, no_such
from sim.layout.reading import Document, Where, shown

_PLACE = re.compile(r"(pin|chain) ([0-9]{1,2})")
_EIGHT = 8  # a chain grows by eight with every chip


class Terminals:
    """All inputs, or all follower outputs: those on pins first, then those on the chain."""

    def __init__(self, document: Document, noun: str, most: int) -> None:
        self._document = document
        self._noun = noun
        self._table = noun + "s"
        self._most = most
        self.pins: list[int] = []
        self.on_chain = 0
        self.numbers: dict[str, int] = {}
        self.uses = Uses(document, noun)
        # False when names or counts could not be read: then nothing more is said about numbers.
        self._complete = True

    @property
    def count(self) -> int:
        """How many there are."""
        return len(self.pins) + self.on_chain

    def read(self, io: dict[str, Any], named: object) -> None:
        """Take pins and chain from the [io] table, names (and what they say about places) from their own."""
        document = self._document
        self.pins = list(io.get(f"{self._noun}_pins", []))
        self._complete = not document.is_wrong(("io",), (self._table,))
        places = self._places(named)
        for name, (kind, number) in places.items():
            if kind == "pin" and number not in self.pins:
                self.pins.append(number)
                if len(self.pins) > 20:
                    document.wrong((self._table, name), f"more than 20 {self._table} on pins: use the chain")
                    return
        furthest = max((number for kind, number in places.values() if kind == "chain"), default=-1)
        given = io.get(f"{self._table}_on_chain")
        self.on_chain = given if given is not None else -(-(furthest + 1) // _EIGHT) * _EIGHT
        if self.count > self._most:
            document.wrong(("io", f"{self._table}_on_chain"), f"{self.count} {self._table}: at most {self._most}")
            self._complete = False
        self._number(places)

    def _places(self, named: object) -> dict[str, tuple[str, int]]:
        """What each name says about its place: a number as it is, 'pin 5' or 'chain 3'."""
        found: dict[str, tuple[str, int]] = {}
        if isinstance(named, dict) and len(named) > self._most:
            self._document.wrong((self._table,), f"has {len(named)} names: at most {self._most}")
            self._complete = False
            return found
        for name, value in named.items() if isinstance(named, dict) else ():
            where = (self._table, name)
            place = _PLACE.fullmatch(value) if isinstance(value, str) else None
            if not 1 <= len(name) <= LONGEST_INPUT_NAME or not name.isprintable():
                self._document.wrong(where, f"a name has 1 to {LONGEST_INPUT_NAME} letters and no control characters")
            elif name.isdigit():
                self._document.wrong(where, f"a name must not be a number: numbers mean the {self._table} themselves")
            elif place:
                found[name] = (place.group(1), int(place.group(2)))
            elif isinstance(value, int) and not isinstance(value, bool) and 0 <= value < self._most:
                found[name] = ("number", value)
            else:
                self._document.wrong(where, f"must be a number from 0 to {self._most - 1}, or 'pin 5', or 'chain 3'")
            self._complete = self._complete and name in found
        return found

    def _number(self, places: dict[str, tuple[str, int]]) -> None:
        """Give each name its number; the same place must not have two names."""
        for name, (kind, place) in places.items():
            number = place
            if kind == "pin":
                number = self.pins.index(place)
            elif kind == "chain":
                number = len(self.pins) + place
            taken = [other for other, has in self.numbers.items() if has == number]
            if taken:
                self._document.wrong(
                    (self._table, name), f"{self._noun} {number} has another name already: '{shown(taken[0])}'"
                )
            self._check((self._table, name), number)
            self.numbers[name] = number

    def _check(self, where: Where, number: int) -> bool:
        if number < self.count:
            return True
        if self._complete:
            there = f"0 to {self.count - 1} are there" if self.count else f"the board has no {self._table}: see [io]"
            self._document.wrong(where, f"there is no {self._noun} {number}: {there}")
        return False

    def find(self, where: Where, text: str) -> int:
        """The number of a name, or a number itself; -1, and noted, if there is none."""
        if text in self.numbers:
            return self.numbers[text] if self.numbers[text] < self.count else -1
        if text.isascii() and text.isdigit():
            return int(text) if len(text) < 4 and self._check(where, int(text)) else -1
        other = self._document.elsewhere(self._table, text)
        if other:
            self._document.wrong(where, f"{self._noun} '{shown(text)}' is on board '{other}': each board has its own")
        elif self._complete:
            self._document.wrong(where, no_such(text, list(self.numbers), f"{self._noun} named"))
        return -1

    def claim_pins(self, pins: PinUses, chain_pins: list[int], chain_key: str) -> None:
        """Claim the pins of those on pins, and of the chain."""
        names = {number: name for name, number in self.numbers.items()}
        for number, pin in enumerate(self.pins):
            name = names.get(number, "")
            where: Where = ("io", f"{self._noun}_pins")
            if name and (self._table, name) in self._document.lines and where not in self._document.lines:
                where = (self._table, name)
            pins.claim(pin, f"{self._noun} {number}" + (f" '{name}'" if name else ""), where)
        for pin in chain_pins:
            pins.claim(pin, f"the {self._noun} chain", ("io", chain_key))


def check_chain_pins(document: Document, io: dict[str, Any], key: str, chain_is_used: bool, what: str) -> None:
    """A chain that is used needs its three pins; one that is not used must have none."""
    if document.is_wrong(("io", key)):
        return
    if chain_is_used and not io.get(key):
        document.wrong(("io", key), f"is missing: {what} needs its three pins")
    if io.get(key) and not chain_is_used:
        document.wrong(("io", key), f"nothing is on {what}: leave its pins out")
