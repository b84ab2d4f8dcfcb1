"""Layout files: TOML that a layout electrician writes, checked whole, turned into settings and a simulated layout."""

from dataclasses import replace
from pathlib import Path

from shared_protocol.settings import Problem, Settings
from shared_protocol.settings_check import check
from shared_protocol.words import REASON_REMEDIES, REASON_TEXTS, REASONS
from sim.circuit_parameters import BankParameters, SupplyParameters
from sim.layout.building import LayoutBuilder
from sim.layout.layout import Layout, MotorPhysics, PhysicsLayout
from sim.layout.problems import BadFile, FileProblem
from sim.layout.reading import read_toml
from sim.layout.warnings import warnings_of
from sim.motor import motor_kinds

__all__ = ["BadFile", "FileProblem", "Layout", "MotorPhysics", "PhysicsLayout", "demo_layout_path", "load_layout"]


def demo_layout_path() -> Path:
    """The demo layout, Saltmarsh Quay."""
    return Path(__file__).parent.parent / "layouts" / "saltmarsh_quay.toml"


def load_layout(path: Path) -> Layout:
    """Read and check a layout file. Raises BadFile with everything that is wrong, by line."""
    document = read_toml(path)
    builder = LayoutBuilder(document)
    builder.build()
    document.raise_if_wrong()
    settings = Settings()
    problem: Problem | None = None
    for message, values in builder.records.rows:
        problem = problem or settings.add(message, values)
    problem = problem or check(settings)
    if problem is not None:
        note(builder, problem)
        document.raise_if_wrong()
    layout = Layout(
        path, builder.name, builder.records.rows, settings, physics_of(builder), builder.junctions.words,
        builder.inputs, [], builder.records.origins,
    )  # fmt: skip
    layout.warnings.extend(warnings_of(layout))
    return layout


def note(builder: LayoutBuilder, problem: Problem) -> None:
    """Note what the check of the whole found, in the owner's terms."""
    number = REASONS.index(problem.why)
    remedy = REASON_REMEDIES[number]
    message = REASON_TEXTS[number] + (f": {remedy}" if remedy else "")
    if problem.record < 0:
        builder.document.wrong((), message)
        return
    where, owner = builder.records.origins[problem.record]
    builder.document.wrong((*where, owner.get(problem.field, problem.field)), message)


def physics_of(builder: LayoutBuilder) -> PhysicsLayout:
    """The simulator's half of the layout."""
    supply = SupplyParameters(builder.full_supply_v(), builder.supply.get("source_ohm", 0.5))
    banks = []
    for bank in builder.banks:
        limit_ma = bank.get("limit_ma", 0)
        banks.append(
            BankParameters(
                capacitance_f=bank.get("capacitance_uf", 4700) * 1e-6,
                esr_ohm=bank.get("esr_ohm", 0.05),
                leak_ohm=bank.get("bleed_ohm", 4700.0),
                charge_ohm=max(0.1, bank.get("charge_ohm", 47.0)),
                charge_limit_a=limit_ma / 1000 if limit_ma else None,
            )
        )
    kinds = motor_kinds()
    motors = []
    for motor in builder.junctions.motors:
        usual = "self_ending" if motor.get("ends_own_pulse") else "usual"
        parameters = replace(kinds[motor.get("simulated", usual)], resistance_ohm=motor["ohm"])
        motors.append(MotorPhysics(parameters, motor.get("starts", "normal")))
    return PhysicsLayout(supply, banks, motors)
