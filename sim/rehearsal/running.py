"""Runs a scenario in virtual time, on either interpreter, and reports what came of it.

The log is the proof that both interpreters decide alike: one line an event, integers and fixed ASCII only.
"""

import time
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from shared_protocol import messages
from shared_protocol.codec import Received
from sim.cpython_board import CPythonBoard
from sim.engine import Engine, Finished
from sim.guest import exchange as at
from sim.rehearsal.actions import Actions
from sim.rehearsal.expectations import Facts, Judge, Verdict, heard_of, looks_of
from sim.rehearsal.host import ScriptedHost
from sim.rehearsal.scenario import Scenario, Step
from sim.rehearsal.stop_watch import StopWatch
from sim.rehearsal.timeline import Timeline
from sim.world import InvariantBroken, World

if TYPE_CHECKING:
    from sim.micropython_board import Interpreter

TELEMETRY = (messages.BANK, messages.STATE, messages.EXPECT)


@dataclass
class Report:
    """What came of a rehearsal."""

    title: str
    on: str
    passed: bool = False
    broken: str = ""
    log: str = ""
    results: list[Verdict] = field(default_factory=list)
    timeline: list[str] = field(default_factory=list)
    virtual_s: float = 0.0
    wall_s: float = 0.0
    ticks: int = 0
    pulses: int = 0
    heap_used: int = 0


class Rehearsal:
    """One run: the script side of an engine (see engine.Script)."""

    def __init__(self, scenario: Scenario, full_log: bool, tell: Callable[[str], None] | None = None) -> None:
        self.scenario = scenario
        layout = scenario.layout
        physics = layout.physics
        self.world = World(
            layout.settings, physics.supply, physics.banks, physics.make_motors(), scenario.seed,
            scenario.us_ticks, scenario.ms_ticks, tell=self._note_world,
        )  # fmt: skip
        if scenario.charged:
            for bank in range(len(physics.banks)):
                self.world.circuit.set_bank_v(bank, self.settled_v(bank))
        self.host = ScriptedHost(layout, scenario.seed, self._hear)
        self.facts = Facts()
        self.stop_watch = StopWatch(self.world, layout.settings)
        self.timeline = Timeline(layout, tell)
        self._actions = Actions(self)
        self._full_log = full_log
        self._log: list[str] = []
        self._lies: dict[int, tuple[int, str]] = {}
        self._moments = self._plan(scenario)
        self._next = 0

    def settled_v(self, bank: int) -> float:
        """What the bank holds when it has been charging for long: supply and bleed divide."""
        physics = self.scenario.layout.physics
        own = physics.banks[bank]
        return physics.supply.voltage_v * own.leak_ohm / (own.leak_ohm + own.charge_ohm + physics.supply.source_ohm)

    def _plan(self, scenario: Scenario) -> list[tuple[int, int, str, Step | None, tuple[str, int, int] | None]]:
        """Everything with a time, in order: looks come before actions of the same moment."""
        plan: list[tuple[int, int, str, Step | None, tuple[str, int, int] | None]] = []
        for key in looks_of(scenario.expectations):
            plan.append((scenario.duration_us if key[2] < 0 else key[2], len(plan), "look", None, key))
        for step in scenario.actions:
            plan.append((round(step.values["time_s"] * 1e6), 100_000 + len(plan), "do", step, None))
        if scenario.host:
            plan.append((0, 50_000, "connect", None, None))
        return sorted(plan, key=lambda row: (row[0], row[1]))

    # ---- the engine's script

    def from_board(self, data: bytes, now_us: int) -> None:
        """The board has sent bytes."""
        self.host.feed(data, now_us)

    def to_board(self, now_us: int, room: int) -> bytes:
        """The host's next bytes."""
        data = self.host.take(room)
        for body in self.host.sent:
            self.note(now_us, ">", body.decode())
        self.host.sent.clear()
        return data

    def room_for_board(self) -> int:
        """What the board may send now."""
        return at.TX_BYTES if self.host.reads else 0

    def next_due_us(self, now_us: int) -> int | None:
        """When something is next due."""
        times = [self.scenario.duration_us]
        if self._next < len(self._moments):
            times.append(self._moments[self._next][0])
        alive = self.host.next_due_us()
        if alive is not None:
            times.append(alive)
        return max(now_us, min(times))

    def act(self, now_us: int) -> None:
        """Do what is due. Raises Restart or Finished."""
        while self._next < len(self._moments) and self._moments[self._next][0] <= now_us:
            _, _, kind, step, look = self._moments[self._next]
            self._next += 1
            if look is not None:
                self._look(look)
            elif kind == "connect":
                self.host.connect(now_us)
            elif step is not None:
                self.note(now_us, "#", f"{step.word} {_plain_values(step)}".rstrip())
                self._actions.do(step.word, step.values)
        self.host.act(now_us)
        if now_us >= self.scenario.duration_us:
            raise Finished

    # ---- what is noted

    def note(self, now_us: int, who: str, text: str) -> None:
        """One line of the log: `>` to the board, `<` from it, `#` the world."""
        self._log.append(f"{stamp(now_us)} {who} {text}")
        if who == "#":
            self.timeline.world(now_us, text)

    def _note_world(self, at_us: int, text: str) -> None:
        """What the world tells: for the log only; the timeline has the board's own word of its pulses."""
        self._log.append(f"{stamp(at_us)} # {text}")

    def _hear(self, received: Received, now_us: int) -> None:
        telemetry = received.message in TELEMETRY
        if self._full_log or not telemetry:
            self._log.append(f"{stamp(now_us)} < {received.text.decode('ascii', 'replace')}")
        heard = heard_of(received, now_us)
        if heard is None:
            return
        if heard.name == "lie":
            self._lies[heard.fields["j"]] = (heard.fields["lie"], heard.fields["src"])
        self.stop_watch.heard(heard)
        if not telemetry:
            self.facts.heard.append(heard)
            self.timeline.heard(heard)

    def _look(self, key: tuple[str, int, int]) -> None:
        what, which, _ = key
        if what == "lie":
            self.facts.looks[key] = self._lies.get(which, (-1, "none"))
        elif what == "points":
            self.facts.looks[key] = self.world.position(which)
        elif what == "follower":
            self.facts.looks[key] = self.world.follower(which)
        else:
            self.facts.looks[key] = self.world.circuit.bank_v(which)

    def restarted(self, boot: int, why: str) -> None:
        """The board has lost its power or reset itself: what it said before no longer counts."""
        self.note(self.world.now_us, "#", f"{why}; boot {boot}")
        self._lies.clear()
        self.facts.boots += 1
        self.stop_watch.board_starts()

    def finish(self, report: Report) -> None:
        """Judge, and fill the report."""
        self.facts.end_us = self.world.now_us
        self.facts.requests = {label: number for label, (number, _) in self.host.requests.items()}
        self.facts.pulses = [(pulse.at_us, pulse.bank) for pulse in self.world.pulses]
        if not report.broken:
            report.results = Judge(self.scenario, self.facts).verdicts()
        report.passed = not report.broken and all(result.ok for result in report.results)
        report.log = "\n".join(self._log) + "\n"
        report.timeline = self.timeline.lines
        report.virtual_s = self.world.now_us / 1e6
        report.pulses = len(self.world.pulses)


def stamp(at_us: int) -> str:
    """A time as the log writes it: seconds with six digits."""
    return f"{at_us // 1_000_000}.{at_us % 1_000_000:06d}"


def _plain_values(step: Step) -> str:
    """An action's values in the order of its table, ASCII only."""
    shown = [f"{key}={value}" for key, value in step.values.items() if key not in ("time_s", "do") and value != ""]
    return " ".join(shown).encode("ascii", "replace").decode()


class RehearsalEngine(Engine):
    """An engine that tells the rehearsal when its board starts again."""

    def __init__(self, rehearsal: Rehearsal) -> None:
        super().__init__(rehearsal.world, rehearsal)
        self._rehearsal = rehearsal

    def restarted(self, why: str = "") -> None:
        super().restarted(why)
        self._rehearsal.restarted(self.boot, why)


def run_rehearsal(
    scenario: Scenario,
    on: str = "cpython",
    full_log: bool = False,
    tell: Callable[[str], None] | None = None,
    interpreter: "Interpreter | None" = None,
) -> Report:
    """Run a scenario. on: 'cpython' or 'micropython'. full_log: telemetry too. tell: called with each timeline line.

    interpreter: MicroPython, for running many. Raises sim.micropython_board.GuestDied if the firmware crashes there.
    """
    rehearsal = Rehearsal(scenario, full_log, tell)
    engine = RehearsalEngine(rehearsal)
    report = Report(scenario.title, on)
    slots = {0: scenario.layout.slot_lines()}
    began = time.perf_counter()
    try:
        if on == "micropython":
            from sim.micropython_board import MicroPythonBoard

            with MicroPythonBoard(slots, interpreter=interpreter) as board:
                board.run(engine)
        else:
            CPythonBoard(slots).run(engine)
    except InvariantBroken as error:
        report.broken = str(error)
    report.wall_s = time.perf_counter() - began
    report.ticks = engine.ticks
    report.heap_used = engine.heap_used
    rehearsal.finish(report)
    return report
