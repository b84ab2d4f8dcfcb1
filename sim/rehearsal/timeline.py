"""The timeline of a rehearsal, in plain words for people; the log is for machines."""

from collections.abc import Callable

from shared_protocol.sentences import FAULT_TEXTS, REASON_TEXTS
from shared_protocol.words import FAULTS, REASONS
from sim.layout import Layout
from sim.rehearsal.expectations import Heard


class Timeline:
    """Collects lines; `tell` gets each as it comes."""

    def __init__(self, layout: Layout, tell: Callable[[str], None] | None) -> None:
        self._layout = layout
        self._tell = tell
        self.lines: list[str] = []

    def _add(self, at_us: int, text: str) -> None:
        line = f"{at_us / 1e6:9.3f} s  {text}"
        self.lines.append(line)
        if self._tell is not None:
            self._tell(line)

    def world(self, at_us: int, text: str) -> None:
        """Something the script did."""
        self._add(at_us, f"* {text}")

    def heard(self, heard: Heard) -> None:
        """Something the board said."""
        text = ""
        fields = heard.fields
        if heard.name == "outcome":
            text = f"{self._throw(fields)}: {fields['o']}, {REASON_TEXTS[REASONS.index(fields['why'])]}"
            if fields["o"] == "refused" and fields["ms"] >= 0:
                text += f"; would pass in {fields['ms']} ms"
        elif heard.name == "route_end":
            text = f"route: {fields['o']}, {fields['done']} of {fields['of']} throws"
        elif heard.name == "fault":
            row = FAULT_TEXTS[FAULTS.index(fields["code"])]
            evidence = f"{row[3]} {fields['e1']}, {row[4]} {fields['e2']}"
            text = f"FAULT {fields['scope']} {fields['i'] + 1}: {row[1]} ({evidence})"
        elif heard.name == "pulse":
            bank = self._layout.settings.banks[fields["b"]].name.decode()
            text = f"pulse on bank {bank}, {fields['us'] / 1000:.1f} ms at {fields['mv'] / 1000:.2f} V"
        elif heard.name == "lie":
            text = self._lie(fields)
        elif heard.name in ("cleared", "accepted", "rejected"):
            text = heard.name + " " + " ".join(f"{key}={value}" for key, value in fields.items())
        if text:
            self._add(heard.at_us, text)

    def _throw(self, fields: dict[str, int]) -> str:
        junctions = self._layout.settings.junctions
        if not 0 <= fields["j"] < len(junctions):
            return "throw"
        words = self._layout.junction_words[fields["j"]]
        lie = words[fields["lie"]] if 0 <= fields["lie"] < len(words) else "?"
        return f"{junctions[fields['j']].name.decode()} to '{lie}'"

    def _lie(self, fields: dict[str, int]) -> str:
        words = self._layout.junction_words[fields["j"]]
        name = self._layout.settings.junctions[fields["j"]].name.decode()
        return f"{name} lies {words[fields['lie']] if fields['lie'] >= 0 else 'unknown'} ({fields['src']})"
