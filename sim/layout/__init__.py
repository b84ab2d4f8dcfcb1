"""Layout files: TOML that a layout electrician writes, checked whole, turned into settings and a simulated layout."""

from pathlib import Path

from sim.layout.assembling import layout_of
from sim.layout.layout import BoardLayout, Layout, Route, SeveralBoards
from sim.layout.physics import MotorPhysics, PhysicsLayout
from sim.layout.problems import BadFile, FileProblem
from sim.layout.reading import read_toml

__all__ = [
    "BadFile", "BoardLayout", "FileProblem", "Layout", "MotorPhysics", "PhysicsLayout", "Route", "SeveralBoards",
    "demo_layout_path", "layout_of", "load_layout",
]  # fmt: skip


def demo_layout_path() -> Path:
    """The demo layout, Saltmarsh Quay."""
    return Path(__file__).parent.parent / "layouts" / "saltmarsh_quay.toml"


def load_layout(path: Path) -> Layout:
    """Read and check a layout file. Raises BadFile with everything that is wrong, by line."""
    return layout_of(read_toml(path))
