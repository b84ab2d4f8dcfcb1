"""Reads TOML files by tables of keys: unknown, missing, mistyped and out-of-range values are found with their lines.

The same tables make the reference pages, so a page can't say what the reader does not do.
"""

import difflib
import re
import tomllib
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from sim.layout.locating import Step, Where, locate
from sim.layout.problems import BadFile, FileProblem

__all__ = [
    "REQUIRED", "Document", "Key", "Step", "Where", "check_table", "check_tables", "fault_of", "key_table_markdown",
    "named", "near_to", "read_toml", "shown",
]  # fmt: skip

LARGEST_FILE = 1 << 20
LONGEST_TEXT = 200
LONGEST_LIST = 1000
DEEPEST = 12
LONGEST_SHOWN = 40
MOST_UNKNOWN = 10

REQUIRED = "required"

# A key of very many parts costs tomllib the square of their number in time and memory: such text never reaches it.
_DEEP_KEY = re.compile(r"""(?<![A-Za-z0-9_-])(?:(?:[A-Za-z0-9_-]++|"[^"\n]*+"|'[^'\n]*+')[ \t]*+\.[ \t]*+){50}""")


@dataclass(frozen=True)
class Key:
    """One key of a table.

    kind: 'whole', 'number', 'text', 'word', 'yes/no', 'name or number' (text or a whole number, kept as text),
    'list of whole numbers', 'list of texts', 'list of names or numbers', 'table', 'tables' (a list of tables), 'any'.
    low, high: range of numbers, or of the length of texts and lists. default: REQUIRED, None (left out) or the value.
    words: what a 'word' may be. refused: words that are understood but not taken, each with the sentence that says
    why. sentence: what it is for.
    """

    name: str
    kind: str
    sentence: str
    default: Any = None
    low: float | None = None
    high: float | None = None
    unit: str = ""
    words: tuple[str, ...] = ()
    refused: tuple[tuple[str, str], ...] = ()


@dataclass
class Document:
    """A file that has been read: its data, on which line each key stands, and what was found wrong so far."""

    file: str
    data: dict[str, Any]
    lines: dict[Where, int]
    problems: list[FileProblem] = field(default_factory=list)
    _wrong: list[Where] = field(default_factory=list)

    def line_of(self, where: Where) -> int:
        """The line of a key, or of the nearest thing around it."""
        while where and where not in self.lines:
            where = where[:-1]
        return self.lines.get(where, 1)

    def wrong(self, where: Where, message: str) -> None:
        """Note a problem."""
        self.note(where, FileProblem(self.file, self.line_of(where), named(where), message))

    def note(self, where: Where, problem: FileProblem) -> None:
        """Note a problem that is told in other words than its place in this document."""
        self._wrong.append(where)
        self.problems.append(problem)

    def is_wrong(self, *tables: Where) -> bool:
        """True if something in one of these tables was found wrong."""
        return any(where[: len(table)] == table for where in self._wrong for table in tables)

    def numbered(self, table: str, number: int) -> int:
        """The number (from 1) of a table of a list, as the file counts them."""
        return number + 1

    def elsewhere(self, table: str, name: str) -> str:
        """Another board that has an input or output of this name; '' if there is none. `table`: inputs or outputs."""
        return ""

    def raise_if_wrong(self) -> None:
        """Raises BadFile if anything was noted."""
        if self.problems:
            raise BadFile(self.problems)


def named(where: Where) -> str:
    """A path as people read it: `junction 3.motors 1.coils` (numbers from 1)."""
    text = ""
    for step in where:
        text += f" {step + 1}" if isinstance(step, int) else f".{shown(step)}" if text else shown(step)
    return text or "file"


def shown(value: object) -> str:
    """A value as it may stand in a message: short, on one line, without control characters."""
    if isinstance(value, int) and not isinstance(value, bool) and value.bit_length() > 100:
        return "a huge number"  # text of it might be refused by Python, and helps nobody
    text = "".join(letter if letter.isprintable() else "?" for letter in str(value)[: LONGEST_SHOWN + 1])
    return text if len(text) <= LONGEST_SHOWN else text[: LONGEST_SHOWN - 3] + "..."


# ---- files


def read_toml(path: Path) -> Document:
    """Read a TOML file. Raises BadFile if it can't be read, is too large, not UTF-8 or not TOML."""
    name = str(path)
    text = _text_of(path, name)
    deep = _DEEP_KEY.search(text)
    if deep:
        line = text.count("\n", 0, deep.start()) + 1
        raise BadFile([FileProblem(name, line, "file", "is nested too deeply")])
    try:
        data = tomllib.loads(text)
        lines = locate(text)
    except tomllib.TOMLDecodeError as error:
        found = re.search(r"at line (\d+)", str(error))
        line = int(found.group(1)) if found else text.count("\n") + 1
        reason = shown_reason(str(error).split(" (at ")[0])
        raise BadFile([FileProblem(name, line, "file", f"is not TOML: {reason}")]) from error
    except RecursionError as error:
        raise BadFile([FileProblem(name, _deepest_line(text), "file", "is nested too deeply")]) from error
    except ValueError as error:  # Python refuses to read whole numbers of thousands of digits
        raise BadFile([FileProblem(name, _longest_number_line(text), "file", "holds a huge number")]) from error
    document = Document(name, data, lines)
    for key, value in data.items():
        if depth_of(value) >= DEEPEST:
            document.wrong((key,), "is nested too deeply")
    document.raise_if_wrong()
    return document


def _text_of(path: Path, name: str) -> str:
    try:
        with path.open("rb") as file:
            content = file.read(LARGEST_FILE + 1)
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else "can't be read"
        raise BadFile([FileProblem(name, 0, "file", reason)]) from error
    if len(content) > LARGEST_FILE:
        raise BadFile([FileProblem(name, 0, "file", f"is larger than {LARGEST_FILE >> 20} MiB")])
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = content[: error.start].count(b"\n") + 1
        raise BadFile([FileProblem(name, line, "file", "is not UTF-8 text")]) from error


def shown_reason(reason: str) -> str:
    """A reason of tomllib as part of a sentence: first letter small, on one line."""
    text = "".join(letter if letter.isprintable() else "?" for letter in reason[:100])
    return text[:1].lower() + text[1:]


def _deepest_line(text: str) -> int:
    """The line with the most opening brackets: good enough to find what is nested thousands deep."""
    rows = text.split("\n")
    return max(range(len(rows)), key=lambda number: rows[number].count("[") + rows[number].count("{")) + 1


def _longest_number_line(text: str) -> int:
    longest = max(re.finditer(r"\d[\d_]*", text), key=lambda found: len(found.group()), default=None)
    return text.count("\n", 0, longest.start()) + 1 if longest else 1


def depth_of(value: object, so_far: int = 0) -> int:
    """How deeply lists and tables are nested; stops counting beyond DEEPEST."""
    if so_far >= DEEPEST or not isinstance(value, (dict, list)):
        return so_far
    inner: Iterable[object] = value.values() if isinstance(value, dict) else value
    return max((depth_of(each, so_far + 1) for each in inner), default=so_far)


# ---- checking against tables of keys


def check_table(document: Document, where: Where, table: object, keys: tuple[Key, ...]) -> dict[str, Any]:
    """The values of one table, defaults filled in. Problems are noted in the document; what is wrong is left out."""
    if not isinstance(table, dict):
        document.wrong(where, "must be a table")
        return {}
    _note_unknown(document, where, table, [key.name for key in keys])
    values: dict[str, Any] = {}
    for key in keys:
        if key.name in table:
            value = table[key.name]
            message = fault_of(key, value)
            if message:
                document.wrong((*where, key.name), message)
            else:
                values[key.name] = _kept(key, value)
        elif key.default == REQUIRED:
            document.wrong((*where, key.name), "is missing")
        elif key.default is not None:
            values[key.name] = key.default
    return values


def check_tables(document: Document, where: Where, tables: object, keys: tuple[Key, ...]) -> list[dict[str, Any]]:
    """The values of each table of a list."""
    if not isinstance(tables, list):
        document.wrong(where, f"must be a list of tables: write [[{where[-1]}]]")
        return []
    if len(tables) > LONGEST_LIST:
        document.wrong(where, f"has {len(tables)} entries: at most {LONGEST_LIST}")
        return []
    return [check_table(document, (*where, number), table, keys) for number, table in enumerate(tables)]


def near_to(text: str, known: Iterable[str]) -> str:
    """The known name most like `text`, or nothing."""
    candidates = [each for each in known if len(each) <= LONGEST_TEXT]
    if len(text) > LONGEST_TEXT:
        return ""
    by_small = {each.casefold(): each for each in candidates}
    near = difflib.get_close_matches(text.casefold(), by_small, 1)
    return by_small[near[0]] if near else ""


def _note_unknown(document: Document, where: Where, table: dict[str, Any], known: list[str]) -> None:
    """Note the keys that are not known here: the first of them one by one, the rest as a number."""
    unknown = [name for name in table if name not in known]
    for name in unknown[:MOST_UNKNOWN]:
        near = near_to(name, known)
        hint = f"did you mean '{near}'?" if near else f"keys: {', '.join(known)}"
        document.wrong((*where, name), f"is not a key here; {hint}")
    if len(unknown) > MOST_UNKNOWN:
        more = len(unknown) - MOST_UNKNOWN
        document.wrong((*where, unknown[MOST_UNKNOWN]), f"is not a key here, nor are {more - 1} more of this table")


def _kept(key: Key, value: Any) -> Any:
    if key.kind == "number":
        return float(value)
    if key.kind == "name or number":
        return str(value)
    if key.kind == "list of names or numbers":
        return [str(each) for each in value]
    return value


def fault_of(key: Key, value: object) -> str:
    """What is wrong with a value, or nothing."""
    if key.kind in ("whole", "number"):
        return _number_fault(key, value)
    if key.kind == "name or number" and _is_small_whole(value):
        return ""
    if key.kind in ("text", "word", "name or number"):
        return _text_fault(key, value)
    if key.kind == "yes/no":
        return "" if isinstance(value, bool) else "must be true or false"
    if key.kind == "table":
        return "" if isinstance(value, Mapping) else f"must be a table: write [{key.name}]"
    if key.kind.startswith("list") or key.kind == "tables":
        return _list_fault(key, value)
    return ""


def _is_small_whole(value: object) -> bool:
    return isinstance(value, int) and not isinstance(value, bool) and 0 <= value < 1000


def _text_fault(key: Key, value: object) -> str:
    if not isinstance(value, str):
        return "must be text in quotes"
    if key.words:
        for word, sentence in key.refused:
            if value == word:
                return sentence
        return "" if value in key.words else f"must be one of: {', '.join(key.words)}"
    longest = int(key.high) if key.high is not None else LONGEST_TEXT
    if len(value) > longest:
        return f"has {len(value)} characters: at most {longest}"
    if key.low is not None and len(value) < key.low:
        return "must not be empty"
    # Such a letter could move the cursor or change the colour of whatever shows the text.
    if not all(letter.isprintable() or (letter == "\n" and key.high is None) for letter in value):
        return "must not hold control characters"
    return ""


def _number_fault(key: Key, value: object) -> str:
    whole = key.kind == "whole"
    if isinstance(value, bool) or not isinstance(value, int if whole else (int, float)):
        what = "a whole number" if whole else "a number"
        return f"must be {what}{' of ' + key.unit if key.unit else ''}, without quotes or unit"
    if value != value or value in (float("inf"), float("-inf")):
        return "must be a finite number"
    if (key.low is not None and value < key.low) or (key.high is not None and value > key.high):
        return f"{shown(value)} is outside {_span(key)}{' ' + key.unit if key.unit else ''}"
    return ""


def _list_fault(key: Key, value: object) -> str:
    if not isinstance(value, list):
        return f"must be a list of tables: [[{key.name}]]" if key.kind == "tables" else f"must be a {key.kind}"
    most = int(key.high) if key.high is not None else LONGEST_LIST
    if len(value) > most:
        return f"has {len(value)} entries: at most {most}"
    if key.low is not None and len(value) < key.low:
        return f"has {len(value)} entries: at least {key.low:g}"
    if key.kind == "list of whole numbers":
        if not all(isinstance(each, int) and not isinstance(each, bool) for each in value):
            return "must hold whole numbers"
    elif key.kind == "list of texts":
        if not all(isinstance(each, str) and len(each) <= LONGEST_TEXT for each in value):
            return "must hold texts in quotes"
    elif key.kind == "list of names or numbers" and not all(
        _is_small_whole(each) or (isinstance(each, str) and len(each) <= LONGEST_TEXT) for each in value
    ):
        return "must hold names in quotes, or numbers"
    return ""


# ---- reference pages


def key_table_markdown(keys: tuple[Key, ...]) -> str:
    """A reference table of keys."""
    rows = ["| key | what | kind | range | default |", "| --- | --- | --- | --- | --- |"]
    for key in keys:
        rows.append(f"| `{key.name}` | {key.sentence} | {key.kind} | {_range(key)} | {_default(key)} |")
    return "\n".join(rows) + "\n"


def _span(key: Key) -> str:
    low, high = _figure(key.low), _figure(key.high)
    return low if low == high else f"{low} to {high}"


def _figure(value: float | None) -> str:
    return "" if value is None else f"{value:,.10g}".replace(",", " ")


def _range(key: Key) -> str:
    if key.words:
        return ", ".join(f"`{word}`" for word in key.words)
    if key.low is None or key.high is None:
        return key.unit
    unit = {"text": "characters", "tables": "tables", "table": "", "whole": key.unit, "number": key.unit}
    return f"{_span(key)} {unit.get(key.kind, 'entries')}".strip()


def _default(key: Key) -> str:
    if key.default == REQUIRED:
        return "must be given"
    if key.default is None or key.default == [] or key.default == "":
        return ""
    if isinstance(key.default, bool):
        return "true" if key.default else "false"
    return f"{key.default:g}" if isinstance(key.default, float) else str(key.default)
