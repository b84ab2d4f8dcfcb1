"""Draws a curve with plotext; the lines are dashed and labelled, so it can be read without colour."""

from typing import Any

from textual.markup import escape
from textual_plotext import PlotextPlot

from host.terminal.curve_view import WINDOW_S, Curve
from host.terminal.rows import fit

_CURVE_MARKER = "braille"
# No colour of its own: readable on any terminal.
_PLAIN = {"color": "default", "background": "default"}


class CurvePlot(PlotextPlot):
    """The voltage curve of one bank."""

    can_focus = False

    def __init__(self, id: str | None = None) -> None:
        super().__init__(id=id)
        self._drawn: Curve | None = None

    def show(self, curve: Curve | None) -> None:
        """Draw this curve; does nothing if it is drawn already."""
        if curve == self._drawn:
            return
        self._drawn = curve
        plt: Any = self.plt
        plt.clear_figure()
        if curve is not None:
            self.border_title = escape(curve.title)
            self._draw(plt, curve)
        self.refresh()

    def _draw(self, plt: Any, curve: Curve) -> None:
        plt.xlim(-WINDOW_S, 0)
        plt.ylim(curve.low_v, curve.high_v)
        plt.frame(True)
        plt.xticks([-20, -15, -10, -5, 0], ["-20 s", "-15 s", "-10 s", "-5 s", "now"])
        plt.yticks(list(curve.ticks_v), [f"{mark:2.0f} V" for mark in curve.ticks_v])
        for line in curve.lines:
            for level in line.levels_v:
                plt.plot([-WINDOW_S, 0], [level, level], marker="-", color="default")
        if curve.times_s:
            plt.plot(list(curve.times_s), list(curve.volts), marker=_CURVE_MARKER, color="default")
        room = max(10, self.size.width - 14)
        for line in curve.lines:
            label = fit(line.label, room) if len(line.label) > room else line.label
            plt.text(f" {label} ", -WINDOW_S + 0.4, line.levels_v[-1], alignment="left", **_PLAIN)
