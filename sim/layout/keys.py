"""The keys of a layout file, table by table. The reader checks by these; the reference page is made from them."""

from dataclasses import replace

from shared_protocol import settings_table as wire
from shared_protocol.fields import NAME_MAX
from sim.layout.reading import REQUIRED, Key
from sim.motor import motor_kinds

SHORT_NAME = 16  # banks and lies: see the settings table
LONGEST_INPUT_NAME = 40  # stays on the host
MOST_BOARDS = 8

REFUSED_SUPPLIES = (
    ("track", "track power is never used: it needs a supply of its own"),
    ("dcc", "track power is never used: it needs a supply of its own"),
)
REFUSED_MOTORS = (
    ("two_wire", "two-wire motors (one coil, reversed polarity) can't be driven: the board switches twin coils only"),
    ("slow_motor", "slow motor drives can't be driven: the board gives short pulses to twin coils only"),
    ("servo", "servos can't be driven: the board gives short pulses to twin coils only"),
)

FILE = (
    Key("layout", "table", "What the layout is called.", REQUIRED),
    Key("supply", "table", "The supply that charges all banks.", REQUIRED),
    Key("board", "table", "The board as a whole. With several boards `[[board]]` tables, one a board."),
    Key("timing", "table", "Timing of the queue, contacts and buttons."),
    Key("io", "table", "Pins of inputs, followers and chains."),
    Key("inputs", "table", "Names of inputs, which everything else may then use."),
    Key("outputs", "table", "Names of follower outputs, which followers may then use."),
    Key("bank", "tables", "A bank of capacitors.", REQUIRED, 1, wire.MOST_BANKS),
    Key("junction", "tables", "A junction, in the order in which people number them (from 1).",
        REQUIRED, 1, wire.MOST_JUNCTIONS),
    Key("route", "tables", "A route.", None, 0, wire.MOST_ROUTES),
    Key("button", "tables", "A button, switch or stud.", None, 0, wire.MOST_BUTTONS),
    Key("follower", "tables", "An output that follows a junction.", None, 0, wire.MOST_FOLLOWERS),
)  # fmt: skip

# With several boards inputs and outputs are each board's own, and banks, junctions and all else add up.
FILE_OF_SEVERAL = tuple(
    Key(key.name, "tables", key.sentence, REQUIRED, 1, MOST_BOARDS) if key.name == "board"
    else replace(key, high=key.high * MOST_BOARDS) if key.kind == "tables" and key.high is not None
    else key
    for key in FILE if key.name not in ("io", "inputs", "outputs")
)  # fmt: skip

LAYOUT = (Key("name", "text", "What the layout is called.", REQUIRED, 1, 60),)

SUPPLY = (
    Key("kind", "word", "`ac` goes through a bridge rectifier; its peak is worked out. 18 V AC at most.", "dc",
        words=("dc", "ac"), refused=REFUSED_SUPPLIES),
    Key("volts", "number", "Its voltage: of `ac` the nominal one.", REQUIRED, 9, 30, "V"),
    Key("peak_v", "number", "Highest voltage unloaded; else 5 % above `dc`, 1.2 x 1.414 times `ac`.", None, 9, 40, "V"),
    Key("source_ohm", "number", "Its inner resistance (for the simulator).", 0.5, 0, 100, "ohm"),
)  # fmt: skip

BOARD = (
    Key("name", "text", "The owner's name for the board; else that of the layout.", None, 1, NAME_MAX),
    Key("host_silence_ms", "whole", "Host silent for longer: its throws not yet fired are cancelled.", 3000, 500,
        60_000, "ms"),
    Key("telemetry_ms", "whole", "Time between two telemetry lines of a bank.", 100, 50, 5000, "ms"),
    Key("restore_lies", "yes/no", "At power-up, throw the junctions back to their saved lies.", False),
    Key("route_order", "word", "Which throw of a route goes first when several banks are ready.", "as_listed",
        words=wire.ROUTE_ORDERS),
    Key("uid", "text", "Its unique id, as `coilwarden boards` tells it. A virtual board has the id that stands here, "
        "else `virtual-1`, `virtual-2` and so on.", None, 1, NAME_MAX),
    Key("address", "whole", "What the address links on its harness plug say; 0 for no links. A spare with the same "
        "address may take its place.", 0, 0, 3),
)  # fmt: skip

BOARD_OF_SEVERAL = (
    replace(BOARD[0], default=REQUIRED),
    *BOARD[1:],
    Key("io", "table", "Its pins of inputs, followers and chains: `[board.io]`, keys as in `[io]`."),
    Key("inputs", "table", "Names of its inputs: `[board.inputs]`."),
    Key("outputs", "table", "Names of its follower outputs: `[board.outputs]`."),
)
# Which board a bank, button or follower belongs to.
OWN_BOARD = Key("board", "name or number", "With several boards: the one it is on.")

TIMING = (
    Key("settle_ms", "whole", "After a pulse, samples are not trusted for this time.", 5, 2, 200, "ms"),
    Key("longest_wait_ms", "whole", "Longest wait of a button's throw, and of a further pulse.", 5000, 0, 60_000, "ms"),
    Key("route_pause_ms", "whole", "Pause between two pulses of a route.", 100, 0, 10_000, "ms"),
    Key("hysteresis_v", "number", "A bank shown as ready is shown so until it falls this far below.", 0.1, 0, 1, "V"),
    Key("button_steady_ms", "whole", "A button counts when steady for this time.", 30, 5, 200, "ms"),
    Key("button_stuck_ms", "whole", "A button held for longer is put out of use.", 10_000, 1000, 60_000, "ms"),
    Key("contact_equal", "whole", "A contact counts after this many equal samples, a millisecond apart.", 3, 1, 20),
    Key("contact_after_ms", "whole", "A contact counts from this time after its pulse began.", 5, 0, 100, "ms"),
    Key("entrance_exit_ms", "whole", "Longest time between entrance and exit button.", 5000, 500, 60_000, "ms"),
)

IO = (
    Key("input_pins", "list of whole numbers", "Pins of inputs 0, 1, 2 and so on. Pins that `[inputs]` names follow.",
        [], 0, 20),
    Key("inputs_on_chain", "whole", "Inputs on the input chain, numbered after those on pins; else as many eights as "
        "`[inputs]` names.", None, 0, wire.MOST_INPUTS),
    Key("input_chain_pins", "list of whole numbers", "Its data, clock and load pins.", [], 3, 3),
    Key("output_pins", "list of whole numbers", "Pins of follower outputs 0, 1, 2 and so on. Pins that `[outputs]` "
        "names follow.", [], 0, 20),
    Key("outputs_on_chain", "whole", "Follower outputs on the output chain; else as many eights as `[outputs]` names.",
        None, 0, wire.MOST_OUTPUTS),
    Key("output_chain_pins", "list of whole numbers", "Data, clock and read-back pins that all output chains share.",
        [], 3, 3),
)  # fmt: skip

BANK = (
    Key("name", "text", "The owner's name for it.", REQUIRED, 1, SHORT_NAME),
    Key("first_pin", "whole", "First pin of its coils; the others follow. Leave out for a bank on the output chain.",
        None, 0, 28),
    Key("chain_pins", "list of whole numbers", "On the output chain: its latch and output-enable pins.", [], 2, 2),
    Key("coils", "whole", "Number of coil outputs (13 at most on pins).", REQUIRED, 1, wire.COILS_ON_CHAIN),
    Key("adc", "whole", "ADC input of its voltage sense (0 is pin 26).", REQUIRED, 0, 2),
    Key("sense_range_v", "number", "Bank voltage at the highest ADC reading: set by the divider.", 33.0, 5, 40, "V"),
    Key("sense_zero_v", "number", "Added to every reading: what the sense reads too little at 0 V.", 0.0, -1, 1, "V"),
    Key("full_v", "number", "Voltage of the full bank; else what supply and bleed make it.", None, 3, 33, "V"),
    Key("gap_ms", "whole", "Shortest time between two pulses of this bank.", 20, 5, 60, "ms"),
    Key("switch", "word", "Which side of the coil the driver switches.", "low", words=wire.SWITCH_SIDES),
    Key("capacitance_uf", "whole", "Capacitance; else 4700, or 2200 above 18 V.", None, 100, 47_000, "uF"),
    Key("rated_v", "number", "Voltage rating of its capacitors, for a warning if it is low.", None, 5, 100, "V"),
    Key("charge", "word", "What charges it: a resistor, a resistor with a cut-off, a current-limited source.",
        "resistor", words=wire.CHARGE_KINDS),
    Key("charge_ohm", "number", "Charge resistor; else 47, or 100 above 18 V, or 1 for a limited source.",
        None, 0.1, 1000, "ohm"),
    Key("limit_ma", "whole", "Current of a limited source; 0 for none.", 0, 0, 5000, "mA"),
    Key("guard", "word", "What protects a coil from a driver failed short.", "none", words=wire.GUARDS),
    Key("resistor_w", "number", "Rating of the charge resistor.", 10.0, 0.1, 200, "W"),
    Key("stall_ms", "whole", "A recharge that takes longer is a fault; else 5000, or five time constants if that is "
        "longer.", None, 200, 60_000, "ms"),
    Key("cut_off_pin", "whole", "Pin of the charge cut-off.", None, 0, 28),
    Key("esr_ohm", "number", "Series resistance of the capacitors (for the simulator).", 0.05, 0, 5, "ohm"),
    Key("bleed_ohm", "number", "Bleed resistor and leakage together (for the simulator).", 4700.0, 100, 1e6, "ohm"),
    Key("driver_ohm", "number", "On-resistance of a driver (for the simulator).", 0.05, 0.001, 5, "ohm"),
    Key("diode_v", "number", "Drop of a flyback diode (for the simulator).", 0.8, 0, 40, "V"),
    Key("common_ohm", "number", "Wire that all its motors share (for the simulator).", 0.0, 0, 10, "ohm"),
    OWN_BOARD,
)  # fmt: skip

MOTOR = (
    Key("coils", "list of whole numbers", "Outputs (from 0) of its two coils: normal, reverse.", REQUIRED, 2, 2),
    Key("bank", "name or number", "Its bank, if it is not the junction's."),
    Key("ohm", "number", "Resistance of one coil; else 4.5, or 15 if it ends its own pulse.", None, 1, 40, "ohm"),
    Key("parallel", "whole", "Motors in parallel on this pair of outputs.", 1, 1, 4),
    Key("ends_own_pulse", "yes/no", "End-of-travel contacts open the coil that has done its work.", False),
    Key("rest_ms", "whole", "Shortest time between two pulses of the same coil.", 500, 200, 10_000, "ms"),
    Key("contact", "word", "What sees its position; else none, or `one` if there is one contact input.", None,
        words=wire.CONTACT_KINDS),
    Key("contact_inputs", "list of names or numbers", "`one`: the input closed at reverse. `two`: at reverse, at "
        "normal. `inverse`: closed at reverse, its opposite.", [], 0, 2),
    Key("answer_ms", "whole", "Its contact must answer within this time after the pulse.", 250, 50, 1000, "ms"),
    Key("simulated", "word", "What kind of motor the simulator puts there; else `usual`, or `self_ending` if it ends "
        "its own pulse.", None, words=tuple(motor_kinds())),
    Key("starts", "word", "Where the simulator's motor is at first.", "normal", words=("normal", "reverse")),
)  # fmt: skip

LIE = (
    Key("name", "text", "Name of the lie.", REQUIRED, 1, SHORT_NAME),
    Key("word", "text", "The owner's own words for it; else its name.", None, 1, NAME_MAX),
    Key("motors", "list of texts", "Position of every motor: normal or reverse.", REQUIRED, 1, 4),
    Key("order", "list of whole numbers", "Order of the motors, from 1. Else one is found that passes no forbidden "
        "combination.", None, 1, 4),
    Key("ready_v", "number", "Ready voltage: below it a pulse is refused; else the junction's.", None, 1, 33, "V"),
    Key("pulse_ms", "number", "Pulse at the ready voltage; else the junction's.", None, 5, 65, "ms"),
    Key("full_pulse_ms", "number", "Pulse at full bank; else the junction's.", None, 3, 65, "ms"),
)  # fmt: skip

JUNCTION = (
    Key("name", "text", "The owner's name for it.", REQUIRED, 1, NAME_MAX),
    Key("kind", "word", "Kind of junction.", "turnout", words=wire.JUNCTION_KINDS, refused=REFUSED_MOTORS),
    Key("bank", "name or number", "The bank of its motors.", REQUIRED),
    Key("motors", "tables", "Its motors, usually written inline.", REQUIRED, 1, 4),
    Key("normal", "text", "The owner's words for normal (where no lies are listed); else `normal`.", None, 1, NAME_MAX),
    Key("reverse", "text", "The owner's words for reverse (where no lies are listed); else `reverse`.", None, 1,
        NAME_MAX),
    Key("lie", "tables", "Its lies, each with the positions of the motors (three-way, slip).", None, 2, wire.MOST_LIES),
    Key("together", "yes/no", "All motors are pulsed at once; else true for a crossover only.", None),
    Key("ready_v", "number", "Ready voltage; else 80 % of the full bank (85 % for two motors at once).",
        None, 1, 33, "V"),
    Key("pulse_ms", "number", "Pulse at the ready voltage.", 40.0, 5, 65, "ms"),
    Key("full_pulse_ms", "number", "Pulse at full bank, where that throws too hard; else the same.", None, 3, 65, "ms"),
    Key("retry_v", "number", "Contact silent: once more, this much above the ready voltage; 0 for no.", 0.0, 0, 5, "V"),
    Key("pulses", "whole", "Pulses given every time.", 1, 1, 2),
    Key("forbidden", "any", "Forbidden combinations: at most 8 lists of normal and reverse, one a motor. They do not "
        "occur, not even between two pulses."),
    Key("not_while", "name or number", "Input that refuses its throws while closed."),
)  # fmt: skip

ROUTE = (
    Key("name", "text", "The owner's name for it.", REQUIRED, 1, NAME_MAX),
    Key("throws", "list of texts", "`junction: lie` each, in order.", REQUIRED, 1, wire.MOST_ROUTE_THROWS),
    Key("entrance", "whole", "Number of its entrance button.", None, 0, 63),
    Key("exit", "whole", "Number of its exit button.", None, 0, 63),
)

BUTTON = (
    Key("kind", "word", "What it does.", REQUIRED, words=wire.BUTTON_KINDS),
    Key("input", "name or number", "Its input.", REQUIRED),
    Key("junction", "name or number", "The junction it throws (`set`, `alternate`, `switch`)."),
    Key("lie", "text", "The lie it sets (`set`; of a `switch`: when closed)."),
    Key("other_lie", "text", "The lie that a `switch` sets when open."),
    Key("route", "name or number", "The route it sets (`route`), or that a `rotary` position chooses."),
    Key("number", "whole", "Its number as `entrance` or `exit`.", None, 0, 63),
    Key("read_at_power_up", "yes/no", "A `switch` is read at power-up.", None),
    replace(OWN_BOARD, sentence=OWN_BOARD.sentence + " Needed where its input's name does not tell."),
)

FOLLOWER = (
    Key("kind", "word", "Lamp, frog relay, or relay that makes the frog dead.", REQUIRED, words=wire.FOLLOWER_KINDS),
    Key("output", "name or number", "Its output.", REQUIRED),
    Key("junction", "name or number", "The junction it follows.", REQUIRED),
    Key("lie", "text", "The lie that switches it on (`lamp`, `frog`)."),
    replace(OWN_BOARD, sentence=OWN_BOARD.sentence + " Needed where its output's name does not tell."),
)

# What each kind of button needs; nothing else may be given.
BUTTON_NEEDS: dict[str, tuple[str, ...]] = {
    "set": ("junction", "lie"),
    "alternate": ("junction",),
    "switch": ("junction", "lie", "other_lie"),
    "route": ("route",),
    "entrance": ("number",),
    "exit": ("number",),
    "rotary": ("route",),
    "go": (),
    "stop": (),
    "release": (),
    "clear": (),
}

# (heading of the reference page, what to say about it, its keys)
TABLES: tuple[tuple[str, str, tuple[Key, ...]], ...] = (
    ("The file", "The tables of a layout file.", FILE),
    ("[layout]", "", LAYOUT),
    ("[supply]", "One supply for all banks; two are never joined. 24 V AC is refused: it peaks at 42 V.", SUPPLY),
    ("[board]", "May be left out.", BOARD),
    ("[[board]]", "Several boards work one layout from one file: a table for each. Inputs, outputs, pins and chains "
     "are a board's own: `[board.io]`, `[board.inputs]` and `[board.outputs]` below its `[[board]]` take the place of "
     "`[io]`, `[inputs]` and `[outputs]`. Every bank names its `board`; a junction is where its bank is, with all its "
     "motors. Names of boards, banks, junctions and routes are unique in the file. A route over several boards is run "
     "by the host, throw by throw: no button sets it, and it has no entrance and exit. A button throws only junctions "
     "and routes of its own board, for it works without a host; a follower follows a junction of its own board. "
     "`[supply]` and `[timing]` hold for all boards; limits such as 3 banks and 64 junctions are each board's. "
     "The shipped layout Reedholme shows two boards.", BOARD_OF_SEVERAL),
    ("[timing]", "May be left out.", TIMING),
    ("[io]", "May be left out where nothing is on a chain and all pins are named. Pins 0 to 22 and 26 to 28 can be "
     "used; 26 to 28 are also the ADC inputs 0 to 2.", IO),
    ("[[bank]]", "Banks are numbered in the order of the file. A bank is either on pins that follow each other "
     "(`first_pin`) or on the output chain (`chain_pins`). With `guard = \"none\"` the charge path alone must keep a "
     "coil under 1 W, and its own resistor within its rating, when a driver fails short; else the file is refused.",
     BANK),
    ("[[junction]]", "", JUNCTION),
    ("motors of a [[junction]]", "Outputs are counted from 0 within the bank.", MOTOR),
    ("[[junction.lie]]", "For three-ways and slips, or wherever normal and reverse are not enough.", LIE),
    ("[[route]]", "", ROUTE),
    ("[[button]]", "Each kind needs what its row names, and takes nothing else.", BUTTON),
    ("[[follower]]", "", FOLLOWER),
)  # fmt: skip
