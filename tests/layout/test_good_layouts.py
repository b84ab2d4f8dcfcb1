"""Layouts that are right: defaults, the demo layout, the largest layout, names of all alphabets, round trips."""

from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from shared_protocol import settings_table as wire
from shared_protocol.codec import Codec
from shared_protocol.line import LINE_MAX
from shared_protocol.registry import board_reads
from shared_protocol.settings import Settings
from shared_protocol.settings_check import check
from sim.layout import Layout, demo_layout_path, load_layout
from sim.layout.records import MOST_RECORDS
from sim.motor import motor_kinds
from tests.layout.files import GOOD, load_text, problems_of

SMALLEST = """
layout.name = "Saltmarsh Halt"
supply.volts = 16.0
bank = [{ name = "Only", first_pin = 2, coils = 2, adc = 0, resistor_w = 10 }]
junction = [{ name = "Loop", bank = "Only", motors = [{ coils = [0, 1] }] }]
"""


def test_the_smallest_layout_has_the_usual_values(tmp_path: Path) -> None:
    """Common practice, no source: 4700 uF, 47 ohm, 40 ms, 0.5 s of rest, ready at 80 % of the full bank."""
    layout = load_text(tmp_path, SMALLEST)
    assert layout.warnings == []
    bank, (motor,), (junction,) = layout.settings.banks[0], layout.settings.motors, layout.settings.junctions
    assert (bank.charge.cap_uf, bank.charge.charge_dohm, bank.charge.stall_ms) == (4700, 470, 5000)
    # 4700 ohm of bleed against 47.5 ohm leave 15.84 V of 16.
    assert (bank.full_mv, bank.peak_mv, bank.range_mv) == (15_800, 16_800, 33_000)
    assert (motor.coil_cohm, motor.rest_ms, motor.contact, motor.answer_ms) == (450, 500, wire.CONTACT_NONE, 250)
    assert [(lie.ready_mv, lie.pulse_us, lie.full_us) for lie in junction.lies] == [(12_600, 40_000, 40_000)] * 2
    assert layout.settings.board is not None and layout.settings.board.name == b"Saltmarsh Halt"
    assert layout.junction_words == [["normal", "reverse"]]
    assert layout.pins_used_and_left == (3, 23)


@pytest.mark.parametrize(
    ("supply", "full_mv", "peak_mv", "cap_uf", "charge_dohm"),
    [
        ("volts = 24.0", 23_400, 25_200, 2200, 1000),
        # 16 V AC is 21 V behind its bridge, 27 V unloaded (common practice, no source).
        ('kind = "ac"\nvolts = 16.0', 20_700, 27_149, 2200, 1000),
        ("volts = 12.0\npeak_v = 13.0", 11_800, 13_000, 4700, 470),
    ],
)
def test_usual_values_follow_the_supply(
    supply: str, full_mv: int, peak_mv: int, cap_uf: int, charge_dohm: int, tmp_path: Path
) -> None:
    layout = load_text(tmp_path, GOOD.replace("volts = 16.0", supply))
    bank = layout.settings.banks[0]
    assert (bank.full_mv, bank.peak_mv) == (full_mv, peak_mv)
    assert (bank.charge.cap_uf, bank.charge.charge_dohm) == (cap_uf, charge_dohm)


def test_a_motor_that_ends_its_own_pulse_is_of_higher_resistance(tmp_path: Path) -> None:
    """15 ohm where nothing is said (common practice, no source)."""
    layout = load_text(tmp_path, GOOD.replace("{ coils = [2, 3] }", "{ coils = [2, 3], ends_own_pulse = true }"))
    assert [motor.coil_cohm for motor in layout.settings.motors] == [450, 450, 1500, 450, 450]
    assert layout.physics.motors[2].parameters == motor_kinds()["self_ending"]


def test_a_slow_charge_path_may_take_longer(tmp_path: Path) -> None:
    layout = load_text(tmp_path, GOOD.replace("adc = 1", "adc = 1\ncapacitance_uf = 22000\ncharge_ohm = 100"))
    assert layout.settings.banks[1].charge.stall_ms == 11_000  # five times 2.2 s
    assert layout.warnings == ["bank 'Chain': three time constants take 6.6 s; over 3 s is slow"]


def test_the_order_that_avoids_the_forbidden_combination_is_found(tmp_path: Path) -> None:
    """Both at reverse jams: the motor that goes to normal goes first."""
    fan = load_text(tmp_path, GOOD).settings.junctions[2]
    assert [lie.order for lie in fan.lies] == [[0, 1], [1, 0], [0, 1]]
    for start in fan.lies:
        for lie in fan.lies:
            now = start.at
            for place in lie.order:
                now = now & ~(1 << place) | lie.at & 1 << place
                assert now not in fan.forbid


def test_places_of_inputs_may_be_named(tmp_path: Path) -> None:
    named = GOOD.replace('"contact A" = 0', '"contact A" = "pin 10"')
    named = named.replace('"button A" = 2', '"button A" = "chain 0"')
    assert load_text(tmp_path, named).crc() == load_text(tmp_path, GOOD).crc()
    bare = (
        named.replace("input_pins = [10, 11]\ninputs_on_chain = 8\n", "")
        .replace('"contact B" = 1', '"contact B" = "pin 11"')
        .replace('"button B" = 3', '"button B" = "chain 1"').replace('"key" = 4', '"key" = "chain 2"')
    )  # fmt: skip
    assert load_text(tmp_path, bare).crc() == load_text(tmp_path, GOOD).crc()


def test_the_owners_words_may_be_in_any_alphabet(tmp_path: Path) -> None:
    layout = load_text(tmp_path, GOOD.replace('"loop"', '"Überholgleis 2 \\"süd\\""').replace("Single", "Süd"))
    junction = layout.settings.junctions[0]
    assert junction.name == b"S?d" and junction.lies[1].word == b"?berholgleis 2 ?s?d?"
    assert layout.junction_words[0] == ["main", 'Überholgleis 2 "süd"']
    assert layout.junction_number("Süd") == layout.junction_number("S?d") == layout.junction_number("1") == 0
    assert layout.lie_number(0, 'Überholgleis 2 "süd"') == layout.lie_number(0, "reverse") == 1


def test_names_and_numbers_of_people(tmp_path: Path) -> None:
    layout = load_text(tmp_path, GOOD)
    assert [layout.junction_number(text) for text in ("Fan", "3", "Cross")] == [2, 2, 1]
    assert [layout.lie_number(2, text) for text in ("right", "3", "middle")] == [2, 2, 0]
    assert layout.bank_number("Chain") == layout.bank_number("2") == 1
    assert layout.route_number("Through") == layout.route_number("1") == 0
    asks = (layout.junction_number, layout.bank_number, layout.route_number, lambda text: layout.lie_number(2, text))
    for ask in asks:
        for text in ("", "0", "9", "-1", "none of these", "²"):
            with pytest.raises(KeyError, match=r"there is no .*there are: "):
                ask(text)
    with pytest.raises(KeyError, match="there is no junction 'fan'; did you mean 'Fan'"):
        layout.junction_number("fan")


# ---- the demo layout


def test_the_demo_layout_is_what_it_should_be() -> None:
    layout = load_layout(demo_layout_path())
    kinds = [wire.JUNCTION_KINDS[junction.kind] for junction in layout.settings.junctions]
    assert layout.name == "Saltmarsh Quay" and layout.warnings == []
    assert sorted(kinds) == ["crossover", "three_way"] + ["turnout"] * 9
    assert len(layout.settings.banks) == 2 and len(layout.settings.routes) == 5
    assert min(layout.pins_used_and_left) >= 0 and sum(layout.pins_used_and_left) == 26
    longest = max(layout.settings.routes, key=lambda route: len(route.throws))
    banks = {
        layout.settings.motors[layout.settings.junctions[junction].motors[0]].bank for junction in longest.throws[::2]
    }
    assert len(longest.throws) == 20 and banks == {0, 1}
    ready = {kind: [] for kind in kinds}  # type: dict[str, list[int]]
    for junction, kind in zip(layout.settings.junctions, kinds, strict=True):
        ready[kind] += [lie.ready_mv for lie in junction.lies]
    assert min(ready["crossover"]) > max(ready["turnout"])
    assert {motor.contact for motor in layout.settings.motors} == {0, 1, 2, 3}
    frictions = {motor.parameters.static_friction_n for motor in layout.physics.motors}
    assert len(frictions) >= 3 and any(motor.parameters.ends_own_pulse for motor in layout.physics.motors)
    assert {follower.kind for follower in layout.settings.followers} >= {wire.LAMP, wire.FROG}
    assert len({button.kind for button in layout.settings.buttons}) >= 5


# ---- the largest layout


def largest() -> str:
    """64 turnouts on three banks of the output chain, with names as long as they may be, and the longest routes."""
    text = "layout.name = 'Saltmarsh'\nsupply.volts = 16\n"
    text += "io = { inputs_on_chain = 48, input_chain_pins = [0, 1, 2], outputs_on_chain = 48, "
    text += "output_chain_pins = [3, 4, 5] }\n"
    for bank in range(3):
        text += f"[[bank]]\nname = '{str(bank) * 16}'\nchain_pins = [{6 + 2 * bank}, {7 + 2 * bank}]\ncoils = 48\n"
        text += f"adc = {bank}\nguard = 'fuse'\n"
    for number in range(64):
        name = f"{number:02}".ljust(24, "J")
        text += f"[[junction]]\nname = '{name}'\nbank = '{str(number // 24) * 16}'\nretry_v = 1.5\nnot_while = 47\n"
        text += f"normal = '{'n' * 24}'\nreverse = '{'r' * 24}'\nready_v = 12.345\npulse_ms = 55.555\n"
        coil = 2 * (number % 24)
        text += f"motors = [{{ coils = [{coil}, {coil + 1}], rest_ms = 10000, answer_ms = 1000, ohm = 12.34 }}]\n"
    for route in range(32):
        throws = [f"{number:02}".ljust(24, "J") + ": " + "r" * 24 for number in range(48, 64)]
        text += f"[[route]]\nname = '{str(route).ljust(24, 'R')}'\nentrance = {route}\nexit = {route}\n"
        text += f"throws = {throws}\n"
    return text


def test_the_largest_layout_fits_lines_and_transaction(tmp_path: Path) -> None:
    layout = load_text(tmp_path, largest())
    assert len(layout.settings.junctions) == 64 and len(layout.settings.routes) == 32
    bodies = layout.record_bodies()
    assert len(bodies) <= MOST_RECORDS
    assert max(len(body) for body in bodies) + len("*12345678\n") <= LINE_MAX
    assert len(layout.physics.motors) == 64


def test_more_records_than_a_board_holds_are_refused(tmp_path: Path) -> None:
    """72 motors, 56 turnouts, 8 slips of four lies, and a full panel: each allowed, together too many."""
    text = largest().split("[[junction]]")[0]
    text = text.replace("'\nchain_pins", "'\nswitch = 'low'\nchain_pins")
    left = [(1, 44), (1, 46), (2, 42), (2, 44), (2, 46), (3, 42), (3, 44), (3, 46)]
    for number in range(64):
        bank, coil = number % 3 + 1, 2 * (number // 3)
        kind, motors = "turnout", f"{{ coils = [{coil}, {coil + 1}] }}"
        if number < 8:
            kind = "slip"
            other, free = left[number]
            motors += f", {{ bank = '{other}', coils = [{free}, {free + 1}] }}"
        text += f"[[junction]]\nname = 'J{number}'\nkind = '{kind}'\nbank = '{bank}'\nmotors = [{motors}]\n"
        for place, ends in enumerate(("nn", "nr", "rn", "rr") if number < 8 else ()):
            positions = [{"n": "normal", "r": "reverse"}[end] for end in ends]
            text += f"[[junction.lie]]\nname = 'lie {place}'\nmotors = {positions}\n"
    text += "".join(f"[[route]]\nname = 'R{number}'\nthrows = ['J20: normal']\n" for number in range(32))
    text += "".join(f"[[button]]\nkind = 'stop'\ninput = {number}\n" for number in range(48))
    followers = [
        f"[[follower]]\nkind = 'lamp'\noutput = {number}\njunction = 'J30'\nlie = 'normal'\n" for number in range(48)
    ]
    fitting = load_text(tmp_path, text + "".join(followers[:30]))
    assert len(fitting.records) == MOST_RECORDS - 1
    too_many = text + "".join(followers)
    first = too_many.split("\n").index("[[junction]]") + 1
    assert problems_of(tmp_path, too_many) == [
        (first, "junction", "the file makes 417 records, a board holds 400: use a second board")
    ]


# ---- round trips


def through_the_wire(layout: Layout) -> Settings:
    """The settings as a board has them after a transfer."""
    codec = Codec(board_reads())
    lines = b"".join(codec.encode(message, values) for message, values in layout.records)
    received = Codec(board_reads()).feed(lines)
    assert [(each.message, each.values, each.fault) for each in received] == [
        (message, values, "") for message, values in layout.records
    ]
    there = Settings()
    for each in received:
        assert each.message is not None and there.add(each.message, each.values) is None
    assert check(there) is None
    return there


def test_shipped_layouts_arrive_unchanged() -> None:
    paths = sorted(demo_layout_path().parent.glob("*.toml"))
    assert demo_layout_path() in paths
    wholes = [load_layout(path) for path in paths]
    for layout in [whole.alone(board) for whole in wholes for board in range(len(whole.boards))]:
        there = through_the_wire(layout)
        assert [vars(lie) for junction in there.junctions for lie in junction.lies] == [
            vars(lie) for junction in layout.settings.junctions for lie in junction.lies
        ]
        assert layout.slot_lines(7)[-1] == f"slot 7 {len(layout.records)} {layout.crc()}".encode()


NAMES = st.text(st.characters(exclude_categories=["C", "Z"]), min_size=1, max_size=24).filter(
    lambda name: name not in ("unknown", "between") and name.isprintable()
)


@st.composite
def layouts(draw: st.DrawFn) -> str:
    """A right layout of some turnouts with figures and names of all sorts."""
    count = draw(st.integers(1, 6))
    names = draw(st.lists(NAMES, min_size=count, max_size=count, unique=True))
    text = f"layout.name = {quoted(draw(NAMES))}\n[supply]\nvolts = {draw(st.floats(12, 24))}\n"
    text += f"[timing]\nhysteresis_v = {draw(st.floats(0, 1))}\nsettle_ms = {draw(st.integers(2, 200))}\n"
    text += f"[[bank]]\nname = {quoted(draw(NAMES)[:16])}\nfirst_pin = 2\ncoils = 12\nadc = 2\nguard = 'fuse'\n"
    for number, name in enumerate(names):
        pulse_ms = draw(st.floats(5, 65))
        text += f"[[junction]]\nname = {quoted(name)}\nbank = '1'\nready_v = {draw(st.floats(1, 11))}\n"
        text += f"pulse_ms = {pulse_ms}\nfull_pulse_ms = {draw(st.floats(3, pulse_ms))}\n"
        text += f"pulses = {draw(st.integers(1, 2))}\n"
        words = draw(st.lists(NAMES, min_size=2, max_size=2, unique=True).filter(lambda pair: pair[0] != "reverse"))
        text += f"normal = {quoted(words[0])}\nreverse = {quoted(words[1] if words[1] != 'normal' else 'x')}\n"
        text += f"motors = [{{ coils = [{2 * number}, {2 * number + 1}], ohm = {draw(st.floats(1, 40))} }}]\n"
    return text


def quoted(text: str) -> str:
    """A TOML string."""
    return '"' + text.replace("\\", "\\\\").replace('"', '\\"') + '"'


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(text=layouts())
def test_any_layout_arrives_unchanged(text: str, tmp_path: Path) -> None:
    layout = load_text(tmp_path, text)
    there = through_the_wire(layout)
    assert [vars(motor) for motor in there.motors] == [vars(motor) for motor in layout.settings.motors]
