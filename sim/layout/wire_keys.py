"""Which of the owner's keys each field of a settings record comes from.

Problems that are found in records are told by the owner's keys, and the settings page names them.
"""

from shared_protocol import settings_table as wire
from shared_protocol.fields import Message

# Fields not listed have the same name in the layout file. '' : not written by the owner (numbering).
_OTHER_NAMES: dict[str, dict[str, str]] = {
    "set_board": {
        "silence_ms": "host_silence_ms", "tell_ms": "telemetry_ms", "restore": "restore_lies", "order": "route_order",
    },
    "set_timing": {
        "wait_ms": "longest_wait_ms", "pause_ms": "route_pause_ms", "hysteresis_mv": "hysteresis_v",
        "steady_ms": "button_steady_ms", "stuck_ms": "button_stuck_ms", "equal": "contact_equal",
        "after_ms": "contact_after_ms", "pair_ms": "entrance_exit_ms",
    },
    "set_io": {
        "inputs": "input_pins", "in_chain": "inputs_on_chain", "in_pins": "input_chain_pins",
        "outputs": "output_pins", "out_chain": "outputs_on_chain", "out_pins": "output_chain_pins",
    },
    "set_bank": {
        "i": "", "pin": "first_pin", "chain": "chain_pins", "range_mv": "sense_range_v", "zero_mv": "sense_zero_v",
        "full_mv": "full_v", "peak_mv": "peak_v",
    },
    "set_charge": {
        "i": "", "kind": "charge", "cap_uf": "capacitance_uf", "charge_dohm": "charge_ohm", "rated_mw": "resistor_w",
        "cut_pin": "cut_off_pin",
    },
    "set_motor": {
        "i": "", "normal": "coils", "reverse": "coils", "coil_cohm": "ohm", "ends": "ends_own_pulse",
        "c1": "contact_inputs", "c2": "contact_inputs",
    },
    "set_junction": {"i": "", "forbid": "forbidden", "retry_mv": "retry_v", "bar": "not_while"},
    "set_lie": {
        "j": "", "i": "", "at": "motors", "ready_mv": "ready_v", "pulse_us": "pulse_ms", "full_us": "full_pulse_ms",
    },
    "set_route": {"i": ""},
    "set_button": {
        "i": "", "j": "junction", "other": "other_lie", "n": "number", "read": "read_at_power_up",
    },
    "set_follower": {"i": "", "j": "junction"},
}  # fmt: skip

# In which table of the layout file the keys of a record stand.
TABLE_OF: dict[str, str] = {
    "set_board": "[board]",
    "set_timing": "[timing]",
    "set_io": "[io]",
    "set_bank": "[[bank]]",
    "set_charge": "[[bank]]",
    "set_motor": "motors of a [[junction]]",
    "set_junction": "[[junction]]",
    "set_lie": "[[junction.lie]] or [[junction]]",
    "set_route": "[[route]]",
    "set_button": "[[button]]",
    "set_follower": "[[follower]]",
}


def owner_key(message: Message, field: str) -> str:
    """The owner's key for a field of a settings record; '' if the owner does not write it."""
    return _OTHER_NAMES[message.name].get(field, field)


def owner_keys(message: Message) -> dict[str, str]:
    """All fields of a record with the owner's keys, in table order."""
    assert message in wire.SETTINGS
    return {field.key: owner_key(message, field.key) for field in message.fields}
