"""Reads TOML files by tables of keys: unknown, missing, mistyped and out-of-range values are found with their lines.

The same tables make the reference pages, so a page can't say what the reader does not do.
"""

import difflib
import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from sim.layout.problems import BadFile, FileProblem

LARGEST_FILE = 1 << 20
LONGEST_TEXT = 200
LONGEST_LIST = 1000
DEEPEST = 12

REQUIRED = "required"
Step = str | int
Where = tuple[Step, ...]


@dataclass(frozen=True)
class Key:
    """One key of a table.

    kind: 'whole', 'number', 'text', 'word', 'yes/no', 'list of whole numbers', 'list of texts', 'table' or 'tables'
    (a list of tables), 'any'. low, high: range of numbers, or of list lengths. default: REQUIRED, None (left out) or
    the value. words: what a 'word' may be. sentence: what it is for.
    """

    name: str
    kind: str
    sentence: str
    default: Any = None
    low: float | None = None
    high: float | None = None
    unit: str = ""
    words: tuple[str, ...] = ()


@dataclass
class Document:
    """A file that has been read: its data, and on which line each key stands."""

    file: str
    data: dict[str, Any]
    lines: dict[Where, int]
    problems: list[FileProblem] = field(default_factory=list)

    def line_of(self, where: Where) -> int:
        """The line of a key, or of the nearest thing around it."""
        while where and where not in self.lines:
            where = where[:-1]
        return self.lines.get(where, 1)

    def wrong(self, where: Where, message: str) -> None:
        """Note a problem."""
        self.problems.append(FileProblem(self.file, self.line_of(where), named(where), message))

    def raise_if_wrong(self) -> None:
        """Raises BadFile if anything was noted."""
        if self.problems:
            raise BadFile(self.problems)


def named(where: Where) -> str:
    """A path as people read it: `junction 3.motors 1.coils` (numbers from 1)."""
    text = ""
    for step in where:
        text += f" {step + 1}" if isinstance(step, int) else f".{step}" if text else step
    return text or "file"


def read_toml(path: Path) -> Document:
    """Read a TOML file. Raises BadFile if it can't be read, is too large, not UTF-8 or not TOML."""
    name = str(path)
    try:
        if path.stat().st_size > LARGEST_FILE:
            raise BadFile([FileProblem(name, 0, "file", f"larger than {LARGEST_FILE >> 20} MiB")])
        text = path.read_bytes().decode("utf-8")
    except OSError as error:
        raise BadFile([FileProblem(name, 0, "file", error.strerror or "can't be read")]) from error
    except UnicodeDecodeError as error:
        line = path.read_bytes()[: error.start].count(b"\n") + 1
        raise BadFile([FileProblem(name, line, "file", "is not UTF-8 text")]) from error
    try:
        data = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        found = re.search(r"at line (\d+)", str(error))
        line = int(found.group(1)) if found else text.count("\n") + 1
        reason = str(error).split(" (at ")[0]
        raise BadFile([FileProblem(name, line, "file", f"is not TOML: {reason[0].lower()}{reason[1:]}")]) from error
    except RecursionError as error:
        raise BadFile([FileProblem(name, 0, "file", "is nested too deeply")]) from error
    if depth_of(data) > DEEPEST:
        raise BadFile([FileProblem(name, 0, "file", "is nested too deeply")])
    return Document(name, data, locate(text))


def depth_of(value: object, so_far: int = 0) -> int:
    """How deeply lists and tables are nested; stops counting beyond DEEPEST."""
    if so_far > DEEPEST:
        return so_far
    if isinstance(value, dict):
        return max((depth_of(each, so_far + 1) for each in value.values()), default=so_far)
    if isinstance(value, list):
        return max((depth_of(each, so_far + 1) for each in value), default=so_far)
    return so_far


_KEY = re.compile(
    r"""\s*((?:[A-Za-z0-9_-]+|"[^"\n]*"|'[^'\n]*')(?:\s*\.\s*(?:[A-Za-z0-9_-]+|"[^"\n]*"|'[^'\n]*'))*)\s*="""
)
_HEAD = re.compile(r"\s*(\[\[?)\s*(.+?)\s*\]\]?\s*(?:#.*)?$")
_PART = re.compile(r"""[A-Za-z0-9_-]+|"[^"\n]*"|'[^'\n]*'""")


def locate(text: str) -> dict[Where, int]:
    """The line of each table and key of a TOML text that is known to be right.

    Also of each inline table of a list that spreads over lines. What stands in multi-line strings is not mistaken.
    """
    lines: dict[Where, int] = {(): 1}
    counts: dict[Where, int] = {}
    table: Where = ()
    rows = text.split("\n")
    number = 0
    while number < len(rows):
        row = rows[number]
        number += 1
        head = _HEAD.match(row)
        if head and not _KEY.match(row):
            table = _table_of(head.group(1) == "[[", _parts(head.group(2)), counts)
            lines.setdefault(table, number)
            continue
        key = _KEY.match(row)
        if key:
            where = table + _parts(key.group(1))
            for length in range(len(table) + 1, len(where) + 1):
                lines.setdefault(where[:length], number)
            number = _skip_value(rows, number, row[key.end() :], where, lines)
    return lines


def _parts(dotted: str) -> Where:
    return tuple(part.strip("\"'") for part in _PART.findall(dotted))


def _table_of(is_list: bool, parts: Where, counts: dict[Where, int]) -> Where:
    """The path of a table header; `[junction.lie]` means the newest junction."""
    where: Where = ()
    for place, part in enumerate(parts):
        where += (part,)
        if is_list and place == len(parts) - 1:
            counts[where] = counts.get(where, -1) + 1
        if where in counts:
            where += (counts[where],)
    return where


def _skip_value(rows: list[str], number: int, rest: str, where: Where, lines: dict[Where, int]) -> int:
    """Pass over a value that may spread over lines; note where the items of a list stand."""
    depth = 0
    item = 0
    while True:
        place = 0
        while place < len(rest):
            for quotes in ('"""', "'''"):
                if rest.startswith(quotes, place):
                    number, rest, place = _skip_text(rows, number, rest, place + 3, quotes)
                    break
            else:
                letter = rest[place]
                if letter in "\"'":
                    end = _end_of_string(rest, place)
                    if depth == 1:
                        lines.setdefault((*where, item), number)
                    place = end
                elif letter == "#":
                    break
                else:
                    if letter in "[{":
                        if depth == 1:
                            lines.setdefault((*where, item), number)
                        depth += 1
                    elif letter in "]}":
                        depth -= 1
                    elif letter == "," and depth == 1:
                        item += 1
                    place += 1
        if depth <= 0 or number >= len(rows):
            return number
        rest = rows[number]
        number += 1


def _skip_text(rows: list[str], number: int, rest: str, place: int, quotes: str) -> tuple[int, str, int]:
    while True:
        end = rest.find(quotes, place)
        if end >= 0:
            return number, rest, end + 3
        if number >= len(rows):
            return number, "", 0
        rest = rows[number]
        number += 1
        place = 0


def _end_of_string(rest: str, place: int) -> int:
    quote = rest[place]
    place += 1
    while place < len(rest) and rest[place] != quote:
        place += 2 if rest[place] == "\\" and quote == '"' else 1
    return place + 1


# ---- checking against tables of keys


def check_table(document: Document, where: Where, table: object, keys: tuple[Key, ...]) -> dict[str, Any]:
    """The values of one table, defaults filled in. Problems are noted in the document; what is wrong is left out."""
    if not isinstance(table, dict):
        document.wrong(where, "must be a table")
        return {}
    known = {key.name: key for key in keys}
    for name in table:
        if name not in known:
            document.wrong((*where, name), _unknown(name, list(known)))
    values: dict[str, Any] = {}
    for key in keys:
        if key.name in table:
            value = table[key.name]
            message = fault_of(key, value)
            if message:
                document.wrong((*where, key.name), message)
            else:
                values[key.name] = float(value) if key.kind == "number" else value
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


def _unknown(name: str, known: list[str]) -> str:
    near = difflib.get_close_matches(name, known, 1)
    return f"is not a key here; did you mean '{near[0]}'?" if near else f"is not a key here; keys: {', '.join(known)}"


def fault_of(key: Key, value: object) -> str:
    """What is wrong with a value, or nothing."""
    if key.kind in ("whole", "number"):
        return _number_fault(key, value)
    if key.kind in ("text", "word"):
        if not isinstance(value, str):
            return "must be text in quotes"
        if key.words and value not in key.words:
            return f"must be one of: {', '.join(key.words)}"
        return f"is longer than {LONGEST_TEXT} characters" if len(value) > LONGEST_TEXT else ""
    if key.kind == "yes/no":
        return "" if isinstance(value, bool) else "must be true or false"
    if key.kind == "table":
        return "" if isinstance(value, Mapping) else "must be a table"
    if key.kind.startswith("list") or key.kind == "tables":
        return _list_fault(key, value)
    return ""


def _number_fault(key: Key, value: object) -> str:
    whole = key.kind == "whole"
    if isinstance(value, bool) or not isinstance(value, int if whole else (int, float)):
        return "must be a whole number" if whole else "must be a number"
    if value != value or value in (float("inf"), float("-inf")):
        return "must be a finite number"
    if (key.low is not None and value < key.low) or (key.high is not None and value > key.high):
        return f"{value} is outside {key.low:g} to {key.high:g}{' ' + key.unit if key.unit else ''}"
    return ""


def _list_fault(key: Key, value: object) -> str:
    if not isinstance(value, list):
        return "must be a list"
    if len(value) > (key.high if key.high is not None else LONGEST_LIST):
        return f"has {len(value)} entries: at most {key.high:g}"
    if key.low is not None and len(value) < key.low:
        return f"has {len(value)} entries: at least {key.low:g}"
    if key.kind == "list of whole numbers" and any(
        isinstance(each, bool) or not isinstance(each, int) for each in value
    ):
        return "must hold whole numbers"
    if key.kind == "list of texts" and not all(isinstance(each, str) and len(each) <= LONGEST_TEXT for each in value):
        return "must hold texts in quotes"
    return ""


def key_table_markdown(keys: tuple[Key, ...]) -> str:
    """A reference table of keys."""
    rows = ["| key | what | kind | range | default |", "| --- | --- | --- | --- | --- |"]
    for key in keys:
        span = ", ".join(key.words)
        if key.low is not None and key.high is not None:
            span = f"{key.low:g} to {key.high:g}"
        if key.unit:
            span = f"{span} {key.unit}".strip()
        default = {REQUIRED: "must be given", "None": ""}.get(str(key.default), str(key.default))
        if isinstance(key.default, bool):
            default = str(key.default).lower()
        rows.append(f"| `{key.name}` | {key.sentence} | {key.kind} | {span} | {default} |")
    return "\n".join(rows) + "\n"
