"""The two panels of a response curve as lines with a look, to be drawn here or in LaTeX."""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction

from symbolic_response.control.curve_data import (
    CurveData,
    Reference,
    balanced,
    divisor_text,
    number_of,
    rescaled_text,
    saturating,
    sensitivity_text,
)


@dataclass(frozen=True, slots=True)
class Look:
    """Name in the legend, colour (red, green, blue to 255), dashes (on, off in pt), width in pt.

    Looks are told apart by dashes and widths alone, so in grey print too.
    """

    name: str
    colour: tuple[int, int, int]
    dashes: tuple[float, ...]
    width: float


CURVE = Look("exact", (0, 0, 0), (), 1.5)
SATURATING = Look("saturating", (0, 90, 160), (4.5, 2), 1.1)
BALANCED = Look("saturating, no driving", (200, 80, 0), (1.1, 1.6), 1.2)
STEEPNESS = Look("steepness bound", (0, 90, 160), (4.5, 2), 1.1)
COVARIANCE = Look("covariance bound", (0, 120, 80), (5, 1.6, 1.1, 1.6), 0.9)


@dataclass(frozen=True, slots=True)
class Line:
    """One curve: its look, its values at the points; None where there is no value."""

    look: Look
    values: tuple[float | None, ...]


@dataclass(frozen=True, slots=True)
class Panel:
    """``latex``, ``plain``: what the vertical axis shows; ``about``: what the file says of it."""

    latex: str
    plain: str
    about: str
    lines: tuple[Line, ...]

    @property
    def top(self) -> float:
        """The largest value, 1 where all are zero."""
        values = [value for line in self.lines for value in line.values if value is not None]
        return max(values) or 1.0


@dataclass(frozen=True, slots=True)
class Panels:
    """The curve above, its sensitivity below.

    ``anchor``: where the saturating curve meets the exact one, ``anchor_name`` what is said of it,
    nothing where the curve is one half there.
    """

    xs: tuple[float, ...]
    anchor: tuple[float, float]
    anchor_name: str
    upper: Panel
    lower: Panel


def panels_of(data: CurveData) -> Panels:
    """Return what a figure of a response curve shows.

    Of the sensitivity its size is shown, which the bounds are about. The curve without driving is
    left out where H at zero force is not known, and named with the other where both are one.
    """
    best = saturating(data)
    lines = [Line(CURVE, tuple(float(point.q) for point in data.points)), *_references(data, best)]
    upper = Panel(rescaled_text(data, data.observable_latex),
                  rescaled_text(data, data.observable), data.observable_about, tuple(lines))
    return Panels(tuple(number_of(point.x) for point in data.points), best.anchor,
                  "" if best.crossings else "nearest one half", upper, _lower(data))


def _references(data: CurveData, best: Reference) -> list[Line]:
    if data.h0 is None:
        return [Line(SATURATING, best.values)]
    if _same(data):
        return [Line(replace(SATURATING, name="saturating, driven or not"), best.values)]
    return [Line(SATURATING, best.values), Line(BALANCED, balanced(data, data.h0).values)]


def _same(data: CurveData) -> bool:
    """Return whether H is what it is at zero force at every point."""
    h0 = [data.h0] * len(data.points) if isinstance(data.h0, Fraction) else data.h0
    return h0 is not None and all(point.steepness == h
                                  for point, h in zip(data.points, h0, strict=True))


def _lower(data: CurveData) -> Panel:
    lines = [
        Line(CURVE, tuple(float(abs(point.sensitivity)) for point in data.points)),
        Line(STEEPNESS, tuple(float(point.bound) for point in data.points)),
    ]
    finer = tuple(None if point.covariance is None else float(point.covariance)
                  for point in data.points)
    if any(value is not None for value in finer):
        lines.append(Line(COVARIANCE, finer))
    by = rf"\, \ln {data.parameter_latex}" if data.logarithmic else data.parameter_latex
    latex = (rf"\left|\partial {data.observable_latex} \, / \, \partial {by}\right|"
             + divisor_text(data))
    return Panel(latex, f"abs({sensitivity_text(data)})", "", tuple(lines))
