"""What each bank's voltage was in the last minute: a ring of (time, millivolts)."""

from collections import deque

from host.model import LayoutModel

# A minute at ten readings a second.
KEPT = 600


class VoltageHistory:
    """Takes a reading whenever the board has told one."""

    def __init__(self) -> None:
        self._rings: dict[int, deque[tuple[float, int]]] = {}
        self._heard: dict[int, float] = {}

    def take(self, model: LayoutModel) -> None:
        """Keep the readings that are new."""
        for bank in model.banks:
            if bank.heard_at_s is None or bank.mv < 0 or self._heard.get(bank.number) == bank.heard_at_s:
                continue
            self._heard[bank.number] = bank.heard_at_s
            self.add(bank.number, bank.heard_at_s - max(0, bank.age_ms) / 1000, bank.mv)

    def add(self, bank: int, at_s: float, mv: int) -> None:
        """Keep one reading."""
        self._rings.setdefault(bank, deque(maxlen=KEPT)).append((at_s, mv))

    def since(self, bank: int, from_s: float) -> list[tuple[float, int]]:
        """The readings of a bank from that time on, oldest first."""
        return [reading for reading in self._rings.get(bank, ()) if reading[0] >= from_s]
