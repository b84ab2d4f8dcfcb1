"""Routes over several boards: in order, one throw at a time, each asked for once; the first bad end is the end."""

import pytest
from hypothesis import settings
from hypothesis import strategies as st
from hypothesis.stateful import RuleBasedStateMachine, invariant, precondition, rule

from tests.host.fleet_bench import ROAD_1, ROAD_4, RUN_ROUND, TERMINUS, YARD, Bench

# The steps of the route Road 1 to platform: port, the board's own number of the junction, lie.
STEPS = [(1, 1, 1), (1, 0, 0), (0, 0, 0), (0, 1, 0)]


def asked(bench: Bench) -> list[tuple[int, int, int]]:
    """Every throw that was asked for, of both boards: port, junction, lie."""
    return [(port, values[2], values[3]) for port in (1, 0) for values in bench.sent(port, "throw")]  # type: ignore[misc]


def newest(bench: Bench, port: int) -> int:
    number = bench.sent(port, "throw")[-1][1]
    assert isinstance(number, int)
    return number


def done(bench: Bench, steps: int, pause: bool = True) -> None:
    """The next throws of the route are done."""
    already = len(asked(bench))
    for port, junction, lie in STEPS[already - 1 : already - 1 + steps]:
        bench.ends(port, newest(bench, port), junction, lie)
        if pause:
            bench.passes(0.15)


def steps_of(bench: Bench, number: int) -> list[tuple[str, str]]:
    outcomes = bench.model.outcomes
    return [(outcomes[key].outcome, outcomes[key].why) for key in sorted(outcomes) if key[0] == number and key[1]]


def test_each_throw_is_asked_for_when_the_one_before_is_done() -> None:
    bench = Bench().both()
    number = bench.fleet.route(ROAD_1, 4000)
    assert asked(bench) == STEPS[:1]
    assert [values[4] for values in bench.sent(1, "throw")] == [4000], "the wait is for each throw"
    bench.passes(2.0)
    assert asked(bench) == STEPS[:1], "nothing goes on by itself"
    bench.ends(1, newest(bench, 1), 1, 1)
    bench.passes(0.05)
    assert asked(bench) == STEPS[:1], "the pause that the settings want between two throws is 100 ms"
    bench.passes(0.1)
    assert asked(bench) == STEPS[:2]
    done(bench, 2)
    assert asked(bench) == STEPS and bench.fleet.outcome_of(number) is None
    bench.ends(0, newest(bench, 0), 1, 0)
    ended = bench.fleet.outcome_of(number)
    assert ended is not None and (ended.outcome, ended.kind, ended.route) == ("done", "route", ROAD_1)
    assert (ended.done, ended.of, ended.text) == (4, 4, "route Road 1 to platform done: 4 of 4 throws")
    assert steps_of(bench, number) == [("done", "sent")] * 4
    bench.passes(3.0)
    assert asked(bench) == STEPS
    assert ended.text in bench.events()


def test_the_queue_shows_what_is_still_to_be_asked_for() -> None:
    bench = Bench().both()
    number = bench.fleet.route(ROAD_1, 4000)
    assert [(item.id, item.step, item.due_ms, item.board) for item in bench.model.queue] == [
        (number, 2, -1, "Yard"), (number, 3, -1, "Terminus"), (number, 4, -1, "Terminus"),
    ]  # fmt: skip
    assert [junction.waiting for junction in bench.model.junctions] == [True, True, False, False, True, False, False]


@pytest.mark.parametrize(
    ("how", "why", "route"),
    [
        ("failed", "no_contact", "failed"), ("refused", "below_ready", "refused"),
        ("expired", "longest_wait", "expired"), ("cancelled", "stop", "cancelled"),
    ],
)  # fmt: skip
def test_the_first_bad_end_is_the_end(how: str, why: str, route: str) -> None:
    bench = Bench().both()
    number = bench.fleet.route(ROAD_1, 4000)
    done(bench, 1)
    bench.ends(1, newest(bench, 1), 0, 0, how, why)
    ended = bench.fleet.outcome_of(number)
    assert ended is not None and (ended.outcome, ended.why, ended.done, ended.of) == (route, why, 1, 4)
    rest = why if why == "stop" else "route_failed"
    assert steps_of(bench, number) == [("done", "sent"), (how, why), ("cancelled", rest), ("cancelled", rest)]
    bench.passes(3.0)
    assert asked(bench) == STEPS[:2] and bench.model.queue == []


@pytest.mark.parametrize("lost", [TERMINUS, YARD])
def test_losing_a_board_that_is_needed_ends_the_route_and_names_it(lost: int) -> None:
    bench = Bench().both()
    number = bench.fleet.route(ROAD_1, 4000)
    done(bench, 1)
    bench.goes(lost)
    if lost == TERMINUS:
        # The throw that waits on the other board is called back, and its end awaited.
        assert len(bench.sent(1, "cancel")) == 1 and bench.fleet.outcome_of(number) is None
        bench.ends(1, newest(bench, 1), 0, 0, "cancelled", "operator")
    ended = bench.fleet.outcome_of(number)
    name = bench.layout.board_names[lost]
    assert ended is not None and ended.outcome == "failed"
    assert ended.text == f"route Road 1 to platform failed: board {name} not connected; 1 of 4 throws done"
    under_way = ("cancelled", "operator") if lost == TERMINUS else ("unknown", "")
    assert steps_of(bench, number)[1:] == [under_way, ("cancelled", "route_failed"), ("cancelled", "route_failed")]
    before = asked(bench)
    bench.comes(lost, lost)
    bench.passes(5.0)
    assert asked(bench) == before, "coming back asks for nothing"


def test_losing_a_board_whose_throws_are_done_does_not_matter() -> None:
    bench = Bench().both()
    number = bench.fleet.route(ROAD_1, 4000)
    done(bench, 2)
    bench.goes(1)
    bench.passes(0.5)
    done(bench, 2)
    ended = bench.fleet.outcome_of(number)
    assert ended is not None and ended.outcome == "done"


def test_a_board_that_came_and_went_between_two_looks_is_lost_too() -> None:
    bench = Bench().both()
    number = bench.fleet.route(ROAD_1, 4000)
    done(bench, 1)
    link = bench.links[0]
    link.breaks()
    link.connects(8, bench.layout.boards[0].crc(), "virtual-1", "address 1")
    bench.fleet.poll()
    bench.ends(1, newest(bench, 1), 0, 0, "cancelled", "operator")
    ended = bench.fleet.outcome_of(number)
    assert ended is not None and ended.outcome == "failed" and "board Terminus was lost or has restarted" in ended.text


def test_a_board_that_has_restarted_knows_nothing_of_the_route() -> None:
    bench = Bench().both()
    number = bench.fleet.route(ROAD_1, 4000)
    bench.links[0].greets(8, bench.layout.boards[0].crc(), "virtual-1", "address 1")
    bench.fleet.poll()
    assert len(bench.sent(1, "cancel")) == 1
    bench.ends(1, newest(bench, 1), 1, 1)
    ended = bench.fleet.outcome_of(number)
    assert ended is not None and (ended.outcome, ended.done) == ("failed", 1)
    assert "board Terminus was lost or has restarted" in ended.text
    bench.passes(1.0)
    assert asked(bench) == STEPS[:1]


def test_nothing_fires_if_a_board_is_missing_or_stopped_at_the_start() -> None:
    bench = Bench().both()
    bench.goes(0)
    ended = bench.fleet.outcome_of(bench.fleet.route(ROAD_1))
    assert ended is not None
    assert (ended.outcome, ended.text) == ("unsent", "route Road 1 to platform: not sent: board Terminus not connected")
    bench.comes(0, TERMINUS)
    bench.state(0, stop=1)
    number = bench.fleet.route(ROAD_1)
    ended = bench.fleet.outcome_of(number)
    assert ended is not None and (ended.outcome, ended.why, ended.done) == ("refused", "stop", 0)
    assert steps_of(bench, number) == [("cancelled", "stop")] * 4
    assert asked(bench) == []


def test_stop_ends_it_though_the_throw_under_way_is_done() -> None:
    bench = Bench().both()
    number = bench.fleet.route(ROAD_1, 4000)
    bench.fleet.stop()
    assert bench.fleet.outcome_of(number) is None
    bench.ends(1, newest(bench, 1), 1, 1)
    ended = bench.fleet.outcome_of(number)
    assert ended is not None and (ended.outcome, ended.why, ended.done) == ("cancelled", "stop", 1)
    bench.fleet.release()
    bench.passes(3.0)
    assert asked(bench) == STEPS[:1]


def test_a_stop_pressed_on_the_panel_of_a_board_that_is_needed_later_ends_it() -> None:
    bench = Bench().both()
    number = bench.fleet.route(ROAD_1, 4000)
    bench.state(0, stop=1)
    done(bench, 1)
    ended = bench.fleet.outcome_of(number)
    assert ended is not None and (ended.outcome, ended.why, ended.done) == ("cancelled", "stop", 1)


def test_cancel_calls_back_the_throw_under_way() -> None:
    bench = Bench().both()
    number = bench.fleet.route(ROAD_1, 4000)
    assert bench.fleet.cancel(number)
    assert [values[1] for values in bench.sent(1, "cancel")] == [newest(bench, 1)] and not bench.sent(0, "cancel")
    bench.answers(1, "cancel")
    assert bench.model.answers["cancel"].ok
    bench.ends(1, newest(bench, 1), 1, 1, "cancelled", "operator")
    ended = bench.fleet.outcome_of(number)
    assert ended is not None and (ended.outcome, ended.why) == ("cancelled", "operator")


def test_cancel_between_two_throws() -> None:
    bench = Bench().both()
    number = bench.fleet.route(ROAD_1, 4000)
    done(bench, 1, pause=False)
    assert bench.fleet.cancel(number)
    bench.passes(1.0)
    ended = bench.fleet.outcome_of(number)
    assert ended is not None and ended.outcome == "cancelled" and bench.model.answers["cancel"].ok
    assert asked(bench) == STEPS[:1] and not bench.sent(1, "cancel")


def test_a_cancel_that_comes_too_late_for_the_last_throw_changes_nothing() -> None:
    bench = Bench().both()
    number = bench.fleet.route(ROAD_1, 4000)
    done(bench, 3)
    bench.fleet.cancel(number)
    bench.ends(0, newest(bench, 0), 1, 0)
    ended = bench.fleet.outcome_of(number)
    assert ended is not None and (ended.outcome, ended.done) == ("done", 4)


def test_two_routes_at_once_each_go_their_own_way() -> None:
    bench = Bench().both()
    first, second = bench.fleet.route(ROAD_1, 4000), bench.fleet.route(ROAD_4, 4000)
    assert [values[2:4] for values in bench.sent(1, "throw")] == [[1, 1], [2, 0]]
    one, two = (values[1] for values in bench.sent(1, "throw"))
    assert isinstance(one, int) and isinstance(two, int)
    bench.ends(1, one, 1, 1, "failed", "no_drop")
    bench.ends(1, two, 2, 0)
    ended = bench.fleet.outcome_of(first)
    assert ended is not None and ended.outcome == "failed" and bench.fleet.outcome_of(second) is None
    bench.passes(0.2)
    assert [values[2:4] for values in bench.sent(1, "throw")][2:] == [[0, 1]]
    assert bench.fleet.route(RUN_ROUND) > second


class Crossing(RuleBasedStateMachine):
    """Boards that come, go, restart, refuse and stop while a person sets routes over both."""

    def __init__(self) -> None:
        super().__init__()
        self.bench = Bench().both()
        self.boots = [7, 7]
        self.routes: list[int] = []
        # Of each route: the throws that were asked for since it began, and how many of them were done.
        self.open: list[tuple[int, int]] = []
        self.book: dict[int, list[tuple[int, int, int]]] = {}
        self.good: dict[int, int] = {}
        self.taken: set[tuple[int, int]] = set()
        self.owner: dict[tuple[int, int], int] = {}

    def look(self) -> None:
        """Write down what was asked for; nothing is asked for twice, or for a route that has ended."""
        for port in (0, 1):
            for values in self.bench.sent(port, "throw"):
                number, junction, lie = values[1:4]
                assert isinstance(number, int) and isinstance(junction, int) and isinstance(lie, int)
                if (port, number) in self.taken:
                    continue
                self.taken.add((port, number))
                route = self.current
                assert route is not None, "asked for, but no route is being set"
                self.owner[(port, number)] = route
                self.book[route].append((port, junction, lie))
                self.open.append((port, number))

    @property
    def current(self) -> int | None:
        running = [route for route in self.routes if self.bench.fleet.outcome_of(route) is None]
        return running[-1] if running else None

    @precondition(lambda self: self.current is None)
    @rule()
    def route(self) -> None:
        number = self.bench.fleet.route(ROAD_1, 4000)
        self.routes.append(number)
        self.book[number] = []
        self.good[number] = 0
        self.look()

    @precondition(lambda self: self.open)
    @rule(how=st.sampled_from(["done", "done", "done", "failed", "refused"]))
    def ends(self, how: str) -> None:
        port, number = self.open.pop(0)
        if not self.bench.links[port].connected:
            return
        route = self.owner[(port, number)]
        _, junction, lie = self.book[route][-1]
        still = self.bench.fleet.outcome_of(route) is None
        self.good[route] += how == "done" and still
        self.bench.ends(port, number, junction, lie, how, "sent" if how == "done" else "no_contact")
        self.look()

    @rule(seconds=st.sampled_from([0.05, 0.2, 4.0]))
    def passes(self, seconds: float) -> None:
        for port in (0, 1):
            if self.bench.links[port].connected:
                self.bench.state(port)
        self.bench.passes(seconds)
        self.look()

    @rule(port=st.sampled_from([0, 1]))
    def breaks(self, port: int) -> None:
        self.bench.goes(port)
        self.look()

    @rule(port=st.sampled_from([0, 1]), restarts=st.booleans())
    def comes(self, port: int, restarts: bool) -> None:
        self.boots[port] += restarts
        if restarts:
            self.open = [each for each in self.open if each[0] != port]
        self.bench.comes(port, port, boot=self.boots[port])
        self.look()

    @rule()
    def stop(self) -> None:
        self.bench.fleet.stop()
        self.bench.fleet.poll()
        self.look()

    @precondition(lambda self: self.routes)
    @rule()
    def cancel(self) -> None:
        self.bench.fleet.cancel(self.routes[-1])
        self.bench.fleet.poll()
        self.look()

    @invariant()
    def in_order_once_and_only_after_the_one_before(self) -> None:
        for route, throws in self.book.items():
            assert throws == STEPS[: len(throws)]
            assert len(throws) <= self.good[route] + 1

    @invariant()
    def an_end_counts_what_was_done(self) -> None:
        for route in self.routes:
            ended = self.bench.fleet.outcome_of(route)
            if ended is not None:
                assert ended.done == self.good[route] and ended.of == 4
                assert (ended.outcome == "done") is (self.good[route] == 4)


TestCrossing = Crossing.TestCase
TestCrossing.settings = settings(max_examples=60, stateful_step_count=25, deadline=None)
