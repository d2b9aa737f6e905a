"""Quantities of a network as exact functions of one symbol, all others given; their curves."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise

import flint

from symbolic_response.control.line import Line
from symbolic_response.control.rational import EXPONENTIAL, POWER, RationalFunction
from symbolic_response.errors import EvaluationError
from symbolic_response.expressions.enclosure import ball
from symbolic_response.expressions.tree import Expression
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.deriving import Given, arb_fraction, given

GRID_BITS = 6  # how much finer the grid of the points is than their distance


def function_of(
    analysis: Analysis, quantity: Expression, symbol: str, values: Mapping[str, Given]
) -> RationalFunction:
    """Return a quantity of a network as an exact function of one symbol.

    ``quantity``: any that is a rational function of the rates, as ``read_quantity`` gives it;
    ``values``: exact values of all other symbols. Raises AssignmentError for a value that its
    symbol cannot take, EvaluationError where a value is missing or makes a coefficient irrational
    (it names the symbol) and where the quantity is not rational.

    >>> from symbolic_response.network.build import build_network
    >>> from symbolic_response.network.quantity_reader import read_quantity
    >>> pair = build_network("pair", states="A B", transitions=[("A", "B", "k*c", "k*q")])
    >>> p = function_of(Analysis(pair), read_quantity("p[B]", pair), "c", {"k": 3, "q": "1/2"})
    >>> p.text(), p.sensitivity().text(), p.value("1/2")
    ('2*c/(2*c + 1)', '2*c/(2*c + 1)**2', Fraction(1, 2))
    """
    return Line(analysis.network, symbol, values).function(quantity)


@dataclass(frozen=True, slots=True)
class CurvePoint:
    """An exact point of a curve: the symbol, the variable y of the function, the value there."""

    x: Expression
    y: Fraction
    value: Fraction

    def position(self) -> float:
        """Return x for drawing."""
        with flint.ctx.workprec(64):
            return float(ball(self.x))


def curve(
    f: RationalFunction, low: Given, high: Given, count: int, spacing: str = "log"
) -> tuple[CurvePoint, ...]:
    """Return ``count`` exact points of a function between two values of its symbol.

    ``spacing``: ``"log"`` (even in ln x; positive symbols) or ``"linear"``. The first and last
    point are exactly the ends where y is rational there; all others lie at short fractions of y,
    off the even grid by less than a fiftieth of a step. EvaluationError at a pole, or for ends or a
    spacing that do not fit.
    """
    if spacing not in ("log", "linear") or (spacing == "log" and f.kind != POWER):
        raise EvaluationError(f"spacing {spacing!r} does not fit {f.symbol}; take 'linear'"
                              + (" or 'log'" if f.kind == POWER else ""))
    ends = [f.place(end) for end in (low, high)]
    with flint.ctx.workprec(192):
        start, stop = (ball(given({f.symbol: end})[f.symbol]) for end in (low, high))
        if count < 2 or not start < stop:
            raise EvaluationError("a curve needs two or more points, and low below high")
        if spacing == "log":
            start, stop = start.log(), stop.log()
        places = [arb_fraction(_variable_ball(f, x, spacing).mid()) for x in (
            start + (stop - start) * place / (count - 1) for place in range(count))]
    gaps = [b - a for a, b in pairwise(places)]
    places = [_short(y, min(gaps[max(i - 1, 0) : i + 1])) for i, y in enumerate(places)]
    for place, end in zip((0, -1), ends, strict=True):
        if end is not None:
            places[place] = end
    return tuple(CurvePoint(f.symbol_at(y), y, f.at_place(y)) for y in places)


def _variable_ball(f: RationalFunction, x: flint.arb, spacing: str) -> flint.arb:
    if spacing == "log" or f.kind == EXPONENTIAL:
        return (x / f.root).exp()
    return x.root(f.root) if f.root > 1 else x


def _short(y: Fraction, gap: Fraction) -> Fraction:
    """Return a short binary fraction near y, much nearer than its neighbours."""
    step = Fraction(2) ** (gap.numerator.bit_length() - gap.denominator.bit_length() - GRID_BITS)
    return round(y / step) * step
