"""The reference page of scenario files, made from the tables that check them."""

from shared_protocol import sentences, words
from sim.layout.reading import Key, key_table_markdown
from sim.rehearsal import keys

INTRODUCTION = """# Scenario file

Made from the tables in `sim/rehearsal/keys.py`, which also check what is read. Don't edit it by hand.

A scenario is a TOML file: which layout, what happens when, and what must come of it. `coilwarden rehearse FILE` runs it
in virtual time; `--on micropython` runs the same firmware in real MicroPython. Times are seconds from the start, when
the board starts too; coils then rest for their time before the first throw can fire. One seed fixes everything random.

```toml
title = "A throw straight after another is refused"
duration_s = 3.0

[[at]]
time_s = 1.0
do = "throw"
junction = "Throat"
lie = "to platform 2"
label = "first"

[[expect]]
what = "outcome"
label = "first"
outcome = "done"
```

The event log (`--log`) has one line an event: time, then `>` host to board, `<` board to host, `#` the world (actions
of the script, pulses as the hardware gives them, restarts). It is the same to the byte on both interpreters.
"""


def scenario_keys() -> dict[str, tuple[Key, ...]]:
    """Every table of a scenario file by its heading, in the order in which people meet them."""
    tables: dict[str, tuple[Key, ...]] = {
        "(the file)": keys.SCENARIO,
        "[clock]": keys.CLOCK,
        "[settings]": keys.SETTINGS,
        "[settings.supply]": keys.SETTINGS_SUPPLY,
        "[settings.board]": keys.SETTINGS_BOARD,
        "[settings.timing]": keys.SETTINGS_TIMING,
        "[[settings.bank]]": keys.SETTINGS_BANK,
        "[[settings.junction]]": keys.SETTINGS_JUNCTION,
        "[[at]]": keys.ACTION,
        "[[expect]]": keys.EXPECTATION,
    }
    for word, (_, needed) in keys.ACTIONS.items():
        tables[f'[[at]] do = "{word}"'] = needed
    for word, (_, needed) in keys.EXPECTATIONS.items():
        tables[f'[[expect]] what = "{word}"'] = needed
    return tables


def scenario_page() -> str:
    """The whole page, Markdown."""
    tables = scenario_keys()
    parts = [INTRODUCTION]
    for heading in list(tables)[:8]:
        parts.append(f"## `{heading}`\n\n{key_table_markdown(tables[heading])}")
    parts.append(f"## What happens: `[[at]]`\n\n{key_table_markdown(keys.ACTION)}")
    for word, (sentence, needed) in keys.ACTIONS.items():
        parts.append(_kind("do", word, sentence, needed))
    parts.append(f"## What must come of it: `[[expect]]`\n\n{key_table_markdown(keys.EXPECTATION)}")
    for word, (sentence, needed) in keys.EXPECTATIONS.items():
        parts.append(_kind("what", word, sentence, needed))
    parts.append(_reasons())
    return "\n".join(parts)


def _kind(key: str, word: str, sentence: str, needed: tuple[Key, ...]) -> str:
    table = "\n" + key_table_markdown(needed) if needed else "\nNeeds nothing more.\n"
    return f'### `{key} = "{word}"`\n\n{sentence}\n{table}'


def _reasons() -> str:
    rows = ["## Reasons", "", "What `why` may be.", "", "| word | meaning |", "| --- | --- |"]
    rows += [f"| `{word}` | {text} |" for word, text in zip(words.REASONS, sentences.REASON_TEXTS, strict=True)]
    return "\n".join(rows) + "\n"
