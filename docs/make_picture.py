"""Draws the README's picture: the terminal in the middle of a rehearsed route. `python -m docs.make_picture OUT.svg`.

Made from a rehearsal's log in virtual time, so it is the same on every machine and every day.
"""

import sys
from pathlib import Path
from typing import Any

from host.model import LayoutModel
from host.terminal.app import DeskApp
from shared_protocol.codec import Codec
from shared_protocol.registry import host_reads
from sim.rehearsal import load_scenario, run_rehearsal, shipped

# Eight throws are done, one runs, one waits for its bank.
MOMENT_S = 2.62
SIZE = (100, 30)


class Onlooker:
    """A session that only shows a model as it was at one moment."""

    def __init__(self, model: LayoutModel) -> None:
        self.model = model

    def clock(self) -> float:
        """The moment."""
        return MOMENT_S

    def poll(self) -> int:
        """Nothing new comes in."""
        return 0

    def __getattr__(self, name: str) -> Any:
        raise AttributeError(f"an onlooker does not {name}")


def model_at(moment_s: float) -> LayoutModel:
    """What a host had heard by then in the rehearsal of the ten-throw route."""
    path = next(path for path in shipped() if path.stem.startswith("04"))
    scenario = load_scenario(path)
    model = LayoutModel(scenario.layout)
    model.connection.state = "connected"
    codec = Codec(host_reads())
    for line in run_rehearsal(scenario, full_log=True).log.splitlines():
        stamp, who, body = line.split(" ", 2)
        if float(stamp) > moment_s:
            break
        if who == "<":
            model.apply(codec.decode_body(body.encode()), float(stamp))
    return model


def main(out: Path) -> None:
    """Draw."""
    app = DeskApp(Onlooker(model_at(MOMENT_S)), stamp=lambda at_s: f"{at_s:6.2f} s", live=False)

    async def draw(pilot: Any) -> None:
        app.draw()
        await pilot.pause()
        out.write_text(app.export_screenshot(title="Coilwarden"), encoding="utf-8")
        app.exit(0)

    app.run(headless=True, size=SIZE, auto_pilot=draw)


if __name__ == "__main__":
    main(Path(sys.argv[1]))
