"""Signs that hold for all values of the symbols."""

from __future__ import annotations

from symbolic_response.errors import SizeLimitError, UndecidedError
from symbolic_response.expressions.enclosure import sign_of_constant
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.ring import Domain, Poly, Ring, expression_of
from symbolic_response.expressions.tree import Expression, Number, symbols_of


def certain_sign(node: Expression, positive: frozenset[str]) -> int | None:
    """Return +1, 0 or -1 if the expression has that sign for all values of its symbols.

    Symbols in ``positive`` are positive, the others real. 0 means identically zero; None that
    the sign is not certain. Raises EvaluationError for a division by zero.

    >>> from symbolic_response.expressions.reader import read_expression
    >>> certain_sign(read_expression("a*b + exp(-F)"), frozenset("ab"))
    1
    """
    if isinstance(node, Number):
        return (node.value > 0) - (node.value < 0)
    domain = Domain(tuple(sorted(symbols_of(node))), positive)
    try:
        value = normal_form(node, domain)
    except SizeLimitError:
        return None
    if value.is_zero():
        return 0
    top = _sign(value.numerator, value.ring)
    bottom = _sign(value.denominator, value.ring)
    return None if top is None or bottom is None else top * bottom


def _sign(poly: Poly, ring: Ring) -> int | None:
    signs = {1 if coefficient > 0 else -1 for coefficient in poly.coeffs()}
    strict = False
    for exponents, _ in poly.terms():
        powers = ring.powers(exponents)
        if any(not g.positive and g.kind != "root" and e % 2 != 0 for g, e in powers):
            return _constant_sign(poly, ring)
        strict = strict or all(g.positive for g, _ in powers)
    if len(signs) == 1 and strict:
        return signs.pop()
    return _constant_sign(poly, ring)


def _constant_sign(poly: Poly, ring: Ring) -> int | None:
    node = expression_of(ring, poly)
    if symbols_of(node):
        return None
    try:
        return sign_of_constant(node)
    except UndecidedError:
        return None
