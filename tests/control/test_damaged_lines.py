"""100,000 damaged lines into a running controller: no wrong action, no exception, and it still answers."""

import random

from bench import Bench
from bench_layouts import usual

from shared_protocol import messages
from shared_protocol.codec import Codec
from shared_protocol.registry import board_reads
from tests.protocol.test_reader import damaged

LINES = 100_000


def test_damaged_lines_do_nothing() -> None:
    rng = random.Random(20261202)
    bench = Bench(usual())
    bench.hello()
    codec = Codec(board_reads())
    boot = bench.board.boot
    sent = [
        codec.encode(messages.THROW, [boot, 901, 0, 1, 0]),
        codec.encode(messages.THROW, [boot, 902, 4, 2, 5000]),
        codec.encode(messages.ROUTE, [boot, 903, 0, 5000]),
        codec.encode(messages.STOP, []),
        codec.encode(messages.STAGE, [boot, 9]),
        codec.encode(messages.COMMIT, [boot, b"CBF43926"]),
        codec.encode(messages.RESTART, [boot]),
    ]
    controller = bench.controller
    fed = 0
    while fed < LINES:
        line = rng.choice(sent)
        # The byte that means leave is no part of a line; what arrives whole after all is not damaged.
        broken = damaged(line, rng).replace(b"\x03", b"?") + b"\n"
        if line.strip() in [part.strip(b"\r") for part in broken.split(b"\n")]:
            continue
        fed += 1
        bench.board.say(broken)
        while bench.board.unread():
            bench.board.pass_us(20)
            controller.tick()
            if controller.has_work:
                controller.work()
        bench.board.out_count = 0
    assert controller.plant is not None and controller.queue is not None
    assert bench.board.pulse_count == 0 and controller.queue.throws.count == 0
    assert not controller.plant.stopped and not controller.store.staging and not controller.leaving
    assert controller.store.sequence == 1 and bench.board.was_reset == 0
    assert controller.endpoint.bad_lines > LINES // 2
    bench.send("hello", v=1)
    bench.run(50)
    number = bench.throw(0, 1, 5000)
    bench.keep_alive(1000)
    found = bench.outcome(number)
    assert found is not None and found["o"] == "done"
