"""The `[settings]` of a scenario: values of its layout that are different for this rehearsal."""

import copy
from typing import Any

from sim.layout import Layout, layout_of
from sim.layout.problems import BadFile, FileProblem
from sim.layout.reading import Document, Where, check_table, check_tables, named
from sim.rehearsal import keys

LISTS = {"bank": keys.SETTINGS_BANK, "junction": keys.SETTINGS_JUNCTION}
TABLES = {"supply": keys.SETTINGS_SUPPLY, "board": keys.SETTINGS_BOARD, "timing": keys.SETTINGS_TIMING}


class Overridden(Document):
    """A layout's document with values of a scenario put in; problems with those name the scenario's lines."""

    def __init__(self, layout: Document, scenario: Document) -> None:
        super().__init__(layout.file, copy.deepcopy(layout.data), layout.lines)
        self._scenario = scenario
        self._from: dict[Where, Where] = {}

    def put(self, table: dict[str, Any], where: Where, values: dict[str, Any], origin: Where) -> None:
        """Put values into a table of the layout that stands at `where`; they come from `origin`."""
        for name, value in values.items():
            table[name] = value
            self._from[(*where, name)] = (*origin, name)

    def wrong(self, where: Where, message: str) -> None:
        """Note a problem: against the scenario, if the value came from there."""
        for length in range(len(where), 0, -1):
            origin = self._from.get(where[:length])
            if origin is not None:
                scenario = self._scenario
                self.note(where, FileProblem(scenario.file, scenario.line_of(origin), named(origin), message))
                return
        super().wrong(where, message)


def overridden_layout(layout: Document, scenario: Document, table: object) -> Layout:
    """The layout as this scenario has it. Raises BadFile."""
    checked = check_table(scenario, ("settings",), table, keys.SETTINGS)
    merged = Overridden(layout, scenario)
    for name, own_keys in TABLES.items():
        if name in checked:
            origin: Where = ("settings", name)
            own = merged.data.setdefault(name, {})
            values = check_table(scenario, origin, checked[name], own_keys)
            if isinstance(own, list):
                scenario.wrong(origin, "can't be changed here: the layout has several boards")
            if isinstance(own, dict):
                merged.put(own, (name,), values, origin)
    for name, own_keys in LISTS.items():
        rows = check_tables(scenario, ("settings", name), checked.get(name, []), own_keys)
        for number, values in enumerate(rows):
            _put_row(merged, scenario, name, ("settings", name, number), values)
    if scenario.problems:
        raise BadFile(scenario.problems)
    return layout_of(merged)


def _put_row(merged: Overridden, scenario: Document, name: str, origin: Where, values: dict[str, Any]) -> None:
    """One bank or junction, found by its name in the layout."""
    if "name" not in values:
        return
    own = merged.data.get(name, [])
    names = [row.get("name") for row in own if isinstance(row, dict)] if isinstance(own, list) else []
    if values["name"] not in names:
        known = ", ".join(str(each) for each in names)
        scenario.wrong((*origin, "name"), f"there is no {name} '{values['name']}'; there are: {known}")
        return
    place = names.index(values["name"])
    new = {key: value for key, value in values.items() if key != "name"}
    merged.put(own[place], (name, place), new, origin)
