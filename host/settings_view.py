"""Views made from settings: banks, junctions, routes and their names."""

from dataclasses import dataclass, field

from host.views import BankView, JunctionView, LieView, Names, RouteView
from shared_protocol.settings import JunctionSettings, LieSettings, Settings
from shared_protocol.settings_table import JUNCTION_KINDS


@dataclass
class Plan:
    """All that settings say about a layout, as views."""

    settings: Settings | None = None
    banks: list[BankView] = field(default_factory=list)
    junctions: list[JunctionView] = field(default_factory=list)
    routes: list[RouteView] = field(default_factory=list)
    names: Names = field(default_factory=Names)


def empty_plan() -> Plan:
    """What is known without settings: nothing."""
    return Plan()


def plan_of(settings: Settings) -> Plan:
    """The views of checked settings."""
    plan = Plan(settings)
    for bank in settings.banks:
        plan.banks.append(BankView(bank.i, bank.name.decode() or str(bank.i + 1), bank.full_mv))
    for junction in settings.junctions:
        plan.junctions.append(_junction(settings, junction))
    for route in settings.routes:
        pairs = [(route.throws[place], route.throws[place + 1]) for place in range(0, len(route.throws) - 1, 2)]
        plan.routes.append(RouteView(route.i, route.name.decode() or str(route.i + 1), pairs))
    plan.names = Names(
        [bank.name for bank in plan.banks],
        [junction.name for junction in plan.junctions],
        [[lie.word for lie in junction.lies] for junction in plan.junctions],
        [route.name for route in plan.routes],
    )
    return plan


def _junction(settings: Settings, junction: JunctionSettings) -> JunctionView:
    banks = sorted({settings.motors[motor].bank for motor in junction.motors})
    return JunctionView(
        junction.i,
        junction.name.decode() or f"junction {junction.i + 1}",
        JUNCTION_KINDS[junction.kind],
        banks,
        [_lie(lie) for lie in junction.lies],
    )


def _lie(lie: LieSettings) -> LieView:
    name = lie.name.decode()
    return LieView(lie.i, name, lie.word.decode() or name, lie.ready_mv, lie.pulse_us, lie.full_us)
