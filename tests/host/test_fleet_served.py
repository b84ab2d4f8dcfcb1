"""Two virtual boards on sockets, through pyserial as hardware would be: routes over both, one lost, a spare, twins."""

import contextlib
from collections.abc import Iterator
from contextlib import ExitStack, contextmanager
from pathlib import Path

import pytest

from host.fleet import Fleet
from host.link import Link
from sim.layout import BoardLayout, Layout, load_layout
from sim.serving import VirtualBoards, VirtualServer
from tests.host.fleet_bench import ENTRY, FAN, REEDHOLME, ROAD_1, THROAT, YARD, with_ids

LIMIT_S = 20.0


@contextmanager
def served(*boards: tuple[BoardLayout, str]) -> Iterator[list[VirtualServer]]:
    """Virtual boards, each with an id of its own."""
    with ExitStack() as stack:
        yield [stack.enter_context(VirtualServer(board, uid=uid)) for board, uid in boards]


@contextmanager
def fleet_at(layout: Layout, *ports: int) -> Iterator[Fleet]:
    """A fleet at these ports, in this order, connected."""
    with ExitStack() as stack:
        links = [stack.enter_context(contextlib.closing(Link(f"socket://127.0.0.1:{port}"))) for port in ports]
        fleet = Fleet(layout, links)
        fleet.connect()
        yield fleet


def pulses(server: VirtualServer) -> list[tuple[int, int, int]]:
    """Bank, group and mask of every pulse that its hardware gave, in order."""
    return [(pulse.bank, pulse.group, pulse.mask) for pulse in server.world.pulses]


def is_ready(fleet: Fleet) -> bool:
    return fleet.model.go_line(fleet.clock()).level == "go"


def outcome_of(fleet: Fleet, number: int) -> str:
    assert fleet.wait_for(lambda: fleet.outcome_of(number) is not None, LIMIT_S)
    ended = fleet.outcome_of(number)
    assert ended is not None
    return ended.outcome


@pytest.mark.parametrize("kind", ["cpython", "micropython"])
def test_a_route_over_both_boards_with_the_ports_the_wrong_way_round(kind: str) -> None:
    layout = load_layout(REEDHOLME)
    with VirtualBoards(layout, kind) as boards:
        terminus, yard = boards.servers
        with fleet_at(layout, yard.port, terminus.port) as fleet:
            assert fleet.wait_for(lambda: is_ready(fleet), LIMIT_S)
            assert outcome_of(fleet, fleet.route(ROAD_1, 5000)) == "done"
            # Two motors of the fan and the entry, then the throat and the loop: one pulse each.
            assert len(pulses(yard)) == 3 and len(pulses(terminus)) == 2
            assert len(set(pulses(yard))) == 3 and len(set(pulses(terminus))) == 2
            assert [fleet.model.junctions[each].word for each in (FAN, ENTRY, THROAT)] == [
                "road 1", "to roads 1-3", "to platform",
            ]  # fmt: skip
        assert not boards.failures


def test_losing_a_board_in_the_middle_of_a_route_and_finding_it_again() -> None:
    layout = load_layout(REEDHOLME)
    with VirtualBoards(layout) as boards:
        terminus, yard = boards.servers
        with fleet_at(layout, terminus.port, yard.port) as fleet:
            assert fleet.wait_for(lambda: is_ready(fleet), LIMIT_S)
            number = fleet.route(ROAD_1, 5000)
            # After the fan's two pulses the Yard's bank must recharge: the entry waits there.
            assert fleet.wait_for(lambda: len(pulses(yard)) >= 2, LIMIT_S)
            yard.script.detach()
            assert outcome_of(fleet, number) == "failed"
            ended = fleet.outcome_of(number)
            assert ended is not None and "board Yard" in ended.text and ended.done < ended.of == 4
            # The other board goes on.
            assert outcome_of(fleet, fleet.throw(THROAT, 1, 5000)) == "done"
            assert fleet.wait_for(lambda: is_ready(fleet), LIMIT_S), "the Yard is found again"
            held = len(pulses(terminus))
            fleet.wait_for(lambda: False, 2.0)
            assert len(pulses(terminus)) == held == 1, "nothing of the route fires on the other board"
            assert len(set(pulses(yard))) == len(pulses(yard)), "no coil of the Yard is fired twice"
            assert outcome_of(fleet, fleet.throw(ENTRY, 1, 5000)) == "done"
        assert not boards.failures


def test_a_stop_reaches_both_boards() -> None:
    layout = load_layout(REEDHOLME)
    with VirtualBoards(layout) as boards, fleet_at(layout, *[each.port for each in boards.servers]) as fleet:
        assert fleet.wait_for(lambda: is_ready(fleet), LIMIT_S)
        assert fleet.stop()
        assert fleet.wait_for(lambda: "stop" in fleet.model.answers, LIMIT_S)
        assert fleet.model.answers["stop"].ok
        assert fleet.wait_for(lambda: all(part.model.stopped for part in fleet.boards), LIMIT_S)
        for junction in (THROAT, ENTRY):
            number = fleet.throw(junction, 1, 5000)
            assert outcome_of(fleet, number) == "refused"
        assert [pulses(server) for server in boards.servers] == [[], []]
        fleet.release()
        assert fleet.wait_for(lambda: is_ready(fleet), LIMIT_S)
        assert outcome_of(fleet, fleet.throw(ENTRY, 1, 5000)) == "done"


def test_a_spare_takes_over(tmp_path: Path) -> None:
    layout = with_ids(tmp_path, "T-1", "Y-1")
    terminus, yard = layout.boards
    with ExitStack() as stack:
        servers = stack.enter_context(served((terminus, "T-1"), (yard, "Y-1"), (yard, "S-9")))
        fleet = stack.enter_context(fleet_at(layout, *[server.port for server in servers]))
        assert fleet.wait_for(lambda: is_ready(fleet), LIMIT_S)
        seat = fleet.boards[YARD].seat
        assert fleet.wait_for(lambda: seat.taken_by is not None and seat.taken_by.uid == "Y-1", LIMIT_S)
        servers[1].close()
        assert fleet.wait_for(lambda: seat.spare and is_ready(fleet), LIMIT_S)
        assert outcome_of(fleet, fleet.throw(ENTRY, 1, 5000)) == "done"
        assert len(pulses(servers[2])) == 1 and pulses(servers[1]) == []
        assert outcome_of(fleet, fleet.route(ROAD_1, 5000)) == "done"


def test_a_spare_with_other_settings_gets_them_first(tmp_path: Path) -> None:
    layout = with_ids(tmp_path, "T-1", "Y-1")
    terminus, yard = layout.boards
    with ExitStack() as stack:
        servers = stack.enter_context(served((terminus, "T-1"), (yard, "S-9")))
        fleet = stack.enter_context(fleet_at(layout, *[server.port for server in servers]))
        assert fleet.wait_for(lambda: is_ready(fleet), LIMIT_S)
        session = fleet.parts[YARD].session
        tuned = [(message, list(values)) for message, values in yard.records]
        for message, values in tuned:
            if message.name == "set_timing":
                values[message.position("pause_ms")] = 250
        first = session.send_settings(tuned)
        assert fleet.wait_for(lambda: first.state == "accepted", LIMIT_S), first.text
        assert outcome_of(fleet, fleet.throw(ENTRY, 1, 5000)) == "unsent"
        assert "spare with other settings" in fleet.model.go_line(fleet.clock()).text
        second = session.send_settings(yard.records)
        assert fleet.wait_for(lambda: second.state == "accepted", LIMIT_S), second.text
        assert fleet.wait_for(lambda: is_ready(fleet), LIMIT_S)
        assert outcome_of(fleet, fleet.throw(ENTRY, 1, 5000)) == "done"
        assert len(pulses(servers[1])) == 1


def test_two_boards_of_one_id() -> None:
    layout = load_layout(REEDHOLME)
    terminus, yard = layout.boards
    with ExitStack() as stack:
        servers = stack.enter_context(served((terminus, "virtual-1"), (yard, "virtual-2"), (yard, "virtual-2")))
        fleet = stack.enter_context(fleet_at(layout, *[server.port for server in servers]))
        assert fleet.wait_for(lambda: all(port.text for port in fleet.ports[1:]), LIMIT_S)
        assert all("two boards say that they are 'virtual-2'" in port.text for port in fleet.ports[1:])
        assert outcome_of(fleet, fleet.throw(ENTRY, 1, 5000)) == "unsent"
        assert outcome_of(fleet, fleet.throw(THROAT, 1, 5000)) == "done"
        servers[2].close()
        assert fleet.wait_for(lambda: is_ready(fleet), LIMIT_S)
        assert outcome_of(fleet, fleet.throw(ENTRY, 1, 5000)) == "done"
        assert pulses(servers[2]) == [] and len(pulses(servers[1])) == 1
