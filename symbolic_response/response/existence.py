"""Refusing logarithms and roots of what is negative for all values of the symbols."""

from __future__ import annotations

from symbolic_response.errors import EvaluationError
from symbolic_response.expressions.ring import Polynomial
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    walk,
)
from symbolic_response.network.quantities import (
    DirectedRate,
    Probability,
    Response,
    Traffic,
    walk_quantity,
)
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_form import closed_form


def require_existence(node: Expression, positive: frozenset[str]) -> None:
    """Raise EvaluationError at a logarithm or root of an expression that is plainly negative."""
    for part in walk(node):
        match part:
            case Function("ln", argument):
                what = "a logarithm"
            case Power(argument, exponent) if exponent.denominator != 1:
                what = "a root"
            case _:
                continue
        if plain_sign(argument, positive) == -1:
            raise EvaluationError(f"{what} of an expression that is negative for all values")


def require_inner_existence(quantity: Expression, analysis: Analysis) -> None:
    """Raise EvaluationError where a response is asked of what does not exist.

    A derivative may well exist as a formula: that of ``ln(-c)``, or of ``1/(k - k)`` by c.
    """
    positive = analysis.domain.positive
    for part in walk_quantity(quantity):
        if not isinstance(part, Response):
            continue
        for piece in walk(part.quantity):
            match piece:
                case Function("ln", argument):
                    pass
                case Power(argument, exponent) if exponent < 0 or exponent.denominator != 1:
                    pass
                case _:
                    continue
            if plain_sign(argument, positive) != 1:
                require_existence(closed_form(piece, analysis).expression, positive)


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
