"""A response curve as plain data, the curves it is compared with, and its table."""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Sequence
from dataclasses import dataclass
from decimal import Context, Decimal
from fractions import Fraction
from itertools import accumulate, pairwise

from symbolic_response.certificates.axes import value_text
from symbolic_response.errors import EvaluationError, QuantityError
from symbolic_response.expressions.enclosure import ball, sign_of_constant
from symbolic_response.expressions.text import fraction_text
from symbolic_response.expressions.tree import Expression, Number, add, negate, number

HALF = Fraction(1, 2)
DIGITS = 12

Exact = Fraction | Expression
"""A fraction, or a constant such as ``2*ln(3/2)``."""


@dataclass(frozen=True, slots=True)
class CurvePoint:
    """One point of a curve.

    ``x``: the parameter. ``q``: the observable, from 0 to 1. ``sensitivity``: d q/d ln x or
    d q/d x. ``steepness``: H, a rational upper bound of it where it is irrational. ``covariance``:
    the finer bound on the sensitivity, None where there is none.
    """

    x: Exact
    q: Fraction
    sensitivity: Fraction
    steepness: Fraction
    covariance: Fraction | None = None

    @property
    def bound(self) -> Fraction:
        """H q (1 - q), which the size of the sensitivity does not exceed."""
        return self.steepness * self.q * (1 - self.q)


@dataclass(frozen=True, slots=True)
class CurveData:
    """An observable as a function of one parameter, at points of increasing x.

    ``parameter``, ``observable``: as texts of the file (``c``, ``mean[open]``), each with its LaTeX
    and what the file says about it. ``logarithmic``: x is positive and sensitivities are by ln x.
    ``rescaled``: (low, high) where q = (Q - low)/(high - low), None where q is Q itself. ``h0``: H
    at zero force, one for all points or one for each; None if it is not known.

    Raises QuantityError for fewer than two points, EvaluationError for a point out of order or out
    of range.
    """

    parameter: str
    parameter_latex: str
    observable: str
    observable_latex: str
    logarithmic: bool
    points: tuple[CurvePoint, ...]
    parameter_about: str = ""
    observable_about: str = ""
    rescaled: tuple[Fraction, Fraction] | None = None
    h0: Fraction | tuple[Fraction, ...] | None = None

    def __post_init__(self) -> None:
        if len(self.points) < 2:
            raise QuantityError("a curve needs two points or more; give a finer grid")
        for point in self.points:
            if not 0 <= point.q <= 1:
                raise EvaluationError(f"{self.observable} is {fraction_text(point.q)} at"
                                      f" {self.parameter} = {exact_text(point.x)}, not from 0 to 1;"
                                      " rescale it")
        first = self.points[0].x
        if self.logarithmic and _sign(first) <= 0:
            raise EvaluationError(f"{self.parameter} = {exact_text(first)} has no logarithm; begin"
                                  " at a positive value")
        for before, after in pairwise(point.x for point in self.points):
            if _sign(after, before) <= 0:
                raise EvaluationError(f"the points of {self.parameter} do not increase:"
                                      f" {exact_text(before)}, then {exact_text(after)}")


@dataclass(frozen=True, slots=True)
class Reference:
    """A curve to compare with, for drawing: its value at each point of the data.

    ``anchor``: the point (x, q) that it shares with the curve. ``crossings``: how often the curve
    crosses one half; the anchor is the first crossing or, where there is none, the point closest to
    one half.
    """

    values: tuple[float, ...]
    anchor: tuple[float, float]
    crossings: int


def saturating(data: CurveData) -> Reference:
    """Return the curve as steep as H allows, through the first point where the curve is one half.

    Its logit is the integral of H d ln x (or d x), by trapezoids between the points: a Hill curve
    of exponent H where H is constant. It rises or falls as the curve does at that point.
    """
    return _through_half(data, [float(point.steepness) for point in data.points])


def balanced(data: CurveData, h0: Fraction | Sequence[Fraction]) -> Reference:
    """Return the same curve for H at zero force, one for all points or one for each."""
    if isinstance(h0, Fraction):
        return _through_half(data, [float(h0)] * len(data.points))
    if len(h0) != len(data.points):
        raise QuantityError(f"{len(h0)} values of H at zero force for {len(data.points)} points")
    return _through_half(data, [float(h) for h in h0])


@dataclass(frozen=True, slots=True)
class _Anchor:
    """A place between points ``left`` and ``left`` + 1, a part ``share`` of the way."""

    left: int
    share: float
    logit: float
    sign: int
    crossings: int


def _through_half(data: CurveData, slopes: Sequence[float]) -> Reference:
    places = positions(data)
    anchor = _anchor(data)
    steps = [(b - a) * (h + k) / 2
             for (a, b), (h, k) in zip(pairwise(places), pairwise(slopes), strict=True)]
    integral = list(accumulate(steps, initial=0.0))
    left, share = anchor.left, anchor.share
    start, place = integral[left], places[left]
    if share:
        width = places[left + 1] - place
        middle = slopes[left] + share * (slopes[left + 1] - slopes[left]) / 2
        start, place = start + share * width * middle, place + share * width
    values = tuple(_logistic(anchor.logit + anchor.sign * (total - start)) for total in integral)
    x = math.exp(place) if data.logarithmic else place
    return Reference(values, (x, _logistic(anchor.logit)), anchor.crossings)


def _anchor(data: CurveData) -> _Anchor:
    """Return where the curve first is one half, else its point closest to one half."""
    points = data.points
    found: list[_Anchor] = []
    for left, point in enumerate(points):
        if point.q == HALF:
            found.append(_Anchor(left, 0.0, 0.0, -1 if point.sensitivity < 0 else 1, 0))
        elif left + 1 < len(points) and (point.q - HALF) * (points[left + 1].q - HALF) < 0:
            share = _crossing(point.q, points[left + 1].q)
            found.append(_Anchor(left, share, 0.0, 1 if point.q < HALF else -1, 0))
    if found:
        first = found[0]
        return _Anchor(first.left, first.share, first.logit, first.sign, len(found))
    closest = min(range(len(points)), key=lambda k: abs(points[k].q - HALF))
    point = points[closest]
    return _Anchor(closest, 0.0, _logit(point.q), -1 if point.sensitivity < 0 else 1, 0)


def _crossing(q: Fraction, after: Fraction) -> float:
    """Return which part of the way to the next point the logit, taken as linear, crosses 0."""
    here, there = _logit(q), _logit(after)
    if math.isinf(here) or math.isinf(there):
        return float((HALF - q) / (after - q))
    return here / (here - there)


def _logit(q: Fraction) -> float:
    if q in (0, 1):
        return math.inf if q else -math.inf
    return logarithm(q / (1 - q))


def _logistic(y: float) -> float:
    if y >= 0:
        return 1 / (1 + math.exp(-y))
    return math.exp(y) / (1 + math.exp(y)) if y > -700 else 0.0


# -- numbers for drawing ---------------------------------------------------------------------------


def logarithm(value: Fraction) -> float:
    """Return ln of a positive fraction as a float, also next to 1 and where it overflows.

    >>> round(logarithm(Fraction(10**400)), 6)
    921.034037
    """
    gap = value - 1
    if abs(gap) < HALF:
        return math.log1p(float(gap))
    return math.log(value.numerator) - math.log(value.denominator)


def positions(data: CurveData) -> tuple[float, ...]:
    """Return ln x of each point where the data are logarithmic, else x."""
    xs = [point.x for point in data.points]
    if not data.logarithmic:
        return tuple(number_of(x) for x in xs)
    return tuple(logarithm(x) if isinstance(x, Fraction) else math.log(number_of(x)) for x in xs)


def number_of(x: Exact) -> float:
    """Return a constant as a float; EvaluationError where it is too large for one."""
    try:
        value = float(x) if isinstance(x, Fraction) else float(ball(x))
    except OverflowError:
        value = math.inf
    if not math.isfinite(value):
        raise EvaluationError(f"{exact_text(x)} is too large to be drawn")
    return value


def _sign(x: Exact, less: Exact | None = None) -> int:
    """Return the sign of a constant, or of what it exceeds another by; exact."""
    if x == less:
        return 0
    gap = add([_expression(x), negate(_expression(Fraction(0) if less is None else less))])
    if isinstance(gap, Number):
        return (gap.value > 0) - (gap.value < 0)
    return sign_of_constant(gap)


def _expression(x: Exact) -> Expression:
    return number(x) if isinstance(x, Fraction) else x


# -- the table -------------------------------------------------------------------------------------


def exact_text(x: Exact) -> str:
    """Return a fraction, or a constant in the syntax of the file."""
    return fraction_text(x) if isinstance(x, Fraction) else value_text(x)


def decimal_text(x: Exact) -> str:
    """Return a constant to 12 significant digits.

    >>> decimal_text(Fraction(2, 3)), decimal_text(Fraction(5, 2))
    ('0.666666666667', '2.5')
    """
    if isinstance(x, Fraction):
        shown = Context(prec=DIGITS).divide(Decimal(x.numerator), Decimal(x.denominator))
        shown = shown.normalize()
        return f"{shown:f}" if -DIGITS < shown.adjusted() < DIGITS else str(shown)
    return f"{number_of(x):.{DIGITS}g}"


def rescaled_text(data: CurveData, observable: str) -> str:
    """Return what q is, in words or in LaTeX as the observable is given."""
    if data.rescaled is None:
        return observable
    low = data.rescaled[0]
    shifted = observable if low == 0 else f"({observable} - {_bracketed(low)})"
    return shifted + divisor_text(data)


def divisor_text(data: CurveData) -> str:
    """Return what a difference of the observable is divided by, as ``/3``; often nothing."""
    if data.rescaled is None:
        return ""
    low, high = data.rescaled
    return "" if high - low == 1 else f"/{_bracketed(high - low)}"


def _bracketed(value: Fraction) -> str:
    shown = fraction_text(value)
    return shown if value.denominator == 1 and value >= 0 else f"({shown})"


def sensitivity_text(data: CurveData) -> str:
    """Return what the sensitivity is."""
    by = f"ln {data.parameter}" if data.logarithmic else data.parameter
    shown = f"d {data.observable} / d {by}"
    return f"({shown}){divisor_text(data)}" if divisor_text(data) else shown


def curve_csv(data: CurveData) -> str:
    """Return the points as CSV: each number exactly and to 12 digits, the header saying what.

    A covariance bound that is not known is left empty.
    """
    heads = [data.parameter, rescaled_text(data, data.observable), sensitivity_text(data),
             "bound H*q*(1 - q)", "H", "covariance bound"]
    rows = [[head for name in heads for head in (name, f"{name} (decimal)")]]
    for point in data.points:
        entries = (point.x, point.q, point.sensitivity, point.bound, point.steepness,
                   point.covariance)
        rows.append([shown for entry in entries for shown in (
            ("", "") if entry is None else (exact_text(entry), decimal_text(entry)))])
    return csv_text(rows)


def csv_text(rows: Sequence[Sequence[str]]) -> str:
    """Return rows as CSV, quoted where needed, lines ended by a line feed."""
    made = io.StringIO()
    csv.writer(made, lineterminator="\n").writerows(rows)
    return made.getvalue()
