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
from symbolic_response.figures.panels import Look, Panel, panels_of
from symbolic_response.figures.saving import (
    DOTS,
    LABEL_SIZE,
    WIDTHS,
    check_figure_path,
    drawing,
    width_of,
    write_figure,
)

HEIGHTS = {"single": 4.2, "double": 4.6}
CHARACTERS = {"single": 60, "double": 130}
"""How many characters fit beside the horizontal axis."""
BESIDE = 36
"""How many characters fit beside a vertical axis."""
LINE_SPACING = 1.0
MARGIN = 45
"""What is beside a panel, in pt."""


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
        figure = Figure(figsize=(width_of(columns), HEIGHTS[columns]), dpi=DOTS,
                        layout="constrained")
        upper, lower = figure.subplots(2, 1, sharex=True)
        for axes, panel in ((upper, shown.upper), (lower, shown.lower)):
            if data.logarithmic:
                axes.set_xscale("log")
            _draw(axes, shown.xs, panel)
        upper.plot(*shown.anchor, label=shown.anchor_name or None, clip_on=False, marker="o",
                   color="black", markerfacecolor="white", markersize=3.5, markeredgewidth=0.8,
                   linestyle="none", zorder=3)
        for axes in (upper, lower):
            legend_above(axes, columns)
        upper.set_ylim(-0.03, 1.03)
        lower.set_ylim(-0.03 * shown.lower.top, 1.05 * shown.lower.top)
        lower.set_xlim(shown.xs[0], shown.xs[-1])
        parameter = math_label(data.parameter_latex, data.parameter)
        lower.set_xlabel(with_about(parameter, data.parameter_about, CHARACTERS[columns]),
                         linespacing=LINE_SPACING)
        for axes in (upper, lower):
            fit_labels(axes, columns, HEIGHTS[columns] / 2)
    return figure


def _draw(axes: Axes, xs: Sequence[float], panel: Panel) -> None:
    for place, line in enumerate(panel.lines):
        values = [math.nan if value is None else value for value in line.values]
        axes.plot(xs, values, label=line.look.name, zorder=2.5 - 0.1 * place,
                  **line_style(line.look))
    axes.set_ylabel(with_about(math_label(panel.latex, panel.plain), panel.about, BESIDE),
                    linespacing=LINE_SPACING)


def line_style(look: Look) -> dict[str, Any]:
    """Return the look of a line as arguments of a plot; dashes count in widths there."""
    dashes = (0.0, tuple(length / look.width for length in look.dashes))
    return {
        "color": "#" + "".join(f"{part:02x}" for part in look.colour),
        "linewidth": look.width,
        "linestyle": dashes if look.dashes else "-",
    }


def fit_labels(axes: Axes, columns: str, height: float) -> None:
    """Make labels smaller that are longer than their axis; ``height``: of the panel, in inches."""
    across = (axes.xaxis.label, 72 * WIDTHS[columns] - MARGIN)
    upright = (axes.yaxis.label, 72 * height - MARGIN)
    for label, room in (across, upright):
        extent = label.get_window_extent()
        length = 72 * max(extent.width, extent.height) / DOTS
        if length > room:
            label.set_fontsize(LABEL_SIZE * room / length)


def legend_above(axes: Axes, columns: str) -> None:
    """Put the legend above a panel, where it covers nothing, in as few rows as fit."""
    room = 72 * WIDTHS[columns] - MARGIN
    for fitting in range(len(axes.get_legend_handles_labels()[1]), 0, -1):
        legend = axes.legend(
            loc="lower left", bbox_to_anchor=(-0.02, 1.0), ncols=fitting, frameon=False,
            borderaxespad=0.1, borderpad=0.2, handlelength=2.3, columnspacing=1.0,
            handletextpad=0.5)
        if 72 * legend.get_window_extent().width / DOTS <= room:
            break
