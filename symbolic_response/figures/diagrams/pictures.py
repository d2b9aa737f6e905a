"""A drawing as data: strokes, states and labels in pt, y upwards."""

from __future__ import annotations

from dataclasses import dataclass

from symbolic_response.figures.diagrams.geometry import Box, Curve
from symbolic_response.figures.diagrams.labels import Label


@dataclass(frozen=True, slots=True)
class Stroke:
    """A line of a look (:data:`looks.LINES`); its tip, if it has one, is at its end.

    ``transition`` is the place of the transition it stands for.
    """

    curve: Curve
    look: str
    transition: int


@dataclass(frozen=True, slots=True)
class Dot:
    """A state of a small picture; ``look`` is a name of :data:`looks.MARKS`."""

    centre: complex
    look: str


@dataclass(frozen=True, slots=True)
class Shape:
    """A state of the network's picture: a circle, or a box with round corners."""

    box: Box
    radius: float

    @property
    def is_circle(self) -> bool:
        """Whether it is a circle."""
        return abs(self.box.width - 2 * self.radius) < 1e-9


@dataclass(frozen=True, slots=True)
class Picture:
    """One picture; ``box`` is the room it takes."""

    box: Box
    strokes: tuple[Stroke, ...]
    dots: tuple[Dot, ...] = ()
    shapes: tuple[Shape, ...] = ()
    labels: tuple[Label, ...] = ()
