"""The command line on a layout of two boards."""

import json
from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path

import pytest

from host.cli import boards as cli_boards
from host.cli.main import main
from sim.layout import demo_layout_path, load_layout
from sim.serving import VirtualBoards, VirtualServer
from tests.host.fleet_bench import REEDHOLME
from tests.host.scripted_board import wait_until

Run = Callable[..., tuple[int, str, str]]
LAYOUT = ("--layout", str(REEDHOLME))


@pytest.fixture(scope="module")
def served() -> Iterator[VirtualBoards]:
    with VirtualBoards(load_layout(REEDHOLME)) as boards:
        yield boards


@pytest.fixture
def run(served: VirtualBoards, capsys: pytest.CaptureFixture[str]) -> Run:
    """Runs a command: status, stdout, stderr."""

    def run(*argv: str) -> tuple[int, str, str]:
        # One host at a time: the one before must be seen to have gone.
        assert wait_until(lambda: not any(server.script.attached.is_set() for server in served.servers))
        status = main(list(argv))
        out, err = capsys.readouterr()
        assert "Traceback" not in err and not served.failures
        return status, out, err

    return run


@pytest.fixture
def ports(served: VirtualBoards) -> list[str]:
    """The Yard's first: the order of the ports is of no matter."""
    return [word for url in reversed(served.urls) for word in ("--port", url)]


def test_boards_are_told_apart(run: Run, ports: list[str]) -> None:
    status, out, _ = run("boards", *LAYOUT, *ports, "--json")
    said = json.loads(out)
    assert status == 0 and said["missing"] == []
    assert [(row["board"], row["uid"], row["address"], row["spare"]) for row in said["boards"]] == [
        ("Yard", "virtual-2", 2, False), ("Terminus", "virtual-1", 1, False),
    ]  # fmt: skip
    status, out, _ = run("boards", *LAYOUT, *ports[2:])
    assert status == 0 and "address 1: board Terminus" in out and "board Yard of the layout is not there" in out
    status, out, _ = run("boards", *ports, "--json")
    assert status == 0 and [row["board"] for row in json.loads(out)["boards"]] == ["", ""]


def test_throw_by_name_and_by_the_number_on_the_panel(run: Run, ports: list[str]) -> None:
    for name in ("Yard entry", "5"):
        status, out, _ = run("throw", name, "to road 4", "--json", *LAYOUT, *ports)
        said = json.loads(out)
        assert (status, said["outcome"], said["junction"], said["lie"]) == (0, "done", "Yard entry", "to road 4")


def test_a_route_over_both_tells_each_throw(run: Run, ports: list[str]) -> None:
    status, out, _ = run("route", "Road 1 to platform", "--json", *LAYOUT, *ports)
    said = json.loads(out)
    assert (status, said["outcome"], said["done"], said["of"]) == (0, "done", 4, 4)
    assert [each["junction"] for each in said["throws"]] == ["Yard fan", "Yard entry", "Throat", "Loop"]
    assert all(each["outcome"] == "done" for each in said["throws"])


def test_status_of_both_and_of_one(run: Run, ports: list[str]) -> None:
    status, out, _ = run("status", "--json", *LAYOUT, *ports)
    said = json.loads(out)
    assert [(row["name"], row["connected"]) for row in said["boards"]] == [("Terminus", True), ("Yard", True)]
    assert said["boards"][1]["junctions"] == [5, 6, 7] and said["settings_match"] is True
    assert [bank["name"] for bank in said["banks"]] == ["Station", "Fan"] and all(b["mv"] > 0 for b in said["banks"])
    status, out, err = run("status", *LAYOUT, *ports[2:])
    assert status == 1 and out.startswith("board Yard not connected: 3 junctions unavailable; else ")
    assert "board Yard: not connected" in out and "board Yard not connected" in err
    status, out, _ = run("throw", "Yard entry", "reverse", *LAYOUT, *ports[2:])
    assert status == 2 and "not sent: board Yard not connected" in out
    status, out, _ = run("route", "Road 4 to bay", *LAYOUT, *ports[2:])
    assert status == 2 and "not sent: board Yard not connected" in out


def test_stop_reaches_both_and_says_whom_it_did_not(run: Run, ports: list[str]) -> None:
    try:
        assert run("stop", *LAYOUT, *ports)[0] == 0
        said = json.loads(run("status", "--json", *LAYOUT, *ports)[1])
        assert [row["stopped"] for row in said["boards"]] == [True, True] and said["go"]["level"] == "stop"
        status, out, _ = run("throw", "1", "reverse", "--json", *LAYOUT, *ports)
        assert status == 1 and json.loads(out)["why"] == "stop"
    finally:
        assert run("release", *LAYOUT, *ports)[0] == 0
    status, out, _ = run("stop", *LAYOUT, *ports[2:], "--json")
    said = json.loads(out)
    assert status == 1 and said["ok"] is False and said["text"] == "board Yard: NOT stopped, no answer"
    assert run("release", *LAYOUT, *ports)[0] == 0


def test_stop_needs_no_layout_file_and_minds_no_bad_one(run: Run, ports: list[str], tmp_path: Path) -> None:
    bad = tmp_path / "bad.toml"
    bad.write_text("[layout")
    for argv in (ports, [*ports, "--layout", str(bad)]):
        status, out, _ = run("stop", *argv, "--json")
        assert status == 0 and json.loads(out)["ok"] is True
        said = json.loads(run("status", "--json", *LAYOUT, *ports)[1])
        assert [row["stopped"] for row in said["boards"]] == [True, True]
        assert run("release", *LAYOUT, *ports)[0] == 0
    status, out, err = run("stop", *ports, "--port", "socket://127.0.0.1:9")
    assert status == 1 and out == "socket://127.0.0.1:9: NOT stopped, no answer\n" and err == ""
    assert run("release", *LAYOUT, *ports)[0] == 0


def test_several_ports_need_a_layout_of_several_boards(run: Run, ports: list[str]) -> None:
    for argv in (ports, [*ports, "--layout", str(demo_layout_path())]):
        status, out, err = run("status", *argv)
        assert status == 2 and out == "" and "no layout file of several boards" in err
    status, _, err = run("status", *LAYOUT, *ports, *ports[:2])
    assert status == 2 and "was named twice" in err


def test_no_board_of_the_layout_is_there(run: Run) -> None:
    status, out, err = run("status", *LAYOUT, "--port", "socket://127.0.0.1:9")
    assert status == 2 and out == "" and "socket://127.0.0.1:9: nothing answers there" in err


def test_without_port_all_boards_found_are_tried(
    run: Run, served: VirtualBoards, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(cli_boards, "likely_ports", lambda: served.urls)
    out = run("status", "--json", *LAYOUT)[1]
    assert [row["connected"] for row in json.loads(out)["boards"]] == [True, True]


def test_settings_of_each_board(run: Run, ports: list[str], tmp_path: Path) -> None:
    layout = load_layout(REEDHOLME)
    assert run("settings", "compare", *LAYOUT, *ports)[0] == 0
    text = REEDHOLME.read_text("utf-8")
    changed = tmp_path / "changed.toml"
    changed.write_text(
        text.replace('name = "Stock siding"', 'name = "Stock siding"\nretry_v = 0.0\npulses = 2'), "utf-8"
    )
    new = ("--layout", str(changed))
    status, out, _ = run("settings", "compare", *new, *ports, "--json")
    said = json.loads(out)["boards"]
    assert status == 1 and [(each["board"], each["same"]) for each in said] == [("Terminus", True), ("Yard", False)]
    assert {row["field"] for row in said[1]["differences"]} == {"pulses"}
    assert run("settings", "compare", *new, *ports, "--board", "Terminus")[0] == 0
    status, out, _ = run("settings", "send", *new, *ports, "--board", "Yard")
    assert status == 0 and "board Yard: accepted" in out and "Terminus" not in out
    assert run("settings", "compare", *new, *ports)[0] == 0
    target = tmp_path / "records"
    assert run("settings", "fetch", *LAYOUT, *ports, "--board", "2", "--out", str(target))[0] == 0
    assert target.read_bytes().splitlines() == load_layout(changed).boards[1].record_bodies()
    assert run("settings", "fetch", *LAYOUT, *ports, "--out", str(target))[0] == 2
    status, out, _ = run("settings", "fetch", *LAYOUT, *ports)
    assert status == 0 and out.startswith("# board Terminus\n") and "\n# board Yard\n" in out
    status, out, _ = run("settings", "send", str(REEDHOLME), *ports, "--json")
    assert status == 0 and [each["state"] for each in json.loads(out)["boards"]] == ["accepted", "accepted"]
    assert [each["crc"] for each in json.loads(out)["boards"]] == [board.crc() for board in layout.boards]


def test_settings_of_a_board_that_is_not_there(run: Run, ports: list[str]) -> None:
    status, _, err = run("settings", "compare", *LAYOUT, *ports[2:], "--board", "Yard")
    assert status == 2 and "board Yard is not connected" in err
    # What is there is compared; that not all are is no yes.
    status, out, _ = run("settings", "compare", *LAYOUT, *ports[2:])
    assert status == 2 and "board Terminus holds the settings of the layout file" in out
    status, _, err = run("settings", "compare", *LAYOUT, *ports, "--board", "Sidings")
    assert status == 2 and "there is no board 'Sidings'; there are: Terminus, Yard" in err


def test_check_show_and_card_of_two_boards(run: Run) -> None:
    layout = load_layout(REEDHOLME)
    status, out, _ = run("settings", "check", str(REEDHOLME), "--json")
    said = json.loads(out)
    assert status == 0 and [row["crc"] for row in said["boards"]] == [board.crc() for board in layout.boards]
    status, out, _ = run("settings", "check", str(REEDHOLME))
    assert "2 boards, 2 routes over several" in out and "board Yard. 1 banks, 3 junctions" in out
    status, out, _ = run("settings", "show", *LAYOUT, "--board", "Yard")
    assert status == 0 and "'Yard fan'" in out and "'Throat'" not in out
    status, out, _ = run("settings", "card", *LAYOUT)
    pages = out.split("\f")
    assert status == 0 and len(pages) == 2 and "Throat" in pages[0] and "Yard fan" in pages[1]


def test_virtual_wants_room_for_its_ports(run: Run) -> None:
    status, _, err = run("virtual", "--listen", "65535", *LAYOUT)
    assert status == 2 and "2 boards need as many ports from 65535" in err


def test_a_rehearsal_runs_one_board_of_the_layout(run: Run, tmp_path: Path) -> None:
    text = (
        'title = "Yard"\nlayout = "reedholme.toml"\nduration_s = 3\n[[at]]\ntime_s = 1.0\ndo = "route"\n'
        'route = "Yard shunt"\nlabel = "shunt"\n[[expect]]\nwhat = "route"\nlabel = "shunt"\noutcome = "done"\n'
    )
    path = tmp_path / "one.toml"
    path.write_text(text.replace("duration_s", 'board = "Yard"\nduration_s'), "utf-8")
    status, out, _ = run("rehearse", str(path))
    assert status == 0 and "2 pulses" in out
    path.write_text(text, "utf-8")
    status, _, err = run("rehearse", str(path))
    assert status == 2 and "board: is missing: the layout has several boards, a rehearsal runs one of Ter" in err
    path.write_text(text.replace("duration_s", 'board = "Yerd"\nduration_s'), "utf-8")
    status, _, err = run("rehearse", str(path))
    assert status == 2 and ":3: board: there is no board 'Yerd'; did you mean 'Yard'" in err


def test_one_board_whose_id_the_file_names(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """It works as one board does; another board is not taken for it."""
    text = demo_layout_path().read_text("utf-8")
    path = tmp_path / "named.toml"
    path.write_text(text.replace("[board]\n", '[board]\nuid = "Q-1"\naddress = 3\n'), "utf-8")
    layout = load_layout(path)
    for uid, address, good in (("Q-1", 3, True), ("Q-2", 1, False)):
        board = replace(layout.only, address=address)
        with VirtualServer(board, uid=uid) as server:
            where = ("--layout", str(path), "--port", f"socket://127.0.0.1:{server.port}")
            status = main(["throw", "Throat", "to platform 2", *where])
            out, err = capsys.readouterr()
            if not good:
                assert status == 2 and "does not name the board 'Q-2', and no board has its address 1" in err
                continue
            assert status == 0 and out.startswith("Throat, to platform 2: done")
            assert wait_until(lambda: not server.script.attached.is_set())
            assert main(["status", *where]) == 0
            out, _ = capsys.readouterr()
            assert "board" not in out.splitlines()[0] and out.splitlines()[1].startswith("bank West: ")
            assert wait_until(lambda: not server.script.attached.is_set())
            assert main(["settings", "compare", *where, "--json"]) == 0
            assert json.loads(capsys.readouterr()[0]) == {"same": True, "differences": []}
