"""Which port is which board: ids decide, spares by address, twins are refused."""

from pathlib import Path

import pytest

from host.link import LinkChange
from host.link_errors import PermissionDenied, WrongVersion
from host.seats import address_of
from shared_protocol import messages
from tests.host.fleet_bench import ENTRY, TERMINUS, THROAT, YARD, Bench, with_ids


@pytest.mark.parametrize(
    ("caps", "address"),
    [
        ("", 0), ("3 banks", 0), ("3 banks address 2", 2), ("address 1 3 banks", 1), ("3 banks address 4", 0),
        ("3 banks address 22", 0), ("3 banks subaddress 2", 0), ("address", 0), ("3 banks address -1", 0),
    ],
)  # fmt: skip
def test_address_in_what_a_board_can_do(caps: str, address: int) -> None:
    assert address_of(caps) == address


def port_of(bench: Bench, board: int) -> str:
    return bench.fleet.boards[board].seat.port


@pytest.mark.parametrize("swapped", [False, True])
def test_ids_tell_which_board_is_where(swapped: bool) -> None:
    bench = Bench()
    bench.comes(0, YARD if swapped else TERMINUS)
    bench.comes(1, TERMINUS if swapped else YARD)
    bench.forget()
    yard = 0 if swapped else 1
    assert port_of(bench, YARD) == f"port-{yard}"
    bench.fleet.throw(ENTRY, 1, 5000)
    assert [values[2:] for values in bench.sent(yard, "throw")] == [[0, 1, 5000]], "junction 5 is the Yard's first"
    assert bench.sent(1 - yard, "throw") == []


def test_boards_that_swap_their_ports_are_found_again() -> None:
    bench = Bench().both()
    bench.goes(0)
    bench.goes(1)
    bench.comes(0, YARD)
    bench.comes(1, TERMINUS)
    bench.forget()
    assert (port_of(bench, TERMINUS), port_of(bench, YARD)) == ("port-1", "port-0")
    bench.fleet.throw(THROAT, 1)
    assert len(bench.sent(1, "throw")) == 1 and bench.sent(0, "throw") == []


def test_another_board_of_the_layout_at_the_same_port_without_a_break() -> None:
    bench = Bench(links=1)
    bench.comes(0, TERMINUS)
    bench.links[0].greets(7, bench.layout.boards[YARD].crc(), "virtual-2", "address 2")
    bench.fleet.poll()
    assert port_of(bench, TERMINUS) == "" and port_of(bench, YARD) == "port-0"


def test_a_board_of_no_layout_is_not_used(tmp_path: Path) -> None:
    bench = Bench(with_ids(tmp_path, "T", "Y"))
    bench.comes(0, TERMINUS, uid="stranger", address=3)
    text = bench.fleet.ports[0].text
    assert text == "the layout file does not name the board 'stranger', and no board has its address 3"
    assert f"port-0: {text}" in bench.events() and port_of(bench, TERMINUS) == ""
    number = bench.fleet.throw(THROAT, 1)
    found = bench.fleet.outcome_of(number)
    assert found is not None and found.outcome == "unsent"
    assert found.text == "Throat, to loop: not sent: board Terminus not connected"
    assert bench.sent(0, "throw") == []


def test_two_boards_of_one_id_are_both_refused_and_named() -> None:
    bench = Bench(links=3).both()
    bench.comes(2, YARD)
    text = "two boards say that they are 'virtual-2' (port-1 and port-2): neither is used; unplug one"
    assert [port.text for port in bench.fleet.ports[1:]] == [text, text]
    assert bench.events().count(text) == 1
    assert port_of(bench, YARD) == "" and port_of(bench, TERMINUS) == "port-0"
    found = bench.fleet.outcome_of(bench.fleet.throw(ENTRY, 1))
    assert found is not None and found.outcome == "unsent"
    assert not bench.sent(1, "throw") and not bench.sent(2, "throw")
    # One is unplugged: the other is known again, and nothing fires by that.
    bench.goes(1)
    bench.quiet(2, YARD)
    assert port_of(bench, YARD) == "port-2" and bench.fleet.ports[2].text == ""
    assert not bench.sent(2, "throw", "route")


def test_a_spare_takes_the_place_of_the_board_of_its_address(tmp_path: Path) -> None:
    bench = Bench(with_ids(tmp_path, "T", "Y"), links=3).both()
    bench.comes(2, YARD, uid="S")
    assert port_of(bench, YARD) == "port-1", "not while the board itself is there"
    assert "is there already" in bench.fleet.ports[2].text
    bench.goes(1)
    bench.quiet(2, YARD)
    assert port_of(bench, YARD) == "port-2" and bench.fleet.boards[YARD].seat.spare
    assert any("the spare 'S' at port-2 takes the place of board Yard (address 2)" in text for text in bench.events())
    assert [part.spare for part in bench.fleet.parts] == [False, True]
    bench.forget()
    bench.fleet.throw(ENTRY, 1)
    assert [values[2:4] for values in bench.sent(2, "throw")] == [[0, 1]]
    # The board itself comes back: it goes before the spare.
    bench.comes(1, YARD)
    assert port_of(bench, YARD) == "port-1" and not bench.fleet.boards[YARD].seat.spare
    assert any("the spare for board Yard is not used any more" in text for text in bench.events())
    assert "board Yard, of the same address 2, is there already" in bench.fleet.ports[2].text
    assert not bench.sent(1, "throw"), "what was asked of the spare is not asked again"


def test_a_spare_that_waits_takes_the_place_when_another_board_is_at_the_port(tmp_path: Path) -> None:
    bench = Bench(with_ids(tmp_path, "T", "Y"))
    bench.comes(0, YARD)
    bench.comes(1, YARD, uid="S")
    assert port_of(bench, YARD) == "port-0"
    bench.links[0].greets(9, bench.layout.boards[TERMINUS].crc(), "T", "3 banks address 1")
    bench.fleet.poll()
    assert (port_of(bench, TERMINUS), port_of(bench, YARD)) == ("port-0", "port-1")


def test_a_spare_with_other_settings_is_shown_and_refused_until_it_has_them(tmp_path: Path) -> None:
    bench = Bench(with_ids(tmp_path, "T", "Y"))
    bench.comes(0, TERMINUS)
    bench.comes(1, YARD, uid="S", crc="01234567")
    line = bench.model.go_line(bench.clock.now_s)
    assert line.level == "out"
    assert line.text == "board Yard is a spare with other settings: send them; else ready"
    found = bench.fleet.outcome_of(bench.fleet.throw(ENTRY, 1))
    assert found is not None and found.outcome == "unsent" and "is a spare with other settings" in found.text
    assert not bench.sent(1, "throw")
    transfer = bench.fleet.parts[YARD].session.send_settings(bench.layout.boards[YARD].records)
    bench.answers(1, "stage")
    while transfer.state == "sending":
        bench.fleet.poll()
    bench.links[1].says(messages.ACCEPTED, crc=bench.layout.boards[YARD].crc(), seq=1)
    bench.fleet.poll()
    bench.quiet(1, YARD)
    assert transfer.state == "accepted" and bench.model.go_line(bench.clock.now_s).level == "go"
    bench.fleet.throw(ENTRY, 1)
    assert len(bench.sent(1, "throw")) == 1


def test_a_spare_without_links_is_nobodys(tmp_path: Path) -> None:
    bench = Bench(with_ids(tmp_path, "T", "Y"))
    bench.comes(0, YARD, uid="S", address=0)
    assert "no board has its address 0" in bench.fleet.ports[0].text


def test_an_address_that_two_boards_have_tells_nothing(tmp_path: Path) -> None:
    layout = with_ids(tmp_path, "T", "Y")
    for board in layout.boards:
        board.address = 0
    bench = Bench(layout)
    bench.comes(0, YARD, uid="S")
    assert "address 0 does not tell whose place it could take" in bench.fleet.ports[0].text


def test_a_board_without_its_harness_does_not_put_out_the_spare_that_has_it(tmp_path: Path) -> None:
    bench = Bench(with_ids(tmp_path, "T", "Y"))
    bench.comes(0, YARD, uid="S")
    bench.comes(1, YARD, address=0)
    assert port_of(bench, YARD) == "port-0" and bench.fleet.boards[YARD].seat.spare
    assert bench.fleet.ports[1].text == "board Yard says address 0, its spare 2: the spare is used"
    # Without a spare it is used, and its address is pointed out.
    bench.goes(0)
    assert port_of(bench, YARD) == "port-1"
    assert "board Yard says address 0, the layout file 2: look at its harness plug" in bench.events()


def test_without_ids_in_the_file_addresses_tell_and_nobody_is_a_spare() -> None:
    bench = Bench()
    bench.comes(0, YARD, uid="E66A")
    bench.comes(1, TERMINUS, uid="E66B")
    assert (port_of(bench, YARD), port_of(bench, TERMINUS)) == ("port-0", "port-1")
    assert not any(part.seat.spare for part in bench.fleet.boards)


def test_what_is_wrong_at_a_port_is_said(tmp_path: Path) -> None:
    bench = Bench()
    for port, error in ((0, PermissionDenied("port-0")), (1, WrongVersion("port-1", 1, 2, "9.0.0"))):
        bench.links[port].received.put(LinkChange("refused" if port else "lost", str(error), error))
    bench.fleet.poll()
    line = bench.model.go_line(bench.clock.now_s)
    assert line.level == "lost" and line.text.startswith("port-0: you may not open this port; on Linux join the group")
    assert [event.level for event in bench.model.events] == ["warn", "bad"]
    assert "the board (firmware 9.0.0) version 2" in bench.events()[1]
    # The same again is not said again; a board that comes is what counts.
    bench.links[0].received.put(LinkChange("lost", str(PermissionDenied("port-0"))))
    bench.fleet.poll()
    assert len(bench.events()) == 2
    bench.comes(0, TERMINUS)
    assert bench.model.go_line(bench.clock.now_s).text.startswith("board Yard not connected: 3 junctions unavailable")
