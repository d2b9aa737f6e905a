"""The least limit on a response at one point, from the forces there; rigorously rounded."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction

import flint

from symbolic_response.bounds.balls import BallPoint
from symbolic_response.bounds.claim import MixedCycles
from symbolic_response.bounds.decide import tanh_bounds
from symbolic_response.bounds.evaluate import ClaimPoint, IrrationalError
from symbolic_response.control.changes import Vector, change_of
from symbolic_response.control.decomposition import Decomposition, LinearForm, assembled
from symbolic_response.control.family import Family, classes_of, family_of
from symbolic_response.control.program import optimum
from symbolic_response.control.separations import Part
from symbolic_response.errors import UndecidedError
from symbolic_response.expressions.tree import ONE, Expression
from symbolic_response.network.quantities import Perturbation
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.deriving import arb_fraction
from symbolic_response.response.values import Point

Interval = tuple[Fraction, Fraction]
"""Exact numbers that enclose one; equal where it is rational and known."""

_Value = Callable[[BallPoint], flint.arb]
_PRECISIONS = (128, 256, 512, 1024, 2048, 4096)
_BITS = 64


@dataclass(frozen=True, slots=True)
class Limit:
    """The least limit H of the family at a point: ``low`` <= H <= ``high``.

    ``t``: bounds of tanh(F/4) for each bundle; ``decomposition``: pieces, in numbers, that give
    ``high`` less ``error``, which is what rounding changes of rates that are irrational there may
    add; ``dual``: the numbers y of :mod:`symbolic_response.control.program` at the upper t.
    """

    low: Fraction
    high: Fraction
    t: tuple[tuple[Part, Interval], ...]
    decomposition: Decomposition
    dual: Vector
    family: Family
    error: Fraction


class Place:
    """A network at one point; numbers there, enclosed by exact fractions."""

    def __init__(self, analysis: Analysis, values: Mapping[str, Expression]) -> None:
        self.analysis = analysis
        self.values = values
        self.point = Point(analysis.network, values)
        self.exact = ClaimPoint(analysis, self.point)
        self._tanh: dict[Part, Interval] = {}

    def tanh(self, part: Part) -> Interval:
        """Return bounds of tanh(F/4), F the largest force of a cycle inside and outside a set."""
        if part not in self._tanh:
            self._tanh[part] = self._found_tanh(part)
        return self._tanh[part]

    def _found_tanh(self, part: Part) -> Interval:
        one = Fraction(1)
        try:
            g = self.exact.force(MixedCycles(part))
        except IrrationalError:
            low, high = self._enclosed(lambda place: _tanh(place.force(MixedCycles(part))))
        else:
            low, high = (one, one) if g is None else tanh_bounds(g, 4, _BITS)
        if low == high:
            return low, high
        return max(Fraction(0), _rounded(low, False)), min(one, _rounded(high, True))

    def number(self, node: Expression) -> Interval:
        """Return bounds of an expression of symbols, or of a quantity, at the point."""
        try:
            exact = self.exact.value(node)
        except IrrationalError:
            return self._enclosed(lambda place: place.value(node))
        return exact, exact

    def form(self, form: LinearForm) -> Interval:
        """Return bounds of a linear form at the point."""
        low, high = self.number(form.constant)
        for part, slope in form.slopes:
            t, factor = self.tanh(part), self.number(slope)
            low, high = low + t[0] * factor[0], high + t[1] * factor[1]
        return low, high

    def least(self, forms: Sequence[LinearForm]) -> Interval:
        """Return bounds of the minimum of linear forms at the point, a limit without a program."""
        found = [self.form(form) for form in forms]
        return min(low for low, _ in found), min(high for _, high in found)

    def _enclosed(self, value: _Value) -> Interval:
        for bits in _PRECISIONS:
            with flint.ctx.workprec(bits):
                try:
                    found = value(BallPoint(self.analysis, self.values))
                except ZeroDivisionError:  # a matrix not known to be regular at this precision
                    continue
                if found.is_finite() and found.rad() < flint.arb(2) ** -_BITS:
                    return arb_fraction(found.lower()), arb_fraction(found.upper())
        raise UndecidedError("a number was not enclosed well enough at 4096 bits")


def _tanh(force: flint.arb | None) -> flint.arb:
    return flint.arb(1) if force is None else (force / 4).tanh()


def _rounded(value: Fraction, upwards: bool) -> Fraction:
    scaled = value * 2**_BITS
    return Fraction(-(-scaled.numerator // scaled.denominator) if upwards
                    else scaled.numerator // scaled.denominator, 2**_BITS)


def limit_at(
    analysis: Analysis, by: Perturbation, values: Mapping[str, Expression] | Place,
    family: Family | None = None,
) -> Limit:
    """Return the least limit of the family at a point, rounded outwards.

    ``values``: a constant expression for every symbol. Raises EvaluationError where a rate is not
    positive there, SizeLimitError past the limit of cycles.
    """
    place = values if isinstance(values, Place) else Place(analysis, values)
    family = family or family_of(analysis)
    change = change_of(analysis, by)
    numbers, rest = list(change.numbers), []
    for expression, vector in change.parts:
        low, high = place.number(expression)
        middle = low if low == high else _rounded((low + high) / 2, True)
        numbers = [x + middle * u for x, u in zip(numbers, vector, strict=True)]
        rest.append((max(high - middle, middle - low), vector))
    classes = classes_of(family, analysis)
    first = dict(zip(reversed(classes), reversed(family.bundles), strict=True))
    t = [place.tanh(first[c]) for c in classes]
    lower, upper = ([pair[side] for pair in t] for side in (0, 1))
    found = optimum(family, tuple(numbers), upper)
    least = found if lower == upper else optimum(family, tuple(numbers), lower)
    high = found.value + _rest(family, rest, upper)
    low = least.value - _rest(family, rest, upper)
    made = assembled(analysis, family, [(ONE, found.amounts)])
    return Limit(max(low, Fraction(0)), high, tuple(zip(family.bundles, t, strict=True)), made,
                 found.dual, family, high - found.value)


def _rest(
    family: Family, rest: Sequence[tuple[Fraction, Vector]], t: Sequence[Fraction]
) -> Fraction:
    """Return what the errors of rounded changes can add to the least limit."""
    return sum((error * optimum(family, vector, t).value for error, vector in rest if error),
               Fraction(0))
