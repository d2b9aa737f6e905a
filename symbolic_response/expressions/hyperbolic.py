"""Hyperbolic functions, written with exponentials, which the normal form decides about."""

from __future__ import annotations

from symbolic_response.errors import EvaluationError
from symbolic_response.expressions.tree import (
    ONE,
    ZERO,
    Expression,
    add,
    divide,
    function,
    multiply,
    negate,
    number,
)

HYPERBOLIC = ("tanh", "sinh", "cosh", "coth")


def hyperbolic(name: str, argument: Expression) -> Expression:
    """Return ``tanh``, ``sinh``, ``cosh`` or ``coth`` of ``argument``.

    tanh x = (e^2x - 1)/(e^2x + 1), sinh x = (e^x - e^-x)/2, cosh x = (e^x + e^-x)/2. Raises
    EvaluationError for coth of zero.

    >>> from symbolic_response.expressions.text import expression_text
    >>> from symbolic_response.expressions.tree import Symbol
    >>> expression_text(hyperbolic("tanh", Symbol("F")))
    '(exp(2*F) - 1)/(exp(2*F) + 1)'
    """
    if name in ("tanh", "coth"):
        squared = function("exp", multiply([number(2), argument]))
        below, above = add([squared, negate(ONE)]), add([squared, ONE])
        if name == "tanh":
            return divide(below, above)
        if below == ZERO:
            raise EvaluationError("coth of zero")
        return divide(above, below)
    up, down = function("exp", argument), function("exp", negate(argument))
    return divide(add([up, down if name == "cosh" else negate(down)]), number(2))
