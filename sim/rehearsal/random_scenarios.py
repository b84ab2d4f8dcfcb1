"""Random scenarios with faults, as text: what is found wrong can be kept as a file and run again.

One number gives one scenario, the same on every machine.
"""

import random
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from sim.layout import Layout, load_layout

LAYOUTS = ("saltmarsh_quay.toml", "tidemill_yard.toml", "small_bank.toml")
SHARES = (6, 5, 1)
DURATION_S = 5.5
# Nothing new is asked for after this time, so that what was asked for can end.
LAST_ASKED_S = 4.5
WRAP = 1 << 30
# What a chooser writes: keys of one [[at]].
Values = dict[str, object]


def random_scenario_text(number: int) -> str:
    """The text of scenario `number`."""
    rng = random.Random(number)
    name = rng.choices(LAYOUTS, SHARES)[0]
    layout = load_layout(Path(__file__).parent.parent / "layouts" / name)
    return _Writer(rng, layout, name, number).text()


@dataclass
class _Kind:
    """One action: how often it is chosen, and what chooses its keys."""

    weight: int
    choose: Callable[[], Values]


class _Writer:
    """Writes one scenario."""

    def __init__(self, rng: random.Random, layout: Layout, name: str, number: int) -> None:
        self._rng = rng
        self._layout = layout
        self._settings = layout.settings
        self._lines = [
            f'title = "Random scenario {number}"',
            f'layout = "{name}"',
            f"seed = {number}",
            f"duration_s = {DURATION_S}",
            f"charged = {'true' if rng.random() < 0.8 else 'false'}",
            f"host = {'true' if rng.random() < 0.95 else 'false'}",
        ]
        self._labels = 0
        self._kinds = self._make_kinds()

    def text(self) -> str:
        """The whole scenario."""
        self._clock()
        self._overrides()
        moment_s = self._rng.choice((0.05, 0.55, 0.7))
        words = list(self._kinds)
        weights = [self._kinds[word].weight for word in words]
        while moment_s < LAST_ASKED_S:
            word = self._rng.choices(words, weights)[0]
            self._step(moment_s, word, self._kinds[word].choose())
            moment_s += self._rng.choice((0.001, 0.02, 0.08, 0.2, 0.5)) * self._rng.uniform(0.3, 2.0)
        return "\n".join(self._lines) + "\n"

    def _step(self, moment_s: float, word: str, values: Values) -> None:
        self._lines += ["", "[[at]]", f"time_s = {moment_s:.4f}", f'do = "{word}"']
        for key, value in values.items():
            shown = str(value).lower() if isinstance(value, bool) else f'"{value}"' if isinstance(value, str) else value
            self._lines.append(f"{key} = {shown}")

    def _clock(self) -> None:
        rng = self._rng
        if rng.random() < 0.3:
            # The clocks wrap while it runs.
            self._lines += ["", "[clock]"]
            self._lines.append(f"us_ticks = {WRAP - rng.randrange(1, int(DURATION_S * 1e6))}")
            self._lines.append(f"ms_ticks = {WRAP - rng.randrange(1, int(DURATION_S * 1e3))}")

    def _overrides(self) -> None:
        rng = self._rng
        self._lines += ["", "[settings.board]", f"host_silence_ms = {rng.choice((500, 900, 3000))}"]
        self._lines.append(f'route_order = "{rng.choice(("as_listed", "fullest", "number"))}"')
        self._lines.append(f"restore_lies = {'true' if rng.random() < 0.2 else 'false'}")
        self._lines += ["", "[settings.timing]", f"route_pause_ms = {rng.choice((0, 20, 100))}"]
        self._lines.append(f"longest_wait_ms = {rng.choice((300, 2000, 5000))}")
        self._lines.append(f"settle_ms = {rng.choice((2, 5, 30))}")

    # ---- what may happen

    def _make_kinds(self) -> dict[str, _Kind]:
        kinds = {
            "throw": _Kind(40, self._throw),
            "repeat": _Kind(4, self._label_of_request),
            "cancel": _Kind(4, self._label_of_request),
            "stop": _Kind(3, dict),
            "release": _Kind(4, dict),
            "clear": _Kind(6, self._clear),
            "tune": _Kind(2, self._tune),
            "ask_restart": _Kind(1, dict),
            "restart": _Kind(2, dict),
            "host_lost": _Kind(2, dict),
            "host_back": _Kind(5, dict),
            "host_stops_reading": _Kind(1, dict),
            "host_reads": _Kind(2, dict),
            "damage_lines": _Kind(2, self._count),
            "double_lines": _Kind(2, self._count),
            "lose_lines": _Kind(1, self._count),
            "press": _Kind(14, self._press),
            "close": _Kind(3, self._input),
            "open": _Kind(3, self._input),
            "supply_off": _Kind(2, dict),
            "supply_on": _Kind(3, dict),
            "hand": _Kind(6, self._hand),
        }
        kinds.update(self._fault_kinds())
        if self._settings.routes:
            kinds["route"] = _Kind(12, self._route)
        return kinds

    def _fault_kinds(self) -> dict[str, _Kind]:
        rng = self._rng
        return {
            "driver_stuck": _Kind(2, self._coil),
            "driver_mended": _Kind(1, self._coil),
            "coil_open": _Kind(3, self._coil),
            "coil_shorted": _Kind(2, lambda: {**self._coil(), "ohm": rng.choice((0.05, 0.3, 1.5))}),
            "joint_bad": _Kind(2, lambda: {**self._coil(), "ohm": rng.choice((1.0, 4.0, 40.0))}),
            "coil_mended": _Kind(3, self._coil),
            "jammed": _Kind(2, self._motor),
            "freed": _Kind(2, self._motor),
            "capacitor_faded": _Kind(2, lambda: {**self._bank(), "factor": rng.choice((0.4, 0.7, 1.2))}),
            "leakage_high": _Kind(2, lambda: {**self._bank(), "ohm": rng.choice((15.0, 80.0, 600.0))}),
            "divider_broken": _Kind(1, lambda: {**self._bank(), "leg": rng.choice(("upper", "lower"))}),
            "bank_mended": _Kind(2, self._bank),
            "contact_stuck": _Kind(2, lambda: {**self._input(), "closed": rng.random() < 0.5}),
            "contact_freed": _Kind(2, self._input),
        }

    def _junction(self) -> Values:
        junctions = self._settings.junctions
        # The first few are chosen more often: requests then meet each other.
        last = len(junctions) if self._rng.random() < 0.5 else min(3, len(junctions))
        return {"junction": str(1 + self._rng.randrange(last))}

    def _lie_of(self, values: Values) -> Values:
        lies = self._settings.junctions[int(str(values["junction"])) - 1].lies
        return {**values, "lie": self._rng.choice(lies).name.decode()}

    def _wait(self) -> Values:
        return {"wait_ms": self._rng.choice((0, 0, 50, 400, 1500, 3000))}

    def _label(self) -> Values:
        self._labels += 1
        return {"label": f"request {self._labels}"}

    def _throw(self) -> Values:
        return {**self._lie_of(self._junction()), **self._wait(), **self._label()}

    def _route(self) -> Values:
        return {"route": str(1 + self._rng.randrange(len(self._settings.routes))), **self._wait(), **self._label()}

    def _label_of_request(self) -> Values:
        if not self._labels:
            # Nothing to name yet: ask for something first.
            self._labels += 1
            self._step(0.0, "throw", {**self._lie_of(self._junction()), "wait_ms": 0, "label": "request 1"})
        return {"label": f"request {max(1, self._labels - self._rng.randrange(3))}"}

    def _clear(self) -> Values:
        if self._rng.random() < 0.5:
            return {}
        return self._bank() if self._rng.random() < 0.5 else self._junction()

    def _tune(self) -> Values:
        ready_v = self._rng.choice((9.0, 10.5, 11.0))
        return {**self._junction(), "ready_v": ready_v}

    def _count(self) -> Values:
        return {"count": self._rng.choice((1, 2, 5))}

    def _input(self) -> Values:
        return {"input": str(self._rng.randrange(self._settings.inputs))}

    def _button_input(self) -> Values:
        if not self._settings.buttons:
            return self._input()
        return {"input": str(self._rng.choice(self._settings.buttons).input)}

    def _press(self) -> Values:
        return {**self._button_input(), "for_ms": self._rng.choice((5, 60, 150, 150, 400, 3300))}

    def _hand(self) -> Values:
        return self._lie_of(self._junction())

    def _bank(self) -> Values:
        return {"bank": str(1 + self._rng.randrange(len(self._settings.banks)))}

    def _motor(self) -> Values:
        values = self._junction()
        motors = self._settings.junctions[int(str(values["junction"])) - 1].motors
        return {**values, "motor": self._rng.randint(1, len(motors))}

    def _coil(self) -> Values:
        return {**self._motor(), "side": self._rng.choice(("normal", "reverse"))}
