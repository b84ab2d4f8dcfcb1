"""The number being typed: what it means, what Enter would do, said before anything fires."""

from dataclasses import dataclass

from host.model import LayoutModel
from host.terminal.rows import volts
from host.views import BankView, JunctionView

MOST_DIGITS = 2
_SPARE_KEYS = "abcdefgh"


@dataclass(frozen=True)
class Throw:
    """Enter throws this."""

    junction: int
    lie: int


@dataclass(frozen=True)
class Choose:
    """Enter asks which lie."""

    junction: int


@dataclass(frozen=True)
class Wrong:
    """Enter does nothing; why."""

    text: str


Meaning = Throw | Choose | Wrong


def lie_keys(junction: JunctionView) -> list[str]:
    """A key for each lie: the first letter of its name where those differ ('n', 'r'), else a, b, c."""
    keys = [lie.name[:1].lower() for lie in junction.lies]
    if len(set(keys)) == len(keys) and all(key.isascii() and key.isalpha() for key in keys):
        return keys
    return list(_SPARE_KEYS[: len(junction.lies)])


def lie_choices(junction: JunctionView) -> str:
    """'n main, r quay'."""
    return ", ".join(f"{key} {lie.word}" for key, lie in zip(lie_keys(junction), junction.lies, strict=True))


class Typing:
    """Digits of a junction's number, perhaps a letter for its lie."""

    def __init__(self) -> None:
        self.digits = ""
        self.letter = ""
        self.most_digits = MOST_DIGITS

    @property
    def text(self) -> str:
        """What was typed."""
        return self.digits + self.letter

    def clear(self) -> None:
        """Nothing is typed."""
        self.digits = self.letter = ""

    def add(self, character: str) -> bool:
        """Take a digit, or a letter after digits. False if it means nothing here."""
        if len(character) != 1 or not character.isascii():
            return False
        if character.isdigit():
            if not self.letter and len(self.digits) < self.most_digits and (self.digits or character != "0"):
                self.digits += character
            return True
        if character.isalpha() and self.digits:
            self.letter = character.lower()
            return True
        return False

    def back(self) -> bool:
        """Take the last one away. False if there is none."""
        if self.letter:
            self.letter = ""
        elif self.digits:
            self.digits = self.digits[:-1]
        else:
            return False
        return True

    def junction(self, model: LayoutModel) -> JunctionView | None:
        """The junction meant, if there is one."""
        number = int(self.digits) - 1 if self.digits else -1
        return model.junctions[number] if 0 <= number < len(model.junctions) else None

    def meaning(self, model: LayoutModel) -> Meaning:
        """What Enter would do."""
        if not self.digits:
            return Wrong("Type a junction number first.")
        junction = self.junction(model)
        if junction is None:
            return Wrong(f"There is no junction {self.digits}; there are {len(model.junctions)}.")
        if self.letter:
            keys = lie_keys(junction)
            if self.letter not in keys:
                return Wrong(f"{self.digits} {junction.name} has no lie '{self.letter}': {lie_choices(junction)}.")
            return Throw(junction.number, keys.index(self.letter))
        if len(junction.lies) == 2 and junction.lie >= 0:
            return Throw(junction.number, 1 - junction.lie)
        return Choose(junction.number)


def prompt_text(typing: Typing, model: LayoutModel, choosing: int = -1) -> str:
    """The line under the fingers: what was typed and what Enter does, or the lies to choose from."""
    if 0 <= choosing < len(model.junctions):
        chosen = model.junctions[choosing]
        return f"{choosing + 1} {chosen.name} lies {chosen.word}. To which lie? Press its letter"
    if not typing.digits:
        return "Junction: _   (number, Enter)"
    meaning = typing.meaning(model)
    start = f"Junction: {typing.text}_  "
    if isinstance(meaning, Wrong):
        return start + meaning.text
    junction = model.junctions[meaning.junction]
    # What Enter does comes first: on a narrow screen the end is cut.
    if isinstance(meaning, Choose):
        return f"{start}Enter asks which lie of {junction.name} (lies {junction.word})"
    hint = banks_hint(model, junction, meaning.lie)
    return f"{start}Enter throws {junction.name} to {junction.word_of(meaning.lie)} (lies {junction.word}; {hint})"


def banks_hint(model: LayoutModel, junction: JunctionView, lie: int) -> str:
    """What its banks hold against what it needs: 'West 15.9 V, needs 12.0 V'."""
    banks: list[BankView] = [model.banks[number] for number in junction.bank_numbers if number < len(model.banks)]
    held = ", ".join(f"{bank.name} {volts(bank.mv)} V" for bank in banks)
    return f"{held}, needs {volts(junction.lies[lie].ready_mv)} V"
