"""'Now' or 'wait': what a throw asks of a bank that is not ready."""

from dataclasses import dataclass

from host.terminal.rows import seconds

WAITS_MS = (1000, 2000, 5000, 10_000, 20_000, 30_000, 60_000)


@dataclass
class Mode:
    """How throws are asked for. `longest_ms`: how long one may wait, in the mode 'wait'."""

    waits: bool = True
    longest_ms: int = 5000

    @property
    def wait_ms(self) -> int:
        """The wait that goes with a request; 0 means now or not at all."""
        return self.longest_ms if self.waits else 0

    def switch(self) -> None:
        """To the other mode."""
        self.waits = not self.waits

    def longer(self) -> None:
        """The next longer wait."""
        self.longest_ms = next((each for each in WAITS_MS if each > self.longest_ms), WAITS_MS[-1])

    def shorter(self) -> None:
        """The next shorter wait."""
        self.longest_ms = next((each for each in reversed(WAITS_MS) if each < self.longest_ms), WAITS_MS[0])

    @property
    def short_text(self) -> str:
        """'NOW' or 'WAIT 5.0 s'."""
        return f"WAIT {seconds(self.longest_ms)}" if self.waits else "NOW"

    @property
    def text(self) -> str:
        """What the mode does, in a sentence."""
        if self.waits:
            return f"Throws wait up to {seconds(self.longest_ms)} for their bank (m: now, + and - change the wait)."
        return "Throws go now or are refused (m: wait)."
