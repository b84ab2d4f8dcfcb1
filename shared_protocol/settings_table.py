"""The table of settings: every record that makes up what a board knows about its layout.

A record is a line on the wire and a line in a settings slot. Records of a kind are numbered from 0 without gaps.
Range, unit and sentence here make the tuning form, the board's own check and the reference page.
"""

from shared_protocol.fields import Message, name, numbers, whole, word

NO_YES = ("no", "yes")
ROUTE_ORDERS = ("as_listed", "fullest", "number")
AS_LISTED, FULLEST, BY_NUMBER = 0, 1, 2
CHARGE_KINDS = ("resistor", "switched", "limited")
RESISTOR, SWITCHED, LIMITED = 0, 1, 2
GUARDS = ("none", "cutoff", "ptc", "fuse")
GUARD_NONE, GUARD_CUTOFF = 0, 1
SWITCH_SIDES = ("low", "high")
CONTACT_KINDS = ("none", "one", "two", "inverse")
CONTACT_NONE, CONTACT_ONE, CONTACT_TWO, CONTACT_INVERSE = 0, 1, 2, 3
JUNCTION_KINDS = ("turnout", "crossover", "three_way", "slip")
TURNOUT, CROSSOVER, THREE_WAY, SLIP = 0, 1, 2, 3
BUTTON_KINDS = (
    "set",
    "alternate",
    "switch",
    "route",
    "entrance",
    "exit",
    "rotary",
    "go",
    "stop",
    "release",
    "clear",
)
(
    BUTTON_SET,
    BUTTON_ALTERNATE,
    BUTTON_SWITCH,
    BUTTON_ROUTE,
    BUTTON_ENTRANCE,
    BUTTON_EXIT,
    BUTTON_ROTARY,
    BUTTON_GO,
    BUTTON_STOP,
    BUTTON_RELEASE,
    BUTTON_CLEAR,
) = range(11)
FOLLOWER_KINDS = ("lamp", "frog", "dead_frog")
LAMP, FROG, DEAD_FROG = 0, 1, 2

MOST_BANKS = 3
MOST_MOTORS = 96
MOST_JUNCTIONS = 64
MOST_LIES = 6
MOST_ROUTES = 32
MOST_ROUTE_THROWS = 16
MOST_BUTTONS = 96
MOST_FOLLOWERS = 48
MOST_INPUTS = 48
MOST_OUTPUTS = 48
COILS_ON_PINS = 13
COILS_ON_CHAIN = 48
GROUP_COILS = 24

SET_BOARD = Message(
    "set_board",
    (
        name("name", "The owner's name for the board."),
        whole(
            "silence_ms",
            500,
            60_000,
            "ms",
            "Host silent for longer: its throws not yet fired are cancelled.",
            3000,
        ),
        whole("tell_ms", 50, 5000, "ms", "Time between two telemetry lines of a bank.", 100),
        word("restore", NO_YES, "Set the junctions at power-up as they lay when they were last saved.", 0),
        word("order", ROUTE_ORDERS, "Which throw of a route goes first when several banks are ready.", 0),
    ),
    "The board.",
)
SET_TIMING = Message(
    "set_timing",
    (
        whole("settle_ms", 2, 200, "ms", "After a pulse, samples are not trusted for this time.", 5),
        whole(
            "wait_ms",
            0,
            60_000,
            "ms",
            "Longest wait of a throw asked for by button, and of a second pulse.",
            5000,
        ),
        whole("pause_ms", 0, 10_000, "ms", "Pause between two pulses of a route.", 100),
        whole(
            "hysteresis_mv",
            0,
            1000,
            "mV",
            "A bank shown as ready is shown so until it falls this far below.",
            100,
        ),
        whole("steady_ms", 5, 200, "ms", "A button counts when steady for this time.", 30),
        whole("stuck_ms", 1000, 60_000, "ms", "A button held for longer is put out of use.", 10_000),
        whole("equal", 1, 20, "", "A contact counts after this many equal samples, a millisecond apart.", 3),
        whole("after_ms", 0, 100, "ms", "A contact counts from this time after its pulse began.", 5),
        whole("pair_ms", 500, 60_000, "ms", "Longest time between entrance and exit button.", 5000),
    ),
    "Timing of the queue, contacts and buttons.",
)
SET_IO = Message(
    "set_io",
    (
        numbers("inputs", 0, 29, 20, "Pins of the inputs wired to pins; they are inputs 0, 1, 2 and so on."),
        whole(
            "in_chain",
            0,
            MOST_INPUTS,
            "",
            "Inputs on the input chain; they are numbered after those on pins.",
            0,
        ),
        numbers("in_pins", 0, 29, 3, "Pins of the input chain: data, clock, load."),
        numbers("outputs", 0, 29, 20, "Pins of the follower outputs wired to pins."),
        whole("out_chain", 0, MOST_OUTPUTS, "", "Follower outputs on the output chain.", 0),
        numbers("out_pins", 0, 29, 3, "Pins that all output chains share: data, clock, read-back."),
    ),
    "Pins of inputs and followers, and of the chains.",
)
SET_BANK = Message(
    "set_bank",
    (
        whole("i", 0, MOST_BANKS - 1, "", "Number of the bank."),
        name("name", "The owner's name for the bank.", 16),
        whole("pin", -1, 29, "", "First pin of its coils, the others follow; -1: on the output chain."),
        whole("coils", 1, COILS_ON_CHAIN, "", "Number of coil outputs."),
        numbers("chain", 0, 29, 2, "Pins of its part of the output chain: latch, output enable."),
        whole("adc", 0, 2, "", "ADC input of its voltage sense (0: pin 26)."),
        whole("range_mv", 5000, 40_000, "mV", "Bank voltage at the highest ADC reading.", 33_000),
        whole("zero_mv", -1000, 1000, "mV", "Added to every reading: what the sense reads too little at 0 V.", 0),
        whole("full_mv", 3000, 33_000, "mV", "Voltage of the full bank."),
        whole("peak_mv", 3000, 40_000, "mV", "Highest voltage that the supply can give, unloaded."),
        whole("gap_ms", 5, 60, "ms", "Shortest time between two pulses of this bank.", 20),
        word("switch", SWITCH_SIDES, "Which side of the coil the driver switches.", 0),
    ),
    "A bank.",
)
SET_CHARGE = Message(
    "set_charge",
    (
        whole("i", 0, MOST_BANKS - 1, "", "Number of the bank."),
        word("kind", CHARGE_KINDS, "What charges the bank.", 0),
        whole("cap_uf", 100, 47_000, "uF", "Capacitance.", 4700),
        whole("charge_dohm", 1, 10_000, "0.1 ohm", "Charge resistance.", 470),
        whole("limit_ma", 0, 5000, "mA", "Current of a limited source; 0 for none.", 0),
        word("guard", GUARDS, "What protects the coil from a driver failed short.", 0),
        whole("rated_mw", 100, 200_000, "mW", "Rating of the charge resistor.", 5000),
        whole("stall_ms", 200, 60_000, "ms", "A recharge that takes longer is a fault.", 5000),
        whole("cut_pin", -1, 29, "", "Pin of the charge cut-off; -1 for none."),
    ),
    "The charge path of a bank.",
)
SET_MOTOR = Message(
    "set_motor",
    (
        whole("i", 0, MOST_MOTORS - 1, "", "Number of the motor."),
        whole("bank", 0, MOST_BANKS - 1, "", "Its bank."),
        whole("normal", 0, COILS_ON_CHAIN - 1, "", "Output of the coil that pulls it to normal."),
        whole("reverse", 0, COILS_ON_CHAIN - 1, "", "Output of the coil that pulls it to reverse."),
        whole("coil_cohm", 100, 4000, "0.01 ohm", "Resistance of one coil of one motor.", 450),
        whole("parallel", 1, 4, "", "Motors in parallel on this pair of outputs.", 1),
        word("ends", NO_YES, "The motor ends its own pulse.", 0),
        whole("rest_ms", 200, 10_000, "ms", "Shortest time between two pulses of the same coil.", 500),
        word("contact", CONTACT_KINDS, "What sees its position.", 0),
        whole("c1", -1, MOST_INPUTS - 1, "", "Input of the contact that closes at reverse; -1 for none."),
        whole("c2", -1, MOST_INPUTS - 1, "", "Input of the contact at normal, or of the inverse; -1 for none."),
        whole("answer_ms", 50, 1000, "ms", "Its contact must answer within this time after the pulse.", 250),
    ),
    "A motor.",
)
SET_JUNCTION = Message(
    "set_junction",
    (
        whole("i", 0, MOST_JUNCTIONS - 1, "", "Number of the junction."),
        name("name", "The owner's name for the junction."),
        word("kind", JUNCTION_KINDS, "Kind of junction."),
        numbers("motors", 0, MOST_MOTORS - 1, 4, "Its motors."),
        numbers("forbid", 0, 15, 8, "Forbidden combinations: bit n is set if its motor n is at reverse."),
        whole(
            "retry_mv",
            0,
            5000,
            "mV",
            "If its contact does not answer: once more, at this much above; 0 for no.",
            0,
        ),
        whole("pulses", 1, 2, "", "Pulses given every time (two: for a motor that nothing can see).", 1),
        whole("bar", -1, MOST_INPUTS - 1, "", "Input that refuses its throws while closed; -1 for none."),
    ),
    "A junction.",
)
SET_LIE = Message(
    "set_lie",
    (
        whole("j", 0, MOST_JUNCTIONS - 1, "", "Number of its junction."),
        whole("i", 0, MOST_LIES - 1, "", "Number of the lie within its junction."),
        name("name", "Name of the lie.", 16, 1),
        name("word", "The owner's own words for it."),
        whole("at", 0, 15, "", "Positions of the motors: bit n is set if its motor n is at reverse."),
        numbers("order", 0, 3, 4, "Order in which its motors are pulsed."),
        word("together", NO_YES, "All its motors are pulsed at once.", 0),
        whole("ready_mv", 1000, 33_000, "mV", "Ready voltage: below it a pulse is refused."),
        whole("pulse_us", 5000, 65_000, "us", "Pulse at the ready voltage.", 40_000),
        whole(
            "full_us",
            3000,
            65_000,
            "us",
            "Pulse at full bank: shorter for a motor that full bank throws too hard.",
            40_000,
        ),
    ),
    "One lie of a junction.",
)
SET_ROUTE = Message(
    "set_route",
    (
        whole("i", 0, MOST_ROUTES - 1, "", "Number of the route."),
        name("name", "The owner's name for the route."),
        whole("entrance", -1, 63, "", "Number of its entrance button; -1 for none."),
        whole("exit", -1, 63, "", "Number of its exit button; -1 for none."),
        numbers("throws", 0, 63, 2 * MOST_ROUTE_THROWS, "Junction and lie of each throw, in order."),
    ),
    "A route.",
)
SET_BUTTON = Message(
    "set_button",
    (
        whole("i", 0, MOST_BUTTONS - 1, "", "Number of the button."),
        word("kind", BUTTON_KINDS, "What it does."),
        whole("input", 0, MOST_INPUTS - 1, "", "Its input."),
        whole("j", -1, MOST_JUNCTIONS - 1, "", "Junction it throws; -1 for none."),
        whole("lie", -1, MOST_LIES - 1, "", "Lie it sets (of a switch: when closed); -1 for none."),
        whole("other", -1, MOST_LIES - 1, "", "Lie that a switch sets when open; -1 for none."),
        whole("n", -1, 63, "", "Its route, or its number as entrance or exit; -1 for none."),
        word("read", NO_YES, "A switch is read at power-up.", 0),
    ),
    "A button, switch or stud on the panel.",
)
SET_FOLLOWER = Message(
    "set_follower",
    (
        whole("i", 0, MOST_FOLLOWERS - 1, "", "Number of the follower."),
        word("kind", FOLLOWER_KINDS, "Lamp, frog relay, or relay that makes the frog dead."),
        whole("output", 0, MOST_OUTPUTS - 1, "", "Its output."),
        whole("j", 0, MOST_JUNCTIONS - 1, "", "The junction it follows."),
        whole("lie", 0, MOST_LIES - 1, "", "The lie that switches it on.", 0),
    ),
    "An output that follows a junction.",
)

SETTINGS = (
    SET_BOARD,
    SET_TIMING,
    SET_IO,
    SET_BANK,
    SET_CHARGE,
    SET_MOTOR,
    SET_JUNCTION,
    SET_LIE,
    SET_ROUTE,
    SET_BUTTON,
    SET_FOLLOWER,
)
