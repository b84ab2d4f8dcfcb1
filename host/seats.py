"""Which port is which board of the layout: told by the unique id in the first exchange, never by the port's name.

Each board of the layout has a seat. A board whose id the file names takes its own seat; a spare, whose id no seat has,
takes the seat of the same address if that is empty. Two boards with one id take none: it can't be told which is which.
"""

import queue
import re
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Protocol

from host.link import LinkChange, News
from host.link_errors import LinkError
from host.session import LinkLike
from shared_protocol import messages
from shared_protocol.codec import Received
from shared_protocol.fields import Message

_ADDRESS = re.compile(r"\baddress ([0-3])\b")
VIRTUAL = "virtual"
TWINS = "two boards say that they are"

Note = Callable[[str, str], None]


class SeatLayout(Protocol):
    """What a seat needs of a board's part of a layout file."""

    @property
    def name(self) -> str:
        """The owner's name for the board."""

    @property
    def uid(self) -> str:
        """Its unique id; '' where the file names none."""

    @property
    def address(self) -> int:
        """What its address links say."""


@dataclass
class Port:
    """One port and who is there. `text` says why what is there has no seat, or why nothing is there.

    hello: the board's part of the first exchange. seen: a board was there once.
    """

    link: LinkLike
    hello: Received | None = None
    seat: "Seat | None" = None
    text: str = ""
    seen: bool = False

    @property
    def name(self) -> str:
        """The port's name."""
        return self.link.port

    @property
    def uid(self) -> str:
        """The unique id of the board there; '' if there is none."""
        return self.hello.name("uid") if self.hello is not None else ""

    @property
    def address(self) -> int:
        """What the address links of the board there say."""
        return address_of(self.hello.name("caps")) if self.hello is not None else 0

    @property
    def is_virtual(self) -> bool:
        """True for a virtual board."""
        return self.hello is not None and self.hello.name("kind").startswith(VIRTUAL)


@dataclass
class Seat:
    """A board's place. To the board's session it is a link that is up while a board sits there.

    uid: whose seat it is. spare: another board sits here.
    """

    layout: SeatLayout
    uid: str
    taken_by: Port | None = None
    spare: bool = False
    error: LinkError | None = None
    received: queue.Queue[News] = field(default_factory=queue.Queue)

    @property
    def name(self) -> str:
        """The board's name."""
        return self.layout.name

    @property
    def port(self) -> str:
        """The port of the board that sits here."""
        return self.taken_by.name if self.taken_by is not None else ""

    @property
    def connected(self) -> bool:
        """True while a board sits here and its link is up."""
        return self.taken_by is not None and self.taken_by.link.connected

    def open(self) -> None:
        """The ports are opened by who has them."""

    def send(self, message: Message, values: list[object]) -> bool:
        """Write one message to the board that sits here; False if there is none."""
        return self.taken_by is not None and self.taken_by.link.send(message, values)


def address_of(caps: str) -> int:
    """The address in what a board says that it can do: '3 banks address 2' is 2; without one 0."""
    found = _ADDRESS.search(caps)
    return int(found.group(1)) if found else 0


class Seating:
    """Ports and seats. Give it what ports say (`take`); it hands on to the session of each seat what belongs there.

    note(level, text): told what a person should know.
    """

    def __init__(self, seats: list[Seat], ports: list[Port], note: Note) -> None:
        self.seats = seats
        self.ports = ports
        self._note = note

    def poll(self) -> int:
        """Take what came in at all ports. Returns how many things came in."""
        count = 0
        for port in self.ports:
            while True:
                try:
                    item = port.link.received.get_nowait()
                except queue.Empty:
                    break
                self.take(port, item)
                count += 1
        return count

    def take(self, port: Port, item: News) -> None:
        """One thing that came in at a port."""
        if isinstance(item, LinkChange):
            if item.state == "connected":
                return  # who is there is told next
            gone = port.hello is not None
            port.hello = None
            if not gone and item.text != port.text and (item.state == "refused" or not port.seen):
                self._note("bad" if item.state == "refused" else "warn", item.text)
            port.text = "" if gone else item.text
            self._leave(port, item)
            if gone:
                self._look_again()
        elif item.message is messages.BOARD and not item.fault:
            changed = port.hello is None or port.uid != item.name("uid")
            port.hello, port.seen = item, True
            if changed or port.seat is None:
                self._place(port)
            else:
                port.seat.received.put(item)
            if changed:
                self._look_again()
        elif port.seat is not None:
            port.seat.received.put(item)

    # ---- who sits where

    def _place(self, port: Port) -> None:
        """Give the board at this port its seat, if it has one."""
        seat, text = self._seat_for(port)
        if text != port.text:
            port.text = text
            if text:
                self._note("bad", text if text.startswith(TWINS) else f"{port.name}: {text}")
        if port.seat is not None and port.seat is not seat:
            self._leave(port, LinkChange("lost", text or "another board is there now"))
        if seat is None or port.seat is seat:
            return
        if seat.taken_by is not None:
            text = f"the spare for board {seat.name} is not used any more: the board itself is there"
            self._note("warn", text)
            self._leave(seat.taken_by, LinkChange("lost", text))
        self._sit(port, seat)

    def _sit(self, port: Port, seat: Seat) -> None:
        assert port.hello is not None
        port.seat, seat.taken_by = seat, port
        seat.spare = bool(seat.layout.uid) and port.uid != seat.uid
        where = f"connected to the board at {port.name}"
        if seat.spare:
            where = (
                f"the spare '{port.uid}' at {port.name} takes the place of board {seat.name} (address {port.address})"
            )
            self._note("warn", where)
        elif seat.layout.address and port.address != seat.layout.address and not port.is_virtual:
            says = f"board {seat.name} says address {port.address}, the layout file {seat.layout.address}"
            self._note("warn", f"{says}: look at its harness plug")
        seat.received.put(LinkChange("connected", where))
        seat.received.put(port.hello)

    @staticmethod
    def _leave(port: Port, change: LinkChange) -> None:
        """The board at this port has its seat no more."""
        seat = port.seat
        if seat is None:
            return
        port.seat = seat.taken_by = None
        seat.spare = False
        seat.received.put(LinkChange("lost", change.text, change.error))

    def _look_again(self) -> None:
        """Somebody came or went: who has no seat may get one."""
        for port in self.ports:
            if port.hello is not None and port.seat is None:
                self._place(port)

    def _seat_for(self, port: Port) -> tuple[Seat | None, str]:
        """Its seat, or why it has none."""
        twins = [other for other in self.ports if other.hello is not None and other.uid == port.uid]
        if len(twins) > 1:
            where = " and ".join(sorted(twin.name for twin in twins))
            text = f"{TWINS} '{port.uid}' ({where}): neither is used; unplug one"
            for twin in twins:
                if twin is not port and twin.text != text:
                    twin.text = text
                    self._leave(twin, LinkChange("lost", text))
            return None, text
        for seat in self.seats:
            if seat.uid == port.uid:
                return self._own_seat(port, seat)
        return self._spare_seat(port)

    @staticmethod
    def _own_seat(port: Port, seat: Seat) -> tuple[Seat | None, str]:
        """The board itself goes before a spare, unless its address says that the harness is on the spare."""
        address = seat.layout.address
        if seat.taken_by not in (None, port) and address and port.address != address and not port.is_virtual:
            return None, (f"board {seat.name} says address {port.address}, its spare {address}: the spare is used")
        return seat, ""

    def _spare_seat(self, port: Port) -> tuple[Seat | None, str]:
        """The one seat of the same address, if nobody sits there."""
        found = [seat for seat in self.seats if seat.layout.address == port.address]
        if len(found) == 1 and found[0].taken_by in (None, port):
            return found[0], ""
        if len(found) == 1:
            why = f"board {found[0].name}, of the same address {port.address}, is there already"
        elif found:
            why = f"address {port.address} does not tell whose place it could take"
        else:
            why = f"no board has its address {port.address}"
        return None, f"the layout file does not name the board '{port.uid}', and {why}"
