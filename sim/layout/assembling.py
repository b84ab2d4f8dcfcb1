"""From a layout file that has been read to a whole layout, of one board or several."""

from pathlib import Path
from typing import Any

from shared_protocol.sentences import REASON_REMEDIES, REASON_TEXTS
from shared_protocol.settings import Problem, Settings
from shared_protocol.settings_check import check
from shared_protocol.words import REASONS
from sim.layout import keys
from sim.layout.building import LayoutBuilder
from sim.layout.layout import BoardLayout, Layout, Place, Route
from sim.layout.names import no_such
from sim.layout.physics import physics_of
from sim.layout.reading import Document, Where, check_table, shown
from sim.layout.several import Sorter
from sim.layout.warnings import warnings_of


def layout_of(document: Document) -> Layout:
    """Check a layout file that has been read. Raises BadFile with everything that is wrong, by line."""
    if isinstance(document.data.get("board"), list):
        return _of_several(document)
    for name in ("bank", "button", "follower"):
        tables = document.data.get(name)
        for number, table in enumerate(tables if isinstance(tables, list) else ()):
            if isinstance(table, dict) and "board" in table:
                document.wrong((name, number, "board"), "has no use: there are no [[board]] tables")
    builder = LayoutBuilder(document)
    builder.build()
    document.raise_if_wrong()
    board = _board(builder)
    document.raise_if_wrong()
    junctions, panel = builder.junctions, builder.panel
    layout = Layout(
        Path(document.file), builder.name, [board], junctions.names.all, junctions.words, junctions.lie_names,
        builder.banks.names.all, [_route(builder, number, None) for number in range(len(panel.routes.all))],
        [(0, number) for number in range(len(junctions.names.all))],
        [(0, number) for number in range(len(builder.banks.names.all))],
        [(0, number) for number in range(len(document.data.get("button", [])))],
    )  # fmt: skip
    layout.warnings.extend(warnings_of(layout, [(builder.banks, document.data["bank"])]))
    return layout


def _board(builder: LayoutBuilder) -> BoardLayout:
    """One board's part: the board's own check has the last word; the reader has named most of this, with more detail.

    A problem is noted in the document.
    """
    settings = Settings()
    problem: Problem | None = None
    for message, values in builder.records.rows:
        problem = problem or settings.add(message, values)
    problem = problem or check(settings)
    if problem is not None:
        _note(builder, problem)
    board = builder.board
    return BoardLayout(
        str(board.get("name", builder.name)), builder.records.rows, settings,
        physics_of(builder.banks, builder.junctions.motors.tables), str(board.get("uid", "")),
        int(board.get("address", 0)), builder.inputs.numbers, builder.outputs.numbers, builder.records.origins,
    )  # fmt: skip


def _note(builder: LayoutBuilder, problem: Problem) -> None:
    """Note what the check of the whole found, in the owner's terms."""
    number = REASONS.index(problem.why)
    remedy = REASON_REMEDIES[number]
    message = REASON_TEXTS[number] + (f": {remedy}" if remedy else "")
    if problem.record < 0:
        builder.document.wrong((), message)
        return
    where, owner_keys = builder.records.origins[problem.record]
    key = owner_keys.get(problem.field, "")
    builder.document.wrong((*where, key) if key else where, message)


def _route(builder: LayoutBuilder, number: int, junctions: list[int] | None, board: int = 0) -> Route:
    """A board's own route. junctions: the numbers of its junctions in the whole file; None: the same."""
    throws = [row for row in builder.records.rows if row[0].name == "set_route"][number][1][-1]
    assert isinstance(throws, list)
    pairs = [(throws[place], throws[place + 1]) for place in range(0, len(throws), 2)]
    if junctions is not None:
        pairs = [(junctions[junction], lie) for junction, lie in pairs]
    return Route(builder.panel.routes.all[number], tuple(pairs), (board, number))


# ---- several boards


def _of_several(document: Document) -> Layout:
    sorter = Sorter(document)
    sorter.sort()
    builders = [LayoutBuilder(part) for part in sorter.parts if part is not None]
    for builder in builders:
        builder.build()
    spanning = _spanning(document, sorter, builders)
    document.raise_if_wrong()
    boards = [_board(builder) for builder in builders]
    document.raise_if_wrong()
    places = {name: _places(sorter.rows[name].boards, len(boards)) for name in ("bank", "junction", "button")}
    rows = sorter.rows["route"]
    own = _places(rows.boards, len(boards))
    junction_boards = sorter.rows["junction"].boards
    numbers = [[number for number, at in enumerate(junction_boards) if at == board] for board in range(len(boards))]
    routes = [
        spanning[number] if number in spanning else _route(builders[place[0]], place[1], numbers[place[0]], place[0])
        for number, place in enumerate(own)
    ]
    built = [(builders[board].junctions, number) for board, number in places["junction"]]
    layout = Layout(
        Path(document.file), builders[0].name, boards, sorter.rows["junction"].names,
        [its.words[number] for its, number in built], [its.lie_names[number] for its, number in built],
        sorter.rows["bank"].names, routes, places["junction"], places["bank"], places["button"],
    )  # fmt: skip
    layout.warnings.extend(warnings_of(layout, [(each.banks, each.document.data["bank"]) for each in builders]))
    return layout


def _places(boards: list[int], count: int) -> list[Place]:
    """The board of each table and its number there; (-1, -1) for one that is on no board."""
    next_free = [0] * count
    found: list[Place] = []
    for board in boards:
        found.append((board, next_free[board]) if board >= 0 else (-1, -1))
        if board >= 0:
            next_free[board] += 1
    return found


def _spanning(document: Document, sorter: Sorter, builders: list[LayoutBuilder]) -> dict[int, Route]:
    """The routes over several boards, by number; their problems are noted."""
    found: dict[int, Route] = {}
    if len(builders) < len(sorter.boards):
        return found  # something is wrong that matters more
    places = _places(sorter.rows["junction"].boards, len(builders))
    for number, table in enumerate(sorter.rows["route"].tables):
        if not sorter.is_spanning(number):
            continue
        where: Where = ("route", number)
        values = check_table(document, where, table, keys.ROUTE)
        for key in ("entrance", "exit"):
            if key in values:
                document.wrong((*where, key), "a route over several boards is run by the host: no button can set it")
        throws = _throws(document, sorter, builders, places, where, values)
        found[number] = Route(str(values.get("name", "")), tuple(throws), None)
    return found


def _throws(
    document: Document, sorter: Sorter, builders: list[LayoutBuilder], places: list[Place], where: Where,
    route: dict[str, Any],
) -> list[tuple[int, int]]:  # fmt: skip
    throws: list[tuple[int, int]] = []
    for place, text in enumerate(route.get("throws", [])):
        if ":" not in text:
            document.wrong((*where, "throws", place), f"'{shown(text)}' must be written 'junction: lie'")
    for at, junction, text in sorter.throws_of(where, route):
        board, own = places[junction] if junction >= 0 else (-1, -1)
        if board < 0:
            continue
        name = sorter.rows["junction"].names[junction]
        if any(junction == other for other, _ in throws):
            document.wrong(at, f"the route throws '{name}' twice")
        built = builders[board].junctions
        words, lies = built.words[own], built.lie_names[own]
        lie = words.index(text) if text in words else lies.index(text) if text in lies else -1
        if lie < 0 and not document.is_wrong(("junction", junction)):
            document.wrong(at, no_such(text, list(dict.fromkeys(words + lies)), f"lie of '{name}'"))
        throws.append((junction, lie))
    return throws
