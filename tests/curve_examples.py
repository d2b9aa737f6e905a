"""Response curves whose values, sensitivities and saturating curves are known in closed form."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from fractions import Fraction
from typing import Any

from symbolic_response.control.curve_data import CurveData, CurvePoint

F = Fraction
ONE = F(1)
GRID = tuple(F(10 + k, 10) * F(2) ** octave for octave in range(-6, 7) for k in range(10))


def curve(
    q: Callable[[Fraction], Fraction],
    sensitivity: Callable[[Fraction], Fraction],
    steepness: Callable[[Fraction], Fraction],
    grid: tuple[Fraction, ...] = GRID,
    **more: Any,
) -> CurveData:
    points = tuple(CurvePoint(x, q(x), sensitivity(x), steepness(x)) for x in grid)
    entries = {"parameter": "c", "parameter_latex": "c", "observable": "mean[open]",
               "observable_latex": r"\langle \mathrm{open} \rangle", "logarithmic": True}
    return CurveData(points=points, **{**entries, **more})


def hill(n: int, half: Fraction = ONE, **more: Any) -> CurveData:
    """Return x^n/(half^n + x^n), which is its own saturating curve for H = |n|."""

    def q(x: Fraction) -> Fraction:
        return x**n / (half**n + x**n)

    return curve(q, lambda x: n * q(x) * (1 - q(x)), lambda x: F(abs(n)), **more)


def below_hill(**more: Any) -> CurveData:
    """Return x^2/(1 + x + x^2) with H = 2 + x/(1 + x) and a covariance bound at all but a point."""

    def q(x: Fraction) -> Fraction:
        return x**2 / (1 + x + x**2)

    def sensitivity(x: Fraction) -> Fraction:
        return x**2 * (2 + x) / (1 + x + x**2) ** 2

    data = curve(q, sensitivity, lambda x: 2 + x / (1 + x), h0=F(2), **more)
    points = tuple(replace(point, covariance=(abs(point.sensitivity) + point.bound) / 2)
                   for point in data.points)
    return replace(data, points=(*points[:5], replace(points[5], covariance=None), *points[6:]))


def constant(value: Fraction, **more: Any) -> CurveData:
    return curve(lambda x: value, lambda x: F(0), lambda x: F(3, 2), **more)
