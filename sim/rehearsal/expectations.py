"""Judges what came of a scenario: each expectation gets a verdict and says what was found."""

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

from shared_protocol.codec import plain
from sim.rehearsal.scenario import Scenario, Step

# Expectations that look at how things are at a certain time.
LOOKS = ("lie", "points", "voltage", "follower")


@dataclass(frozen=True)
class Heard:
    """One message that the host took in: when (microseconds), its name, its fields with words as text."""

    at_us: int
    name: str
    fields: dict[str, Any]


@dataclass(frozen=True)
class Verdict:
    """One expectation judged."""

    ok: bool
    text: str
    line: int


@dataclass
class Facts:
    """What a run left to judge by. `looks` holds what was true at the times that expectations name."""

    heard: list[Heard] = field(default_factory=list)
    pulses: list[tuple[int, int]] = field(default_factory=list)
    requests: dict[str, int] = field(default_factory=dict)
    looks: dict[tuple[str, int, int], Any] = field(default_factory=dict)
    boots: int = 1
    end_us: int = 0


class Judge:
    """Judges the expectations of one scenario against the facts."""

    def __init__(self, scenario: Scenario, facts: Facts) -> None:
        self._scenario = scenario
        self._facts = facts

    def verdicts(self) -> list[Verdict]:
        """One verdict an expectation, in the order of the file."""
        found = []
        for step in self._scenario.expectations:
            judge: Callable[[dict[str, Any]], tuple[bool, str]] = getattr(self, f"_{step.word}")
            ok, text = judge(step.values)
            found.append(Verdict(ok, f"{step.word}: {text}", step.line))
        return found

    def _span(self, values: dict[str, Any]) -> tuple[int, int]:
        end = values.get("to_s")
        return round(values["from_s"] * 1e6), self._facts.end_us if end is None else round(end * 1e6)

    def _messages(self, name: str, values: dict[str, Any], number: int) -> list[Heard]:
        return [heard for heard in self._facts.heard if heard.name == name and heard.fields["id"] == number]

    def _outcome(self, values: dict[str, Any]) -> tuple[bool, str]:
        number = self._facts.requests.get(values["label"], -1)
        found = [heard for heard in self._messages("outcome", values, number) if heard.fields["step"] == values["step"]]
        title = f"{values['label']} step {values['step']}" if values["step"] else values["label"]
        return self._judge_end(title, found, values)

    def _route(self, values: dict[str, Any]) -> tuple[bool, str]:
        number = self._facts.requests.get(values["label"], -1)
        return self._judge_end(values["label"], self._messages("route_end", values, number), values)

    def _judge_end(self, title: str, found: list[Heard], values: dict[str, Any]) -> tuple[bool, str]:
        if not found:
            return False, f"{title} has no outcome; expected {values['outcome']}"
        last = found[-1]
        fields = last.fields
        text = f"{title} {fields['o']} ({fields['why']}) at {last.at_us / 1e6:.3f} s"
        if "ms" in fields:
            text += f", {fields['ms']} ms"
        begin, end = self._span(values)
        wrong = []
        if fields["o"] != values["outcome"]:
            wrong.append(values["outcome"])
        if "why" in values and fields["why"] != values["why"]:
            wrong.append(values["why"])
        if not begin <= last.at_us <= end:
            wrong.append(f"between {begin / 1e6:g} and {end / 1e6:g} s")
        took_ms = fields.get("ms", 0)
        if took_ms < values.get("low_ms", took_ms) or took_ms > values.get("high_ms", took_ms):
            wrong.append(f"{values.get('low_ms', 0)} to {values.get('high_ms', 'any')} ms")
        if "after_high_v" in values and fields["after"] > values["after_high_v"] * 1000:
            wrong.append(f"bank left at {values['after_high_v']} V at most, was {fields['after']} mV")
        if "done" in values and fields["done"] != values["done"]:
            wrong.append(f"{values['done']} done, were {fields['done']}")
        return not wrong, text + (f"; expected {', '.join(wrong)}" if wrong else "")

    def _lie(self, values: dict[str, Any]) -> tuple[bool, str]:
        lie, source = self._facts.looks[look_key("lie", values)]
        wanted = -1 if values["lie"] == "unknown" else values["lie"]
        names = self._scenario.layout.junction_words[values["junction"]]
        said = names[lie] if lie >= 0 else "unknown"
        ok = lie == wanted and values.get("source", source) == source
        return ok, f"{self._name(values)} said to lie {said} ({source})" + ("" if ok else f"; expected {values}")

    def _points(self, values: dict[str, Any]) -> tuple[bool, str]:
        lie = self._facts.looks[look_key("points", values)]
        names = self._scenario.layout.junction_words[values["junction"]]
        wanted = None if values["lie"] == "between" else values["lie"]
        ok = lie == wanted
        text = f"{self._name(values)} really lies {names[lie] if lie is not None else 'between'}"
        return ok, text + ("" if ok else f"; expected {names[wanted] if wanted is not None else 'between'}")

    def _name(self, values: dict[str, Any]) -> str:
        junction: int = values["junction"]
        return self._scenario.layout.settings.junctions[junction].name.decode()

    def _fault(self, values: dict[str, Any]) -> tuple[bool, str]:
        scope = next(key for key in ("bank", "junction", "button") if key in values)
        number = values[scope] - (scope == "button")
        begin, end = self._span(values)
        told = [heard for heard in self._facts.heard if heard.name == "fault" and heard.fields["scope"] == scope]
        told = [heard for heard in told if heard.fields["i"] == number]
        ok = any(heard.fields["code"] == values["code"] and begin <= heard.at_us <= end for heard in told)
        found = ", ".join(f"{heard.fields['code']} at {heard.at_us / 1e6:.3f} s" for heard in told) or "none"
        return ok, f"{scope} {number + 1}: {found}" + ("" if ok else f"; expected {values['code']}")

    def _no_fault(self, values: dict[str, Any]) -> tuple[bool, str]:
        begin, end = self._span(values)
        told = [heard for heard in self._facts.heard if heard.name == "fault" and begin <= heard.at_us <= end]
        found = ", ".join(f"{heard.fields['scope']} {heard.fields['i'] + 1} {heard.fields['code']}" for heard in told)
        return not told, found or "none told"

    def _pulses(self, values: dict[str, Any]) -> tuple[bool, str]:
        begin, end = self._span(values)
        bank = values.get("bank")
        count = sum(begin <= at <= end and bank in (None, own) for at, own in self._facts.pulses)
        ok = values["least"] <= count <= values["most"]
        return ok, f"{count} given" + ("" if ok else f"; expected {values['least']} to {values['most']}")

    def _voltage(self, values: dict[str, Any]) -> tuple[bool, str]:
        volts = self._facts.looks[look_key("voltage", values)]
        ok = values["low_v"] <= volts <= values["high_v"]
        span = f"; expected {values['low_v']:g} to {values['high_v']:g} V"
        return ok, f"bank {values['bank'] + 1} at {volts:.2f} V" + ("" if ok else span)

    def _follower(self, values: dict[str, Any]) -> tuple[bool, str]:
        on = self._facts.looks[look_key("follower", values)]
        ok = on == values["on"]
        return ok, f"output {values['output']} is {'on' if on else 'off'}" + ("" if ok else "; expected the other")

    def _boots(self, values: dict[str, Any]) -> tuple[bool, str]:
        ok = self._facts.boots == values["count"]
        return ok, f"{self._facts.boots}" + ("" if ok else f"; expected {values['count']}")

    def _settings(self, values: dict[str, Any]) -> tuple[bool, str]:
        told = [heard for heard in self._facts.heard if heard.name in ("accepted", "rejected")]
        if not told:
            return False, "no answer"
        last = told[-1]
        why = last.fields.get("why", "ok")
        ok = (last.name == "accepted") == values["accepted"] and values.get("why", why) == why
        text = last.name if last.name == "accepted" else f"rejected ({why}, {last.fields['field'] or 'as a whole'})"
        return ok, text + ("" if ok else f"; expected {'accepted' if values['accepted'] else 'rejected'}")


def look_key(what: str, values: dict[str, Any]) -> tuple[str, int, int]:
    """Under what a look is kept: what, of which, when (-1: at the end)."""
    at_s = values.get("at_s")
    which = values[{"voltage": "bank", "follower": "output"}.get(what, "junction")]
    return what, which, -1 if at_s is None else round(at_s * 1e6)


def looks_of(expectations: list[Step]) -> list[tuple[str, int, int]]:
    """All looks that expectations need."""
    return [look_key(step.word, step.values) for step in expectations if step.word in LOOKS]


def heard_of(received: Any, at_us: int) -> Heard | None:
    """A message as the judge keeps it."""
    if received.message is None:
        return None
    return Heard(at_us, received.message.name, plain(received.message, received.values))
