"""Signs that every part of an expression shows, without any expansion."""

from __future__ import annotations

from symbolic_response.expressions.ring import Polynomial
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
)
from symbolic_response.network.quantities import DirectedRate, Probability, Traffic


def plain_sign(node: Expression, positive: frozenset[str]) -> int | None:
    """Return +1 or -1 where every part shows that sign for all values, else None."""
    match node:
        case Number(value):
            return 1 if value > 0 else -1 if value < 0 else None
        case Symbol(name):
            return 1 if name in positive else None
        case Sum(terms):
            return _common([plain_sign(term, positive) for term in terms])
        case Product(factors):
            return _product([plain_sign(factor, positive) for factor in factors])
        case Power(base, exponent) if exponent.denominator == 1:
            sign = plain_sign(base, positive)
            return sign if sign is None or exponent % 2 else 1
        case Power(base, _):
            return 1 if plain_sign(base, positive) == 1 else None
        case Function("exp", _) | Probability() | Traffic() | DirectedRate(_, False):
            return 1
        case Polynomial():
            return _polynomial_sign(node)
    return None


def _common(signs: list[int | None]) -> int | None:
    return signs[0] if len(set(signs)) == 1 else None


def _product(signs: list[int | None]) -> int | None:
    total = 1
    for sign in signs:
        if sign is None:
            return None
        total *= sign
    return total


def _polynomial_sign(leaf: Polynomial) -> int | None:
    used = [bool(degree) for degree in leaf.poly.degrees()]
    if not all(g.positive for g, u in zip(leaf.ring.generators, used, strict=True) if u):
        return None
    return _common([1 if coefficient > 0 else -1 for coefficient in leaf.poly.coeffs()])
