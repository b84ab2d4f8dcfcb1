"""The link against a scripted board on a pty: what it says, what it survives, and that coming back never fires."""

import os
import queue
import termios
import threading
from collections.abc import Iterator

import pytest
import serial

from host.link import Link, LinkChange, open_port
from host.link_errors import (
    NoAnswer,
    NotOurBoard,
    PermissionDenied,
    PortBusy,
    PortMissing,
    Unplugged,
    WrongVersion,
    error_of_open,
)
from host.model import LayoutModel
from host.session import Session
from shared_protocol import messages
from shared_protocol.codec import Received
from tests.host.scripted_board import BOARD, Peer, line, usual, wait_until

QUICK = (0.01,)


@pytest.fixture(autouse=True)
def no_thread_stays() -> Iterator[None]:
    """Every link that a test made is closed with no thread left."""
    yield
    assert [each.name for each in threading.enumerate() if each.name.startswith("link ")] == []


def changes(link: Link) -> list[LinkChange]:
    found: list[LinkChange] = []
    while True:
        try:
            item = link.received.get_nowait()
        except queue.Empty:
            return found
        if isinstance(item, LinkChange):
            found.append(item)


def first_change(link: Link, limit_s: float = 5.0) -> LinkChange:
    while True:
        item = link.received.get(timeout=limit_s)
        if isinstance(item, LinkChange):
            return item


@pytest.mark.parametrize("garbage", [b"", b"\x00\xff{half a li", b"boot: hello\r\n", b'{"m":"board"}*00000000\n'])
def test_connects_after_garbage(garbage: bytes) -> None:
    # Opening a port throws away what came before; so the garbage comes with the first answer.
    end = b"\n" if garbage and not garbage.endswith(b"\n") else b""
    peer = Peer(lambda heard: (garbage + end if heard.message is messages.HELLO else b"") + usual(heard))
    with Link(peer.path) as link:
        assert first_change(link).state == "connected"
        assert link.connected
        said = peer.names()
        assert said[0] == "hello"
    peer.unplug()


def test_garbage_without_newline_swallows_one_answer_and_no_more() -> None:
    garbage = [b"\xfe\xfegarbage"]
    peer = Peer(lambda heard: (garbage.pop() if garbage else b"") + usual(heard))
    with Link(peer.path) as link:
        assert first_change(link).state == "connected"
        assert peer.names().count("hello") == 2
    peer.unplug()


@pytest.mark.parametrize("chunk", [1, 2, 3, 7])
def test_any_split_of_the_bytes_gives_the_same_messages(chunk: int) -> None:
    def answers(heard: Received) -> bytes:
        if heard.message is messages.HELLO:
            return line(messages.BOARD, **BOARD) + b"a text\n" + line(messages.LIE, j=1, lie=0, src="sent")
        return b""

    peer = Peer(answers, chunk=chunk)
    with Link(peer.path) as link:
        assert first_change(link).state == "connected"
        got = [link.received.get(timeout=3) for _ in range(3)]
        assert [each.message.name if isinstance(each, Received) and each.message else "" for each in got] == [
            "board", "", "lie",
        ]  # fmt: skip
    peer.unplug()


def test_every_split_point_of_the_answer() -> None:
    answer = line(messages.BOARD, **BOARD)
    for split in range(1, len(answer), 2):
        parts = [answer[:split], answer[split:]]
        peer = Peer(lambda heard, parts=parts: parts.pop(0) if parts and heard.message is messages.HELLO else b"")
        with Link(peer.path) as link:
            assert wait_until(lambda peer=peer: "hello" in peer.names())
            rest = parts.pop(0) if parts else b""
            peer.say(rest)
            assert first_change(link).state == "connected", split
        peer.unplug()


def test_unplugged_at_any_byte_of_a_line_is_lost_not_an_exception() -> None:
    whole = line(messages.LIE, j=1, lie=0, src="sent")
    for cut in range(len(whole)):
        peer = Peer()
        link = Link(peer.path, back_off_s=QUICK)
        link.open()
        assert first_change(link).state == "connected"
        peer.say(whole[:cut])
        peer.unplug()
        lost = first_change(link)
        assert lost.state == "lost" and isinstance(lost.error, Unplugged), cut
        assert not link.connected
        assert link.send(messages.STOP, []) is False
        link.close()


def test_another_programs_text_is_shown() -> None:
    peer = Peer(lambda heard: b"MicroPython v1.99 on 2026-01-01\r\n>>> \n")
    with Link(peer.path, hello_limit_s=0.4) as link:
        change = first_change(link)
    assert change.state == "refused"
    assert isinstance(change.error, NotOurBoard) and ">>>" in str(change.error)
    peer.unplug()


def test_a_device_that_goes_away_while_it_is_opened_is_typed_too() -> None:
    # Here termios raises its own error, which is no OSError; the thread must outlive it and try again.
    tries = []

    def opener(port: str) -> object:
        tries.append(port)
        raise termios.error(5, "Input/output error")

    with Link("/dev/gone", opener=opener, back_off_s=QUICK) as link:
        assert isinstance(first_change(link).error, PortMissing)
        assert wait_until(lambda: len(tries) > 3)


def test_after_a_refusal_hello_is_not_repeated_for_long() -> None:
    peer = Peer(lambda heard: b"some other program\n")
    with Link(peer.path, back_off_s=QUICK, hello_limit_s=0.2, refused_s=30.0) as link:
        assert first_change(link).state == "refused"
        said = len(peer.heard)
        assert not wait_until(lambda: len(peer.heard) > said, 0.8)
    peer.unplug()


def test_silence_is_no_answer() -> None:
    peer = Peer(lambda heard: b"")
    with Link(peer.path, hello_limit_s=0.3) as link:
        assert isinstance(first_change(link).error, NoAnswer)
    peer.unplug()


@pytest.mark.parametrize("theirs", [messages.VERSION + 1, messages.VERSION + 40])
def test_wrong_version_names_both_and_the_remedy(theirs: int) -> None:
    def answers(heard: Received) -> bytes:
        if heard.message is messages.HELLO:
            return line(messages.WRONG_VERSION, v=theirs, fw="9.9", asked=heard.number("v"))
        return b""

    peer = Peer(answers)
    with Link(peer.path, back_off_s=(9.0,)) as link:
        change = first_change(link)
    assert change.state == "refused" and isinstance(change.error, WrongVersion)
    assert str(messages.VERSION) in str(change.error) and str(theirs) in str(change.error)
    assert "update this program" in str(change.error)
    peer.unplug()


def test_says_alive_when_idle_and_no_oftener_than_needed() -> None:
    peer = Peer()
    with Link(peer.path) as link:
        assert first_change(link).state == "connected"
        assert wait_until(lambda: peer.names().count("alive") >= 3, 3.0)
        assert peer.names().count("hello") == 1
    peer.unplug()


def test_a_missing_port_is_told_once_and_tried_again() -> None:
    tries = []

    def opener(port: str) -> object:
        tries.append(port)
        return open_port(port)

    with Link("/dev/no-such-port", opener, back_off_s=QUICK) as link:
        assert isinstance(first_change(link).error, PortMissing)
        assert wait_until(lambda: len(tries) > 4)
        assert changes(link) == []


def test_a_second_program_finds_the_port_busy() -> None:
    peer = Peer()
    with Link(peer.path) as first:
        assert first_change(first).state == "connected"
        with Link(peer.path) as second:
            change = first_change(second)
        assert isinstance(change.error, PortBusy)
        assert first.connected
    peer.unplug()


@pytest.mark.parametrize(
    ("number", "port", "kind"),
    [
        (13, "/dev/ttyACM0", PermissionDenied),
        (13, "COM4", PortBusy),
        (16, "/dev/ttyACM0", PortBusy),
        (2, "/dev/ttyACM0", PortMissing),
        (111, "socket://127.0.0.1:1", PortMissing),
    ],
)
def test_what_the_system_says_becomes_a_typed_error(number: int, port: str, kind: type[Exception]) -> None:
    error = error_of_open(port, serial.SerialException(number, os.strerror(number)))
    assert type(error) is kind
    if kind is PermissionDenied:
        assert "dialout" in str(error)


def test_coming_back_reads_and_never_fires() -> None:
    peers: list[Peer] = []

    def opener(_: str) -> object:
        peers.append(Peer())
        return open_port(peers[-1].path)

    link = Link("any", opener, back_off_s=QUICK)
    model = LayoutModel()
    session = Session(link, model)
    session.connect()
    session.throw(0, 1, 5000)
    session.route(0, 5000)
    assert wait_until(lambda: {"throw", "route"} <= set(peers[0].names()))
    for round_ in range(1, 4):
        peers[-1].unplug()
        assert session.wait_for(lambda: model.connection.state == "lost", 5)
        lost_id = session.throw(0, 0, 5000)
        assert session.outcome_of(lost_id) is not None, "a request without a link must end at once"
        assert session.wait_for(lambda: session.status_whole, 5)
        assert len(peers) == round_ + 1
    link.close()
    for peer in peers[1:]:
        assert set(peer.names()) <= {"hello", "ask", "alive", "ack"}
        assert peer.names()[0] == "hello"
    peers[-1].unplug()


def test_kept_messages_are_acknowledged_each_time_they_come() -> None:
    kept = line(messages.CLEARED, q=5, scope="bank", i=0)

    def answers(heard: Received) -> bytes:
        return usual(heard) + (kept if heard.message is messages.ALIVE else b"")

    peer = Peer(answers)
    link = Link(peer.path)
    session = Session(link, LayoutModel())
    session.connect()
    assert session.wait_for(lambda: peer.names().count("ack") >= 2, 4)
    cleared = [event for event in session.model.events if "in use again" in event.text]
    assert len(cleared) == 1
    link.close()
    peer.unplug()
