"""Every field of the settings can be reached from a layout file, and what the owner writes is what the board gets."""

import json
from pathlib import Path

import pytest

from shared_protocol import settings_table as wire
from shared_protocol.codec import plain
from sim.layout import keys
from sim.layout.reading import REQUIRED, Key
from sim.layout.wire_keys import TABLE_OF, owner_key
from tests.layout.files import GOOD, load_text

REACH = """\
[layout]
name = "Reach"
[supply]
volts = 17.0
peak_v = 18.5
[board]
name = "Boardname"
host_silence_ms = 777
telemetry_ms = 66
restore_lies = true
route_order = "fullest"
[timing]
settle_ms = 7
longest_wait_ms = 7001
route_pause_ms = 170
hysteresis_v = 0.17
button_steady_ms = 37
button_stuck_ms = 7002
contact_equal = 4
contact_after_ms = 8
entrance_exit_ms = 7003
[io]
input_pins = [6, 7]
inputs_on_chain = 9
input_chain_pins = [8, 9, 10]
output_pins = [11]
outputs_on_chain = 3
output_chain_pins = [12, 13, 14]
[[bank]]
name = "First"
first_pin = 0
coils = 6
adc = 2
sense_range_v = 28.0
sense_zero_v = -0.07
full_v = 17.5
gap_ms = 27
switch = "high"
capacitance_uf = 3300
charge = "limited"
charge_ohm = 56.7
limit_ma = 270
guard = "cutoff"
resistor_w = 7.5
stall_ms = 2700
cut_off_pin = 15
[[bank]]
name = "Second"
chain_pins = [16, 17]
coils = 27
adc = 1
guard = "ptc"
[[junction]]
name = "Turnout"
bank = "First"
normal = "ahead"
reverse = "aside"
ready_v = 12.7
pulse_ms = 37
full_pulse_ms = 17
retry_v = 0.7
pulses = 2
not_while = 5
motors = [{ coils = [4, 5], ohm = 7.77, parallel = 3, ends_own_pulse = true, rest_ms = 770, contact = "two", \
contact_inputs = [6, 7], answer_ms = 177 }]
[[junction]]
name = "Slip"
kind = "slip"
bank = "Second"
together = true
forbidden = [["reverse", "reverse"]]
motors = [{ coils = [0, 1] }, { coils = [2, 3] }]
[[junction.lie]]
name = "one"
word = "first way"
motors = ["normal", "reverse"]
order = [2, 1]
ready_v = 13.3
pulse_ms = 33
full_pulse_ms = 13
[[junction.lie]]
name = "two"
motors = ["reverse", "normal"]
[[route]]
name = "Out"
throws = ["Slip: two", "Turnout: aside"]
entrance = 17
exit = 27
[[button]]
kind = "switch"
input = 8
junction = "Turnout"
lie = "aside"
other_lie = "ahead"
read_at_power_up = true
[[button]]
kind = "entrance"
input = 9
number = 17
[[follower]]
kind = "frog"
output = 2
junction = "Slip"
lie = "two"
"""

RECORDS: dict[str, list[dict[str, object]]] = {
    "set_board": [{"name": "Boardname", "silence_ms": 777, "tell_ms": 66, "restore": "yes", "order": "fullest"}],
    "set_timing": [{
        "settle_ms": 7, "wait_ms": 7001, "pause_ms": 170, "hysteresis_mv": 170, "steady_ms": 37, "stuck_ms": 7002,
        "equal": 4, "after_ms": 8, "pair_ms": 7003,
    }],
    "set_io": [{
        "inputs": [6, 7], "in_chain": 9, "in_pins": [8, 9, 10], "outputs": [11], "out_chain": 3,
        "out_pins": [12, 13, 14],
    }],
    "set_bank": [
        {"i": 0, "name": "First", "pin": 0, "coils": 6, "chain": [], "adc": 2, "range_mv": 28_000, "zero_mv": -70,
         "full_mv": 17_500, "peak_mv": 18_500, "gap_ms": 27, "switch": "high"},
        {"i": 1, "name": "Second", "pin": -1, "coils": 27, "chain": [16, 17], "adc": 1, "range_mv": 33_000,
         "zero_mv": 0, "full_mv": 16_800, "peak_mv": 18_500, "gap_ms": 20, "switch": "low"},
    ],
    "set_charge": [
        {"i": 0, "kind": "limited", "cap_uf": 3300, "charge_dohm": 567, "limit_ma": 270, "guard": "cutoff",
         "rated_mw": 7500, "stall_ms": 2700, "cut_pin": 15},
        {"i": 1, "kind": "resistor", "cap_uf": 4700, "charge_dohm": 470, "limit_ma": 0, "guard": "ptc",
         "rated_mw": 10_000, "stall_ms": 5000, "cut_pin": -1},
    ],
    "set_motor": [
        {"i": 0, "bank": 0, "normal": 4, "reverse": 5, "coil_cohm": 777, "parallel": 3, "ends": "yes", "rest_ms": 770,
         "contact": "two", "c1": 6, "c2": 7, "answer_ms": 177},
        {"i": 1, "bank": 1, "normal": 0, "reverse": 1, "coil_cohm": 450, "parallel": 1, "ends": "no", "rest_ms": 500,
         "contact": "none", "c1": -1, "c2": -1, "answer_ms": 250},
        {"i": 2, "bank": 1, "normal": 2, "reverse": 3, "coil_cohm": 450, "parallel": 1, "ends": "no", "rest_ms": 500,
         "contact": "none", "c1": -1, "c2": -1, "answer_ms": 250},
    ],
    "set_junction": [
        {"i": 0, "name": "Turnout", "kind": "turnout", "motors": [0], "forbid": [], "retry_mv": 700, "pulses": 2,
         "bar": 5},
        {"i": 1, "name": "Slip", "kind": "slip", "motors": [1, 2], "forbid": [3], "retry_mv": 0, "pulses": 1,
         "bar": -1},
    ],
    "set_lie": [
        {"j": 0, "i": 0, "name": "normal", "word": "ahead", "at": 0, "order": [0], "together": "no", "ready_mv": 12_700,
         "pulse_us": 37_000, "full_us": 17_000},
        {"j": 0, "i": 1, "name": "reverse", "word": "aside", "at": 1, "order": [0], "together": "no",
         "ready_mv": 12_700, "pulse_us": 37_000, "full_us": 17_000},
        {"j": 1, "i": 0, "name": "one", "word": "first way", "at": 2, "order": [1, 0], "together": "yes",
         "ready_mv": 13_300, "pulse_us": 33_000, "full_us": 13_000},
        {"j": 1, "i": 1, "name": "two", "word": "two", "at": 1, "order": [0, 1], "together": "yes", "ready_mv": 14_300,
         "pulse_us": 40_000, "full_us": 40_000},
    ],
    "set_route": [{"i": 0, "name": "Out", "entrance": 17, "exit": 27, "throws": [1, 1, 0, 1]}],
    "set_button": [
        {"i": 0, "kind": "switch", "input": 8, "j": 0, "lie": 1, "other": 0, "n": -1, "read": "yes"},
        {"i": 1, "kind": "entrance", "input": 9, "j": -1, "lie": -1, "other": -1, "n": 17, "read": "no"},
    ],
    "set_follower": [{"i": 0, "kind": "frog", "output": 2, "j": 1, "lie": 1}],
}  # fmt: skip


def test_every_record_is_what_the_owner_wrote(tmp_path: Path) -> None:
    found: dict[str, list[dict[str, object]]] = {message.name: [] for message in wire.SETTINGS}
    for message, values in load_text(tmp_path, REACH).records:
        found[message.name].append(plain(message, values))
    assert found == RECORDS


def test_the_records_above_use_every_field_with_more_than_its_default() -> None:
    """Else the test above would not show that a field can be reached."""
    for message in wire.SETTINGS:
        for field in message.fields:
            if owner_key(message, field.key):
                usual = field.words[field.default] if field.words and field.default is not None else field.default
                values = [row[field.key] for row in RECORDS[message.name]]
                assert any(value not in (usual, -1, []) for value in values), (message.name, field.key)


def test_the_order_of_records_is_that_of_a_slot(tmp_path: Path) -> None:
    names = [message.name for message, _ in load_text(tmp_path, REACH).records]
    assert names == [
        "set_board", "set_timing", "set_io", "set_bank", "set_bank", "set_charge", "set_charge", "set_motor",
        "set_motor", "set_motor", "set_junction", "set_lie", "set_lie", "set_junction", "set_lie", "set_lie",
        "set_route", "set_button", "set_button", "set_follower",
    ]  # fmt: skip


TABLES = {heading: table for heading, _, table in keys.TABLES}


@pytest.mark.parametrize("message", wire.SETTINGS, ids=lambda message: message.name)
def test_every_field_has_an_owners_key_that_is_in_the_reference(message: object) -> None:
    assert message in wire.SETTINGS
    known: set[str] = set()
    for heading in TABLE_OF[message.name].split(" or "):
        known |= {key.name for key in TABLES[heading]}
    if message is wire.SET_BANK:
        known |= {key.name for key in keys.SUPPLY}  # the peak is the supply's
    for field in message.fields:
        key = owner_key(message, field.key)
        assert key in known or (key == "" and field.key in ("i", "j")), field.key


def defaults(table: tuple[Key, ...]) -> str:
    """The defaults of a table, written out."""
    given = [key for key in table if key.default not in (None, REQUIRED, [])]
    return "".join(f"{key.name} = {json.dumps(key.default)}\n" for key in given)


def all_keys() -> list[Key]:
    """Every key of the reference."""
    return [key for _, _, table in keys.TABLES for key in table]


def test_every_default_passes_its_own_check(tmp_path: Path) -> None:
    """What the reference names as default may as well be written: the same layout comes of it."""
    written = GOOD.replace("[io]\n", f"[board]\n{defaults(keys.BOARD)}[timing]\n{defaults(keys.TIMING)}[io]\n")
    written = written.replace("volts = 16.0\n", f"volts = 16.0\n{defaults(keys.SUPPLY)}")
    written = written.replace("resistor_w = 10\n", defaults(keys.BANK))
    written = written.replace('name = "Single"\n', f'name = "Single"\n{defaults(keys.JUNCTION)}')
    motor = ", ".join(defaults(keys.MOTOR).splitlines())
    written = written.replace("{ coils = [2, 3] }", f"{{ coils = [2, 3], {motor} }}")
    assert len(written.splitlines()) > len(GOOD.splitlines()) + 30
    assert load_text(tmp_path, written).crc() == load_text(tmp_path, GOOD).crc()


def test_every_key_has_a_sentence() -> None:
    assert all(key.sentence.endswith(".") and key.sentence[0] != " " for key in all_keys())
