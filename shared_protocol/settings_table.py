"""The table of settings: every record that makes up what a board knows about its layout.

A record is a line on the wire and a line in a settings slot. Records of a kind are numbered from 0 without gaps.
Range, unit and sentence here make the tuning form, the board's own check and the reference page.

What each is for and what its fields mean stands here (key [unit]: sentence): a board's compiler drops this text, and
`sentences` reads it for everybody else.

set_board: The board.
    name: The owner's name for the board.
    silence_ms [ms]: Host silent for longer: its throws not yet fired are cancelled.
    tell_ms [ms]: Time between two telemetry lines of a bank.
    restore: Set the junctions at power-up as they lay when they were last saved.
    order: Which throw of a route goes first when several banks are ready.
set_timing: Timing of the queue, contacts and buttons.
    settle_ms [ms]: After a pulse, samples are not trusted for this time.
    wait_ms [ms]: Longest wait of a throw asked for by button, and of a second pulse.
    pause_ms [ms]: Pause between two pulses of a route.
    hysteresis_mv [mV]: A bank shown as ready is shown so until it falls this far below.
    steady_ms [ms]: A button counts when steady for this time.
    stuck_ms [ms]: A button held for longer is put out of use.
    equal: A contact counts after this many equal samples, a millisecond apart.
    after_ms [ms]: A contact counts from this time after its pulse began.
    pair_ms [ms]: Longest time between entrance and exit button.
set_io: Pins of inputs and followers, and of the chains.
    inputs: Pins of the inputs wired to pins; they are inputs 0, 1, 2 and so on.
    in_chain: Inputs on the input chain; they are numbered after those on pins.
    in_pins: Pins of the input chain: data, clock, load.
    outputs: Pins of the follower outputs wired to pins.
    out_chain: Follower outputs on the output chain.
    out_pins: Pins that all output chains share: data, clock, read-back.
set_bank: A bank.
    i: Number of the bank.
    name: The owner's name for the bank.
    pin: First pin of its coils, the others follow; -1: on the output chain.
    coils: Number of coil outputs.
    chain: Pins of its part of the output chain: latch, output enable.
    adc: ADC input of its voltage sense (0: pin 26).
    range_mv [mV]: Bank voltage at the highest ADC reading.
    zero_mv [mV]: Added to every reading: what the sense reads too little at 0 V.
    full_mv [mV]: Voltage of the full bank.
    peak_mv [mV]: Highest voltage that the supply can give, unloaded.
    gap_ms [ms]: Shortest time between two pulses of this bank.
    switch: Which side of the coil the driver switches.
set_charge: The charge path of a bank.
    i: Number of the bank.
    kind: What charges the bank.
    cap_uf [uF]: Capacitance.
    charge_dohm [0.1 ohm]: Charge resistance.
    limit_ma [mA]: Current of a limited source; 0 for none.
    guard: What protects the coil from a driver failed short.
    rated_mw [mW]: Rating of the charge resistor.
    stall_ms [ms]: A recharge that takes longer is a fault.
    cut_pin: Pin of the charge cut-off; -1 for none.
set_motor: A motor.
    i: Number of the motor.
    bank: Its bank.
    normal: Output of the coil that pulls it to normal.
    reverse: Output of the coil that pulls it to reverse.
    coil_cohm [0.01 ohm]: Resistance of one coil of one motor.
    parallel: Motors in parallel on this pair of outputs.
    ends: The motor ends its own pulse.
    rest_ms [ms]: Shortest time between two pulses of the same coil.
    contact: What sees its position.
    c1: Input of the contact that closes at reverse; -1 for none.
    c2: Input of the contact at normal, or of the inverse; -1 for none.
    answer_ms [ms]: Its contact must answer within this time after the pulse.
set_junction: A junction.
    i: Number of the junction.
    name: The owner's name for the junction.
    kind: Kind of junction.
    motors: Its motors.
    forbid: Forbidden combinations: bit n is set if its motor n is at reverse.
    retry_mv [mV]: If its contact does not answer: once more, at this much above; 0 for no.
    pulses: Pulses given every time (two: for a motor that nothing can see).
    bar: Input that refuses its throws while closed; -1 for none.
set_lie: One lie of a junction.
    j: Number of its junction.
    i: Number of the lie within its junction.
    name: Name of the lie.
    word: The owner's own words for it.
    at: Positions of the motors: bit n is set if its motor n is at reverse.
    order: Order in which its motors are pulsed.
    together: All its motors are pulsed at once.
    ready_mv [mV]: Ready voltage: below it a pulse is refused.
    pulse_us [us]: Pulse at the ready voltage.
    full_us [us]: Pulse at full bank: shorter for a motor that full bank throws too hard.
set_route: A route.
    i: Number of the route.
    name: The owner's name for the route.
    entrance: Number of its entrance button; -1 for none.
    exit: Number of its exit button; -1 for none.
    throws: Junction and lie of each throw, in order.
set_button: A button, switch or stud on the panel.
    i: Number of the button.
    kind: What it does.
    input: Its input.
    j: Junction it throws; -1 for none.
    lie: Lie it sets (of a switch: when closed); -1 for none.
    other: Lie that a switch sets when open; -1 for none.
    n: Its route, or its number as entrance or exit; -1 for none.
    read: A switch is read at power-up.
set_follower: An output that follows a junction.
    i: Number of the follower.
    kind: Lamp, frog relay, or relay that makes the frog dead.
    output: Its output.
    j: The junction it follows.
    lie: The lie that switches it on.
"""

from shared_protocol.fields import Message, explain, name, numbers, whole, word

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
        name("name"),
        whole(
            "silence_ms",
            500,
            60_000,
            3000,
        ),
        whole("tell_ms", 50, 5000, 100),
        word("restore", NO_YES, 0),
        word("order", ROUTE_ORDERS, 0),
    ),
)
SET_TIMING = Message(
    "set_timing",
    (
        whole("settle_ms", 2, 200, 5),
        whole(
            "wait_ms",
            0,
            60_000,
            5000,
        ),
        whole("pause_ms", 0, 10_000, 100),
        whole(
            "hysteresis_mv",
            0,
            1000,
            100,
        ),
        whole("steady_ms", 5, 200, 30),
        whole("stuck_ms", 1000, 60_000, 10_000),
        whole("equal", 1, 20, 3),
        whole("after_ms", 0, 100, 5),
        whole("pair_ms", 500, 60_000, 5000),
    ),
)
SET_IO = Message(
    "set_io",
    (
        numbers("inputs", 0, 29, 20),
        whole(
            "in_chain",
            0,
            MOST_INPUTS,
            0,
        ),
        numbers("in_pins", 0, 29, 3),
        numbers("outputs", 0, 29, 20),
        whole("out_chain", 0, MOST_OUTPUTS, 0),
        numbers("out_pins", 0, 29, 3),
    ),
)
SET_BANK = Message(
    "set_bank",
    (
        whole("i", 0, MOST_BANKS - 1),
        name("name", 16),
        whole("pin", -1, 29),
        whole("coils", 1, COILS_ON_CHAIN),
        numbers("chain", 0, 29, 2),
        whole("adc", 0, 2),
        whole("range_mv", 5000, 40_000, 33_000),
        whole("zero_mv", -1000, 1000, 0),
        whole("full_mv", 3000, 33_000),
        whole("peak_mv", 3000, 40_000),
        whole("gap_ms", 5, 60, 20),
        word("switch", SWITCH_SIDES, 0),
    ),
)
SET_CHARGE = Message(
    "set_charge",
    (
        whole("i", 0, MOST_BANKS - 1),
        word("kind", CHARGE_KINDS, 0),
        whole("cap_uf", 100, 47_000, 4700),
        whole("charge_dohm", 1, 10_000, 470),
        whole("limit_ma", 0, 5000, 0),
        word("guard", GUARDS, 0),
        whole("rated_mw", 100, 200_000, 5000),
        whole("stall_ms", 200, 60_000, 5000),
        whole("cut_pin", -1, 29),
    ),
)
SET_MOTOR = Message(
    "set_motor",
    (
        whole("i", 0, MOST_MOTORS - 1),
        whole("bank", 0, MOST_BANKS - 1),
        whole("normal", 0, COILS_ON_CHAIN - 1),
        whole("reverse", 0, COILS_ON_CHAIN - 1),
        whole("coil_cohm", 100, 4000, 450),
        whole("parallel", 1, 4, 1),
        word("ends", NO_YES, 0),
        whole("rest_ms", 200, 10_000, 500),
        word("contact", CONTACT_KINDS, 0),
        whole("c1", -1, MOST_INPUTS - 1),
        whole("c2", -1, MOST_INPUTS - 1),
        whole("answer_ms", 50, 1000, 250),
    ),
)
SET_JUNCTION = Message(
    "set_junction",
    (
        whole("i", 0, MOST_JUNCTIONS - 1),
        name("name"),
        word("kind", JUNCTION_KINDS),
        numbers("motors", 0, MOST_MOTORS - 1, 4),
        numbers("forbid", 0, 15, 8),
        whole(
            "retry_mv",
            0,
            5000,
            0,
        ),
        whole("pulses", 1, 2, 1),
        whole("bar", -1, MOST_INPUTS - 1),
    ),
)
SET_LIE = Message(
    "set_lie",
    (
        whole("j", 0, MOST_JUNCTIONS - 1),
        whole("i", 0, MOST_LIES - 1),
        name("name", 16, 1),
        name("word"),
        whole("at", 0, 15),
        numbers("order", 0, 3, 4),
        word("together", NO_YES, 0),
        whole("ready_mv", 1000, 33_000),
        whole("pulse_us", 5000, 65_000, 40_000),
        whole(
            "full_us",
            3000,
            65_000,
            40_000,
        ),
    ),
)
SET_ROUTE = Message(
    "set_route",
    (
        whole("i", 0, MOST_ROUTES - 1),
        name("name"),
        whole("entrance", -1, 63),
        whole("exit", -1, 63),
        numbers("throws", 0, 63, 2 * MOST_ROUTE_THROWS),
    ),
)
SET_BUTTON = Message(
    "set_button",
    (
        whole("i", 0, MOST_BUTTONS - 1),
        word("kind", BUTTON_KINDS),
        whole("input", 0, MOST_INPUTS - 1),
        whole("j", -1, MOST_JUNCTIONS - 1),
        whole("lie", -1, MOST_LIES - 1),
        whole("other", -1, MOST_LIES - 1),
        whole("n", -1, 63),
        word("read", NO_YES, 0),
    ),
)
SET_FOLLOWER = Message(
    "set_follower",
    (
        whole("i", 0, MOST_FOLLOWERS - 1),
        word("kind", FOLLOWER_KINDS),
        whole("output", 0, MOST_OUTPUTS - 1),
        whole("j", 0, MOST_JUNCTIONS - 1),
        whole("lie", 0, MOST_LIES - 1, 0),
    ),
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

explain(globals().get("__doc__"), SETTINGS)
