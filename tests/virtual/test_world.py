"""The world judges: each thing that must never happen, done to it on purpose, is found. No firmware runs here."""

from collections.abc import Callable
from dataclasses import replace

import pytest

from sim.layout import Layout, demo_layout_path, load_layout
from sim.rules import InvariantBroken
from sim.sensing import FRESH_SAMPLES, SAMPLE_US
from sim.world import World

WEST, EAST = 0, 1
# Throat (motor 0) is on outputs 0 and 1 of bank West; the crossover on 6 to 9 of East, the three-way on 10 to 13.
THROAT_REVERSE, THROAT_NORMAL = 1 << 1, 1 << 0
CROSSING = (1 << 7) | (1 << 9)
FAN_FIRST_REVERSE, FAN_SECOND_REVERSE, FAN_FIRST_NORMAL = 1 << 11, 1 << 13, 1 << 10


@pytest.fixture
def layout() -> Layout:
    return load_layout(demo_layout_path())


@pytest.fixture
def world(layout: Layout) -> World:
    physics = layout.physics
    world = World(layout.settings, physics.supply, physics.banks, physics.make_motors(), seed=3)
    for bank in (WEST, EAST):
        world.circuit.set_bank_v(bank, 15.9)
    world.put_in_force(layout.settings)
    world.advance(600_000)
    return world


def both_coils(world: World) -> None:
    world.start_pulse(WEST, 0, THROAT_NORMAL | THROAT_REVERSE, 40_000)


def too_long(world: World) -> None:
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_001)


def too_low(world: World) -> None:
    world.circuit.set_bank_v(WEST, 11.9)
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_000)


def half_a_crossover(world: World) -> None:
    world.start_pulse(EAST, 0, 1 << 7, 40_000)


def an_output_without_a_coil(world: World) -> None:
    world.start_pulse(WEST, 0, THROAT_REVERSE | 1 << 20, 40_000)


def the_other_group(world: World) -> None:
    world.start_pulse(WEST, 1, THROAT_REVERSE, 40_000)


def two_at_once(world: World) -> None:
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_000)
    world.advance(world.now_us + 10_000)
    world.start_pulse(WEST, 0, 1 << 6, 18_000)


def in_the_gap(world: World) -> None:
    world.start_pulse(WEST, 0, THROAT_REVERSE, 5_000)
    world.advance(world.now_us + 24_000)
    world.circuit.set_bank_v(WEST, 15.9)
    world.start_pulse(WEST, 0, 1 << 6, 18_000)


def without_rest(world: World) -> None:
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_000)
    world.advance(world.now_us + 490_000)
    world.circuit.set_bank_v(WEST, 15.9)
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_000)


def after_a_restart_without_rest(world: World) -> None:
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_000)
    world.power_cut()
    world.put_in_force(world.settings)
    world.advance(world.now_us + 400_000)
    world.circuit.set_bank_v(WEST, 15.9)
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_000)


def while_stopped(world: World) -> None:
    world.stopped = True
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_000)


def forbidden_in_passing(world: World) -> None:
    world.start_pulse(EAST, 0, FAN_FIRST_REVERSE, 40_000)
    world.advance(world.now_us + 2_000_000)
    world.start_pulse(EAST, 0, FAN_SECOND_REVERSE, 40_000)


def without_settings(world: World) -> None:
    world.power_cut()
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_000)


def on_a_bank_that_is_not_there(world: World) -> None:
    world.start_pulse(2, 0, 1, 40_000)


def flash_during_a_pulse(world: World) -> None:
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_000)
    world.write_flash(1)


@pytest.mark.parametrize(
    "deed",
    [
        both_coils, too_long, too_low, half_a_crossover, an_output_without_a_coil, the_other_group, two_at_once,
        in_the_gap, without_rest, after_a_restart_without_rest, while_stopped, forbidden_in_passing, without_settings,
        on_a_bank_that_is_not_there, flash_during_a_pulse,
    ],
)  # fmt: skip
def test_what_must_never_happen_is_found(deed: Callable[[World], None], world: World) -> None:
    with pytest.raises(InvariantBroken):
        deed(world)


def test_what_may_happen_is_not_complained_of(world: World) -> None:
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_000)
    world.start_pulse(EAST, 0, CROSSING, 40_000)
    world.advance(world.now_us + 3_000_000)
    world.start_pulse(WEST, 0, THROAT_NORMAL, 40_000)
    world.start_pulse(EAST, 0, FAN_FIRST_REVERSE, 40_000)
    world.advance(world.now_us + 3_000_000)
    world.start_pulse(EAST, 0, FAN_FIRST_NORMAL, 40_000)
    world.advance(world.now_us + 3_000_000)
    world.start_pulse(EAST, 0, FAN_SECOND_REVERSE, 40_000)
    world.advance(world.now_us + 40_000)
    assert len(world.pulses) == 6
    crossover = world.settings.junctions[9]
    assert crossover.name == b"Crossover" and world.position(9) == 1 and world.position(0) == 0


def test_a_pulse_ends_by_itself_whatever_the_board_does(world: World) -> None:
    told: list[str] = []
    world.tell = lambda at_us, text: told.append(f"{at_us} {text}")
    began_us = world.now_us
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_000)
    world.advance(began_us + 39_999)
    assert world.circuit.coil_a(0, 1) > 0.5
    world.advance(began_us + 5_000_000)
    assert world.circuit.coil_a(0, 1) == 0.0
    assert told[0].startswith(f"{began_us} pulse begins") and told[1].startswith(f"{began_us + 40_000} pulse ends")


def test_a_power_cut_ends_it_at_once(world: World) -> None:
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_000)
    world.advance(world.now_us + 3_000)
    world.power_cut()
    world.advance(world.now_us + 20_000)
    assert world.circuit.coil_a(0, 1) == pytest.approx(0.0, abs=0.01)
    assert world.circuit.bank_v(WEST) > 8.0


def test_samples_are_fresh_only_with_no_pulse_and_after_it_has_settled(world: World) -> None:
    assert world.read_bank(EAST).low_mv > 0
    world.start_pulse(WEST, 0, THROAT_REVERSE, 40_000)
    world.advance(world.now_us + 10_000)
    # Of the other bank too: a pulse disturbs them all.
    assert world.read_bank(EAST).low_mv == -1 and world.read_bank(EAST).last_mv > 0
    settled_us = world.pulses[0].at_us + 40_000 + 5_000
    world.advance(settled_us + FRESH_SAMPLES * SAMPLE_US - 1)
    assert world.read_bank(EAST).low_mv == -1
    world.advance(settled_us + FRESH_SAMPLES * SAMPLE_US)
    assert world.read_bank(EAST).low_mv > 0


def test_the_adc_reads_within_its_steps_and_noise(world: World) -> None:
    step_mv = world.sense[WEST].range_mv / 4096
    lows, means = [], []
    for _ in range(500):
        true_mv = world.circuit.bank_v(WEST) * 1000
        reading = world.read_bank(WEST)
        lows.append(true_mv - reading.low_mv)
        means.append(true_mv - reading.mean_mv)
        world.advance(world.now_us + 5_000)
    assert -3.0 * step_mv < min(lows) and max(lows) < 6 * step_mv
    assert abs(sum(means) / len(means) - step_mv) < step_mv


@pytest.mark.parametrize(("fault", "expected"), [("upper_open", 0), ("lower_open", 33_000)])
def test_a_broken_divider_reads_nothing_or_the_most(world: World, fault: str, expected: int) -> None:
    world.sense[WEST].fault = fault
    assert world.read_bank(WEST).low_mv == pytest.approx(expected, abs=30)


def test_clocks_wrap(layout: Layout) -> None:
    physics = layout.physics
    world = World(
        layout.settings, physics.supply, physics.banks, physics.make_motors(),
        first_tick_us=(1 << 30) - 1000, first_tick_ms=(1 << 30) - 1,
    )  # fmt: skip
    assert (world.ticks_us(), world.ticks_ms()) == ((1 << 30) - 1000, (1 << 30) - 1)
    world.advance(1000)
    assert (world.ticks_us(), world.ticks_ms()) == (0, 0)


def test_contacts_and_buttons_bounce_and_then_stay(world: World) -> None:
    number = world.settings.buttons[0].input
    world.inputs.hold(number, True, world.now_us, 100_000)
    seen = set()
    for _ in range(200):
        world.advance(world.now_us + 100)
        seen.add((world.inputs.word(0) >> number) & 1)
    assert seen == {0, 1}
    for _ in range(50):
        world.advance(world.now_us + 1000)
        assert (world.inputs.word(0) >> number) & 1
    world.advance(world.now_us + 100_000)
    assert not (world.inputs.word(0) >> number) & 1


def test_a_contact_follows_its_motor_unless_stuck(world: World) -> None:
    contact = world.settings.motors[0].c1
    world.move_by_hand(0, 1)
    world.advance(world.now_us + 1)
    world.advance(world.now_us + 10_000)
    assert (world.inputs.word(0) >> contact) & 1
    world.inputs.stuck[contact] = True
    world.move_by_hand(0, 0)
    world.advance(world.now_us + 10_000)
    assert (world.inputs.word(0) >> contact) & 1


def test_a_charge_path_without_a_cut_off_stays_on(world: World, layout: Layout) -> None:
    world.set_charge(WEST, False)
    assert world.circuit.charge_on == [True, True]


def test_one_seed_one_world(layout: Layout) -> None:
    def readings(seed: int) -> list[int]:
        physics = layout.physics
        world = World(layout.settings, replace(physics.supply), physics.banks, physics.make_motors(), seed)
        found = []
        for moment in range(1, 200):
            world.advance(moment * 1000)
            found.append(world.read_bank(0).last_mv)
        return found

    assert readings(5) == readings(5) != readings(6)
