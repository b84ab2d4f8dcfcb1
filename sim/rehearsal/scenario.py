"""A scenario file, read and checked: what happens when, and what must come of it."""

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sim.layout import Layout, demo_layout_path, layout_of
from sim.layout.problems import BadFile
from sim.layout.reading import Document, Key, Where, check_table, read_toml
from sim.rehearsal import keys
from sim.rehearsal.overrides import overridden_layout


@dataclass(frozen=True)
class Step:
    """One action or expectation: its word, what it needs (names turned into numbers), and its line."""

    word: str
    values: dict[str, Any]
    line: int


@dataclass(frozen=True)
class Scenario:
    """A whole scenario."""

    path: Path
    title: str
    layout: Layout
    seed: int
    duration_us: int
    charged: bool
    host: bool
    us_ticks: int
    ms_ticks: int
    actions: list[Step]
    expectations: list[Step]


def shipped() -> list[Path]:
    """The scenarios that come with the program."""
    return sorted((Path(__file__).parent.parent / "scenarios").glob("*.toml"))


def load_scenario(path: Path) -> Scenario:
    """Read and check a scenario file and its layout. Raises BadFile."""
    document = read_toml(path)
    data = check_table(document, (), document.data, keys.SCENARIO)
    document.raise_if_wrong()
    clock = check_table(document, ("clock",), data.get("clock", {}), keys.CLOCK)
    document.raise_if_wrong()
    source = read_toml(_layout_path(document, data))
    layout = overridden_layout(source, document, data["settings"]) if "settings" in data else layout_of(source)
    layout = _one_board(document, layout, data)
    resolver = _Resolver(document, layout)
    actions = resolver.steps("at", data["at"], "do", keys.ACTION, keys.ACTIONS)
    expectations = resolver.steps("expect", data["expect"], "what", keys.EXPECTATION, keys.EXPECTATIONS)
    resolver.check_labels(actions, expectations)
    resolver.check_times(actions, expectations, data["duration_s"])
    document.raise_if_wrong()
    return Scenario(
        path, data["title"], layout, data["seed"], round(data["duration_s"] * 1e6), data["charged"], data["host"],
        clock["us_ticks"], clock["ms_ticks"], actions, expectations,
    )  # fmt: skip


def _one_board(document: Document, layout: Layout, data: dict[str, Any]) -> Layout:
    """The board's part that the scenario names, where the layout has several. Raises BadFile."""
    if len(layout.boards) == 1 and "board" not in data:
        return layout
    if "board" in data:
        try:
            return layout.alone(layout.board_number(data["board"]))
        except KeyError as error:
            document.wrong(("board",), str(error.args[0]))
    else:
        names = ", ".join(layout.board_names)
        document.wrong(("board",), f"is missing: the layout has several boards, a rehearsal runs one of {names}")
    raise BadFile(document.problems)


def _layout_path(document: Document, data: dict[str, Any]) -> Path:
    """Beside the scenario, else among the shipped layouts."""
    if "layout" not in data:
        return demo_layout_path()
    for folder in (Path(document.file).parent, demo_layout_path().parent):
        found: Path = folder / data["layout"]
        if found.is_file():
            return found
    document.wrong(("layout",), f"there is no layout file '{data['layout']}'")
    raise BadFile(document.problems)


class _Resolver:
    """Turns names in steps into numbers; notes what is not there."""

    def __init__(self, document: Document, layout: Layout) -> None:
        self._document = document
        self._layout = layout

    def steps(
        self, name: str, tables: list[Any], word_key: str, common: tuple[Key, ...], kinds: dict[str, Any]
    ) -> list[Step]:
        """The steps of one list."""
        found = []
        for number, table in enumerate(tables):
            where: Where = (name, number)
            word = table.get(word_key) if isinstance(table, dict) else None
            extra = kinds[word][1] if isinstance(word, str) and word in kinds else ()
            if not extra and isinstance(table, dict) and word not in kinds:
                # Say what is wrong with the word, not with all that would belong to it.
                table = {key: value for key, value in table.items() if key in {known.name for known in common}}
            before = len(self._document.problems)
            values = check_table(self._document, where, table, common + extra)
            if len(self._document.problems) == before:
                self._resolve(where, word, values)
                found.append(Step(str(word), values, self._document.line_of(where)))
        return found

    def _resolve(self, where: Where, word: object, values: dict[str, Any]) -> None:
        for key in ("junction", "bank", "route", "lie", "input", "output", "motor"):
            if key in values:
                try:
                    values[key] = self._number(key, values)
                except KeyError as error:
                    self._document.wrong((*where, key), str(error.args[0]))
                    return
        span_end = values.get("to_s")
        if span_end is not None and span_end < values.get("from_s", 0):
            self._document.wrong((*where, "to_s"), "is before from_s")
        named = [key for key in ("bank", "junction", "button") if key in values]
        if word == "fault" and len(named) != 1:
            self._document.wrong(where, "names one of bank, junction, button")
        if word == "clear" and len(named) > 1:
            self._document.wrong(where, "names one of bank, junction, button, or none")
        for low, high in (("low_v", "high_v"), ("least", "most"), ("low_ms", "high_ms")):
            if low in values and high in values and values[low] > values[high]:
                self._document.wrong((*where, low), f"is above {high}")

    def _number(self, key: str, values: dict[str, Any]) -> int | str:
        layout = self._layout
        text = values[key]
        if key == "junction":
            return layout.junction_number(text)
        if key == "bank":
            return layout.bank_number(text)
        if key == "route":
            return layout.route_number(text)
        if key == "lie":
            return str(text) if text in ("unknown", "between") else layout.lie_number(values["junction"], text)
        if key == "input":
            return numbered(text, layout.input_names, layout.settings.inputs, "input")
        if key == "output":
            return numbered(text, layout.output_names, layout.settings.outputs, "output")
        motors = layout.settings.junctions[values["junction"]].motors
        if not 1 <= int(text) <= len(motors):
            raise KeyError(f"the junction has {len(motors)} motors")
        number: int = motors[int(text) - 1]
        return number

    def check_times(self, actions: list[Step], expectations: list[Step], duration_s: float) -> None:
        """Nothing may stand after the end, where it would never come about."""
        for name, steps in (("at", actions), ("expect", expectations)):
            for number, step in enumerate(steps):
                for key in ("time_s", "at_s", "from_s"):
                    if step.values.get(key, 0) > duration_s:
                        self._document.wrong((name, number, key), f"is after the end, at {duration_s:g} s")

    def check_labels(self, actions: list[Step], expectations: list[Step]) -> None:
        """Every label used must be one that is given, once, and before it is used."""
        given: dict[str, Step] = {}
        for number, step in enumerate(actions):
            label = step.values.get("label", "")
            if step.word in ("throw", "route") and label:
                if label in given:
                    self._document.wrong(("at", number, "label"), f"another request is called '{label}'")
                given.setdefault(label, step)
        for name, steps in (("at", actions), ("expect", expectations)):
            for number, step in enumerate(steps):
                label = step.values.get("label", "")
                message = _label_fault(step, given, name == "expect") if label else ""
                if message:
                    self._document.wrong((name, number, "label"), message)


def _label_fault(step: Step, given: dict[str, Step], expected: bool) -> str:
    """What is wrong with a label that a step uses, or nothing."""
    label = step.values["label"]
    if label not in given:
        return f"no request is called '{label}'"
    if expected and step.word == "route" and given[label].word != "route":
        return f"'{label}' is not a route"
    if not expected and step.values["time_s"] < given[label].values["time_s"]:
        return f"is used before '{label}' is asked for"
    return ""


def numbered(text: str, names: dict[str, int], count: int, what: str) -> int:
    """An input or output by its name or number. Raises KeyError naming what there is."""
    if text in names:
        return names[text]
    if text.isascii() and text.isdigit() and int(text) < count:
        return int(text)
    raise KeyError(f"there is no {what} '{text}'; there are: {', '.join(names) or 'none'}")
