"""Settings being tuned: the form's subjects and entries, what was changed, what is wrong, what would be sent."""

from dataclasses import dataclass

from host import wording
from host.model import LayoutModel, Records
from host.settings_diff import Difference, differences, label_of
from host.terminal.session_like import SettingsTaker, TransferLike
from host.terminal.tuning_table import TUNABLE, label_of_key, limits_text, parse, shown_value, units_text
from shared_protocol import settings_table as table
from shared_protocol.codec import plain
from shared_protocol.fields import Field, Message
from shared_protocol.settings import Settings
from shared_protocol.settings_check import check

Place = tuple[int, int]


@dataclass(frozen=True)
class Entry:
    """One field of the form: where it is in the records, its label, its declaration in the table."""

    record: int
    position: int
    label: str
    field: Field

    @property
    def place(self) -> Place:
        """Record and position."""
        return (self.record, self.position)

    @property
    def limits(self) -> str:
        """Unit and range, or the words to choose from."""
        return limits_text(self.field)

    @property
    def sentence(self) -> str:
        """What it is, from the table."""
        return f"{self.label} - {self.field.text} {units_text(self.field)}".rstrip()


@dataclass(frozen=True)
class Subject:
    """What is tuned together: a junction, a bank, the timing, the board. `bank`: whose voltage curve belongs to it."""

    title: str
    bank: int
    junction: int
    entries: tuple[Entry, ...]


class Tuning:
    """The form's state. Nothing is sent before `send`."""

    def __init__(self) -> None:
        self.base: Records = []
        self.transfer: TransferLike | None = None
        self._texts: dict[Place, str] = {}
        self._told = True
        # The numbers that people know the board's junctions by, where they are not its own.
        self.numbers: tuple[int, ...] = ()

    # ---- the settings it starts from

    def take(self, model: LayoutModel) -> bool:
        """Start from the board's settings, if they are known and differ from those before. True if it did."""
        records = self._board_records(model)
        if records is None or records == self.base:
            return False
        kept = self._changes_by_name()
        self.base = [(message, list(values)) for message, values in records]
        self._restore(kept)
        return True

    @staticmethod
    def _board_records(model: LayoutModel) -> Records | None:
        if model.board_records is not None:
            return model.board_records
        if model.settings_match:
            records: Records | None = getattr(model.layout, "records", None)
            return records
        return None

    def _changes_by_name(self) -> dict[tuple[str, str], str]:
        return {
            (label_of(self.base, record), self.base[record][0].fields[position].key): text
            for (record, position), text in self._texts.items()
        }

    def _restore(self, kept: dict[tuple[str, str], str]) -> None:
        """Changes that were not sent stay, where their record is still there and they still change something."""
        self._texts = {}
        for number, (message, values) in enumerate(self.base):
            for position, field in enumerate(message.fields):
                text = kept.get((label_of(self.base, number), field.key))
                if text is not None and parse(field, text) != values[position]:
                    self._texts[(number, position)] = text

    # ---- the form

    def subjects(self) -> list[Subject]:
        """Junctions first, then banks, timing, board."""
        found = [self._junction(number) for number in self._numbers(table.SET_JUNCTION)]
        found += [self._bank(number) for number in self._numbers(table.SET_BANK)]
        for message, title in ((table.SET_TIMING, "Timing"), (table.SET_BOARD, "Board")):
            entries = [each for number in self._numbers(message) for each in self._entries(number, "")]
            if entries:
                found.append(Subject(title, -1, -1, tuple(entries)))
        return found

    def _numbers(self, message: Message) -> list[int]:
        return [number for number, (each, _) in enumerate(self.base) if each is message]

    def _plain(self, number: int) -> dict[str, object]:
        return plain(*self.base[number])

    def _entries(self, number: int, prefix: str) -> list[Entry]:
        message = self.base[number][0]
        keys = TUNABLE[message.name]
        return [
            Entry(number, position, prefix + label_of_key(field.key), field)
            for position, field in enumerate(message.fields)
            if field.key in keys
        ]

    def _junction(self, number: int) -> Subject:
        fields = self._plain(number)
        junction, motors = fields["i"], fields["motors"]
        assert isinstance(junction, int)
        assert isinstance(motors, list)
        entries: list[Entry] = []
        for lie in self._numbers(table.SET_LIE):
            row = self._plain(lie)
            if row["j"] == junction:
                entries += self._entries(lie, f"{row['word'] or row['name']}: ")
        entries += self._entries(number, "")
        bank = -1
        for motor in self._numbers(table.SET_MOTOR):
            row = self._plain(motor)
            if row["i"] in motors:
                place = motors.index(row["i"]) + 1
                entries += self._entries(motor, f"motor {place}: " if len(motors) > 1 else "motor: ")
                bank = row["bank"] if bank < 0 and isinstance(row["bank"], int) else bank
        shown = self.numbers[junction] if junction < len(self.numbers) else junction
        title = f"{shown + 1:>2} {fields['name'] or 'junction'}"
        return Subject(title, bank, junction, tuple(entries))

    def _bank(self, number: int) -> Subject:
        fields = self._plain(number)
        bank = fields["i"]
        assert isinstance(bank, int)
        entries = self._entries(number, "")
        for charge in self._numbers(table.SET_CHARGE):
            if self._plain(charge)["i"] == bank:
                entries += self._entries(charge, "charge: ")
        return Subject(f"Bank {fields['name'] or bank + 1}", bank, -1, tuple(entries))

    def text(self, entry: Entry) -> str:
        """What stands in the entry."""
        return self._texts.get(entry.place, self.old_text(entry))

    def old_text(self, entry: Entry) -> str:
        """What the board has."""
        return shown_value(entry.field, self.base[entry.record][1][entry.position])

    def write(self, entry: Entry, text: str) -> None:
        """A person has typed this into the entry."""
        value = parse(entry.field, text)
        if value == self.base[entry.record][1][entry.position] and not isinstance(value, str):
            self._texts.pop(entry.place, None)
        else:
            self._texts[entry.place] = text

    def revert(self) -> None:
        """Drop every change."""
        self._texts = {}

    def changed(self, entry: Entry) -> bool:
        """True if the entry differs from what the board has."""
        return entry.place in self._texts

    def wrong(self, entry: Entry) -> str:
        """What is wrong with the entry, in a sentence; '' if it is right."""
        value = parse(entry.field, self.text(entry))
        return f"{entry.label} {value}" if isinstance(value, str) else ""

    @property
    def change_count(self) -> int:
        """How many entries differ."""
        return len(self._texts)

    # ---- the whole

    def new_records(self) -> Records:
        """All records with the changes. Wrong entries keep their old value: see `problem`."""
        records = [(message, list(values)) for message, values in self.base]
        for (number, position), text in self._texts.items():
            value = parse(records[number][0].fields[position], text)
            if not isinstance(value, str):
                records[number][1][position] = value
        return records

    def problem(self) -> tuple[str, Place | None]:
        """The first thing wrong with the whole, and where; '' if it may be sent."""
        for place, text in self._texts.items():
            field = self.base[place[0]][0].fields[place[1]]
            value = parse(field, text)
            if isinstance(value, str):
                return f"{label_of(self.base, place[0])}: {label_of_key(field.key)} {value}", place
        records = self.new_records()
        settings = Settings()
        for message, values in records:
            settings.add(message, values)
        found = check(settings)
        if found is None:
            return "", None
        label = label_of(records, found.record)
        where: Place | None = None
        if found.record >= 0 and records[found.record][0].has(found.field):
            where = (found.record, records[found.record][0].position(found.field))
        return wording.rejected_text(found.record, found.field, found.why, label), where

    def changes(self) -> list[Difference]:
        """Old and new of each change."""
        return differences(self.base, self.new_records())

    def ready_mv(self, model: LayoutModel) -> dict[tuple[int, int], int]:
        """Ready voltages that the form changes, by junction and lie."""
        found: dict[tuple[int, int], int] = {}
        for number, position in self._texts:
            message, _ = self.base[number]
            if message is table.SET_LIE and message.fields[position].key == "ready_mv":
                value = parse(message.fields[position], self._texts[(number, position)])
                row = self._plain(number)
                junction, lie = row["j"], row["i"]
                if isinstance(value, int) and isinstance(junction, int) and isinstance(lie, int):
                    found[(junction, lie)] = value
        return found

    # ---- sending

    @property
    def sending(self) -> bool:
        """True while a transaction is under way."""
        return self.transfer is not None and self.transfer.open

    def send(self, session: SettingsTaker) -> None:
        """Send all records as one transaction."""
        self.transfer = session.send_settings(self.new_records())
        self._told = False

    def progress_text(self) -> str:
        """How the transaction stands."""
        if self.transfer is None:
            return ""
        return f"sending settings, {round(self.transfer.progress * 100)} %: {self.transfer.answer}"

    def answer(self, model: LayoutModel) -> tuple[str, str] | None:
        """Level and sentence of the board's answer, once; None while there is nothing new."""
        if self.transfer is None or self.transfer.open or self._told:
            return None
        self._told = True
        if self.transfer.state != "accepted":
            return "bad", self.transfer.answer
        differs = model.settings_match is False
        return "good", self.transfer.answer + ("; the layout file still has the old values" if differs else "")


def change_text(change: Difference, width: int) -> list[str]:
    """Old and new of one change, on two lines."""
    unit = f" {change.unit}" if change.unit else ""
    return [
        f"{change.record}, {label_of_key(change.field)}"[:width],
        f"    old {change.old}{unit}   new {change.new}{unit}"[:width],
    ]
