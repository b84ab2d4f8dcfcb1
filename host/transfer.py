"""Settings on their way to the board, as one transaction: staged, sent, committed; the board answers for the whole."""

from collections.abc import Callable

from host import wording
from host.settings_diff import label_of
from shared_protocol import messages
from shared_protocol.codec import Codec, Received
from shared_protocol.fields import Message
from shared_protocol.registry import host_reads

Send = Callable[[Message, list[object]], bool]

RECORDS_A_STEP = 8
ANSWER_S = 8.0
_OPEN = ("staging", "sending", "waiting")


class SettingsTransfer:
    """One transaction. `state`: staging, sending, waiting (for the answer); then accepted, rejected, failed, cancelled.

    `sent` of `total` records are on their way; `text` says in words how it stands. After a rejection `record` (-1: the
    whole), `field` and `why` (the reason word) say what is wrong.
    """

    def __init__(self, records: list[tuple[Message, list[object]]], boot: int, send: Send, now_s: float) -> None:
        self.records = records
        self.total = len(records)
        self.sent = 0
        self.state = "staging"
        self.text = "asking the board to take settings"
        self.record = -1
        self.field = ""
        self.why = ""
        self.sequence = 0
        codec = Codec(host_reads())
        bodies = b"".join(codec.body(message, values) + b"\n" for message, values in records)
        self.crc = codec.crc_text(bodies).decode()
        self._boot = boot
        self._send = send
        self._asked_s = now_s
        if not send(messages.STAGE, [boot, max(1, self.total)]):
            self._end("failed", "not sent: there is no connection to the board")

    @property
    def open(self) -> bool:
        """True until the board has answered for the whole, or it has failed."""
        return self.state in _OPEN

    @property
    def answer(self) -> str:
        """What the board answered, or how it stands."""
        return self.text

    @property
    def progress(self) -> float:
        """0 to 1."""
        return self.sent / self.total if self.total else 0.0

    def cancel(self) -> None:
        """Drop it; the settings before stay in force. Too late once all is sent."""
        if self.state in ("staging", "sending"):
            self._send(messages.ABANDON, [self._boot])
            self._end("cancelled", "cancelled: the settings before stay in force")

    def lost(self) -> None:
        """The link was lost."""
        if self.state == "waiting":
            self._end("failed", "the link was lost before the answer: fetch the settings to see which are in force")
        elif self.open:
            self._end("failed", "the link was lost: the settings before stay in force")

    def step(self, now_s: float) -> None:
        """Send some more."""
        if self.state == "sending":
            for message, values in self.records[self.sent : self.sent + RECORDS_A_STEP]:
                if not self._send(message, values):
                    return
                self.sent += 1
                self._asked_s = now_s
            if self.sent == self.total:
                self._send(messages.COMMIT, [self._boot, self.crc.encode()])
                self.state, self.text = "waiting", "the board checks the settings"
            else:
                self.text = f"record {self.sent} of {self.total}"
        if self.open and now_s - self._asked_s > ANSWER_S:
            self._end("failed", "no answer: fetch the settings to see which are in force")

    def take(self, received: Received) -> None:
        """An answer of the board."""
        if received.message is messages.ANSWER:
            if self.open and received.word("to") in ("stage", "commit"):
                self._answer(received)
        elif received.message is messages.ACCEPTED:
            if self.state == "waiting":
                self.sequence = received.number("seq")
                self._end("accepted", f"accepted: settings number {self.sequence} are in force")
        elif received.message is messages.REJECTED and self.state == "waiting":
            self.record, self.field = received.number("n"), received.name("field")
            self.why = received.word("why")
            label = label_of(self.records, self.record)
            self._end("rejected", wording.rejected_text(self.record, self.field, self.why, label))

    def _answer(self, received: Received) -> None:
        if not received.number("ok"):
            self.why = received.word("why")
            self._end("rejected", wording.rejected_text(-1, "", self.why))
        elif self.state == "staging" and received.word("to") == "stage":
            self.state = "sending"

    def _end(self, state: str, text: str) -> None:
        self.state, self.text = state, text


Transfer = SettingsTransfer
