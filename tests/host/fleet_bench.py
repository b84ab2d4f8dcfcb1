"""Two boards on links without ports: a test says what each board says. Time stands still."""

from pathlib import Path

from host.fleet import Fleet
from shared_protocol import messages
from sim.layout import Layout, demo_layout_path, load_layout
from tests.host.fake_link import Clock, FakeLink

REEDHOLME = demo_layout_path().parent / "reedholme.toml"
# Junctions, by their number in the whole file from 0.
THROAT, LOOP, BAY, COAL, ENTRY, FAN, SIDING = range(7)
RUN_ROUND, ROAD_1, ROAD_4, SHUNT = range(4)
TERMINUS, YARD = range(2)


def with_ids(folder: Path, *ids: str) -> Layout:
    """The layout of two boards, with ids in the file."""
    text = REEDHOLME.read_text("utf-8")
    for number, uid in enumerate(ids, 1):
        old = f"address = {number}"
        assert text.count(old) == 1
        text = text.replace(old, f'{old}\nuid = "{uid}"')
    path = folder / "with_ids.toml"
    path.write_text(text, "utf-8")
    return load_layout(path)


class Bench:
    """A fleet on fake links: link 0 and 1 are for the boards of the layout, more for others."""

    def __init__(self, layout: Layout | None = None, links: int = 2) -> None:
        self.layout = layout or load_layout(REEDHOLME)
        self.clock = Clock()
        self.links = [FakeLink() for _ in range(links)]
        for number, link in enumerate(self.links):
            link.port = f"port-{number}"
        self.fleet = Fleet(self.layout, self.links, self.clock, first=1000)
        self.model = self.fleet.model
        self.q = 0

    def comes(self, port: int, board: int, boot: int = 7, uid: str = "", address: int = -1, crc: str = "") -> None:
        """A board that is, unless said otherwise, `board` of the layout is there, quiet, its banks ready."""
        part = self.layout.boards[board]
        told = part.address if address < 0 else address
        caps = f"3 banks address {told}" if told else "3 banks"
        uid = uid or part.uid or f"virtual-{board + 1}"
        self.links[port].connects(boot, crc or part.crc(), uid, caps)
        self.quiet(port, board)

    def quiet(self, port: int, board: int, stop: int = 0) -> None:
        """The board tells a whole status."""
        link = self.links[port]
        self.state(port, stop)
        for bank in range(len(self.layout.boards[board].settings.banks)):
            link.says(messages.BANK, b=bank, mv=15_800, age=1, state="ready", ready=0)
        self.fleet.poll()
        link.says(messages.END, what="status")
        self.fleet.poll()

    def state(self, port: int, stop: int = 0) -> None:
        """The board's own telemetry."""
        self.links[port].says(messages.STATE, stop=stop, queue=0, up=1, dropped=0, bad=0, in1=0, in2=0)
        self.fleet.poll()

    def both(self) -> "Bench":
        """Both boards are there."""
        self.comes(0, TERMINUS)
        self.comes(1, YARD)
        self.forget()
        return self

    def forget(self) -> None:
        """What was sent so far is of no interest."""
        for link in self.links:
            link.sent.clear()

    def sent(self, port: int, *names: str) -> list[list[object]]:
        """The values of the messages of these names that were sent at a port."""
        return [values for name, values in self.links[port].sent if name in names]

    def goes(self, port: int) -> None:
        """The cable is out."""
        self.links[port].breaks()
        self.fleet.poll()

    def ends(self, port: int, number: int, junction: int, lie: int, o: str = "done", why: str = "sent") -> None:
        """A throw of a board ends; junction by the board's own number."""
        self.q += 1
        self.links[port].says(
            messages.OUTCOME, q=self.q, id=number, step=0, j=junction, lie=lie, o=o, why=why, ms=40, i=-1, mv=15_800,
            after=9000,
        )  # fmt: skip
        self.fleet.poll()

    def answers(self, port: int, request: str, ok: int = 1, why: str = "ok") -> None:
        """The answer to a request that is no throw."""
        self.links[port].says(messages.ANSWER, to=request, ok=ok, why=why, i=-1)
        self.fleet.poll()

    def passes(self, seconds: float) -> None:
        """Time passes, in steps small enough for every timer."""
        until = self.clock.now_s + seconds
        while self.clock.now_s < until - 1e-9:
            self.clock.now_s = min(until, self.clock.now_s + 0.05)
            self.fleet.poll()

    def events(self) -> list[str]:
        """The texts of all events."""
        return [event.text for event in self.model.events]
