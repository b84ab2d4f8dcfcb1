"""Reads a board's settings slots from outside, to know which settings it must have in force."""

import zlib

from shared_protocol.line import GOOD, LineDecoder
from shared_protocol.registry import by_name
from shared_protocol.settings import Settings
from shared_protocol.settings_check import check
from shared_protocol.settings_table import SETTINGS

Slots = dict[int, list[bytes]]


def settings_in_slots(slots: Slots) -> Settings | None:
    """The settings of the valid slot with the highest sequence number, None if there is none."""
    found: tuple[int, Settings] | None = None
    for number in (0, 1):
        lines = [line for line in slots.get(number, []) if line]
        sequence = sequence_of(lines)
        settings = parse(lines[:-1]) if sequence else None
        if settings is not None and (found is None or sequence > found[0]):
            found = (sequence, settings)
    return found[1] if found else None


def sequence_of(lines: list[bytes]) -> int:
    """The sequence number of a slot, 0 if it is not whole."""
    parts = lines[-1].split(b" ") if lines else []
    if len(parts) != 4 or parts[0] != b"slot" or not (parts[1].isdigit() and parts[2].isdigit()):
        return 0
    crc = zlib.crc32(b"".join(line + b"\n" for line in lines[:-1]))
    whole = int(parts[2]) == len(lines) - 1 and parts[3] == b"%08X" % crc
    return int(parts[1]) if whole else 0


def parse(bodies: list[bytes]) -> Settings | None:
    """Records to settings, None if they are not right."""
    decoder = LineDecoder(by_name(SETTINGS))
    settings = Settings()
    for body in bodies:
        decoded = decoder.decode(body)
        if decoded.fault != GOOD or decoded.message is None:
            return None
        if settings.add(decoded.message, decoded.values) is not None:
            return None
    return settings if check(settings) is None else None
