"""One screen as an SVG file, without a terminal."""

import asyncio
import sys
from pathlib import Path
from typing import Any

from host.terminal.desk import Desk
from host.terminal.session_like import SessionLike

# How long a picture waits for the board and its banks.
LONGEST_S = 20.0
STEADY_MV = 100


def draw_picture(
    session: SessionLike, path: Path, size: tuple[int, int], settle_s: float = 1.5, longest_s: float = LONGEST_S
) -> int:
    """Draw the main screen to an SVG file, once the banks are ready and steady; after `longest_s` as it is.

    size: columns and rows. settle_s: for how long the banks must have been steady. Returns 0; 2 if the file can't be
    written.
    """
    from host.terminal.app import DeskApp

    began_s = session.clock()
    # Times since the picture began: the same on every day.
    app = DeskApp(session, stamp=lambda at_s: f"{max(0.0, at_s - began_s):3.0f} s", live=False)
    problem = ""

    async def draw(pilot: Any) -> None:
        nonlocal problem
        loop = asyncio.get_running_loop()
        ends_s = loop.time() + longest_s
        while loop.time() < ends_s:
            app.desk.poll()
            if steady(app.desk, settle_s):
                break
            await asyncio.sleep(0.05)
        app.desk.use_settings_wait()
        # Twice: the first drawing may move panels, the second fills them.
        for _ in range(2):
            app.draw()
            await pilot.pause()
        try:
            path.write_text(app.export_screenshot(title="Coilwarden"), encoding="utf-8")
        except OSError as error:
            problem = f"{path}: {error.strerror or error}"
        app.exit(0)

    app.run(headless=True, size=size, auto_pilot=draw)
    if problem:
        print(problem, file=sys.stderr)
        return 2
    return 0


def steady(desk: Desk, settle_s: float) -> bool:
    """True if the desk says go, and no bank's voltage has moved for `settle_s`."""
    now_s = desk.now_s()
    if desk.model.go_line(now_s).level != "go":
        return False
    if settle_s == 0:
        return True
    for bank in desk.model.banks:
        readings = desk.history.since(bank.number, now_s - settle_s)
        voltages = [mv for _, mv in readings]
        if not voltages or max(voltages) - min(voltages) > STEADY_MV:
            return False
        if readings[-1][0] - readings[0][0] < settle_s / 2:
            return False
    return True
