"""Recognising a product of powers of symbols from its values at points.

One symbol at a time is scaled so that the generator it stands for is doubled: a monomial is then
multiplied by a power of 2, which gives the exponent.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

import flint

from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    Number,
    Symbol,
    add,
    function,
    multiply,
    number,
    power,
    walk,
)
from symbolic_response.hand.diagnosis.case import Case, Values, point_at, value_at
from symbolic_response.hand.judging.witness import Axis
from symbolic_response.response.direct import direct_value
from symbolic_response.response.values import Point

MAX_EXPONENT = 12
MAX_COEFFICIENT = 10_000

Column = Sequence[flint.fmpq]
"""Values at the points of a :class:`Probe`, in their order."""


@dataclass(frozen=True, slots=True)
class Monomial:
    """A coefficient times powers of symbols and exponentials of symbols."""

    coefficient: Fraction
    powers: tuple[tuple[Axis, Fraction], ...]

    def expression(self) -> Expression:
        """Return the monomial as a tree."""
        factors: list[Expression] = [number(self.coefficient)]
        argument: list[Expression] = []
        for axis, exponent in self.powers:
            if axis.kind == "logarithm":
                argument.append(multiply([number(exponent), Symbol(axis.name)]))
            else:
                factors.append(power(Symbol(axis.name), exponent))
        return multiply([*factors, function("exp", add(argument))])

    def is_number(self) -> bool:
        """Whether no symbol occurs."""
        return not self.powers

    def is_simple(self) -> bool:
        """Whether it is a number, a power of one symbol, or one symbol over another."""
        if not self.powers:
            return True
        if self.coefficient != 1:
            return False
        return len(self.powers) == 1 or (
            len(self.powers) == 2 and self.powers[0][1] == -self.powers[1][1]
            and abs(self.powers[0][1]) <= 1)


class Probe:
    """Points for one case: two that differ everywhere, then one for each symbol, doubled."""

    def __init__(self, case: Case) -> None:
        self.axes = case.axes
        self.points: list[Point] = []
        if len(case.points) < 2:
            return
        base = case.points[0]
        assert isinstance(base, dict)
        found = [case.point(0), case.point(1)]
        for axis in self.axes:
            point = point_at(case.network, {**base, axis.name: doubled(axis, base)})
            if point is None:
                return
            found.append(point)
        self.points = found

    def recognised(self, values: Column) -> Monomial | None:
        """Return the monomial that has these values at the points, None if there is none."""
        base, second, *others = values
        if base == 0:
            return None
        powers = []
        for axis, value in zip(self.axes, others, strict=True):
            step = _exponent_of_two(value / base)
            if step is None or abs(step) > MAX_EXPONENT * axis.order:
                return None
            if step:
                powers.append((axis, Fraction(step, axis.order)))
        bare = Monomial(Fraction(1), tuple(powers))
        here, there = (self._value(bare, point) for point in self.points[:2])
        if here is None or there is None or base / here != second / there:
            return None
        ratio = base / here
        coefficient = Fraction(int(ratio.p), int(ratio.q))
        if max(abs(coefficient.numerator), coefficient.denominator) > MAX_COEFFICIENT:
            return None
        return Monomial(coefficient, bare.powers)

    def _value(self, monomial: Monomial, point: Point) -> flint.fmpq | None:
        return direct_value(monomial.expression(), point.values)


def column_of(node: Expression, probe: Probe) -> Column | None:
    """Return the values of a quantity at the points, None where one is not rational."""
    found = []
    for point in probe.points:
        value = value_at(point, node)
        if not isinstance(value, Number):
            return None
        found.append(flint.fmpq(value.value.numerator, value.value.denominator))
    return found


def doubled(axis: Axis, values: Values) -> Expression:
    """Return the value of a symbol at which what it stands for is doubled.

    For a symbol in exponents that is exp(a/order), for one under roots its root, else itself.
    """
    value = values[axis.name]
    if axis.kind == "logarithm":
        number_of = [part.value for part in walk(value) if isinstance(part, Number)]
        base = number_of[-1] if value != ZERO else Fraction(1)
        return multiply([number(axis.order), function("ln", number(2 * base))])
    assert isinstance(value, Number)
    return number(value.value * (2**axis.order if axis.kind == "power" else 2))


def _exponent_of_two(ratio: flint.fmpq) -> int | None:
    if ratio <= 0:
        return None
    top, bottom = int(ratio.p), int(ratio.q)
    if top & (top - 1) or bottom & (bottom - 1):
        return None
    return top.bit_length() - bottom.bit_length()
