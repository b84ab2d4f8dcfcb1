"""The line of every key and list item, also where TOML is written in an unusual way."""

import json
import tomllib
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sim.layout.locating import Where, locate

UNUSUAL = '''\
# a comment with [brackets] and key = 1
title = "a # no comment, [no] = table"   # 2
"quoted key" = 1                         # 3
'literal "key"' = 2                      # 4
"esc\\"aped \\u00e9" = 3                 # 5
a.b . "c.d" = 4                          # 6
text = """                               # 7
[not.a.table]
not_a_key = 1
quote: \\""" and ""two"" and at the end """"" # 10
raw = \'\'\'
x = 1 \\
''\'\'\'                                 # 13
empty = ""                               # 14
when = 2020-01-01 10:00:00Z              # 15
list = [ 1,                              # 16
  # 2, a comment in a list
  2, [ 3,                                # 18
  4 ],                                   # 19
]
inline = { x = 1, y = { z = [ "]", 5,    # 21
  6 ] } }                                # 22

[[bank]]                                 # 24
name = "one"                             # 25
[bank.part]                              # 26
depth = 1                                # 27
[[bank.row]]                             # 28
[[bank.row]]                             # 29
width = 2                                # 30
[[bank]]                                 # 31
[[bank.row]]                             # 32
[ "odd" . 'names' ]                      # 33
k = 1                                    # 34
[x.y]                                    # 35
k = 1                                    # 36
[x]                                      # 37
k = 1                                    # 38
'''

LINES: tuple[tuple[Where, int], ...] = (
    ((), 1), (("title",), 2), (("quoted key",), 3), (('literal "key"',), 4), (('esc"aped \u00e9',), 5), (("a",), 6),
    (("a", "b"), 6), (("a", "b", "c.d"), 6), (("text",), 7), (("raw",), 11), (("empty",), 14), (("when",), 15),
    (("list",), 16), (("list", 0), 16), (("list", 1), 18), (("list", 2), 18), (("list", 2, 0), 18),
    (("list", 2, 1), 19), (("inline", "x"), 21), (("inline", "y"), 21), (("inline", "y", "z", 0), 21),
    (("inline", "y", "z", 2), 22), (("bank",), 24), (("bank", 0), 24),
    (("bank", 0, "name"), 25), (("bank", 0, "part"), 26),
    (("bank", 0, "part", "depth"), 27), (("bank", 0, "row", 0), 28), (("bank", 0, "row", 1), 29),
    (("bank", 0, "row", 1, "width"), 30), (("bank", 1), 31), (("bank", 1, "row", 0), 32), (("odd", "names"), 33),
    (("odd", "names", "k"), 34), (("x", "y"), 35), (("x", "y", "k"), 36), (("x",), 37), (("x", "k"), 38),
)  # fmt: skip


@pytest.mark.parametrize(("where", "line"), LINES, ids=[".".join(map(str, where)) for where, _ in LINES])
def test_unusual_toml(where: Where, line: int) -> None:
    tomllib.loads(UNUSUAL)
    assert locate(UNUSUAL)[where] == line
    assert locate(UNUSUAL.replace("\n", "\r\n"))[where] == line


def test_nothing_in_strings_and_comments_is_taken_for_a_key() -> None:
    assert set(locate(UNUSUAL)) == set(paths_of(tomllib.loads(UNUSUAL)))


def paths_of(value: Any, where: Where = ()) -> list[Where]:
    """The paths of everything in read TOML."""
    found = [where]
    inner: list[tuple[Any, Any]] = []
    if isinstance(value, dict):
        inner = list(value.items())
    elif isinstance(value, list):
        inner = list(enumerate(value))
    for step, each in inner:
        found += paths_of(each, (*where, step))
    return found


# ---- any TOML: a writer that puts line ends where it likes and keeps the lines of all that it writes

KEYS = st.text("ab_-", min_size=1, max_size=3) | st.text("a. \"'[]{}=#\\\u00e9", min_size=1, max_size=4)
SCALARS = st.integers(-5, 5) | st.booleans() | st.text("x\\\"'[]{},=# \u00e9", max_size=6)
VALUES = st.recursive(
    SCALARS, lambda inner: st.lists(inner, max_size=3) | st.dictionaries(KEYS, inner, max_size=3), max_leaves=8
)


class Writer:
    """Writes TOML, and notes on which line each path begins."""

    def __init__(self, data: st.DataObject) -> None:
        self._data = data
        self.text = ""
        self.lines: dict[Where, int] = {}

    def table(self, table: dict[str, Any], where: Where = ()) -> None:
        """Values first, then tables of its own, as headers."""
        headed: list[tuple[str, Any]] = []
        for key, value in table.items():
            is_table = isinstance(value, dict) or (
                isinstance(value, list) and bool(value) and all(isinstance(each, dict) for each in value)
            )
            if is_table and self._data.draw(st.booleans()):
                headed.append((key, value))
            else:
                self._key_value(key, value, where)
                self.text += self._data.draw(st.sampled_from(["\n", "\n\n", " # [x] = 1\n", "\t\r\n"]))
        for key, value in headed:
            name = ".".join(json.dumps(step, ensure_ascii=False) for step in (*where, key) if isinstance(step, str))
            for number, each in enumerate(value if isinstance(value, list) else [value]):
                at: Where = (*where, key, number) if isinstance(value, list) else (*where, key)
                self.text += "  "
                self._note(at)
                self.text += f"[[{name}]]\n" if isinstance(value, list) else f"[{name}] # k = 1\n"
                self.table(each, at)

    def _note(self, where: Where) -> None:
        while where not in self.lines:
            self.lines[where] = self.text.count("\n") + 1
            where = where[:-1]

    def _key_value(self, key: str, value: Any, where: Where) -> None:
        self._note((*where, key))
        self.text += json.dumps(key, ensure_ascii=False) + self._data.draw(st.sampled_from(["=", " = ", "\t="]))
        self._value(value, (*where, key))

    def _value(self, value: Any, where: Where) -> None:
        if isinstance(value, dict):
            self.text += "{"
            for place, (key, each) in enumerate(value.items()):
                self.text += "," if place else ""
                self._key_value(key, each, where)
            self.text += "}"
        elif isinstance(value, list):
            self.text += "["
            for place, each in enumerate(value):
                self.text += self._data.draw(st.sampled_from(["", " ", "\n", " # ], \n  "]))
                self._note((*where, place))
                self._value(each, (*where, place))
                self.text += ","
            self.text += "]"
        elif isinstance(value, str) and "'" not in value and self._data.draw(st.booleans()):
            self.text += f"'''{value}'''" if self._data.draw(st.booleans()) else f"'{value}'"
        elif isinstance(value, str):
            quoted = json.dumps(value, ensure_ascii=False)
            self.text += f'""{quoted}""' if self._data.draw(st.booleans()) else quoted
        else:
            self.text += json.dumps(value)


@settings(max_examples=150, deadline=None)
@given(table=st.dictionaries(KEYS, VALUES, max_size=4), data=st.data())
def test_any_toml(table: dict[str, Any], data: st.DataObject) -> None:
    writer = Writer(data)
    writer.lines[()] = 1
    writer.table(table)
    assert tomllib.loads(writer.text) == table
    found = locate(writer.text)
    assert {where: found.get(where) for where in writer.lines} == writer.lines
    assert set(found) == set(paths_of(table))
