"""The table of messages: what host and board may say to each other.

No functions here: on a board the sentences of a module without functions are let go after its import.

The first exchange (hello, board, wrong_version) is frozen: it never changes, whatever the protocol version.
"""

from shared_protocol import words
from shared_protocol.fields import INT_MAX, Message, name, whole, word

VERSION = 1
FIRMWARE = b"1.0.0"

_BOOT = whole("boot", 1, INT_MAX, "", "The boot number that the board gave in the first exchange.")
_ID = whole("id", 1, INT_MAX, "", "The host's number for this request; each is larger than the one before.")
_WAIT = whole("wait", 0, 60_000, "ms", "How long it may wait for its bank; 0 means now or not at all.")
_Q = whole("q", 1, INT_MAX, "", "Number of this kept message; the host acknowledges it.")
_JUNCTION = whole("j", 0, 63, "", "Number of the junction.")
_LIE = whole("lie", 0, 5, "", "Number of the lie within its junction.")
_WHY = word("why", words.REASONS, "The reason.")

REQUESTS = ("release", "clear", "cancel", "stage", "commit", "stop", "restart", "ask")
TO_RELEASE, TO_CLEAR, TO_CANCEL, TO_STAGE, TO_COMMIT, TO_STOP, TO_RESTART, TO_ASK = 0, 1, 2, 3, 4, 5, 6, 7
QUESTIONS = ("status", "settings")
ASK_STATUS, ASK_SETTINGS = 0, 1

# ---- from the host to the board

HELLO = Message(
    "hello",
    (whole("v", 1, INT_MAX, "", "Protocol version that the host speaks."),),
    "First word of the host.",
)
ALIVE = Message("alive", (), "The host is there; sent when it has nothing else to say.")
ASK = Message("ask", (word("what", QUESTIONS, "What to tell."),), "Asks for everything of one sort.")
THROW = Message("throw", (_BOOT, _ID, _JUNCTION, _LIE, _WAIT), "Throw one junction to one lie.")
ROUTE = Message(
    "route",
    (_BOOT, _ID, whole("r", 0, 31, "", "Number of the route."), _WAIT),
    "Set a route; the wait is for each throw.",
)
CANCEL = Message("cancel", (_BOOT, _ID), "Cancel the throw or route of that number, as far as it has not fired.")
STOP = Message("stop", (), "The operator's stop; needs no boot number.")
RELEASE = Message("release", (_BOOT,), "Ends the stop.")
CLEAR = Message(
    "clear",
    (_BOOT, word("scope", words.SCOPES, "What to clear."), whole("i", 0, 63, "", "Its number.")),
    "Puts what is out back into use.",
)
ACK = Message("ack", (_Q,), "A kept message has arrived.")
STAGE = Message(
    "stage",
    (_BOOT, whole("n", 1, 400, "", "Number of records that follow.")),
    "Begins a settings transaction.",
)
COMMIT = Message(
    "commit",
    (_BOOT, name("crc", "CRC-32 of the records, eight hex digits.", 8, 8)),
    "Ends a settings transaction.",
)
ABANDON = Message("abandon", (_BOOT,), "Drops a settings transaction.")
RESTART = Message("restart", (_BOOT,), "Finish the pulse, cancel the queue, start again.")

# ---- from the board to the host

BOARD = Message(
    "board",
    (
        whole("v", 1, INT_MAX, "", "Protocol version of the board."),
        name("fw", "Firmware version."),
        name("kind", "Kind of board."),
        name("uid", "Unique id of the board."),
        whole("boot", 1, INT_MAX, "", "Number of this boot."),
        name("crc", "CRC-32 of the settings in use, eight hex digits; empty if there are none.", 8),
        name("caps", "What the board can do."),
    ),
    "First answer of the board.",
)
WRONG_VERSION = Message(
    "wrong_version",
    (
        whole("v", 1, INT_MAX, "", "Protocol version of the board."),
        name("fw", "Firmware version."),
        whole("asked", 1, INT_MAX, "", "Protocol version that the host asked for."),
    ),
    "The board does not speak the host's version.",
)
TAKEN = Message(
    "taken",
    (
        whole("id", 0, INT_MAX, "", "The request's number; 0 for a button's."),
        whole("step", 0, 16, "", "Place in its route from 1; 0 for a single throw."),
        _JUNCTION,
        _LIE,
        word("by", words.ORIGINS, "Who asked."),
        whole("due", -1, INT_MAX, "ms", "Expected time until the pulse; -1 if it can't be told."),
    ),
    "A throw is accepted and waits.",
)
OUTCOME = Message(
    "outcome",
    (
        _Q,
        whole("id", 0, INT_MAX, "", "The request's number; 0 for a button's or the board's own."),
        whole("step", 0, 16, "", "Place in its route from 1; 0 for a single throw."),
        whole("j", -1, INT_MAX, "", "Number of the junction."),
        whole("lie", -1, INT_MAX, "", "Number of the lie asked for."),
        word("o", words.OUTCOMES, "The outcome."),
        _WHY,
        whole("ms", -1, INT_MAX, "ms", "Refused: time until it would pass, -1 unknown. Else: time it took."),
        whole("i", -1, 63, "", "Number of the bank, motor or input concerned; -1 for none."),
        whole("mv", -1, INT_MAX, "mV", "Bank voltage at the decision, or when the last pulse began; -1 unknown."),
        whole("after", -1, INT_MAX, "mV", "Bank voltage after the last pulse; -1 if none was given."),
    ),
    "How a throw ended.",
    True,
)
ROUTE_END = Message(
    "route_end",
    (
        _Q,
        whole("id", 0, INT_MAX, "", "The request's number."),
        whole("r", -1, INT_MAX, "", "Number of the route."),
        word("o", words.OUTCOMES, "The outcome."),
        _WHY,
        whole("done", 0, 16, "", "Throws that ended well."),
        whole("of", 0, 16, "", "Throws of the route."),
    ),
    "How a route ended.",
    True,
)
FAULT = Message(
    "fault",
    (
        _Q,
        word("scope", words.SCOPES, "What is out."),
        whole("i", 0, 63, "", "Its number."),
        word("code", words.FAULTS, "The fault."),
        whole("e1", -INT_MAX, INT_MAX, "", "First evidence: see the table of faults."),
        whole("e2", -INT_MAX, INT_MAX, "", "Second evidence."),
        whole("near", -1, 63, "", "Junction that was thrown last on that bank, or motor concerned; -1 for none."),
    ),
    "A fault: the first one of that bank, junction or button.",
    True,
)
CLEARED = Message(
    "cleared",
    (_Q, word("scope", words.SCOPES, "What is in use again."), whole("i", 0, 63, "", "Its number.")),
    "A fault was cleared.",
    True,
)
ANSWER = Message(
    "answer",
    (
        word("to", REQUESTS, "The request that is answered."),
        whole("ok", 0, 1, "", "1 if done."),
        _WHY,
        whole("i", -1, INT_MAX, "", "Number that belongs to the reason; -1 for none."),
    ),
    "Answer to a request that is not a throw.",
)
REJECTED = Message(
    "rejected",
    (
        whole("n", -1, 400, "", "Which record, from 0; -1 for the whole."),
        name("field", "The field that is wrong."),
        _WHY,
    ),
    "The settings are not taken; those before stay in force.",
)
ACCEPTED = Message(
    "accepted",
    (
        name("crc", "CRC-32 of the settings now in force.", 8),
        whole("seq", 1, INT_MAX, "", "Sequence number of the slot."),
    ),
    "The settings are taken.",
)
LIE = Message(
    "lie",
    (
        _JUNCTION,
        whole("lie", -1, 5, "", "Number of the lie; -1 for unknown."),
        word("src", words.SOURCES, "Where it comes from."),
    ),
    "Which way a junction lies.",
)
PULSE = Message(
    "pulse",
    (
        whole("b", 0, 2, "", "Number of the bank."),
        _JUNCTION,
        whole("group", 0, 1, "", "Run of 24 outputs that the mask means."),
        whole("mask", 1, 16_777_215, "", "Outputs switched on, bit 0 the first."),
        whole("us", 1, 65_535, "us", "Width."),
        whole("mv", 0, 40_000, "mV", "Bank voltage at the decision."),
    ),
    "A pulse begins.",
)
BANK = Message(
    "bank",
    (
        whole("b", 0, 2, "", "Number of the bank."),
        whole("mv", -1, 40_000, "mV", "Bank voltage; -1 unknown."),
        whole("age", 0, INT_MAX, "ms", "Age of that reading."),
        word("state", words.BANK_STATES, "What the bank is doing."),
        whole("ready", -1, INT_MAX, "ms", "Time until its highest ready voltage; -1 if it can't be told."),
    ),
    "Telemetry of a bank.",
)
EXPECT = Message(
    "expect",
    (
        whole("id", 0, INT_MAX, "", "The request's number; 0 for a button's."),
        whole("step", 0, 16, "", "Place in its route from 1; 0 for a single throw."),
        _JUNCTION,
        _LIE,
        word("by", words.ORIGINS, "Who asked."),
        word("st", words.THROW_STATES, "What it is doing."),
        whole("due", -1, INT_MAX, "ms", "Expected time until its pulse; -1 if it can't be told."),
    ),
    "A throw in the queue.",
)
STATE = Message(
    "state",
    (
        whole("stop", 0, 1, "", "1 while the operator's stop is on."),
        whole("queue", 0, 64, "", "Throws accepted and not finished."),
        whole("up", 0, INT_MAX, "s", "Time since the boot."),
        whole("dropped", 0, INT_MAX, "", "Telemetry lines that did not fit."),
        whole("bad", 0, INT_MAX, "", "Lines that were not understood."),
        whole("in1", 0, 16_777_215, "", "Inputs 0 to 23, 1 = closed."),
        whole("in2", 0, 16_777_215, "", "Inputs 24 to 47."),
    ),
    "Telemetry of the board.",
)
END = Message("end", (word("what", QUESTIONS, "What was asked for."),), "All of it has been told.")

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
)
