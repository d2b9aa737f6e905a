"""How much ln of a rate changes with a symbol, read off the form of the rate alone.

The rules are those that a checker of the record has: what they do not cover has no proof.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from fractions import Fraction

from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    symbols_of,
)
from symbolic_response.network.quantities import BySymbol

Rule = Callable[[Expression], Fraction | None]


def logarithmic_change(node: Expression, by: BySymbol) -> Fraction | None:
    """Return d ln(node)/d theta where the form shows that it is a number, else None.

    0 of what does not hold the symbol, 1 of the symbol itself (theta its logarithm); products add,
    powers multiply, the terms of a sum must agree; of exp(a) the slope of a.
    """
    if by.name not in symbols_of(node):
        return Fraction(0)
    match node:
        case Symbol():
            return Fraction(1) if by.logarithmic else None
        case Product(factors):
            return _sum(logarithmic_change(factor, by) for factor in factors)
        case Power(base, exponent):
            change = logarithmic_change(base, by)
            return None if change is None else change * exponent
        case Sum(terms):
            found = {logarithmic_change(term, by) for term in terms}
            return found.pop() if len(found) == 1 else None
        case Function("exp", argument):
            return _slope(argument, by)
    return None


def _slope(node: Expression, by: BySymbol) -> Fraction | None:
    """Return d node/d theta where the form shows that it is a number, else None.

    Of the symbol itself 1 (theta the symbol), of ln(a) that of the logarithm of a.
    """
    if by.name not in symbols_of(node):
        return Fraction(0)
    match node:
        case Symbol():
            return None if by.logarithmic else Fraction(1)
        case Function("ln", argument):
            return logarithmic_change(argument, by)
        case Sum(terms):
            return _sum(_slope(term, by) for term in terms)
        case Product((Number(value), other)):
            slope = _slope(other, by)
            return None if slope is None else value * slope
    return None


def _sum(parts: Iterable[Fraction | None]) -> Fraction | None:
    total = Fraction(0)
    for part in parts:
        if part is None:
            return None
        total += part
    return total


def shows_real(node: Expression, positive: frozenset[str]) -> bool:
    """Return whether the form of an expression shows that it is a real number."""
    match node:
        case Number() | Symbol():
            return True
        case Sum(parts) | Product(parts):
            return all(shows_real(part, positive) for part in parts)
        case Function("exp", argument):
            return shows_real(argument, positive)
        case Power(base, exponent) if exponent >= 0 and exponent.denominator == 1:
            return shows_real(base, positive)
        case Power(argument, _) | Function("ln", argument):
            return shown_sign(argument, positive) == 1
    return False


def shows_sign(values: Iterable[Expression], positive: frozenset[str]) -> bool:
    """Return whether the form of each value shows that it is not negative, of one that it is
    positive."""
    signs = [shown_sign(value, positive) for value in values]
    return None not in signs and 1 in signs


def shown_sign(node: Expression, positive: frozenset[str]) -> int | None:
    """Return 1 (positive), 0 (not negative, maybe zero) or None."""
    match node:
        case Number(value):
            return None if value < 0 else int(value > 0)
        case Symbol(name):
            return 1 if name in positive else None
        case Function("exp", argument):
            return 1 if shows_real(argument, positive) else None
        case Sum(terms):
            signs = [shown_sign(term, positive) for term in terms]
            return None if None in signs else max(s for s in signs if s is not None)
        case Product(factors):
            signs = [shown_sign(factor, positive) for factor in factors]
            return None if None in signs else min(s for s in signs if s is not None)
        case Power(base, _):
            return 1 if shown_sign(base, positive) == 1 else None
    return None
