"""Makes the reference pages from the tables that check files and messages: `python -m sim.reference_pages FOLDER`.

A page can't say anything that the program does not do, because both come from one table. A test holds the pages
in docs/reference against `pages()`.
"""

import sys
from pathlib import Path

from shared_protocol import messages, sentences, words
from shared_protocol.fields import INT, INTS, KIND_NAMES, NAME, WORD, Field, Message
from shared_protocol.line import LINE_MAX
from shared_protocol.settings_table import SETTINGS
from sim.layout import keys
from sim.layout.reading import DEEPEST, LARGEST_FILE, Key, key_table_markdown
from sim.layout.wire_keys import TABLE_OF, owner_key
from sim.rehearsal.reference import scenario_page

MADE = "This page is made from the program's own tables by `python -m sim.reference_pages docs/reference`.\n"

_INPUT_PLACES = """Each line is `name = place`. The place is a number (of the input or output: those on pins come \
first, then those on the chain), or `"pin 5"`, or `"chain 3"` (the fourth place of the chain).

```toml
[inputs]
"throat contact" = "chain 0"
"stop button" = "pin 15"
```
"""

_SMALLEST = """```toml
[layout]
name = "Saltmarsh Halt"

[supply]
volts = 16.0

[[bank]]
name = "Only"
first_pin = 2
coils = 2
adc = 0
resistor_w = 10

[[junction]]
name = "Loop"
bank = "Only"
motors = [{ coils = [0, 1] }]
```
"""


def pages() -> dict[str, str]:
    """All pages: file name -> Markdown."""
    return {
        "layout-file.md": layout_page(),
        "scenario-file.md": scenario_page(),
        "settings.md": settings_page(),
        "messages.md": messages_page(),
        "faults.md": faults_page(),
    }


def layout_page() -> str:
    """Every table and key of a layout file."""
    parts = [
        "# The layout file\n",
        MADE,
        f"A layout file is TOML in UTF-8, {LARGEST_FILE >> 20} MiB at most, nested {DEEPEST} deep at most. Electrical "
        "values carry their unit in the key. Banks, junctions, lies, routes, inputs and outputs are referred to by "
        "name; banks, junctions and routes also by number, as people count them (from 1). "
        "`coilwarden settings check FILE` tells everything that is wrong, with line and key.\n",
        "The smallest layout:\n",
        _SMALLEST,
    ]
    for heading, text, table in keys.TABLES:
        parts.append(f"## {heading}\n")
        if text:
            parts.append(f"{text}\n")
        parts.append(key_table_markdown(table))
        parts += _refused(table)
        if heading == "[io]":
            parts += ["## [inputs] and [outputs]\n", _INPUT_PLACES]
        if heading == "[[button]]":
            parts.append(_button_needs())
    return "\n".join(parts)


def _refused(table: tuple[Key, ...]) -> list[str]:
    """Words that are understood and refused."""
    found = [(key.name, word, sentence) for key in table for word, sentence in key.refused]
    return [f'`{name} = "{word}"` is refused; {sentence}.\n' for name, word, sentence in found]


def _button_needs() -> str:
    rows = ["| kind | needs |", "| --- | --- |"]
    for kind, needed in keys.BUTTON_NEEDS.items():
        rows.append(f"| `{kind}` | {', '.join(f'`{key}`' for key in needed)} |")
    return "\n".join(rows) + "\n"


def settings_page() -> str:
    """Every record of the settings and the keys of the layout file that its fields come from."""
    parts = [
        "# Settings\n",
        MADE,
        "What a board knows about its layout: records, a line each, in this order. Each `set_charge` follows its "
        "`set_bank`, each `set_lie` its `set_junction`. The last column names the key of the layout file.\n",
    ]
    for message in SETTINGS:
        parts.append(f"## {message.name}\n")
        parts.append(f"{message.text} In the layout file: {TABLE_OF[message.name]}.\n")
        parts.append(_fields_markdown(message, with_keys=True))
    return "\n".join(parts)


def messages_page() -> str:
    """Every message, then every word that messages use."""
    parts = [
        "# Messages\n",
        MADE,
        f"A line is compact JSON, then `*`, the CRC-32 of the JSON in eight hex digits, and a newline: {LINE_MAX} "
        "bytes at most. The JSON begins with the message's name as `m`; its fields follow in this order, all of them, "
        f"without spaces. Protocol version {messages.VERSION}. The messages `hello`, `board` and `wrong_version` never "
        "change, whatever the version. A message with a field `q` is sent again until the host acknowledges it.\n",
        "Settings records are messages too: see [settings](settings.md).\n",
    ]
    for heading, table in (("From the host", messages.TO_BOARD), ("From the board", messages.TO_HOST)):
        parts.append(f"## {heading}\n")
        for message in table:
            parts.append(f"### {message.name}\n")
            parts.append(f"{message.text}{' Kept until acknowledged.' if message.kept else ''}\n")
            if message.fields:
                parts.append(_fields_markdown(message, with_keys=False))
    return "\n".join([*parts, "## Reasons\n", _reasons()])


def _reasons() -> str:
    rows = ["| word | what happened | what to do |", "| --- | --- | --- |"]
    for word, text, remedy in zip(words.REASONS, sentences.REASON_TEXTS, sentences.REASON_REMEDIES, strict=True):
        rows.append(f"| `{word}` | {text} | {remedy} |")
    rows += ["", "`{ms}` is the time that the message gives, `{i}` the number of the bank, motor or input.", ""]
    return "\n".join(rows)


def faults_page() -> str:
    """Every fault with its blink code."""
    rows = ["| blinks | fault | what is wrong | what to do | evidence |", "| --- | --- | --- | --- | --- |"]
    for number, (word, text, remedy, first, second) in enumerate(sentences.FAULT_TEXTS):
        if number:
            rows.append(f"| {number} | `{word}` | {text} | {remedy} | {first}; {second} |")
    return "\n".join(
        [
            "# Faults\n",
            MADE,
            "The first fault of a bank, junction or button is kept, and puts it out of use until it is cleared; others "
            "go on. Its number is its blink code. Evidence comes with the message `fault`.\n",
            "\n".join(rows) + "\n",
        ]
    )


def _fields_markdown(message: Message, with_keys: bool) -> str:
    rows = ["| field | what | kind | range | default |", "| --- | --- | --- | --- | --- |"]
    if with_keys:
        rows = [rows[0] + " layout key |", rows[1] + " --- |"]
    for field in message.fields:
        key = owner_key(message, field.key) if with_keys else ""
        last = f" {f'`{key}`' if key else ''} |" if with_keys else ""
        rows.append(
            f"| `{field.key}` | {field.text} | {KIND_NAMES[field.kind]} | {_range(field)} | {_default(field)} |{last}"
        )
    return "\n".join(rows) + "\n"


def _range(field: Field) -> str:
    if field.kind == WORD:
        shown = field.words if field.words is not words.REASONS else ("one of the reasons below",)
        return ", ".join(f"`{word}`" for word in shown) if shown is field.words else shown[0]
    span = f"{_figure(field.low)} to {_figure(field.high)}"
    if field.kind == NAME:
        return f"{span} bytes" if field.low != field.high else f"{field.low} bytes"
    if field.kind == INTS:
        return f"at most {field.most}, each {span}"
    assert field.kind == INT
    return f"{span} {field.unit}".strip()


def _figure(number: int) -> str:
    return f"{number:,}".replace(",", " ")


def _default(field: Field) -> str:
    if field.default is None:
        return ""
    return f"`{field.words[field.default]}`" if field.kind == WORD else _figure(field.default)


def write(folder: Path) -> list[Path]:
    """Write all pages into a folder; returns their paths."""
    folder.mkdir(parents=True, exist_ok=True)
    written = []
    for name, text in pages().items():
        (folder / name).write_text(text, encoding="utf-8", newline="\n")
        written.append(folder / name)
    return written


def main(arguments: list[str]) -> int:
    """Entry point; one argument, the folder."""
    if len(arguments) != 1:
        print("usage: python -m sim.reference_pages FOLDER", file=sys.stderr)
        return 2
    for path in write(Path(arguments[0])):
        print(path)
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
