"""What must always hold, whatever is asked in whatever order: a state machine over the controller on a bench board.

Checked at every pulse and after every step, from outside, with its own book-keeping: not with the controller's.
"""

import hypothesis.strategies as st
from bench import Bench
from bench_board import BenchBoard
from bench_layouts import usual
from hypothesis import HealthCheck, Phase, settings
from hypothesis.stateful import RuleBasedStateMachine, initialize, invariant, precondition, rule

JUNCTIONS = 5
LIES = (2, 2, 2, 2, 3)
# Which mask may be used on which bank, with the lowest ready voltage for it.
ALLOWED = {
    (0, 0b1): 12_000, (0, 0b10): 12_000, (0, 0b100): 12_000, (0, 0b1000): 12_000,
    (0, 0b10000): 12_000, (0, 0b100000): 12_000, (0, 0b1000000): 12_000, (0, 0b10000000): 12_000,
    (1, 0b1): 12_000, (1, 0b10): 12_000, (1, 0b10100): 14_000, (1, 0b101000): 14_000,
}  # fmt: skip
REST_MS = 500
LONGEST_WAIT_MS = 5000
# Beyond its wait a throw may take its pulses, its contact's answer and one more wait for each further pulse.
MARGIN_MS = 3 * (LONGEST_WAIT_MS + 400)


class Machine(RuleBasedStateMachine):
    """Requests, time, hands, faults, lost hosts and restarts in any order."""

    steps = 0

    @initialize(start_ms=st.sampled_from([0, (1 << 30) - 2000]), start_us=st.sampled_from([0, (1 << 30) - 500_000]))
    def begin(self, start_ms: int, start_us: int) -> None:
        self.bench = Bench(usual(), BenchBoard(2, start_us, start_ms), True, False)
        self.bench.hello()
        self.now_ms = 0
        self.asked: dict[int, int] = {}
        self.stopped = False
        self.seen_pulses = 0
        self.rested: dict[tuple[int, int], int] = {}
        self.busy_until: dict[int, int] = {}
        self.combination = [None, None]  # type: list[int | None]
        self.bench.on_pulse = self.check_pulse

    # ---- the rules

    def let_pass(self, ms: int) -> None:
        for _ in range(ms):
            self.bench.run(1)
            self.now_ms += 1
            Machine.steps += 1

    @rule(junction=st.integers(0, JUNCTIONS), lie=st.integers(0, 3), wait=st.sampled_from([0, 0, 100, 1500, 5000]))
    def throw(self, junction: int, lie: int, wait: int) -> None:
        number = self.bench.throw(junction, lie, wait)
        self.asked[number] = self.now_ms
        self.let_pass(3)

    @rule(wait=st.sampled_from([0, 1500, 5000]))
    def route(self, wait: int) -> None:
        self.bench.route(0, wait)
        self.let_pass(3)

    @rule(back=st.integers(1, 3))
    def repeat(self, back: int) -> None:
        number = self.bench.next_id - back
        if number in self.asked:
            self.bench.send("throw", id=number, j=0, lie=1, wait=1000)
            self.let_pass(3)

    @rule(ms=st.integers(1, 1200))
    def wait(self, ms: int) -> None:
        self.bench.send("alive")
        self.let_pass(ms)

    @rule()
    def stop(self) -> None:
        self.bench.send("stop")
        self.let_pass(3)
        self.stopped = True

    @rule()
    def release(self) -> None:
        self.bench.send("release")
        self.stopped = False
        self.let_pass(3)

    @rule(back=st.integers(1, 4))
    def cancel(self, back: int) -> None:
        self.bench.send("cancel", id=max(1, self.bench.next_id - back))
        self.let_pass(3)

    @rule(number=st.integers(10, 13))
    def button(self, number: int) -> None:
        if number == 12:
            self.stopped = False
        self.bench.board.set_input(number, True)
        self.let_pass(45)
        self.bench.board.set_input(number, False)
        self.let_pass(60)
        if number == 11:
            # A press that fell into a pulse may have been ignored: what the board says counts.
            self.stopped = self.bench.controller.plant.stopped  # type: ignore[union-attr]

    @rule(closed=st.booleans())
    def hand_on_points(self, closed: bool) -> None:
        self.bench.board.set_input(0, closed)
        self.let_pass(5)

    @rule(bank=st.integers(0, 1), percent=st.sampled_from([0, 40, 80, 80, 80, 97, 100]))
    def coils(self, bank: int, percent: int) -> None:
        self.bench.board.banks[bank].drop_percent = percent

    @rule(bank=st.integers(0, 1), rise=st.sampled_from([0, 5, 20, 60]))
    def charging(self, bank: int, rise: int) -> None:
        self.bench.board.banks[bank].rise_mv_per_ms = rise

    @rule(bank=st.integers(0, 1), mv=st.sampled_from([-1, -1, -1, 0, 3000, 11_999, 30_000]))
    def sense(self, bank: int, mv: int) -> None:
        self.bench.board.banks[bank].sense_mv = mv
        self.let_pass(2)

    @rule(scope=st.sampled_from(["bank", "junction", "button", "all"]), number=st.integers(0, 4))
    def clear(self, scope: str, number: int) -> None:
        self.bench.send("clear", scope=scope, i=number)
        self.let_pass(3)

    @rule()
    def host_lost(self) -> None:
        # A host that acknowledges is there.
        self.bench.acknowledge = False
        self.let_pass(3200)
        self.bench.acknowledge = True
        count = self.bench.controller.queue.throws.count  # type: ignore[union-attr]
        throws = self.bench.controller.queue.throws.order[:count]  # type: ignore[union-attr]
        assert not [throw for throw in throws if throw.origin == 0 and throw.state == 0]
        before = self.bench.board.pulse_count
        self.bench.send("hello", v=1)
        self.let_pass(20)
        self.bench.send("ask", what="status")
        self.let_pass(40)
        assert self.bench.board.pulse_count - before <= sum(throw.origin == 1 for throw in throws)

    @precondition(lambda self: self.now_ms > 0)
    @rule()
    def restart(self) -> None:
        board = self.bench.board
        for bank in board.banks:
            # The hardware ends its pulse by itself; the interpreter's death changes nothing about it.
            bank.mask = 0
        board.boot += 1
        before = board.pulse_count
        on_pulse, self.bench = self.bench.on_pulse, Bench(None, board, False, False)
        self.bench.on_pulse = on_pulse
        self.asked = {}
        self.stopped = False
        self.bench.send("hello", v=1)
        self.let_pass(20)
        self.bench.send("throw", id=1, j=0, lie=1, wait=0, boot=board.boot - 1)
        self.let_pass(30)
        refused = self.bench.outcome(1)
        assert refused is not None and refused["why"] == "board_restarted"
        self.bench.said.clear()
        assert board.pulse_count == before

    # ---- what must hold

    def check_pulse(self, pulse: tuple[int, int, int, int, int]) -> None:
        bank, group, mask, width_us, mv = pulse
        board = self.bench.board
        ready_mv = ALLOWED[(bank, mask)]
        sensed = board.banks[bank].sense_mv if board.banks[bank].sense_mv >= 0 else mv
        assert group == 0 and sensed >= ready_mv, (pulse, ready_mv)
        assert 3 <= width_us <= 40_000
        assert not self.stopped
        assert self.bench.controller.plant.faults.codes[0][bank] == 0  # type: ignore[union-attr]
        for coil in range(8):
            if (mask >> coil) & 1:
                assert not (mask >> (coil ^ 1)) & 1, "both coils of one motor"
                last = self.rested.get((bank, coil))
                assert last is None or self.now_ms - last >= REST_MS - 1, "a coil did not rest"
                self.rested[(bank, coil)] = self.now_ms
                self.note_three_way(bank, coil)
        assert self.now_ms >= self.busy_until.get(bank, 0), "two pulses on a bank"
        self.busy_until[bank] = self.now_ms + width_us // 1000 + 19

    def note_three_way(self, bank: int, coil: int) -> None:
        if bank == 0 and coil >= 4:
            self.combination[(coil - 4) // 2] = coil & 1
            assert self.combination != [1, 1], "forbidden combination"

    @invariant()
    def one_outcome_each_and_in_time(self) -> None:
        if not hasattr(self, "bench"):
            return
        for number, when in list(self.asked.items()):
            found = {
                tuple(sorted((key, value) for key, value in outcome.items() if key != "q"))
                for outcome in self.bench.all("outcome")
                if outcome["id"] == number and outcome["step"] == 0
            }
            assert len(found) <= 1, found
            if not found:
                assert self.now_ms - when <= LONGEST_WAIT_MS + MARGIN_MS, f"throw {number} has no outcome"

    @invariant()
    def known_lies_say_where_they_come_from(self) -> None:
        if hasattr(self, "bench"):
            for junction in self.bench.controller.plant.junctions:  # type: ignore[union-attr]
                assert (junction.lie < 0) == (junction.source == 0)


TestInvariants = Machine.TestCase
TestInvariants.settings = settings(
    max_examples=60,
    stateful_step_count=40,
    deadline=None,
    suppress_health_check=[HealthCheck.too_slow],
    print_blob=True,
    # Shrinking takes minutes here; the blob that is printed repeats the case.
    phases=[Phase.explicit, Phase.reuse, Phase.generate],
)


def teardown_module() -> None:
    """Say how far it went (pytest shows it with -rP or -s)."""
    print(f"state machine: {Machine.steps} ticks")
