"""Clouds as figures: exact points below the envelope of a barrier bound."""

from __future__ import annotations

import math
import os

from matplotlib.axes import Axes
from matplotlib.figure import Figure

from symbolic_response.control.cloud import Cloud
from symbolic_response.figures.curve import fit_labels, legend_above
from symbolic_response.figures.labels import math_label
from symbolic_response.figures.saving import (
    DOTS,
    check_figure_path,
    drawing,
    width_of,
    write_figure,
)

HEIGHTS = {"single": 2.9, "double": 3.6}
STEPS = 400


def cloud_figure(data: Cloud, path: str | os.PathLike[str], columns: str = "single") -> None:
    """Write the figure of a cloud as PDF, PNG or SVG, by the suffix.

    ``columns``: ``single`` (3.4 inches wide) or ``double`` (7). The same data give the same bytes.
    Raises OutputError.
    """
    check_figure_path(path)
    write_figure(cloud_plot(data, columns), path)


def cloud_plot(data: Cloud, columns: str = "single") -> Figure:
    """Return the figure: each point against the largest cycle force and, lighter, against that of
    the two ends, under the envelope of both."""
    with drawing():
        figure = Figure(figsize=(width_of(columns), HEIGHTS[columns]), dpi=DOTS,
                        layout="constrained")
        axes = figure.subplots()
        _points(axes, data)
        end = 1.02 * max(1.0, *(point.force for point in data.points))
        forces = [end * step / STEPS for step in range(STEPS + 1)]
        axes.plot(forces, [math.tanh(force / 4) for force in forces], color="black",
                  linewidth=1.1, label=r"$\tanh(\mathrm{force}/4)$", zorder=3)
        axes.set_xlim(0, end)
        axes.set_ylim(0, 1.05)
        name = math_label(data.transition_latex, data.transition)
        letter = math_label(data.force_latex, "F_max")
        axes.set_xlabel(f"largest cycle force through {name}, {letter}")
        axes.set_ylabel(math_label(data.value_latex, data.value_text))
        legend_above(axes, columns)
        fit_labels(axes, columns, HEIGHTS[columns])
    return figure


def _points(axes: Axes, data: Cloud) -> None:
    sampled = [point for point in data.points if not point.made]
    made = [point for point in data.points if point.made]
    axes.plot([point.force for point in sampled], [float(point.value) for point in sampled],
              linestyle="none", marker="o", markersize=1.6, markeredgewidth=0, color="#005aa0",
              label="sampled", zorder=2)
    axes.plot([point.end_pair_force for point in data.points],
              [float(point.value) for point in data.points], linestyle="none", marker="x",
              markersize=2, markeredgewidth=0.4, color="0.65",
              label="against end-pair force", zorder=1)
    if made:
        axes.plot([point.force for point in made], [float(point.value) for point in made],
                  linestyle="none", marker="D", markersize=3.2, markeredgewidth=0.7,
                  markerfacecolor="white", color="#c85000", label="constructed", zorder=4)
