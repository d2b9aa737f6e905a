"""Response curves as figures: the curve with its references, its sensitivity with the bounds."""

from __future__ import annotations

import math
import os
from collections.abc import Sequence
from typing import Any

from matplotlib.axes import Axes
from matplotlib.figure import Figure

from symbolic_response.control.curve_data import CurveData
from symbolic_response.figures.labels import math_label, with_about
from symbolic_response.figures.panels import Line, Look, Panel, panels_of
from symbolic_response.figures.saving import check_figure_path, drawing, width_of, write_figure

HEIGHTS = {"single": 4.2, "double": 4.6}
CHARACTERS = {"single": 46, "double": 96}
"""How many characters fit beside the horizontal axis."""
BESIDE = 30
"""How many characters fit beside a vertical axis."""


def curve_figure(
    data: CurveData, path: str | os.PathLike[str], columns: str = "single"
) -> None:
    """Write the figure of a response curve as PDF, PNG or SVG, by the suffix.

    ``columns``: ``single`` (3.4 inches wide) or ``double`` (7). The same data give the same bytes.
    Raises OutputError.
    """
    check_figure_path(path)
    write_figure(curve_plot(data, columns), path)


def curve_plot(data: CurveData, columns: str = "single") -> Figure:
    """Return the figure: the curve above, the size of its sensitivity and the bounds below."""
    shown = panels_of(data)
    with drawing():
        figure = Figure(figsize=(width_of(columns), HEIGHTS[columns]), layout="constrained")
        upper, lower = figure.subplots(2, 1, sharex=True)
        for axes, panel in ((upper, shown.upper), (lower, shown.lower)):
            if data.logarithmic:
                axes.set_xscale("log")
            _draw(axes, shown.xs, panel)
        upper.plot(*shown.anchor, marker="o", color="black", markerfacecolor="white",
                   markersize=3.5, markeredgewidth=0.8, linestyle="none", zorder=3)
        upper.set_ylim(-0.03, 1.03)
        lower.set_ylim(0, 1.08 * (_largest(shown.lower.lines) or 1))
        lower.set_xlim(shown.xs[0], shown.xs[-1])
        parameter = math_label(data.parameter_latex, data.parameter)
        lower.set_xlabel(with_about(parameter, data.parameter_about, CHARACTERS[columns]))
    return figure


def _draw(axes: Axes, xs: Sequence[float], panel: Panel) -> None:
    for place, line in enumerate(panel.lines):
        values = [math.nan if value is None else value for value in line.values]
        axes.plot(xs, values, label=line.look.name, zorder=2.5 - 0.1 * place,
                  **line_style(line.look))
    axes.set_ylabel(with_about(math_label(panel.latex, panel.plain), panel.about, BESIDE))
    legend_above(axes, len(panel.lines))


def line_style(look: Look) -> dict[str, Any]:
    """Return the look of a line as arguments of a plot; dashes count in widths there."""
    dashes = (0.0, tuple(length / look.width for length in look.dashes))
    return {
        "color": "#" + "".join(f"{part:02x}" for part in look.colour),
        "linewidth": look.width,
        "linestyle": dashes if look.dashes else "-",
    }


def legend_above(axes: Axes, columns: int) -> None:
    """Put the legend above a panel, where it covers nothing, in so many columns."""
    axes.legend(loc="lower left", bbox_to_anchor=(-0.02, 1.0), ncols=columns, frameon=False,
                borderaxespad=0.1, borderpad=0.2, handlelength=2.3, columnspacing=1.0,
                handletextpad=0.5)


def _largest(lines: Sequence[Line]) -> float:
    return max(value for line in lines for value in line.values if value is not None)
