"""Finds the line of every key and list item of a TOML text, which tomllib does not tell.

The text has been read by tomllib before, so it is known to be right: this scanner need not judge, only follow.
It knows table headers, arrays of tables, dotted and quoted keys, inline tables, lists over several lines, comments
and all four kinds of string (TOML 1.0; line ends in inline tables, which 1.1 allows, do no harm).
"""

import re
import tomllib
from bisect import bisect_left

Step = str | int
Where = tuple[Step, ...]

_SPACE = re.compile(r"(?:[ \t\r\n]+|#[^\n]*)*")
_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")
_STRING = re.compile(
    r'''"""(?:[^"\\]|\\.|"{1,2}(?!"))*"{3,5}'''
    r"""|\'\'\'(?:[^']|'{1,2}(?!'))*'{3,5}"""
    r'''|"(?:[^"\\]|\\.)*"'''
    r"""|'[^']*'""",
    re.DOTALL,
)
_PLAIN_VALUE = re.compile(r"[^,\]}#\n]*")


def locate(text: str) -> dict[Where, int]:
    """The line (from 1) of each table, key and list item of a right TOML text, by path; () is line 1."""
    return _Scanner(text).run()


class _Scanner:
    """Walks once over the text."""

    def __init__(self, text: str) -> None:
        self._text = text
        self._at = 0
        self._line_ends = [place for place, letter in enumerate(text) if letter == "\n"]
        self._lines: dict[Where, int] = {(): 1}
        # Of each array of tables, the number of its newest table.
        self._newest: dict[Where, int] = {}

    def run(self) -> dict[Where, int]:
        table: Where = ()
        self._skip_space()
        while self._at < len(self._text):
            if self._text[self._at] == "[":
                table = self._header()
            else:
                self._key_and_value(table)
            self._skip_space()
        return self._lines

    def _note(self, where: Where) -> None:
        """Keep the line of a path, and of what is around it where that is new."""
        line = bisect_left(self._line_ends, self._at) + 1
        self._lines.pop(where, None)  # a header after its own sub-tables says better where the table stands
        while where not in self._lines:
            self._lines[where] = line
            where = where[:-1]

    def _skip_space(self) -> None:
        """Pass over blanks, line ends and comments."""
        found = _SPACE.match(self._text, self._at)
        assert found is not None
        self._at = found.end()

    def _header(self) -> Where:
        """`[a.b]` or `[[a.b]]`; inside arrays of tables, the newest table is meant."""
        start = self._at
        is_list = self._text.startswith("[[", start)
        self._at += 2 if is_list else 1
        parts = self._key()
        table: Where = ()
        for place, part in enumerate(parts):
            table += (part,)
            if is_list and place == len(parts) - 1:
                self._newest[table] = self._newest.get(table, -1) + 1
            if table in self._newest:
                table += (self._newest[table],)
        end = self._at + (2 if is_list else 1)
        self._at = start
        self._note(table)
        self._at = end
        return table

    def _key(self) -> tuple[str, ...]:
        """A key, dotted or not; stands behind it, and behind blanks, afterwards."""
        parts: list[str] = []
        while True:
            self._skip_space()
            found = _BARE_KEY.match(self._text, self._at)
            if found:
                parts.append(found.group())
            else:
                found = _STRING.match(self._text, self._at)
                if found is None:
                    raise ValueError("not a TOML text")
                parts.append(_unquoted(found.group()))
            self._at = found.end()
            self._skip_space()
            if not self._text.startswith(".", self._at):
                return tuple(parts)
            self._at += 1

    def _key_and_value(self, table: Where) -> None:
        start = self._at
        where = (*table, *self._key())
        after = self._at
        self._at = start
        self._note(where)
        self._at = after + 1  # the equals sign
        self._skip_space()
        self._value(where)

    def _value(self, where: Where) -> None:
        letter = self._text[self._at]
        if letter == "[":
            self._list(where)
        elif letter == "{":
            self._inline_table(where)
        else:
            found = (_STRING if letter in "\"'" else _PLAIN_VALUE).match(self._text, self._at)
            if found is None:
                raise ValueError("not a TOML text")
            self._at = found.end()

    def _list(self, where: Where) -> None:
        self._at += 1
        number = 0
        self._skip_space()
        while self._text[self._at] != "]":
            self._note((*where, number))
            self._value((*where, number))
            number += 1
            self._skip_comma()
        self._at += 1

    def _inline_table(self, where: Where) -> None:
        self._at += 1
        self._skip_space()
        while self._text[self._at] != "}":
            self._key_and_value(where)
            self._skip_comma()
        self._at += 1

    def _skip_comma(self) -> None:
        self._skip_space()
        if self._text[self._at] == ",":
            self._at += 1
            self._skip_space()


def _unquoted(key: str) -> str:
    """A quoted key without its quotes and escapes."""
    if key[0] == "'" or "\\" not in key:
        return key[1:-1]
    return next(iter(tomllib.loads(f"{key} = 0")))
