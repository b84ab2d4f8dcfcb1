"""The keys of a layout file, table by table. The reader checks by these; the reference page is made from them."""

from shared_protocol import settings_table as wire
from sim.layout.reading import REQUIRED, Key
from sim.motor import motor_kinds

FILE = (
    Key("layout", "table", "What the layout is called.", REQUIRED),
    Key("supply", "table", "The supply that charges all banks.", REQUIRED),
    Key("board", "table", "The board as a whole."),
    Key("timing", "table", "Timing of the queue, contacts and buttons."),
    Key("io", "table", "Pins of inputs, followers and chains."),
    Key("inputs", "table", "Names of inputs: `name = number`. Everything else may then use the name."),
    Key("outputs", "table", "Names of follower outputs: `name = number`."),
    Key("bank", "tables", "A bank of capacitors.", REQUIRED, 1, wire.MOST_BANKS),
    Key(
        "junction", "tables", "A junction, in the order in which people number them.", REQUIRED, 1, wire.MOST_JUNCTIONS
    ),
    Key("route", "tables", "A route.", None, 0, wire.MOST_ROUTES),
    Key("button", "tables", "A button, switch or stud.", None, 0, wire.MOST_BUTTONS),
    Key("follower", "tables", "An output that follows a junction.", None, 0, wire.MOST_FOLLOWERS),
)

LAYOUT = (Key("name", "text", "What the layout is called.", REQUIRED),)

SUPPLY = (
    Key("kind", "word", "`ac` goes through a bridge; its peak is worked out.", "dc", words=("dc", "ac")),
    Key("volts", "number", "Its voltage: of `ac` the nominal one.", REQUIRED, 9, 30, "V"),
    Key("peak_v", "number", "Highest voltage unloaded; else 5 % above `dc`, 1.2 x 1.414 times `ac`.", None, 9, 40, "V"),
    Key("source_ohm", "number", "Its inner resistance (simulator).", 0.5, 0, 100, "ohm"),
)

BOARD = (
    Key("name", "text", "The owner's name for the board.", "board 1"),
    Key("host_silence_ms", "whole", "Host silent for longer: its throws are cancelled.", 3000, 500, 60_000, "ms"),
    Key("telemetry_ms", "whole", "Time between two telemetry lines of a bank.", 100, 50, 5000, "ms"),
    Key("restore_lies", "yes/no", "At power-up, throw the junctions back to their saved lies.", False),
    Key("route_order", "word", "Which throw of a route goes first when several banks are ready.", "as_listed",
        words=wire.ROUTE_ORDERS),
)  # fmt: skip

TIMING = (
    Key("settle_ms", "whole", "After a pulse, samples are not trusted for this time.", 5, 2, 200, "ms"),
    Key("longest_wait_ms", "whole", "Longest wait of a button's throw, and of a further pulse.", 5000, 0, 60_000, "ms"),
    Key("route_pause_ms", "whole", "Pause between two pulses of a route.", 100, 0, 10_000, "ms"),
    Key("hysteresis_v", "number", "A bank shown as ready is shown so until it falls this far below.", 0.1, 0, 1, "V"),
    Key("button_steady_ms", "whole", "A button counts when steady for this time.", 30, 5, 200, "ms"),
    Key("button_stuck_ms", "whole", "A button held for longer is put out of use.", 10_000, 1000, 60_000, "ms"),
    Key("contact_equal", "whole", "A contact counts after this many equal samples.", 3, 1, 20),
    Key("contact_after_ms", "whole", "A contact counts from this time after its pulse began.", 5, 0, 100, "ms"),
    Key("entrance_exit_ms", "whole", "Longest time between entrance and exit button.", 5000, 500, 60_000, "ms"),
)

IO = (
    Key("input_pins", "list of whole numbers", "Pins of inputs 0, 1, 2 and so on.", [], 0, 20),
    Key("inputs_on_chain", "whole", "Inputs on the input chain, numbered after those on pins.", 0, 0, wire.MOST_INPUTS),
    Key("input_chain_pins", "list of whole numbers", "Its data, clock and load pins.", [], 0, 3),
    Key("output_pins", "list of whole numbers", "Pins of follower outputs 0, 1, 2 and so on.", [], 0, 20),
    Key("outputs_on_chain", "whole", "Follower outputs on the output chain.", 0, 0, wire.MOST_OUTPUTS),
    Key("output_chain_pins", "list of whole numbers", "Data, clock and read-back pins of all output chains.", [], 0, 3),
)

BANK = (
    Key("name", "text", "The owner's name for it.", REQUIRED),
    Key("first_pin", "whole", "First pin of its coils; the others follow. Leave out for a bank on the output chain.",
        None, 0, 29),
    Key("chain_pins", "list of whole numbers", "On the output chain: its latch and output-enable pins.", [], 0, 2),
    Key("coils", "whole", "Number of coil outputs (13 at most on pins).", REQUIRED, 1, wire.COILS_ON_CHAIN),
    Key("adc", "whole", "ADC input of its voltage sense (0 is pin 26).", REQUIRED, 0, 2),
    Key("sense_range_v", "number", "Bank voltage at the highest ADC reading: set by the divider.", 33.0, 5, 40, "V"),
    Key("full_v", "number", "Voltage of the full bank; else that of the supply.", None, 3, 33, "V"),
    Key("gap_ms", "whole", "Shortest time between two pulses of this bank.", 20, 5, 60, "ms"),
    Key("switch", "word", "Which side of the coil the driver switches.", "low", words=wire.SWITCH_SIDES),
    Key("capacitance_uf", "whole", "Capacitance.", 4700, 100, 47_000, "uF"),
    Key("charge", "word", "What charges it.", "resistor", words=wire.CHARGE_KINDS),
    Key("charge_ohm", "number", "Charge resistor.", 47.0, 0.1, 1000, "ohm"),
    Key("limit_ma", "whole", "Current of a limited source; 0 for none.", 0, 0, 5000, "mA"),
    Key("guard", "word", "What protects a coil from a driver failed short.", "none", words=wire.GUARDS),
    Key("resistor_w", "number", "Rating of the charge resistor.", 10.0, 0.1, 200, "W"),
    Key("stall_ms", "whole", "A recharge that takes longer is a fault.", 5000, 200, 60_000, "ms"),
    Key("cut_off_pin", "whole", "Pin of the charge cut-off.", None, 0, 29),
    Key("esr_ohm", "number", "Series resistance of the capacitors (simulator).", 0.05, 0, 5, "ohm"),
    Key("bleed_ohm", "number", "Bleed resistor and leakage together (simulator).", 4700.0, 100, 1e6, "ohm"),
)  # fmt: skip

MOTOR = (
    Key("coils", "list of whole numbers", "Outputs of its two coils: normal, reverse.", REQUIRED, 2, 2),
    Key("bank", "text", "Its bank, if it is not the junction's."),
    Key("ohm", "number", "Resistance of one coil; else 4.5, or 15 if it ends its own pulse.", None, 1, 40, "ohm"),
    Key("parallel", "whole", "Motors in parallel on this pair of outputs.", 1, 1, 4),
    Key("ends_own_pulse", "yes/no", "End-of-travel contacts open the coil that has done its work.", False),
    Key("rest_ms", "whole", "Shortest time between two pulses of the same coil.", 500, 200, 10_000, "ms"),
    Key("contact", "word", "What sees its position.", "none", words=wire.CONTACT_KINDS),
    Key("contact_inputs", "list of texts", "`one`: the input closed at reverse. `two`: at reverse, at normal. "
        "`inverse`: closed at reverse, its opposite.", [], 0, 2),
    Key("answer_ms", "whole", "Its contact must answer within this time after the pulse.", 250, 50, 1000, "ms"),
    Key("simulated", "word", "What kind of motor the simulator puts there.", None, words=tuple(motor_kinds())),
    Key("starts", "word", "Where the simulator's motor is at first.", "normal", words=("normal", "reverse")),
)  # fmt: skip

LIE = (
    Key("name", "text", "Name of the lie.", REQUIRED),
    Key("word", "text", "The owner's own words for it; else its name."),
    Key("motors", "list of texts", "Position of every motor: normal or reverse.", REQUIRED, 1, 4),
    Key("order", "list of whole numbers", "Order of the motors, from 1. Else one is found that passes no forbidden "
        "combination.", None, 1, 4),
    Key("ready_v", "number", "Ready voltage: below it a pulse is refused; else the junction's.", None, 1, 33, "V"),
    Key("pulse_ms", "number", "Pulse at the ready voltage; else the junction's.", None, 5, 65, "ms"),
    Key("full_pulse_ms", "number", "Pulse at full bank; else the junction's.", None, 3, 65, "ms"),
)  # fmt: skip

JUNCTION = (
    Key("name", "text", "The owner's name for it.", REQUIRED),
    Key(
        "kind", "word", "Kind of junction.", "turnout", words=(*wire.JUNCTION_KINDS, "two_wire", "slow_motor", "servo")
    ),
    Key("bank", "text", "The bank of its motors.", REQUIRED),
    Key("motors", "tables", "Its motors.", REQUIRED, 1, 4),
    Key("normal", "text", "The owner's words for normal (turnout, crossover).", "normal"),
    Key("reverse", "text", "The owner's words for reverse (turnout, crossover).", "reverse"),
    Key("lie", "tables", "Its lies, each with the positions of the motors (three-way, slip).", None, 2, wire.MOST_LIES),
    Key("together", "yes/no", "All motors are pulsed at once; else true for a crossover.", None),
    Key(
        "ready_v",
        "number",
        "Ready voltage; else 80 % of the full bank (85 % for two motors at once).",
        None,
        1,
        33,
        "V",
    ),
    Key("pulse_ms", "number", "Pulse at the ready voltage.", 40.0, 5, 65, "ms"),
    Key("full_pulse_ms", "number", "Pulse at full bank, where that throws too hard; else the same.", None, 3, 65, "ms"),
    Key("retry_v", "number", "Contact silent: once more, this much above the ready voltage; 0 for no.", 0.0, 0, 5, "V"),
    Key("pulses", "whole", "Pulses given every time.", 1, 1, 2),
    Key("forbidden", "any", "Forbidden combinations: lists of normal and reverse, one a motor."),
    Key("not_while", "text", "Input that refuses its throws while closed."),
)

ROUTE = (
    Key("name", "text", "The owner's name for it.", REQUIRED),
    Key("throws", "list of texts", "`junction: lie` each, in order.", REQUIRED, 1, wire.MOST_ROUTE_THROWS),
    Key("entrance", "whole", "Number of its entrance button.", None, 0, 63),
    Key("exit", "whole", "Number of its exit button.", None, 0, 63),
)

BUTTON = (
    Key("kind", "word", "What it does.", REQUIRED, words=wire.BUTTON_KINDS),
    Key("input", "text", "Its input, by name or number.", REQUIRED),
    Key("junction", "text", "The junction it throws."),
    Key("lie", "text", "The lie it sets (of a switch: when closed)."),
    Key("other_lie", "text", "The lie that a switch sets when open."),
    Key("route", "text", "The route it sets, or that a rotary position chooses."),
    Key("number", "whole", "Its number as entrance or exit.", None, 0, 63),
    Key("read_at_power_up", "yes/no", "A switch is read at power-up.", False),
)

FOLLOWER = (
    Key("kind", "word", "Lamp, frog relay, or relay that makes the frog dead.", REQUIRED, words=wire.FOLLOWER_KINDS),
    Key("output", "text", "Its output, by name or number.", REQUIRED),
    Key("junction", "text", "The junction it follows.", REQUIRED),
    Key("lie", "text", "The lie that switches it on (not for dead_frog)."),
)

TABLES: dict[str, tuple[Key, ...]] = {
    "(the file)": FILE,
    "[layout]": LAYOUT,
    "[supply]": SUPPLY,
    "[board]": BOARD,
    "[timing]": TIMING,
    "[io]": IO,
    "[[bank]]": BANK,
    "[[junction]]": JUNCTION,
    "motors of a [[junction]]": MOTOR,
    "[[junction.lie]]": LIE,
    "[[route]]": ROUTE,
    "[[button]]": BUTTON,
    "[[follower]]": FOLLOWER,
}
