"""Reads an event log and judges it from outside: what must hold of any run, whatever was asked."""

import json
import re
from typing import Any

from sim.layout import Layout
from sim.rehearsal import Scenario

# Beyond its wait a throw of one pulse takes the pulse, the judging of its drop and its contact's answer.
MARGIN_S = 1.5
# After these the host may not hear of an outcome, or the board not of the request.
DISTURBING = ("restart", "ask_restart", "host_lost", "host_stops_reading", "damage_lines", "lose_lines", "tune")


def audit(scenario: Scenario, log: str) -> None:
    """Raises AssertionError."""
    entries = [(float(time), who, body) for time, who, body in (line.split(" ", 2) for line in log.splitlines())]
    assert [entry[0] for entry in entries] == sorted(entry[0] for entry in entries), "times go back"
    _pulses(entries)
    _one_outcome_each(entries)
    if not {step.word for step in scenario.actions} & set(DISTURBING) and scenario.host:
        _in_time(entries, scenario)


def _pulses(entries: list[tuple[float, str, str]]) -> None:
    """Each pulse that begins ends after its width to the microsecond, unless the power is cut."""
    running: dict[str, tuple[float, int]] = {}
    for time, who, body in entries:
        if who != "#":
            continue
        begins = re.match(r"pulse begins bank (\d) group \d mask \d+ for (\d+) us", body)
        ends = re.match(r"pulse ends bank (\d)", body)
        cut = re.match(r"pulse cut short bank (\d)", body)
        if begins:
            assert begins[1] not in running, "two pulses on a bank"
            running[begins[1]] = (time, int(begins[2]))
        elif ends:
            began, width_us = running.pop(ends[1])
            assert round((time - began) * 1e6) == width_us
        elif cut:
            del running[cut[1]]


def _one_outcome_each(entries: list[tuple[float, str, str]]) -> None:
    """A request may be answered again, but never differently, within a boot."""
    boot = 0
    known: dict[tuple[int, int, int], str] = {}
    for _, who, body in entries:
        if who != "<" or not body.startswith("{"):
            continue
        message = json.loads(body)
        if message["m"] == "board":
            boot = message["boot"]
        if message["m"] not in ("outcome", "route_end") or not message["id"] or message["why"] == "board_restarted":
            continue
        step = message.get("step", -1)
        del message["q"]
        said = json.dumps(message)
        assert known.setdefault((boot, message["id"], step), said) == said, (known[boot, message["id"], step], said)


def _in_time(entries: list[tuple[float, str, str]], scenario: Scenario) -> None:
    """Throws of one pulse have an outcome within their deadline."""
    ended = {}
    for time, who, body in entries:
        if who == "<" and body.startswith('{"m":"outcome"'):
            ended.setdefault(json.loads(body)["id"], time)
    for time, who, body in entries:
        if who != ">" or not body.startswith('{"m":"throw"'):
            continue
        asked: dict[str, Any] = json.loads(body)
        if not one_pulse(scenario.layout, asked["j"]):
            continue
        due = time + asked["wait"] / 1000 + MARGIN_S
        if due < scenario.duration_us / 1e6:
            assert ended.get(asked["id"], 1e9) <= due, f"no outcome in time: {body}"


def one_pulse(layout: Layout, junction: int) -> bool:
    """True if its throws take one pulse, whatever happens."""
    settings = layout.settings.junctions[junction]
    together = all(lie.together or len(settings.motors) == 1 for lie in settings.lies)
    return together and settings.pulses == 1 and settings.retry_mv == 0
