"""The session against the firmware's own control over a channel that drops, doubles, delays and damages lines.

Times are the bench board's: nothing sleeps.
"""

import random

import pytest

from device.control.controller import Controller
from host.link import LinkChange
from host.model import LayoutModel
from host.session import Session
from shared_protocol.codec import Codec
from shared_protocol.fields import Message
from shared_protocol.registry import board_reads, host_reads
from tests.control.bench_board import BenchBoard
from tests.control.bench_layouts import usual
from tests.host.benches import RecordLayout
from tests.host.fake_link import FakeLink

TICK_US = 1000


class Channel(FakeLink):
    """A link whose lines pass a bad wire to a board on a bench. `badness`: how often a line comes to harm."""

    def __init__(self, seed: int, badness: float) -> None:
        super().__init__()
        self.random = random.Random(seed)
        self.badness = badness
        self.board = BenchBoard()
        self.board.slots[0] = usual().slot()
        for bank in self.board.banks:
            bank.mv = bank.full_mv
        self.controller = Controller(self.board)
        self.controller.start()
        self.now_ms = 0
        self._to_board: list[tuple[int, bytes]] = []
        self._to_host: list[tuple[int, bytes]] = []
        self._part = b""
        self._in = Codec(host_reads())
        self._out = Codec(board_reads())
        self._alive_ms = 0
        self.asked: dict[int, int] = {}

    def __call__(self) -> float:
        """The session's clock: seconds."""
        return self.now_ms / 1000

    def send(self, message: Message, values: list[object]) -> bool:
        if message.name in ("throw", "route"):
            number = values[1]
            assert isinstance(number, int)
            self.asked[number] = self.asked.get(number, 0) + 1
        if self.connected:
            self._harm(self._to_board, self._out.encode(message, values))
        return self.connected

    def _harm(self, way: list[tuple[int, bytes]], line: bytes) -> None:
        fate = self.random.random()
        copies = 1
        if fate < self.badness:
            kind = self.random.randrange(4)
            if kind == 0:
                return
            if kind == 1:
                copies = 2
            if kind == 2:
                place = self.random.randrange(len(line) - 1)
                line = line[:place] + bytes([self.random.randrange(32, 127)]) + line[place + 1 :]
        late_ms = self.random.randrange(1, 400) if fate < self.badness else 1
        for _ in range(copies):
            way.append((self.now_ms + late_ms, line))

    def runs(self, session: Session, ms: int) -> None:
        """Let time pass on both sides."""
        for _ in range(ms):
            self.now_ms += 1
            self.board.pass_us(TICK_US)
            for due, line in [item for item in self._to_board if item[0] <= self.now_ms]:
                self._to_board.remove((due, line))
                self.board.say(line)
            self.controller.tick()
            if self.controller.has_work:
                self.controller.work()
            if self.board.out_count:
                *lines, self._part = (self._part + self.board.heard()).split(b"\n")
                for line in lines:
                    self._harm(self._to_host, line + b"\n")
            for due, line in [item for item in self._to_host if item[0] <= self.now_ms]:
                self._to_host.remove((due, line))
                for received in self._in.feed(line):
                    self.received.put(received)
            if self.now_ms - self._alive_ms >= 400:
                self._alive_ms = self.now_ms
                self._to_board.append((self.now_ms, self._out.encode(board_reads()["alive"], [])))
            if self.now_ms % 20 == 0:
                session.poll()

    def plugs(self) -> None:
        """The real link's hello, until it is answered, is left to the session's greeting here."""
        self.connected = True
        self.received.put(LinkChange("connected", "connected"))
        self._to_board.append((self.now_ms, b"\n" + self._out.encode(board_reads()["hello"], [1])))

    def unplugs(self) -> None:
        """What is on the wire is gone."""
        self.connected = False
        self._to_board.clear()
        self._to_host.clear()
        self.received.put(LinkChange("lost", "the board is gone"))


def start(seed: int, badness: float) -> tuple[Channel, Session]:
    channel = Channel(seed, badness)
    session = Session(channel, LayoutModel(RecordLayout()), channel, 1)  # type: ignore[arg-type]
    channel.plugs()
    channel.runs(session, 1500)
    return channel, session


@pytest.mark.parametrize("seed", range(8))
def test_over_a_bad_wire_each_throw_fires_at_most_once_and_its_end_is_true(seed: int) -> None:
    channel, session = start(seed, 0.25)
    fired: dict[int, int] = {}
    for turn in range(10):
        before = channel.board.pulse_count
        # Turnouts only: one pulse a throw. Each waits for its bank, so none is refused for it.
        number = session.throw(turn % 2, (turn // 2) % 2, 5000)
        channel.runs(session, 1200)
        if turn == 4:
            channel.unplugs()
            channel.runs(session, 900)
            channel.plugs()
            channel.runs(session, 1000)
        fired[number] = channel.board.pulse_count - before
    channel.badness = 0.0
    channel.runs(session, 9000)
    assert session.in_flight == 0, "every request has an end"
    assert set(channel.asked.values()) <= {1}, "no request is sent twice"
    assert len(channel.asked) == 10 - sum(1 for each in fired if outcome(session, each) == "unsent")
    done = [number for number in fired if outcome(session, number) == "done"]
    assert len(done) <= channel.board.pulse_count <= len(channel.asked)
    unknown = [number for number in fired if outcome(session, number) == "unknown"]
    assert channel.board.pulse_count - len(done) <= len(unknown), "a pulse that no answer admits is at least 'unknown'"
    assert len(done) >= 4, "most get through"


def outcome(session: Session, number: int) -> str:
    found = session.outcome_of(number)
    assert found is not None
    return found.outcome


def test_over_a_good_wire_nothing_is_unknown() -> None:
    channel, session = start(0, 0.0)
    numbers = []
    for turn in range(6):
        numbers.append(session.throw(turn % 2, (turn // 2) % 2, 5000))
        channel.runs(session, 1200)
    assert [outcome(session, number) for number in numbers] == ["done"] * 6 and channel.board.pulse_count == 6
    assert session.model.bad_lines == 0
    assert session.model.junctions[0].source == "sent"


def test_settings_cross_a_bad_wire_whole_or_not_at_all() -> None:
    tuned = usual()
    for message, fields in tuned.records:
        if message.name == "set_lie":
            fields["ready_mv"] = 14_100
    accepted = 0
    for seed in range(6):
        channel, session = start(seed, 0.0)
        old_crc = session.model.layout_crc
        channel.badness = 0.03
        transfer = session.send_settings(RecordLayout(tuned).records)
        channel.runs(session, 12_000)
        channel.badness = 0.0
        channel.runs(session, 4000)
        assert not transfer.open
        assert session.model.board is not None
        in_force = channel.controller.store.crc.decode()
        assert in_force in (old_crc, transfer.crc)
        if transfer.state == "accepted":
            accepted += 1
            assert in_force == transfer.crc
    assert 0 < accepted < 6, "the wire is bad enough to show both"


def test_a_board_that_restarts_in_silence_is_found_again() -> None:
    channel, session = start(3, 0.0)
    number = session.throw(0, 1, 5000)
    channel.board.boot = 2
    channel.controller = Controller(channel.board)
    channel.controller.start()
    channel.runs(session, 6000)
    assert session.model.board is not None and session.model.board.boot == 2
    assert session.model.connection.state == "connected"
    assert outcome(session, number) in ("unknown", "done", "refused")
    assert set(channel.asked.values()) == {1}
