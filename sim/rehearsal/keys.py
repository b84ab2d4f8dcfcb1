"""The keys of a scenario file. The reader checks by these; the reference page is made from them."""

from dataclasses import replace

from shared_protocol import words
from sim.layout import keys as layout_keys
from sim.layout.reading import REQUIRED, Key

# A day and a little: what wraps later can be had by starting the clocks just before it.
LONGEST_S = 25 * 3600

SCENARIO = (
    Key("title", "text", "What the scenario shows.", REQUIRED),
    Key("board", "text", "Which board of the layout, where that has several: a rehearsal runs one.", None, 1, 24),
    Key("layout", "text", "Layout file, beside the scenario or among the shipped ones; else the demo layout."),
    Key("seed", "whole", "Fixes everything random.", 1, 0, 1 << 31),
    Key("duration_s", "number", "How long it lasts.", REQUIRED, 0.1, LONGEST_S, "s"),
    Key("charged", "yes/no", "The banks are full at the start.", True),
    Key("host", "yes/no", "A host is there from the start.", True),
    Key("clock", "table", "Where the board's clocks start."),
    Key("settings", "table", "Values of the layout that are different for this rehearsal."),
    Key("at", "tables", "What happens: each has a time, an action and what that needs.", [], 0, 500),
    Key("expect", "tables", "What must come of it.", [], 0, 500),
)

CLOCK = (
    Key("us_ticks", "whole", "The board's microsecond clock at the start (it wraps at 2**30).", 0, 0, (1 << 30) - 1),
    Key("ms_ticks", "whole", "The board's millisecond clock at the start (it wraps at 2**30).", 0, 0, (1 << 30) - 1),
)

SETTINGS = (
    Key("supply", "table", "Of the supply."),
    Key("board", "table", "Of the board."),
    Key("timing", "table", "Of the timing."),
    Key("bank", "tables", "Of banks, each found by its name.", None, 0, 3),
    Key("junction", "tables", "Of junctions, each found by its name.", None, 0, 64),
)


def _of(keys: tuple[Key, ...], *names: str) -> tuple[Key, ...]:
    """Keys of the layout file, here without defaults: what is not written stays as the layout has it."""
    return tuple(replace(key, default=None) for key in keys if key.name in names)


_NAME = Key("name", "text", "Which one.", REQUIRED)
SETTINGS_SUPPLY = _of(layout_keys.SUPPLY, "volts", "peak_v", "source_ohm")
SETTINGS_BOARD = _of(layout_keys.BOARD, "host_silence_ms", "telemetry_ms", "restore_lies", "route_order")
SETTINGS_TIMING = tuple(replace(key, default=None) for key in layout_keys.TIMING)
SETTINGS_BANK = (
    _NAME,
    *_of(
        layout_keys.BANK, "full_v", "gap_ms", "capacitance_uf", "charge", "charge_ohm", "limit_ma", "guard",
        "resistor_w", "stall_ms", "cut_off_pin", "esr_ohm", "bleed_ohm",
    ),
)  # fmt: skip
SETTINGS_JUNCTION = (
    _NAME,
    *_of(layout_keys.JUNCTION, "ready_v", "pulse_ms", "full_pulse_ms", "retry_v", "pulses"),
)

_TIME = Key("time_s", "number", "When, from the start.", REQUIRED, 0, LONGEST_S, "s")
_JUNCTION = Key("junction", "text", "Junction, by name or number from 1.", REQUIRED)
_LIE = Key("lie", "text", "Lie, by its name or the owner's words.", REQUIRED)
_BANK = Key("bank", "text", "Bank, by name or number from 1.", REQUIRED)
_INPUT = Key("input", "text", "Input, by name or number.", REQUIRED)
_MOTOR = Key("motor", "whole", "Which motor of the junction, from 1.", 1, 1, 4)
_SIDE = Key("side", "word", "Which coil.", "normal", words=("normal", "reverse"))
_LABEL = Key("label", "text", "A name for the request, for expectations and for `cancel` and `repeat`.", "")
_WAIT = Key("wait_ms", "whole", "How long it may wait; 0: now or not at all.", 0, 0, 60_000, "ms")
_COUNT = Key("count", "whole", "How many of the host's next lines.", 1, 1, 1000)

# What each action needs besides `time_s` and `do`.
ACTIONS: dict[str, tuple[str, tuple[Key, ...]]] = {
    "throw": ("The host asks for a throw.", (_JUNCTION, _LIE, _WAIT, _LABEL)),
    "route": (
        "The host asks for a route.",
        (Key("route", "text", "Route, by name or number from 1.", REQUIRED), _WAIT, _LABEL),
    ),
    "cancel": ("The host cancels a request.", (Key("label", "text", "Label of the request.", REQUIRED),)),
    "repeat": ("The host sends an earlier request again, as it was.", (Key("label", "text", "Its label.", REQUIRED),)),
    "stop": ("The host's stop.", ()),
    "release": ("The host's release.", ()),
    "clear": (
        "The host clears what is out; nothing named: everything.",
        (
            Key("bank", "text", "A bank."),
            Key("junction", "text", "A junction."),
            Key("button", "whole", "A button, from 1.", None, 1, 96),
        ),
    ),
    "tune": (
        "The host sends the settings with another ready voltage.",
        (
            _JUNCTION,
            Key("lie", "text", "One lie; else all."),
            Key("ready_v", "number", "The new one.", REQUIRED, 1, 33, "V"),
        ),
    ),
    "ask_restart": ("The host asks the board to start again.", ()),
    "host_lost": ("The host falls silent and hears nothing.", ()),
    "host_back": ("The host connects again: it reads, and fires nothing.", ()),
    "host_stops_reading": ("The host's port stays open, it goes on sending, but it reads nothing.", ()),
    "host_reads": ("The host reads again, from where it left off.", ()),
    "damage_lines": ("The link damages lines of the host.", (_COUNT,)),
    "double_lines": ("The link doubles lines of the host.", (_COUNT,)),
    "lose_lines": ("The link loses lines of the host.", (_COUNT,)),
    "restart": ("The board loses its power and starts again.", ()),
    "press": (
        "A button is pressed.",
        (_INPUT, Key("for_ms", "whole", "How long.", 150, 1, 600_000, "ms")),
    ),
    "close": ("An input is closed until opened.", (_INPUT,)),
    "open": ("An input is opened again.", (_INPUT,)),
    "supply_off": ("The supply fails.", ()),
    "supply_on": ("The supply is back.", ()),
    "driver_stuck": ("A driver fails short: its coil stays on.", (_JUNCTION, _MOTOR, _SIDE)),
    "driver_mended": ("It is mended.", (_JUNCTION, _MOTOR, _SIDE)),
    "coil_open": ("A coil or its wire breaks.", (_JUNCTION, _MOTOR, _SIDE)),
    "coil_shorted": (
        "A coil is shorted.",
        (_JUNCTION, _MOTOR, _SIDE, Key("ohm", "number", "What is left of it.", 0.2, 0.02, 10, "ohm")),
    ),
    "joint_bad": (
        "A joint goes bad.",
        (_JUNCTION, _MOTOR, _SIDE, Key("ohm", "number", "Its resistance.", 3.0, 0, 1000, "ohm")),
    ),
    "coil_mended": ("The coil, its wire and joints are as they should be.", (_JUNCTION, _MOTOR, _SIDE)),
    "jammed": ("A mechanism jams.", (_JUNCTION, _MOTOR)),
    "freed": ("It is free again.", (_JUNCTION, _MOTOR)),
    "capacitor_faded": (
        "A bank loses capacitance.",
        (_BANK, Key("factor", "number", "What is left of it.", 0.6, 0.05, 2)),
    ),
    "leakage_high": (
        "A bank leaks.",
        (_BANK, Key("ohm", "number", "Through how much.", 100.0, 1, 1e6, "ohm")),
    ),
    "divider_broken": (
        "The voltage sense breaks: upper leg open reads nothing, lower leg open the most.",
        (_BANK, Key("leg", "word", "Which leg.", "upper", words=("upper", "lower"))),
    ),
    "bank_mended": ("The bank's capacitors and sense are as they should be.", (_BANK,)),
    "contact_stuck": (
        "A contact or its wire stays as it is.",
        (_INPUT, Key("closed", "yes/no", "Stuck closed; else open.", True)),
    ),
    "contact_freed": ("It works again.", (_INPUT,)),
    "hand": ("Somebody moves the points by hand.", (_JUNCTION, _LIE)),
}

ACTION = (_TIME, Key("do", "word", "The action.", REQUIRED, words=tuple(ACTIONS)))

_AT = Key("at_s", "number", "When it is looked at; else at the end.", None, 0, LONGEST_S, "s")
_FROM = Key("from_s", "number", "Not before.", 0.0, 0, LONGEST_S, "s")
_TO = Key("to_s", "number", "Not after; else the end.", None, 0, LONGEST_S, "s")
_REQUEST = Key("label", "text", "Label of the request.", REQUIRED)
_OUTCOME = Key("outcome", "word", "How it ends.", REQUIRED, words=words.OUTCOMES)
_WHY = Key("why", "word", "The reason.", None, words=words.REASONS)

EXPECTATIONS: dict[str, tuple[str, tuple[Key, ...]]] = {
    "outcome": (
        "How a throw ends (of a route: the throw `step`).",
        (
            _REQUEST, _OUTCOME, _WHY, _FROM, _TO,
            Key("step", "whole", "Place in its route, from 1.", 0, 0, 16),
            Key("low_ms", "whole", "The outcome's time is at least this.", None, 0, 1 << 29, "ms"),
            Key("high_ms", "whole", "The outcome's time is at most this.", None, 0, 1 << 29, "ms"),
            Key("after_high_v", "number", "The bank is left at most at this.", None, 0, 40, "V"),
        ),
    ),
    "route": (
        "How a route ends.",
        (_REQUEST, _OUTCOME, _WHY, _FROM, _TO, Key("done", "whole", "Throws that ended well.", None, 0, 16)),
    ),
    "lie": (
        "What the board says of a junction.",
        (
            _JUNCTION, _AT, Key("lie", "text", "The lie, or `unknown`.", REQUIRED),
            Key("source", "word", "Where it comes from.", None, words=words.SOURCES),
        ),
    ),
    "points": ("How the points really lie.", (_JUNCTION, _AT, Key("lie", "text", "The lie, or `between`.", REQUIRED))),
    "fault": (
        "A fault is told.",
        (
            Key("bank", "text", "Of a bank."), Key("junction", "text", "Of a junction."),
            Key("button", "whole", "Of a button, from 1.", None, 1, 96),
            Key("code", "word", "Which.", REQUIRED, words=words.FAULTS[1:]), _FROM, _TO,
        ),
    ),
    "no_fault": ("No fault at all is told.", (_FROM, _TO)),
    "pulses": (
        "How many pulses are given.",
        (
            _FROM, _TO, Key("bank", "text", "Of one bank; else of all."),
            Key("least", "whole", "At least.", 0, 0, 100_000), Key("most", "whole", "At most.", 100_000, 0, 100_000),
        ),
    ),
    "voltage": (
        "What a bank really holds.",
        (
            _BANK, _AT, Key("low_v", "number", "At least.", 0.0, 0, 100, "V"),
            Key("high_v", "number", "At most.", 100.0, 0, 100, "V"),
        ),
    ),
    "follower": (
        "Whether a follower output is on.",
        (Key("output", "text", "Output, by name or number.", REQUIRED), _AT, Key("on", "yes/no", "On.", REQUIRED)),
    ),
    "boots": ("How often the board has started.", (Key("count", "whole", "So often.", REQUIRED, 1, 100),)),
    "settings": ("How the last transaction of settings ended.", (Key("accepted", "yes/no", "Taken.", REQUIRED), _WHY)),
}  # fmt: skip

EXPECTATION = (Key("what", "word", "What is looked at.", REQUIRED, words=tuple(EXPECTATIONS)),)
