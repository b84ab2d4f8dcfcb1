"""What is allowed but unwise, by the limits of common practice (no source)."""

from shared_protocol.settings_check import charge_time_constant_ms
from sim.layout.layout import Layout

SLOW_RECHARGE_MS = 3000
HIGH_READY_PERCENT = 85


def warnings_of(layout: Layout) -> list[str]:
    """One sentence each."""
    found = []
    settings = layout.settings
    for bank in settings.banks:
        recharge_ms = 3 * charge_time_constant_ms(bank.charge)
        if recharge_ms > SLOW_RECHARGE_MS:
            found.append(
                f"bank {bank.name.decode()}: three time constants take {recharge_ms / 1000:.1f} s; over 3 s is slow"
            )
    for junction in settings.junctions:
        full_mv = min(settings.banks[settings.motors[motor].bank].full_mv for motor in junction.motors)
        for lie in junction.lies:
            if lie.ready_mv * 100 > full_mv * HIGH_READY_PERCENT and len(junction.motors) == 1:
                found.append(
                    f"{junction.name.decode()}, {lie.name.decode()}: its ready voltage is above "
                    f"{HIGH_READY_PERCENT} % of the full bank"
                )
        for number in junction.motors:
            motor = settings.motors[number]
            if motor.ends and motor.contact == 0 and junction.pulses == 2:
                found.append(f"{junction.name.decode()}: a motor that ends its own pulse gains nothing from two pulses")
    return found
