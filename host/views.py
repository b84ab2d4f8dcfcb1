"""What the model shows: plain values, no input or output. Times are seconds of the session's clock."""

from dataclasses import dataclass, field

UNKNOWN_LIE = -1


@dataclass
class LieView:
    """One lie of a junction. ready_mv: millivolts; pulse_us, full_us: microseconds; `word`: the owner's word."""

    number: int
    name: str
    word: str
    ready_mv: int
    pulse_us: int
    full_us: int


@dataclass
class FaultView:
    """A fault as the board reported it. `who` names what is out, `near_name` what was thrown last there."""

    scope: str
    number: int
    code: str
    what: str
    remedy: str
    evidence_text: str
    near: int
    heard_at_s: float
    who: str = ""
    near_name: str = ""
    blink: int = 0


@dataclass
class JunctionView:
    """A junction. `lie` is -1 while unknown; `source` is 'none', 'sent' or 'seen'; `waiting`: it is in the queue.

    lost: its board is not there, while others are: what is known of it is as last told.
    """

    number: int
    name: str
    kind: str
    bank_numbers: list[int]
    lies: list[LieView]
    lie: int = UNKNOWN_LIE
    source: str = "none"
    fault: FaultView | None = None
    waiting: bool = False
    heard_at_s: float | None = None
    lost: bool = False

    @property
    def word(self) -> str:
        """The owner's word for the way it lies, or 'unknown'."""
        return self.word_of(self.lie) if 0 <= self.lie < len(self.lies) else "unknown"

    def word_of(self, lie: int) -> str:
        """The owner's word for lie number `lie`."""
        return self.lies[lie].word if 0 <= lie < len(self.lies) else f"lie {lie + 1}"


@dataclass
class BankView:
    """A bank. mv -1: unknown; age_ms: age of the reading when it was sent; ready_ms -1: can't be told.

    lost: the name of its board, if that is not there while others are.
    """

    number: int
    name: str
    full_mv: int
    mv: int = -1
    age_ms: int = -1
    state: str = "unknown"
    ready_ms: int = -1
    fault: FaultView | None = None
    heard_at_s: float | None = None
    lost: str = ""


@dataclass
class QueueItem:
    """A throw that the board has accepted and not finished. due_ms -1: can't be told; 0: now.

    board: its board's name, where there are several.
    """

    id: int
    step: int
    junction: int
    lie: int
    by: str
    state: str
    due_ms: int
    heard_at_s: float
    board: str = ""


@dataclass
class RouteView:
    """A route: its throws as (junction, lie)."""

    number: int
    name: str
    throws: list[tuple[int, int]]


@dataclass
class OutcomeView:
    """How a throw or a route ended; `text` says it in plain words.

    outcome: done, refused, expired, cancelled, failed; or the host's own 'unsent' (never left this computer) and
    'unknown' (the link was lost; nothing is known of it). ms, mv, after_mv, which: -1 where there is none.
    """

    id: int
    step: int
    kind: str
    outcome: str
    why: str
    text: str
    at_s: float
    junction: int = -1
    lie: int = -1
    route: int = -1
    ms: int = -1
    which: int = -1
    mv: int = -1
    after_mv: int = -1
    done: int = 0
    of: int = 0


@dataclass(frozen=True)
class AnswerView:
    """The board's last answer to a request that is no throw. `count` grows with each answer to that request."""

    ok: bool
    why: str
    which: int
    text: str
    count: int
    at_s: float


@dataclass
class BoardView:
    """Who the board is: the first exchange. `settings_crc` is empty if it has no settings."""

    kind: str
    uid: str
    firmware: str
    boot: int
    settings_crc: str
    version: int = 0
    caps: str = ""


BoardFacts = BoardView


@dataclass
class Connection:
    """state: 'searching', 'connected', 'lost' or 'refused'; `text` says why, in a sentence."""

    state: str = "searching"
    text: str = "looking for the board"
    since_s: float = 0.0


@dataclass
class Telemetry:
    """The board's own telemetry. `inputs`: bit n is set while input n is closed. queue -1: not heard yet."""

    queue: int = -1
    up_s: int = -1
    dropped: int = 0
    bad_lines: int = 0
    inputs: int = 0
    heard_at_s: float | None = None


@dataclass(frozen=True)
class Event:
    """A line of the event log. level: 'info', 'good', 'warn' or 'bad'."""

    at_s: float
    level: str
    text: str


@dataclass(frozen=True)
class GoLine:
    """Can I go? level: 'go', 'wait', 'stop', 'out' or 'lost'."""

    level: str
    text: str


@dataclass
class Names:
    """Names for sentences; where there is no name, the number as people count it (from 1)."""

    banks: list[str] = field(default_factory=list)
    junctions: list[str] = field(default_factory=list)
    words: list[list[str]] = field(default_factory=list)
    routes: list[str] = field(default_factory=list)
    inputs: dict[int, str] = field(default_factory=dict)

    def bank(self, number: int) -> str:
        """'bank East'."""
        return _named("bank", self.banks, number)

    def junction(self, number: int) -> str:
        """The junction's own name."""
        if 0 <= number < len(self.junctions) and self.junctions[number]:
            return self.junctions[number]
        return f"junction {number + 1}"

    def lie(self, junction: int, lie: int) -> str:
        """The owner's word for a lie."""
        if lie < 0:
            return "unknown"
        words = self.words[junction] if 0 <= junction < len(self.words) else []
        return words[lie] if lie < len(words) else f"lie {lie + 1}"

    def input(self, number: int) -> str:
        """The owner's name of an input; without one its number in the settings (from 0)."""
        return self.inputs.get(number, str(number))

    def route(self, number: int) -> str:
        """'route Up main'."""
        return _named("route", self.routes, number)


def _named(what: str, names: list[str], number: int) -> str:
    if 0 <= number < len(names) and names[number]:
        return f"{what} {names[number]}"
    return f"{what} {number + 1}"
