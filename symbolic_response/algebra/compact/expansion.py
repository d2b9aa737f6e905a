"""Re-expansion: what a nested expression stands for, as an exact quotient of polynomials."""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction

from symbolic_response.expressions.ring import Poly, Ring
from symbolic_response.expressions.tree import Expression, Number, Power, Product, Sum

Quotient = tuple[Poly, Poly]
Leaves = Mapping[Expression, Quotient]
"""What each leaf stands for, numerator and denominator."""


def generator_leaves(ring: Ring) -> dict[Expression, Quotient]:
    """Return every generator of a ring as a leaf."""
    one = ring.constant(1)
    return {
        generator.expression(Fraction(1, root)): (ring.context.gen(place), one)
        for place, (generator, root) in enumerate(zip(ring.generators, ring.roots, strict=True))
    }


def expanded(node: Expression, leaves: Leaves, ring: Ring) -> Quotient:
    """Return numerator and denominator of an expression, multiplied out and not reduced.

    ValueError for a node that is neither a leaf, a number, a sum, a product nor a whole power.
    """
    if node in leaves:
        return leaves[node]
    one = ring.constant(1)
    match node:
        case Number(value):
            return ring.constant(value.numerator), ring.constant(value.denominator)
        case Sum(terms):
            return _sum([expanded(term, leaves, ring) for term in terms], ring)
        case Product(factors):
            top, below = one, one
            for factor in factors:
                more, under = expanded(factor, leaves, ring)
                top, below = top * more, below * under
            return top, below
        case Power(base, exponent) if exponent.denominator == 1:
            top, below = expanded(base, leaves, ring)
            if exponent < 0:
                top, below = below, top
            return top ** abs(exponent.numerator), below ** abs(exponent.numerator)
    raise ValueError(f"{node!r} is not made of the generators of the ring")


def _sum(parts: list[Quotient], ring: Ring) -> Quotient:
    total, bottom = ring.constant(0), ring.constant(1)
    for top, below in parts:
        if below == bottom:
            total = total + top
        else:
            shared = bottom.gcd(below)
            total = total * (below // shared) + top * (bottom // shared)
            bottom = bottom * (below // shared)
    return total, bottom


def stands_for(value: Quotient, poly: Poly) -> bool:
    """Return whether a quotient is a polynomial."""
    top, below = value
    return bool(top == poly * below)
