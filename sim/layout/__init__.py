"""Layout files: TOML that a layout electrician writes, checked whole, turned into settings and a simulated layout."""

from pathlib import Path

from shared_protocol.settings import Problem, Settings
from shared_protocol.settings_check import check
from shared_protocol.words import REASON_REMEDIES, REASON_TEXTS, REASONS
from sim.layout.building import LayoutBuilder
from sim.layout.layout import Layout
from sim.layout.physics import MotorPhysics, PhysicsLayout, physics_of
from sim.layout.problems import BadFile, FileProblem
from sim.layout.reading import Document, read_toml
from sim.layout.warnings import warnings_of

__all__ = [
    "BadFile", "FileProblem", "Layout", "MotorPhysics", "PhysicsLayout", "demo_layout_path", "layout_of", "load_layout",
]  # fmt: skip


def demo_layout_path() -> Path:
    """The demo layout, Saltmarsh Quay."""
    return Path(__file__).parent.parent / "layouts" / "saltmarsh_quay.toml"


def load_layout(path: Path) -> Layout:
    """Read and check a layout file. Raises BadFile with everything that is wrong, by line."""
    return layout_of(read_toml(path))


def layout_of(document: Document) -> Layout:
    """Check a layout file that has been read. Raises BadFile with everything that is wrong, by line."""
    builder = LayoutBuilder(document)
    builder.build()
    document.raise_if_wrong()
    settings = Settings()
    problem: Problem | None = None
    for message, values in builder.records.rows:
        problem = problem or settings.add(message, values)
    # The board's own check has the last word; the reader has named most of this before, with more detail.
    problem = problem or check(settings)
    if problem is not None:
        _note(builder, problem)
        document.raise_if_wrong()
    junctions = builder.junctions
    layout = Layout(
        path=Path(document.file), name=builder.name, records=builder.records.rows, settings=settings,
        physics=physics_of(builder.banks, junctions.motors.tables), junction_names=junctions.names.all,
        junction_words=junctions.words, lie_names=junctions.lie_names, bank_names=builder.banks.names.all,
        route_names=builder.panel.routes.all, input_names=builder.inputs.numbers, output_names=builder.outputs.numbers,
        origins=builder.records.origins,
    )  # fmt: skip
    layout.warnings.extend(warnings_of(layout, builder.banks, document.data["bank"]))
    return layout


def _note(builder: LayoutBuilder, problem: Problem) -> None:
    """Note what the check of the whole found, in the owner's terms."""
    number = REASONS.index(problem.why)
    remedy = REASON_REMEDIES[number]
    message = REASON_TEXTS[number] + (f": {remedy}" if remedy else "")
    if problem.record < 0:
        builder.document.wrong((), message)
        return
    where, owner_keys = builder.records.origins[problem.record]
    key = owner_keys.get(problem.field, "")
    builder.document.wrong((*where, key) if key else where, message)
