"""The cautions, shown before the first pulse of a real board on this machine."""

import os
import sys
from pathlib import Path

CAUTIONS = (
    "Local codes, the venue's electrical inspection and licensed practice come before anything written here.",
    "Stop is not isolation: unplug, bleed and measure before you touch anything.",
    "Bleed a bank through 100 ohm 5 W, never with a screwdriver.",
    "Capacitors: mind polarity and voltage rating; vents away from faces; wear eye protection.",
    "Fuse the supply. Mains only as approved ready-made units.",
    "Fingers out of the blades, trains off the points.",
    "Keep the hot charge resistor off the timber, and children behind the barrier.",
    "Do not plug baseboards together live.",
)


def state_file() -> Path:
    """Where this machine remembers for which boards the cautions were shown."""
    if sys.platform == "win32":
        base = Path(os.environ.get("LOCALAPPDATA") or Path.home())
    else:
        base = Path(os.environ.get("XDG_STATE_HOME") or Path.home() / ".local" / "state")
    return base / "coilwarden" / "cautions_shown"


def cautions_for(kind: str, uid: str) -> tuple[str, ...]:
    """The cautions, if this real board has not been fired from this machine before; else nothing.

    If it can't be remembered, they are shown each time.
    """
    if kind.startswith("virtual"):
        return ()
    path = state_file()
    try:
        if uid in path.read_text("utf-8").splitlines():
            return ()
    except (OSError, UnicodeDecodeError):
        pass
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        with path.open("a", encoding="utf-8") as file:
            file.write(uid + "\n")
    except OSError:
        return CAUTIONS
    return CAUTIONS
