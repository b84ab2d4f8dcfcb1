"""A desk on a board that only says what a test lets it say. Its clock stands still: nothing ticks by itself."""

from host.terminal.app import DeskApp
from host.terminal.caution_view import CautionMemory
from host.views import BoardView
from shared_protocol import messages
from sim.layout import Layout, demo_layout_path, load_layout
from tests.host.fake_link import Desk


class NoCautions(CautionMemory):
    """Nothing to read, whatever the board."""

    def due(self, board: BoardView | None) -> bool:
        """Never."""
        return False


class CautionsOnce(CautionMemory):
    """Due until acknowledged; kept nowhere."""

    def __init__(self) -> None:
        super().__init__()
        self.read = False

    def due(self, board: BoardView | None) -> bool:
        """Until read."""
        return not self.read

    def acknowledge(self, board: BoardView | None) -> None:
        """Read."""
        self.read = True


class Bench:
    """The demo layout, a session on a fake link, and the program on it."""

    def __init__(self, ready: bool = True, cautions: CautionMemory | None = None) -> None:
        self.layout: Layout = load_layout(demo_layout_path())
        self.desk = Desk(self.layout)
        self.session = self.desk.session
        self.model = self.desk.model
        self.link = self.desk.link
        if ready:
            self.becomes_ready()
        self.app = DeskApp(
            self.session, stamp=lambda at_s: f"{at_s:06.1f}", live=False, cautions=cautions or NoCautions()
        )

    def becomes_ready(self) -> None:
        """Connected, banks full, some lies known."""
        self.desk.ready(crc=self.layout.crc())
        for junction, lie, source in ((0, 0, "seen"), (1, 0, "seen"), (2, 1, "sent"), (6, 1, "seen"), (10, 2, "sent")):
            self.link.says(messages.LIE, j=junction, lie=lie, src=source)
        self.session.poll()

    def bank(self, number: int, mv: int, state: str, ready: int, age: int = 1) -> None:
        """Telemetry of a bank."""
        self.link.says(messages.BANK, b=number, mv=mv, age=age, state=state, ready=ready)
        self.session.poll()

    def expects(self, number: int, step: int, junction: int, lie: int, due: int, state: str = "waiting") -> None:
        """A throw in the queue."""
        self.link.says(messages.EXPECT, id=number, step=step, j=junction, lie=lie, by="host", st=state, due=due)
        self.session.poll()

    def fault(self, q: int, scope: str, number: int, code: str, e1: int = 0, e2: int = 0, near: int = -1) -> None:
        """A fault."""
        self.link.says(messages.FAULT, q=q, scope=scope, i=number, code=code, e1=e1, e2=e2, near=near)
        self.session.poll()

    def stopped(self) -> None:
        """The operator's stop is on."""
        self.desk.state(stop=1)
        self.session.poll()

    def sent(self, name: str) -> list[list[object]]:
        """The values of every message of that name that was sent."""
        return [values for each, values in self.link.sent if each == name]

    def board_gets_new_settings(self) -> None:
        """The board plays its part of a settings transaction, as far as it has come."""
        self.session.poll()
        if self.sent("commit"):
            crc = self.sent("commit")[-1][1]
            assert isinstance(crc, bytes)
            self.link.says(messages.ACCEPTED, crc=crc.decode(), seq=2)
        elif self.sent("stage"):
            self.link.says(messages.ANSWER, to="stage", ok=1, why="ok", i=-1)
        self.session.poll()
