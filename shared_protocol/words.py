"""The fixed words of the wire: outcomes, reasons, faults, states; with what they mean and what to do.

Each word is sent as ASCII and kept in memory as its index. The numbers are never reused.

What happened and what to do (of a fault also: its first and its second evidence) stands here, divided by bars: a
board's compiler drops this text, and `sentences` reads it for everybody else. {i} is the number of the bank, motor or input
concerned, {ms} a time.

reason:
    seen: a contact saw it arrive
    sent: the pulse was given; nothing can see the points | look at the points
    arrived: the motor ended its own pulse
    already: a contact sees that it lies so already
    below_ready: the bank is below the ready voltage | wait {ms} ms
    resting: the coil has not rested | wait {ms} ms
    gap: a pulse of this bank has only just ended | wait {ms} ms
    pulse_running: a pulse of this bank is running | wait {ms} ms
    stale: there is no fresh reading of the bank's voltage | wait {ms} ms; if it stays, look at the sense wire
    queued_ahead: other throws of this bank come first | wait {ms} ms
    bank_out: the bank is out of use | mend the fault, then clear it
    junction_out: the junction is out of use | move it by hand; mend the fault, then clear it
    stop: the operator's stop is on | release
    not_while: an input forbids it | free input {i}
    queue_full: the queue is full | wait, or cancel what is not needed
    board_restarted: the board has restarted since | look at the lies, then ask again
    no_such_junction: there is no such junction | compare the layout file with the board's settings
    no_such_lie: the junction has no such lie | compare the layout file with the board's settings
    no_such_route: there is no such route | compare the layout file with the board's settings
    old_id: the request is older than what the board remembers | ask again with a new number
    longest_wait: its time ran out before the bank was ready | see why the bank is slow, or allow a longer wait
    operator: the operator cancelled it
    host_lost: the host fell silent | reconnect, look at the lies, then ask again
    route_failed: an earlier throw of the route did not end well | mend that one, then set the route again
    leaving: the firmware was told to leave | start the firmware again
    no_contact: its contact did not answer in time | look at the points: half over, jammed, or the contact
    one_of_two: one of two motors did not arrive |
        the bank may be too small for two at once: raise its voltage or capacitance
    no_drop: the bank did not drop as a coil would make it | look for an open coil, wire or driver
    kept_on: the motor did not end its own pulse | look for a jam, or a worn end contact
    contacts_disagree: its two contacts say different things | look at the contacts and their wires
    held_down: the bank is held down: a driver is stuck on or a coil is shorted |
        switch the supply off now; find the hot coil
    forbidden: the motors would pass a forbidden combination | throw the junction by hand to a plain lie first
    settings_coming: new settings are arriving | wait until they are in
    no_settings: the board has no settings | send it a layout
    busy: throws are waiting or running | wait until the queue is empty
    not_out: nothing is out there
    no_such_throw: no such throw is waiting
    ok: taken
    wrong_count: not as many records came as were announced | send the settings again
    wrong_crc: the settings changed on the way | send the settings again
    flash: the board could not write its settings | look at the board; send the settings again
    out_of_range: a value is outside its range | correct the value
    missing: a record is missing | correct the layout file
    twice: the same thing is said twice | remove one
    no_such_bank: it names a bank that is not there | correct the bank
    no_such_motor: it names a motor that is not there | correct the motor
    no_such_coil: the bank has no such output | correct the output
    no_such_input: the board has no such input | correct the input
    no_such_output: the board has no such follower output | correct the output
    same_coil: two coils share one output | give each coil an output of its own
    same_pin: one pin has two uses | give each use a pin of its own
    same_input: one input has two uses | give each use an input of its own
    pin_not_usable: that pin can't be used for this | choose another pin
    never_reached: the supply can never bring the bank to this ready voltage |
        lower the ready voltage or raise the supply
    over_range: the supply can give more than the board can measure | lower the supply or change the divider
    stuck_driver_burns: a driver failed short would burn the coil or the resistor |
        larger resistor, or a cut-off, PTC or fuse
    full_pulse_longer: the pulse at full bank is longer than the pulse at ready voltage | make it shorter or equal
    motor_twice: a motor belongs to two junctions | give it to one
    motor_unused: a motor belongs to no junction | give it to a junction or remove it
    same_lie: two lies of a junction set its motors alike | make them differ
    too_few_lies: a junction needs at least two lies | add the missing lie
    wrong_motors: the kind of junction takes another number of motors | correct the kind or its motors
    bad_order: the order does not name each motor once | correct the order
    lie_forbidden: a lie sets a forbidden combination | correct the lie or the combination
    forbidden_in_passing: from some lie its motors would pass a forbidden combination | change the order of the motors
    not_together: motors pulsed together must be on one bank and one run of outputs |
        move them, or pulse them one after another
    contact_inputs: the kind of contact takes another number of inputs | correct the contact
    too_many: there are more than the board can hold | use a second board
    bad_route: a route names a junction twice or has no throws | correct the route
    bad_button: the button's target does not fit its kind | correct the button
    wrong_place: records must be numbered from 0 without gaps | number them again
    not_a_setting: that is not a setting | remove it
fault:
    none: no fault
    recharge_stalled: the bank does not recharge as it should |
        look at the charge resistor, its joints, and for leakage | mV reached | ms waited
    supply_missing: nothing charges the bank | look at the supply, its fuse and its plug | mV now | mV before
    no_drop: the bank did not drop: coil or wire open | move it by hand; look at the coil, its wire, plug and driver |
        mV dropped | mV expected
    held_down: the bank is held down: driver stuck on, or coil shorted |
        switch the supply off now; find the hot coil; change the driver | mV now | mV before
    sense_range: the voltage reading is not possible | look at the divider, its joints and the sense wire | mV read |
        mV possible
    contacts_disagree: two contacts of a motor say different things | look at the contacts and their wires |
        contact 1 | contact 2
    button_stuck: a button is held too long | free the button; look at its wire | input | ms held
"""

OUTCOMES = ("done", "refused", "expired", "cancelled", "failed")
DONE, REFUSED, EXPIRED, CANCELLED, FAILED = 0, 1, 2, 3, 4

SOURCES = ("none", "sent", "seen")
SOURCE_NONE, SENT, SEEN = 0, 1, 2

SCOPES = ("bank", "junction", "button", "all")
SCOPE_BANK, SCOPE_JUNCTION, SCOPE_BUTTON, SCOPE_ALL = 0, 1, 2, 3

BANK_STATES = ("charging", "ready", "pulse", "settling", "stale", "out", "cut_off")
BANK_CHARGING, BANK_READY, BANK_PULSE, BANK_SETTLING, BANK_STALE, BANK_OUT, BANK_CUT_OFF = 0, 1, 2, 3, 4, 5, 6

THROW_STATES = ("waiting", "pulse", "answer")
THROW_WAITING, THROW_PULSE, THROW_ANSWER = 0, 1, 2

ORIGINS = ("host", "button", "power_up")
FROM_HOST, FROM_BUTTON, FROM_POWER_UP = 0, 1, 2

REASONS = (
    "seen",
    "sent",
    "arrived",
    "already",
    "below_ready",
    "resting",
    "gap",
    "pulse_running",
    "stale",
    "queued_ahead",
    "bank_out",
    "junction_out",
    "stop",
    "not_while",
    "queue_full",
    "board_restarted",
    "no_such_junction",
    "no_such_lie",
    "no_such_route",
    "old_id",
    "longest_wait",
    "operator",
    "host_lost",
    "route_failed",
    "leaving",
    "no_contact",
    "one_of_two",
    "no_drop",
    "kept_on",
    "contacts_disagree",
    "held_down",
    "forbidden",
    "settings_coming",
    "no_settings",
    "busy",
    "not_out",
    "no_such_throw",
    "ok",
    "wrong_count",
    "wrong_crc",
    "flash",
    "out_of_range",
    "missing",
    "twice",
    "no_such_bank",
    "no_such_motor",
    "no_such_coil",
    "no_such_input",
    "no_such_output",
    "same_coil",
    "same_pin",
    "same_input",
    "pin_not_usable",
    "never_reached",
    "over_range",
    "stuck_driver_burns",
    "full_pulse_longer",
    "motor_twice",
    "motor_unused",
    "same_lie",
    "too_few_lies",
    "wrong_motors",
    "bad_order",
    "lie_forbidden",
    "forbidden_in_passing",
    "not_together",
    "contact_inputs",
    "too_many",
    "bad_route",
    "bad_button",
    "wrong_place",
    "not_a_setting",
)

# Why a board started.
CAUSES = ("power", "watchdog", "brown_out", "request", "crash", "unknown")

# The number of a fault (from 1) is its blink code.
FAULTS = (
    "none",
    "recharge_stalled",
    "supply_missing",
    "no_drop",
    "held_down",
    "sense_range",
    "contacts_disagree",
    "button_stuck",
)

RECHARGE_STALLED = 1
SUPPLY_MISSING = 2
NO_DROP = 3
HELD_DOWN = 4
SENSE_RANGE = 5
CONTACTS_DISAGREE = 6
BUTTON_STUCK = 7

WHY_SEEN = REASONS.index("seen")
WHY_SENT = REASONS.index("sent")
WHY_ARRIVED = REASONS.index("arrived")
WHY_ALREADY = REASONS.index("already")
WHY_BELOW_READY = REASONS.index("below_ready")
WHY_RESTING = REASONS.index("resting")
WHY_GAP = REASONS.index("gap")
WHY_PULSE_RUNNING = REASONS.index("pulse_running")
WHY_STALE = REASONS.index("stale")
WHY_QUEUED_AHEAD = REASONS.index("queued_ahead")
WHY_BANK_OUT = REASONS.index("bank_out")
WHY_JUNCTION_OUT = REASONS.index("junction_out")
WHY_STOP = REASONS.index("stop")
WHY_NOT_WHILE = REASONS.index("not_while")
WHY_QUEUE_FULL = REASONS.index("queue_full")
WHY_BOARD_RESTARTED = REASONS.index("board_restarted")
WHY_NO_SUCH_JUNCTION = REASONS.index("no_such_junction")
WHY_NO_SUCH_LIE = REASONS.index("no_such_lie")
WHY_NO_SUCH_ROUTE = REASONS.index("no_such_route")
WHY_OLD_ID = REASONS.index("old_id")
WHY_LONGEST_WAIT = REASONS.index("longest_wait")
WHY_OPERATOR = REASONS.index("operator")
WHY_HOST_LOST = REASONS.index("host_lost")
WHY_ROUTE_FAILED = REASONS.index("route_failed")
WHY_LEAVING = REASONS.index("leaving")
WHY_NO_CONTACT = REASONS.index("no_contact")
WHY_ONE_OF_TWO = REASONS.index("one_of_two")
WHY_NO_DROP = REASONS.index("no_drop")
WHY_KEPT_ON = REASONS.index("kept_on")
WHY_CONTACTS_DISAGREE = REASONS.index("contacts_disagree")
WHY_HELD_DOWN = REASONS.index("held_down")
WHY_FORBIDDEN = REASONS.index("forbidden")
WHY_SETTINGS_COMING = REASONS.index("settings_coming")
WHY_NO_SETTINGS = REASONS.index("no_settings")
WHY_BUSY = REASONS.index("busy")
WHY_NOT_OUT = REASONS.index("not_out")
WHY_NO_SUCH_THROW = REASONS.index("no_such_throw")
WHY_OK = REASONS.index("ok")
WHY_WRONG_COUNT = REASONS.index("wrong_count")
WHY_WRONG_CRC = REASONS.index("wrong_crc")
WHY_FLASH = REASONS.index("flash")
