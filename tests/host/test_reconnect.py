"""Whatever happens to the link: only a person's own request ever fires, and each is sent once."""

from hypothesis import settings
from hypothesis import strategies as st
from hypothesis.stateful import RuleBasedStateMachine, invariant, rule

from shared_protocol import messages
from shared_protocol.codec import Received
from shared_protocol.fields import Message
from shared_protocol.settings_table import SETTINGS
from tests.host.benches import RecordLayout
from tests.host.fake_link import Desk
from tests.protocol.strategies import messages as any_messages

# All that the session may say without being asked: it changes nothing on the board.
READS = {"hello", "alive", "ask", "ack"}


class Reconnecting(RuleBasedStateMachine):
    """A board that comes, goes, restarts and falls silent; a person who asks now and then."""

    def __init__(self) -> None:
        super().__init__()
        self.layout = RecordLayout()
        self.desk = Desk(self.layout)
        self.boot = 1
        self.q = 0
        self.asked: list[int] = []
        self.fired: list[int] = []

    def _person(self, number: int) -> None:
        """A request was made: it is on its way at once, or is 'unsent'."""
        found = self.desk.session.outcome_of(number)
        self.asked.append(number)
        mine = [values for name, values in self.desk.link.sent if name in ("throw", "route") and values[1] == number]
        assert len(mine) == (0 if found is not None and found.outcome == "unsent" else 1)
        self.fired += [number] * len(mine)
        self.desk.link.sent = [item for item in self.desk.link.sent if item[1] not in mine]

    @rule(junction=st.integers(0, 4), wait_ms=st.sampled_from([0, 5000]))
    def throw(self, junction: int, wait_ms: int) -> None:
        self._person(self.desk.session.throw(junction, 1, wait_ms))

    @rule()
    def route(self) -> None:
        self._person(self.desk.session.route(0, 5000))

    @rule(new_boot=st.booleans(), other_crc=st.booleans())
    def connects(self, new_boot: bool, other_crc: bool) -> None:
        if new_boot:
            self.boot += 1
            self.q = 0
        self.desk.link.connects(self.boot, "00000000" if other_crc else self.layout.crc())
        self.desk.session.poll()

    @rule()
    def breaks(self) -> None:
        self.desk.link.breaks()
        self.desk.session.poll()

    @rule(seconds=st.sampled_from([0.1, 1.3, 3.5, 8.0]))
    def passes(self, seconds: float) -> None:
        self.desk.passes(seconds)

    @rule()
    def status(self) -> None:
        self.desk.state()
        self.desk.end_status()
        self.desk.session.poll()

    @rule()
    def settings_end(self) -> None:
        self.desk.link.says(messages.END, what="settings")
        self.desk.session.poll()

    @rule(which=st.integers(0, 5), ended=st.sampled_from(["done", "refused", "cancelled", "failed"]))
    def outcome(self, which: int, ended: str) -> None:
        number = self.fired[which % len(self.fired)] if self.fired else 0
        self.q += 1
        why = {"done": "sent", "refused": "board_restarted", "cancelled": "host_lost", "failed": "no_drop"}[ended]
        self.desk.outcome(self.q, number, o=ended, why=why)
        self.desk.session.poll()

    @rule(text=st.sampled_from([b"", b">>> ", b"MPY: soft reboot"]))
    def garbage(self, text: bytes) -> None:
        self.desk.link.received.put(Received(None, [], text, ""))
        self.desk.link.received.put(Received(None, [], b"{", "bad_crc"))
        self.desk.session.poll()

    @rule(news=any_messages(messages.TO_HOST + SETTINGS))
    def anything_valid(self, news: tuple[Message, list[object]]) -> None:
        self.desk.link.received.put(Received(*news, b"", ""))
        self.desk.session.poll()

    @invariant()
    def nothing_fires_by_itself(self) -> None:
        names = set(self.desk.link.names())
        assert names <= READS, names
        assert len(set(self.asked)) == len(self.asked), "numbers are never used twice"


Reconnecting.TestCase.settings = settings(max_examples=60, stateful_step_count=30, deadline=None)
TestReconnecting = Reconnecting.TestCase
