"""What the desk needs of a session; host.session.Session has it, tests bring their own."""

from typing import Protocol

from host.model import LayoutModel, Records
from host.session import Part
from host.views import OutcomeView


class TransferLike(Protocol):
    """A settings transaction under way, or ended."""

    state: str

    @property
    def open(self) -> bool:
        """True until it has ended."""

    @property
    def progress(self) -> float:
        """0 to 1."""

    @property
    def answer(self) -> str:
        """What the board answered, or how it stands."""

    def cancel(self) -> None:
        """Drop it."""


class SettingsTaker(Protocol):
    """One board's session, as far as settings are sent to it."""

    def send_settings(self, records: Records) -> TransferLike:
        """Send settings as one transaction."""


class SessionLike(Protocol):
    """A session."""

    @property
    def model(self) -> LayoutModel:
        """What the board said."""

    def clock(self) -> float:
        """Seconds, monotonic."""

    def poll(self) -> int:
        """Take what came in."""

    def throw(self, junction: int, lie: int, wait_ms: int = 0) -> int:
        """Ask for one throw."""

    def route(self, route: int, wait_ms: int = 0) -> int:
        """Ask for a route."""

    def cancel(self, number: int) -> bool:
        """Cancel a request."""

    def stop(self) -> bool:
        """The operator's stop."""

    def release(self) -> bool:
        """End the stop."""

    def clear(self, scope: str, number: int = 0) -> bool:
        """Put what is out back into use."""

    def send_settings(self, records: Records) -> TransferLike:
        """Send settings as one transaction."""

    def fetch_settings(self) -> bool:
        """Ask for the board's settings."""

    @property
    def parts(self) -> list[Part]:
        """Its boards."""

    @property
    def unreached(self) -> str:
        """Which boards a stop or release does not reach now, in a sentence; '' if it reaches all."""

    def outcome_of(self, number: int) -> OutcomeView | None:
        """How a request ended."""
