"""One screen as an SVG file, without a terminal."""

import asyncio
from pathlib import Path
from typing import Any

from host.terminal.session_like import SessionLike

# How long a picture waits for the board and its banks.
LONGEST_S = 20.0


def draw_picture(session: SessionLike, path: Path, size: tuple[int, int]) -> int:
    """Wait until the banks are ready, or for LONGEST_S; draw the main screen. Returns 0; 2 if it can't be written."""
    from host.terminal.app import DeskApp

    began_s = session.clock()
    # Times since the picture began: the same on every day.
    app = DeskApp(session, stamp=lambda at_s: f"{max(0.0, at_s - began_s):5.0f} s", live=False)
    problem = ""

    async def draw(pilot: Any) -> None:
        nonlocal problem
        while session.clock() - began_s < LONGEST_S:
            app.desk.poll()
            if app.desk.model.go_line(session.clock()).level == "go":
                break
            await asyncio.sleep(0.05)
        app.desk.use_settings_wait()
        app.draw()
        await pilot.pause()
        try:
            path.write_text(app.export_screenshot(title="Coilwarden"), encoding="utf-8")
        except OSError as error:
            problem = f"{path}: {error.strerror or error}"
        app.exit(0)

    app.run(headless=True, size=size, auto_pilot=draw)
    if problem:
        print(problem)
        return 2
    return 0
