"""A small layout for tests of the host, made from records: no file, no simulator."""

from shared_protocol.codec import Codec
from shared_protocol.fields import Message
from shared_protocol.registry import host_reads
from shared_protocol.settings import Settings
from tests.control.bench_layouts import BenchLayout, usual


class RecordLayout:
    """What the model needs of a layout file."""

    def __init__(self, made: BenchLayout | None = None) -> None:
        bench = made or usual()
        self.records: list[tuple[Message, list[object]]] = bench.rows()
        self.settings: Settings = bench.settings()
        self.input_names = {"key": 20}

    def crc(self) -> str:
        """CRC-32 of the records."""
        codec = Codec(host_reads())
        return codec.crc_text(
            b"".join(codec.body(message, values) + b"\n" for message, values in self.records)
        ).decode()
