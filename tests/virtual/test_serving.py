"""A virtual board on a loopback socket, at the level of bytes; the host's own link is tested with the host."""

import json
import socket
import time
from collections.abc import Callable, Iterator

import pytest

from shared_protocol import messages
from shared_protocol.codec import Codec, plain, values_from
from shared_protocol.registry import board_reads, host_reads
from sim.layout import demo_layout_path, load_layout
from sim.serving import ServingError, VirtualServer


class Client:
    """Speaks the wire over a plain socket."""

    def __init__(self, port: int) -> None:
        self._socket = socket.create_connection(("127.0.0.1", port), timeout=5)
        self._socket.settimeout(0.2)
        self._writer = Codec(board_reads())
        self._reader = Codec(host_reads())
        self.heard: list[dict[str, object]] = []
        self.closed = False

    def say(self, message: messages.Message, **fields: object) -> None:
        self._socket.sendall(self._writer.encode(message, values_from(message, fields)))

    def until(self, good: Callable[[dict[str, object]], bool], seconds: float = 8.0) -> dict[str, object]:
        """The first message that is good; says that it is there all the time."""
        ends_s = time.monotonic() + seconds
        seen = 0
        while time.monotonic() < ends_s and not self.closed:
            for found in self.heard[seen:]:
                seen += 1
                if good(found):
                    return found
            self.say(messages.ALIVE)
            self._receive()
        raise AssertionError([found for found in self.heard if found["m"] not in ("bank", "state")])

    def _receive(self) -> None:
        try:
            data = self._socket.recv(4096)
        except TimeoutError:
            return
        self.closed = not data
        for received in self._reader.feed(data):
            if received.message is not None:
                self.heard.append({"m": received.message.name, **plain(received.message, received.values)})

    def close(self) -> None:
        self._socket.close()


def named(name: str, **fields: object) -> Callable[[dict[str, object]], bool]:
    return lambda found: found["m"] == name and all(found[key] == value for key, value in fields.items())


@pytest.fixture(params=["cpython", "micropython"])
def server(request: pytest.FixtureRequest) -> Iterator[VirtualServer]:
    with VirtualServer(load_layout(demo_layout_path()), request.param, 0, pace=False) as server:
        yield server
    assert server.failure is None


def test_a_throw_and_an_injected_fault(server: VirtualServer) -> None:
    client = Client(server.port)
    client.say(messages.HELLO, v=1)
    boot = client.until(named("board"))["boot"]
    client.until(lambda found: found["m"] == "bank" and found["b"] == 0 and found["state"] == "ready")
    client.say(messages.THROW, boot=boot, id=1, j=0, lie=1, wait=5000)
    assert client.until(named("outcome", id=1))["o"] == "done"

    def stick(world: object) -> None:
        server.world.circuit.coil_faults[0, 1].driver_stuck = True

    server.inject(stick)
    assert client.until(named("fault", scope="bank", i=0))["code"] == "held_down"
    client.close()


def test_another_run_is_another_boot() -> None:
    boots = []
    for _ in range(2):
        with VirtualServer(load_layout(demo_layout_path())) as server:
            client = Client(server.port)
            client.say(messages.HELLO, v=1)
            boots.append(client.until(named("board"))["boot"])
            client.close()
        time.sleep(1.1)
    assert boots[1] > boots[0], "a host that was connected to the first sees a restart"


def test_time_stands_still_with_nobody_attached_and_one_client_at_a_time(server: VirtualServer) -> None:
    time.sleep(0.3)
    assert server.world.now_us == 0
    first = Client(server.port)
    first.say(messages.HELLO, v=1)
    boot = first.until(named("board"))["boot"]
    second = Client(server.port)
    second.say(messages.HELLO, v=1)
    with pytest.raises((AssertionError, OSError)):
        second.until(named("board"), 2.0)
    second.close()
    first.until(named("state"))
    first.close()
    ends_s = time.monotonic() + 5
    while server.script.attached.is_set() and time.monotonic() < ends_s:
        time.sleep(0.02)
    time.sleep(0.1)
    stood_us = server.world.now_us
    time.sleep(0.3)
    assert server.world.now_us == stood_us
    third = Client(server.port)
    third.say(messages.HELLO, v=1)
    assert third.until(named("board"))["boot"] == boot, "the same board as before"
    third.close()


def test_paced_to_real_time() -> None:
    with VirtualServer(load_layout(demo_layout_path())) as server:
        client = Client(server.port)
        client.say(messages.HELLO, v=1)
        client.until(named("board"))
        began_s, began_us = time.monotonic(), server.world.now_us
        while time.monotonic() < began_s + 1.0:
            client.say(messages.ALIVE)
            client._receive()
        passed_us = server.world.now_us - began_us
        # Never faster; how much slower is up to a machine that others use too.
        assert 0.2 <= passed_us / 1e6 / (time.monotonic() - began_s) <= 1.1
        client.close()


def test_a_lower_ready_voltage_is_taken_and_counts(server: VirtualServer) -> None:
    """The world judges by the settings that the board has in force, not by those it began with."""
    layout = load_layout(demo_layout_path())
    records = []
    for message, values in layout.records:
        values = list(values)
        if message.name == "set_lie" and values[message.position("j")] == layout.junction_number("Bay"):
            values[message.position("ready_mv")] = 6000
        records.append(Codec(board_reads()).body(message, values))
    client = Client(server.port)
    client.say(messages.HELLO, v=1)
    boot = client.until(named("board"))["boot"]
    client.say(messages.STAGE, boot=boot, n=len(records))
    assert client.until(named("answer", to="stage"))["ok"] == 1
    writer = Codec(board_reads())
    for body in records:
        client._socket.sendall(body + b"*" + writer.crc_text(body) + b"\n")
        client._receive()
    crc = writer.crc_text(b"".join(body + b"\n" for body in records)).decode()
    client.say(messages.COMMIT, boot=boot, crc=crc)
    assert client.until(named("accepted"))["crc"] == crc
    # Both at once: the second waits for the bank to come back, and does not wait for long.
    client.say(messages.THROW, boot=boot, id=1, j=0, lie=1, wait=5000)
    client.say(messages.THROW, boot=boot, id=2, j=layout.junction_number("Bay"), lie=1, wait=5000)
    done = client.until(named("outcome", id=2))
    assert done["o"] == "done" and 6000 <= int(str(done["mv"])) < 10_000, done
    client.close()


def test_a_port_that_is_taken_is_said() -> None:
    layout = load_layout(demo_layout_path())
    with VirtualServer(layout) as server, pytest.raises(ServingError, match=str(server.port)):
        VirtualServer(layout, port=server.port).start()


def test_the_records_are_json_that_any_program_reads() -> None:
    for body in load_layout(demo_layout_path()).record_bodies():
        assert json.loads(body)["m"].startswith("set_")
