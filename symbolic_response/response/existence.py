"""Refusing logarithms and roots of what is negative for all values of the symbols."""

from __future__ import annotations

from symbolic_response.errors import EvaluationError
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Power,
    walk,
)
from symbolic_response.network.quantities import Response, walk_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_form import closed_form
from symbolic_response.response.plain_signs import plain_sign


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
