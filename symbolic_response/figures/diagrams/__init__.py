"""Diagrams of networks in LaTeX (TikZ) and SVG: states and rates, cycles, trees, splittings."""

from symbolic_response.figures.diagrams.drawing import (
    Drawing,
    draw,
    network_svg,
    write_drawing,
)
from symbolic_response.figures.diagrams.tikz import PREAMBLE

__all__ = ["PREAMBLE", "Drawing", "draw", "network_svg", "write_drawing"]
