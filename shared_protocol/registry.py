"""Which messages each side reads, under their names."""

from shared_protocol.fields import Message
from shared_protocol.messages import TO_BOARD, TO_HOST
from shared_protocol.settings_table import SETTINGS


def by_name(messages: "tuple[Message, ...]") -> "dict[str, Message]":
    """The messages under their names on the wire. Raises ValueError if two share one."""
    found: "dict[str, Message]" = {}
    for message in messages:
        if message.name in found:
            raise ValueError(message.name)
        found[message.name] = message
    return found


def board_reads() -> "dict[str, Message]":
    """What a board understands: requests and settings records."""
    return by_name(TO_BOARD + SETTINGS)


def host_reads() -> "dict[str, Message]":
    """What a host understands: answers, telemetry and settings records."""
    return by_name(TO_HOST + SETTINGS)
