"""The voltage curve of a bank: its readings, and the ready voltages of its junctions as labelled lines."""

from dataclasses import dataclass

from host.model import LayoutModel
from host.terminal.voltage_history import VoltageHistory

WINDOW_S = 20.0


@dataclass(frozen=True)
class ReadyLine:
    """Level lines that share a label (it stands at the highest of them): their voltages, and what is ready there."""

    levels_v: tuple[float, ...]
    label: str


@dataclass(frozen=True)
class Curve:
    """What the plot shows. `times_s` are 0 (now) and below."""

    title: str
    times_s: tuple[float, ...]
    volts: tuple[float, ...]
    low_v: float
    high_v: float
    ticks_v: tuple[float, ...]
    lines: tuple[ReadyLine, ...]


def curve_of(
    model: LayoutModel,
    history: VoltageHistory,
    bank: int,
    now_s: float,
    rows: int,
    changed: dict[tuple[int, int], int] | None = None,
    only: int = -1,
) -> Curve | None:
    """The curve of a bank; None if there is no such bank.

    rows: how many rows the plot has, so that labels do not cover each other. changed: ready voltages being tuned, by
    junction and lie. only: the junction whose lines alone are drawn; -1: those of all junctions on the bank.
    """
    if not 0 <= bank < len(model.banks):
        return None
    view = model.banks[bank]
    readings = history.since(bank, now_s - WINDOW_S)
    volts = [mv / 1000 for _, mv in readings]
    ready = _ready_voltages(model, bank, changed or {}, only)
    top = max([view.full_mv / 1000, *volts])
    bottom = min([*(mv / 1000 for mv, _ in ready), *volts, top - 2.0])
    low, high = max(0.0, float(int(bottom - 0.5))), float(int(top) + 1)
    held = f"{view.mv / 1000:.1f} V now" if view.mv >= 0 else "no reading"
    return Curve(
        f"Bank {view.name}: {held}; last {WINDOW_S:.0f} s; dashed: ready voltages",
        tuple(round(at_s - now_s, 2) for at_s, _ in readings),
        tuple(volts),
        low,
        high,
        ticks(low, high, rows),
        tuple(_grouped(ready, (high - low) / max(1, rows))),
    )


def _ready_voltages(
    model: LayoutModel, bank: int, changed: dict[tuple[int, int], int], only: int
) -> list[tuple[int, str]]:
    """Voltage and name of each line, lowest first; both lies of a junction at one voltage make one."""
    found: dict[tuple[int, str], None] = {}
    for junction in model.junctions:
        if bank not in junction.bank_numbers or (only >= 0 and junction.number != only):
            continue
        several = len({lie.ready_mv for lie in junction.lies}) > 1
        for lie in junction.lies:
            name = f"{junction.number + 1} {junction.name}" + (f" {lie.word}" if several else "")
            found[(lie.ready_mv, name)] = None
            new_mv = changed.get((junction.number, lie.number))
            if new_mv is not None:
                found[(new_mv, f"{junction.number + 1} {junction.name} {lie.word} NEW")] = None
    return sorted(found)


def _grouped(ready: list[tuple[int, str]], pitch_v: float) -> list[ReadyLine]:
    """Lines closer than a row of the plot share one label, which names every voltage in it."""
    groups: list[list[tuple[int, str]]] = []
    for each in ready:
        if groups and (each[0] - groups[-1][0][0]) / 1000 < pitch_v:
            groups[-1].append(each)
        else:
            groups.append([each])
    lines = []
    for group in groups:
        by_voltage: dict[int, list[str]] = {}
        for mv, name in group:
            by_voltage.setdefault(mv, []).append(name)
        text = "; ".join(f"{mv / 1000:.1f} V {', '.join(names)}" for mv, names in by_voltage.items())
        lines.append(ReadyLine(tuple(mv / 1000 for mv in by_voltage), text))
    return lines


def ticks(low_v: float, high_v: float, rows: int) -> tuple[float, ...]:
    """Whole volts for the scale, at most every other row."""
    step = next((each for each in (1, 2, 5, 10) if (high_v - low_v) / each <= max(1, rows / 2)), 20)
    first = -int(-low_v // step) * step
    return tuple(float(mark) for mark in range(first, int(high_v) + 1, step))
