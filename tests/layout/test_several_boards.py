"""Layout files of several boards: each part is what a file of one board makes, numbers are the whole file's."""

import re
from pathlib import Path

import pytest

from sim.layout import BadFile, SeveralBoards, demo_layout_path, load_layout
from tests.layout.cases_boards import BOARDS, TWO
from tests.layout.files import GOOD, Case, line_of, load_text, problems_of

SHIPPED = demo_layout_path().parent / "reedholme.toml"
# What the board Down of TWO is, as a file of its own.
DOWN_ALONE = """
layout.name = "Two Test"
supply.volts = 16.0
board.name = "Down"
io.input_pins = [20]
inputs = { "key" = 0, "shared" = "pin 21" }
bank = [
    { name = "D", first_pin = 0, coils = 6, adc = 0, resistor_w = 10 },
    { name = "D2", first_pin = 6, coils = 2, adc = 1, resistor_w = 10 },
]
junction = [
    { name = "One", bank = "D", reverse = "loop", not_while = "key", motors = [{ coils = [0, 1] }] },
    { name = "Pair", kind = "crossover", bank = "D", motors = [{ coils = [2, 3] }, { coils = [4, 5] }] },
]
route = [{ name = "Down all", throws = ["One: loop", "Pair: reverse"] }]
button = [{ kind = "alternate", input = "shared", junction = "One" }]
"""


def test_numbers_are_those_of_the_whole_file(tmp_path: Path) -> None:
    layout = load_text(tmp_path, TWO)
    assert layout.warnings == []
    assert layout.board_names == ["Up", "Down"]
    assert [(board.uid, board.address) for board in layout.boards] == [("E6614103E7", 1), ("", 2)]
    assert layout.junction_names == ["One", "Two", "Pair"]
    assert layout.junction_places == [(1, 0), (0, 0), (1, 1)]
    assert layout.bank_places == [(0, 0), (1, 0), (1, 1)]
    assert layout.button_places == [(1, 0)]
    assert layout.junction_words == [["normal", "loop"], ["normal", "reverse"], ["normal", "reverse"]]
    own, across = layout.routes
    assert own.place == (1, 0) and own.throws == ((0, 1), (2, 1))
    assert across.place is None and across.throws == ((1, 1), (0, 1), (2, 0))
    assert layout.junction_number("Pair") == layout.junction_number("3") == 2
    assert layout.board_number("Down") == layout.board_number("2") == 1
    with pytest.raises(KeyError, match="there is no board 'Side'; there are: Up, Down"):
        layout.board_number("Side")


def test_each_part_is_what_a_file_of_its_own_makes(tmp_path: Path) -> None:
    layout = load_text(tmp_path, TWO)
    alone = load_text(tmp_path, DOWN_ALONE)
    assert layout.boards[1].record_bodies() == alone.record_bodies()
    assert layout.boards[1].slot_lines() == alone.slot_lines()
    assert layout.boards[1].physics == alone.physics
    assert layout.boards[1].input_names == alone.input_names == {"key": 0, "shared": 1}
    part = layout.alone(1)
    assert part.crc() == alone.crc() and part.routes == alone.routes
    assert part.junction_names == alone.junction_names and part.lie_names == alone.lie_names
    assert part.bank_names == alone.bank_names and part.button_places == alone.button_places


def test_what_one_board_has_is_not_asked_of_several(tmp_path: Path) -> None:
    layout = load_text(tmp_path, TWO)
    asks = (
        lambda: layout.records, lambda: layout.settings, lambda: layout.physics, layout.crc, layout.slot_lines,
        layout.record_bodies, lambda: layout.pins_used_and_left, lambda: layout.input_names, lambda: layout.origins,
    )  # fmt: skip
    for ask in asks:
        with pytest.raises(SeveralBoards, match=r"has several boards \(Up, Down\): choose one"):
            ask()


def test_banks_and_junctions_may_be_named_by_number(tmp_path: Path) -> None:
    numbers = TWO.replace('board = "Up"', "board = 1").replace('bank = "U"\n', "bank = 1\n")
    numbers = numbers.replace('board = "Down"\njunction = "One"', "board = 2\njunction = 1")
    numbers = numbers.replace('"Pair: reverse"', '"3: reverse"')
    there = load_text(tmp_path, numbers)
    assert [board.crc() for board in there.boards] == [board.crc() for board in load_text(tmp_path, TWO).boards]


def test_a_list_of_one_board_is_a_file_of_one_board(tmp_path: Path) -> None:
    """[[board]] with its own [board.io] instead of [board] and [io]; nothing needs to say which board."""
    tables = re.search(r"\[io\].*?(?=\[\[bank\]\])", GOOD, re.DOTALL)
    assert tables is not None
    listed = '[[board]]\nname = "Saltmarsh Test"\n\n' + re.sub(r"^\[(?=[io])", "[board.", tables.group(), flags=re.M)
    there = load_text(tmp_path, GOOD.replace(tables.group(), listed))
    assert there.crc() == load_text(tmp_path, GOOD).crc()
    assert there.only.name == "Saltmarsh Test"


def test_one_board_may_have_an_id(tmp_path: Path) -> None:
    board = load_text(tmp_path, GOOD + '\n[board]\nname = "B"\nuid = "E66"\naddress = 3\n').only
    assert (board.name, board.uid, board.address) == ("B", "E66", 3)
    without = GOOD + '\n[board]\nname = "B"\n'
    assert load_text(tmp_path, without).crc() == board.crc(), "ids are no settings"


@pytest.mark.parametrize("table", ["bank", "button", "follower"])
def test_nothing_names_its_board_where_there_are_no_boards(table: str, tmp_path: Path) -> None:
    text = GOOD.replace(f"[[{table}]]\n", f'[[{table}]]\nboard = "Up"\n', 1)
    (problem,) = problems_of(tmp_path, text)
    assert problem[1:] == (f"{table} 1.board", "has no use: there are no [[board]] tables")


def test_cases_are_all_different() -> None:
    assert len(BOARDS) >= 35
    assert len({case.name for case in BOARDS}) == len({case.text() for case in BOARDS}) == len(BOARDS)


@pytest.mark.parametrize("bad", BOARDS, ids=[case.name.replace(" ", "_") for case in BOARDS])
def test_bad_layout_of_two_boards(bad: Case, tmp_path: Path) -> None:
    text = bad.text()
    found = problems_of(tmp_path, text)
    assert [(line, field) for line, field, _ in found] == sorted(
        (line_of(text, each.at), each.field) for each in bad.expected
    ), found
    for _, field, message in found:
        patterns = [each.message for each in bad.expected if each.field == field]
        assert any(re.search(pattern, message) for pattern in patterns), message


def test_names_that_two_boards_have(tmp_path: Path) -> None:
    """Unique in the file, not on each board: everything refers to them by name alone."""
    found = problems_of(tmp_path, TWO.replace('name = "D2"', 'name = "U"'))
    assert ("bank 3.name", "another bank is called 'U'") in [each[1:] for each in found]
    found = problems_of(tmp_path, TWO.replace('name = "Pair"', 'name = "Two"'))
    assert ("junction 3.name", "another junction is called 'Two'") in [each[1:] for each in found]


def test_what_is_too_much_for_one_board_names_it(tmp_path: Path) -> None:
    more = "".join(
        f'\n[[bank]]\nname = "X{number}"\nboard = "Down"\nfirst_pin = {8 + 2 * number}\ncoils = 2\nadc = 2\n'
        for number in range(2)
    )
    found = problems_of(tmp_path, TWO + more)
    assert ("bank", "board 'Down': has 4 entries: at most 3") in [each[1:] for each in found]


@pytest.mark.parametrize("value", ["3", '"x"', "[]", "[1]", "[[1]]", "[{}]", "{}", "true", '[{ name = 1 }, "x"]'])
def test_boards_of_any_other_kind_are_told(value: str, tmp_path: Path) -> None:
    rest = TWO[TWO.index("[[bank]]") :]
    text = f'layout.name = "x"\nsupply.volts = 16\nboard = {value}\n\n{rest}'
    assert problems_of(tmp_path, text)


def test_a_stop_button_that_stops_one_board_alone_is_pointed_out(tmp_path: Path) -> None:
    text = TWO.replace('kind = "alternate"', 'kind = "stop"').replace(
        'board = "Down"\njunction = "One"\n', 'board = "Up"\n'
    )
    assert load_text(tmp_path, text).warnings == ["a stop button stops its own board alone; without one: 'Down'"]


def test_boards_that_could_not_be_told_apart_are_pointed_out(tmp_path: Path) -> None:
    said = "without uid, or an address of its own, a real board can't be told from others"
    text = TWO.replace("address = 1\n", "").replace("address = 2\n", "")
    assert load_text(tmp_path, text).warnings == [f"board 'Down': {said}"]
    text = text.replace('uid = "E6614103E7"\n', "")
    assert load_text(tmp_path, text).warnings == [f"board 'Up': {said}", f"board 'Down': {said}"]


def test_the_shipped_layout_of_two_boards_is_right() -> None:
    layout = load_layout(SHIPPED)
    assert layout.warnings == []
    assert len(layout.boards) == 2 and any(route.place is None for route in layout.routes)
    assert all(used < 26 for used, _ in (board.pins_used_and_left for board in layout.boards))


def test_damaged_layouts_of_two_boards_are_taken_or_told(tmp_path: Path) -> None:
    """Any line gone, doubled or with another value: taken, or refused with lines; nothing else."""
    rows = TWO.split("\n")
    values = (
        '"Up"',
        '"Down"',
        "1",
        "9",
        '"x"',
        "[]",
        "true",
        "{}",
        '["One: loop"]',
        '[{ bank = "U", coils = [0, 1] }]',
    )
    taken = refused = 0
    for number, row in enumerate(rows):
        spoilt = [rows[:number] + rows[number + 1 :], [*rows[:number], row, *rows[number:]]]
        if " = " in row:
            spoilt += [[*rows[:number], f"{row.split(' = ')[0]} = {value}", *rows[number + 1 :]] for value in values]
        for each in spoilt:
            try:
                load_text(tmp_path, "\n".join(each))
                taken += 1
            except BadFile as error:
                assert error.problems and all(problem.message for problem in error.problems)
                refused += 1
    assert taken > 50 and refused > 300
