"""The table of messages: what host and board may say to each other.

The first exchange (hello, board, wrong_version) is frozen: it never changes, whatever the protocol version.

What each is for and what its fields mean stands here (key [unit]: sentence): a board's compiler drops this text, and
`sentences` reads it for everybody else.

everywhere: Fields that mean the same in every message.
    boot: The boot number that the board gave in the first exchange.
    id: The host's number for this request; each is larger than the one before.
    j: Number of the junction.
    lie: Number of the lie within its junction.
    i: Its number.
    q: Number of this kept message; the host acknowledges it.
    step: Place in its route from 1; 0 for a single throw.
    why: The reason.
hello: First word of the host.
    v: Protocol version that the host speaks.
alive: The host is there; sent when it has nothing else to say.
ask: Asks for everything of one sort.
    what: What to tell.
throw: Throw one junction to one lie.
    wait [ms]: How long it may wait for its bank; 0 means now or not at all.
route: Set a route; the wait is for each throw.
    r: Number of the route.
    wait [ms]: How long it may wait for its bank; 0 means now or not at all.
cancel: Cancel the throw or route of that number, as far as it has not fired.
stop: The operator's stop; needs no boot number.
release: Ends the stop.
clear: Puts what is out back into use.
    scope: What to clear.
ack: A kept message has arrived.
stage: Begins a settings transaction.
    n: Number of records that follow.
commit: Ends a settings transaction.
    crc: CRC-32 of the records, eight hex digits.
abandon: Drops a settings transaction.
restart: Finish the pulse, cancel the queue, start again.
board: First answer of the board.
    v: Protocol version of the board.
    fw: Firmware version.
    kind: Kind of board.
    uid: Unique id of the board.
    boot: Number of this boot.
    crc: CRC-32 of the settings in use, eight hex digits; empty if there are none.
    caps: What the board can do.
wrong_version: The board does not speak the host's version.
    v: Protocol version of the board.
    fw: Firmware version.
    asked: Protocol version that the host asked for.
taken: A throw is accepted and waits.
    id: The request's number; 0 for a button's.
    by: Who asked.
    due [ms]: Expected time until the pulse; -1 if it can't be told.
outcome: How a throw ended.
    id: The request's number; 0 for a button's or the board's own.
    lie: Number of the lie asked for.
    o: The outcome.
    ms [ms]: Refused: time until it would pass, -1 unknown. Else: time it took.
    i: Number of the bank, motor or input concerned; -1 for none.
    mv [mV]: Bank voltage at the decision, or when the last pulse began; -1 unknown.
    after [mV]: Bank voltage after the last pulse; -1 if none was given.
route_end: How a route ended.
    id: The request's number.
    r: Number of the route.
    o: The outcome.
    done: Throws that ended well.
    of: Throws of the route.
fault: A fault: the first one of that bank, junction or button.
    scope: What is out.
    code: The fault.
    e1: First evidence: see the table of faults.
    e2: Second evidence.
    near: Junction that was thrown last on that bank, or motor concerned; -1 for none.
cleared: A fault was cleared.
    scope: What is in use again.
answer: Answer to a request that is not a throw.
    to: The request that is answered.
    ok: 1 if done.
    i: Number that belongs to the reason; -1 for none.
rejected: The settings are not taken; those before stay in force.
    n: Which record, from 0; -1 for the whole.
    field: The field that is wrong.
accepted: The settings are taken.
    crc: CRC-32 of the settings now in force.
    seq: Sequence number of the slot.
lie: Which way a junction lies.
    lie: Number of the lie; -1 for unknown.
    src: Where it comes from.
pulse: A pulse begins.
    b: Number of the bank.
    group: Run of 24 outputs that the mask means.
    mask: Outputs switched on, bit 0 the first.
    us [us]: Width.
    mv [mV]: Bank voltage at the decision.
bank: Telemetry of a bank.
    b: Number of the bank.
    mv [mV]: Bank voltage; -1 unknown.
    age [ms]: Age of that reading.
    state: What the bank is doing.
    ready [ms]: Time until its highest ready voltage; -1 if it can't be told.
expect: A throw in the queue.
    id: The request's number; 0 for a button's.
    by: Who asked.
    st: What it is doing.
    due [ms]: Expected time until its pulse; -1 if it can't be told.
state: Telemetry of the board.
    stop: 1 while the operator's stop is on.
    queue: Throws accepted and not finished.
    up [s]: Time since the boot.
    dropped: Telemetry lines that did not fit.
    bad: Lines that were not understood.
    in1: Inputs 0 to 23, 1 = closed.
    in2: Inputs 24 to 47.
trace: Asks for the discharge of a bank's last pulse.
    b: Number of the bank.
started: Why the board started, if it was not simply switched on; told after each first exchange.
    cause: The cause.
    note: What the crash before it left; empty if there was none.
loop: How the board's loop goes; once a second, from boards that know.
    us [us]: Mean time once round the loop; -1 unknown.
    worst [us]: Longest time once round since the last such message.
    collect [us]: Longest collection of garbage since the last such message; 0 for none.
    adc [1/s]: Samples a second of one bank's voltage; -1 unknown.
    free [bytes]: Free memory after the last collection; -1 unknown.
points: Some points of a discharge, in order.
    b: Number of the bank.
    from: Number of the first point.
    step [us]: Time from point to point; point 0 is at the beginning of the pulse.
    mv [mV]: The points; 0 stands for a gap, and fills the last line up.
end: All of it has been told.
    what: What was asked for.
"""

from shared_protocol import words
from shared_protocol.fields import INT_MAX, Message, explain, name, numbers, whole, word

VERSION = 1
FIRMWARE = b"1.0.0"

_BOOT = whole("boot", 1, INT_MAX)
_ID = whole("id", 1, INT_MAX)
_WAIT = whole("wait", 0, 60_000)
_Q = whole("q", 1, INT_MAX)
_JUNCTION = whole("j", 0, 63)
_LIE = whole("lie", 0, 5)
_WHY = word("why", words.REASONS)

REQUESTS = ("release", "clear", "cancel", "stage", "commit", "stop", "restart", "ask")
TO_RELEASE, TO_CLEAR, TO_CANCEL, TO_STAGE, TO_COMMIT, TO_STOP, TO_RESTART, TO_ASK = 0, 1, 2, 3, 4, 5, 6, 7
QUESTIONS = ("status", "settings", "trace")
ASK_STATUS, ASK_SETTINGS, ASK_TRACE = 0, 1, 2
# Points in one message.
POINTS_A_LINE = 16

# ---- from the host to the board

HELLO = Message(
    "hello",
    (whole("v", 1, INT_MAX),),
)
ALIVE = Message("alive", ())
ASK = Message("ask", (word("what", QUESTIONS),))
THROW = Message("throw", (_BOOT, _ID, _JUNCTION, _LIE, _WAIT))
ROUTE = Message(
    "route",
    (_BOOT, _ID, whole("r", 0, 31), _WAIT),
)
CANCEL = Message("cancel", (_BOOT, _ID))
STOP = Message("stop", ())
RELEASE = Message("release", (_BOOT,))
CLEAR = Message(
    "clear",
    (_BOOT, word("scope", words.SCOPES), whole("i", 0, 63)),
)
ACK = Message("ack", (_Q,))
STAGE = Message(
    "stage",
    (_BOOT, whole("n", 1, 400)),
)
COMMIT = Message(
    "commit",
    (_BOOT, name("crc", 8, 8)),
)
ABANDON = Message("abandon", (_BOOT,))
RESTART = Message("restart", (_BOOT,))

# ---- from the board to the host

BOARD = Message(
    "board",
    (
        whole("v", 1, INT_MAX),
        name("fw"),
        name("kind"),
        name("uid"),
        whole("boot", 1, INT_MAX),
        name("crc", 8),
        name("caps"),
    ),
)
WRONG_VERSION = Message(
    "wrong_version",
    (
        whole("v", 1, INT_MAX),
        name("fw"),
        whole("asked", 1, INT_MAX),
    ),
)
TAKEN = Message(
    "taken",
    (
        whole("id", 0, INT_MAX),
        whole("step", 0, 16),
        _JUNCTION,
        _LIE,
        word("by", words.ORIGINS),
        whole("due", -1, INT_MAX),
    ),
)
OUTCOME = Message(
    "outcome",
    (
        _Q,
        whole("id", 0, INT_MAX),
        whole("step", 0, 16),
        whole("j", -1, INT_MAX),
        whole("lie", -1, INT_MAX),
        word("o", words.OUTCOMES),
        _WHY,
        whole("ms", -1, INT_MAX),
        whole("i", -1, 63),
        whole("mv", -1, INT_MAX),
        whole("after", -1, INT_MAX),
    ),
    True,
)
ROUTE_END = Message(
    "route_end",
    (
        _Q,
        whole("id", 0, INT_MAX),
        whole("r", -1, INT_MAX),
        word("o", words.OUTCOMES),
        _WHY,
        whole("done", 0, 16),
        whole("of", 0, 16),
    ),
    True,
)
FAULT = Message(
    "fault",
    (
        _Q,
        word("scope", words.SCOPES),
        whole("i", 0, 63),
        word("code", words.FAULTS),
        whole("e1", -INT_MAX, INT_MAX),
        whole("e2", -INT_MAX, INT_MAX),
        whole("near", -1, 63),
    ),
    True,
)
CLEARED = Message(
    "cleared",
    (_Q, word("scope", words.SCOPES), whole("i", 0, 63)),
    True,
)
ANSWER = Message(
    "answer",
    (
        word("to", REQUESTS),
        whole("ok", 0, 1),
        _WHY,
        whole("i", -1, INT_MAX),
    ),
)
REJECTED = Message(
    "rejected",
    (
        whole("n", -1, 400),
        name("field"),
        _WHY,
    ),
)
ACCEPTED = Message(
    "accepted",
    (
        name("crc", 8),
        whole("seq", 1, INT_MAX),
    ),
)
LIE = Message(
    "lie",
    (
        _JUNCTION,
        whole("lie", -1, 5),
        word("src", words.SOURCES),
    ),
)
PULSE = Message(
    "pulse",
    (
        whole("b", 0, 2),
        _JUNCTION,
        whole("group", 0, 1),
        whole("mask", 1, 16_777_215),
        whole("us", 1, 65_535),
        whole("mv", 0, 40_000),
    ),
)
BANK = Message(
    "bank",
    (
        whole("b", 0, 2),
        whole("mv", -1, 40_000),
        whole("age", 0, INT_MAX),
        word("state", words.BANK_STATES),
        whole("ready", -1, INT_MAX),
    ),
)
EXPECT = Message(
    "expect",
    (
        whole("id", 0, INT_MAX),
        whole("step", 0, 16),
        _JUNCTION,
        _LIE,
        word("by", words.ORIGINS),
        word("st", words.THROW_STATES),
        whole("due", -1, INT_MAX),
    ),
)
STATE = Message(
    "state",
    (
        whole("stop", 0, 1),
        whole("queue", 0, 64),
        whole("up", 0, INT_MAX),
        whole("dropped", 0, INT_MAX),
        whole("bad", 0, INT_MAX),
        whole("in1", 0, 16_777_215),
        whole("in2", 0, 16_777_215),
    ),
)
END = Message("end", (word("what", QUESTIONS),))

TRACE = Message("trace", (whole("b", 0, 2),))
STARTED = Message("started", (word("cause", words.CAUSES), name("note", 150)))
LOOP = Message(
    "loop",
    (
        whole("us", -1, INT_MAX),
        whole("worst", 0, INT_MAX),
        whole("collect", 0, INT_MAX),
        whole("adc", -1, INT_MAX),
        whole("free", -1, INT_MAX),
    ),
)
POINTS = Message(
    "points",
    (
        whole("b", 0, 2),
        whole("from", 0, 1000),
        whole("step", 0, INT_MAX),
        numbers("mv", 0, 40_000, POINTS_A_LINE),
    ),
)

TO_BOARD = (
    HELLO,
    ALIVE,
    ASK,
    THROW,
    ROUTE,
    CANCEL,
    STOP,
    RELEASE,
    CLEAR,
    ACK,
    STAGE,
    COMMIT,
    ABANDON,
    RESTART,
    TRACE,
)
TO_HOST = (
    BOARD,
    WRONG_VERSION,
    TAKEN,
    OUTCOME,
    ROUTE_END,
    FAULT,
    CLEARED,
    ANSWER,
    REJECTED,
    ACCEPTED,
    LIE,
    PULSE,
    BANK,
    EXPECT,
    STATE,
    END,
    STARTED,
    LOOP,
    POINTS,
)

explain(globals().get("__doc__"), TO_BOARD + TO_HOST)

# The board writes these in its steady loop.
_known: "list[tuple[tuple[str, ...], tuple[bytes, ...]]]" = []
for _message in TO_HOST:
    _message.prepare(_known)
del _known
