"""Names that one part of a layout file gives and another refers to; pins and outputs that must have one use each."""

from shared_protocol.fields import NAME_MAX
from shared_protocol.settings_check import ADC_PIN_0, LAST_PIN
from sim.layout.reading import Document, Where, near_to, shown


class Names:
    """The names of all things of one sort, numbered in order."""

    def __init__(self, document: Document, noun: str) -> None:
        self._document = document
        self._noun = noun
        self.all: list[str] = []
        # False when something unnamed or unreadable may be the one that is meant: then nothing is said.
        self.complete = True

    def add(self, name: str | None, where: Where) -> None:
        """Take the next one's name (None: it has none that can be read); `where` is its table."""
        if name is None:
            self.complete = False
        elif name in self.all:
            self._document.wrong((*where, "name"), f"another {self._noun} is called '{shown(name)}'")
        self.all.append(name if name is not None else "")

    def find(self, where: Where, text: str) -> int:
        """The number (from 0) of a name, or of a number as people count; -1, and noted, if there is none."""
        number = number_named(text, self.all)
        if number < 0 and self.complete:
            self._document.wrong(where, no_such(text, self.all, self._noun))
        return number


def number_named(text: str, names: list[str]) -> int:
    """The number (from 0) of a name, or of a number as people count; -1 if there is none."""
    if text and text in names:
        return names.index(text)
    if text.isascii() and text.isdigit() and 1 <= len(text) <= 3 and 1 <= int(text) <= len(names):
        return int(text) - 1
    return -1


def no_such(text: str, names: list[str], noun: str) -> str:
    """There is no such thing; did you mean another, or here is what there is."""
    near = near_to(text, names)
    if near:
        return f"there is no {noun} '{shown(text)}'; did you mean '{near}'?"
    listed = ", ".join(names[:12]) + (", and more" if len(names) > 12 else "")
    return f"there is no {noun} '{shown(text)}'; there are: {listed or 'none'}"


def plain_name(text: str, most: int = NAME_MAX) -> str:
    """The owner's text as a board can keep it: ASCII, no quote or backslash, '?' for the rest."""
    kept = "".join(letter if 32 <= ord(letter) < 127 and letter not in '"\\' else "?" for letter in text)
    return kept[:most]


class Uses:
    """Things that may have one use each: told when all is read, at the later line of two."""

    def __init__(self, document: Document, noun: str) -> None:
        self._document = document
        self._noun = noun
        self._claims: list[tuple[int, str, Where]] = []

    def claim(self, number: int, use: str, where: Where) -> None:
        """`number` is used for `use`, as written at `where`."""
        self._claims.append((number, use, where))

    def report(self) -> None:
        """Note what is used twice, one problem a place."""
        taken: dict[int, str] = {}
        told: set[Where] = set()
        for number, use, where in sorted(self._claims, key=lambda claim: self._document.line_of(claim[2])):
            if where in told:
                continue
            if number in taken:
                self._document.wrong(where, f"{self._noun} {number} has a use already: {taken[number]}")
                told.add(where)
            else:
                taken[number] = use


class PinUses(Uses):
    """The pins of the board."""

    def __init__(self, document: Document) -> None:
        super().__init__(document, "pin")

    def claim(self, number: int, use: str, where: Where) -> None:
        """`number` is used for `use`, as written at `where`; noted if that pin can't be used at all."""
        if 0 <= number <= LAST_PIN or ADC_PIN_0 <= number <= ADC_PIN_0 + 2:
            super().claim(number, use, where)
        elif not self._document.is_wrong(where):
            self._document.wrong(
                where, f"pin {shown(number)} can't be used; 0 to {LAST_PIN} and {ADC_PIN_0} to {ADC_PIN_0 + 2} can"
            )
