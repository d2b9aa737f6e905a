"""Expressions that vanish identically though their form does not show it."""

from __future__ import annotations

from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.enclosure import nonzero_somewhere
from symbolic_response.expressions.normal_form import normal_form, reduce_roots
from symbolic_response.expressions.ring import Domain, Poly, Polynomial, Ring
from symbolic_response.expressions.tree import Expression


def polynomial_vanishes(poly: Poly, ring: Ring) -> bool:
    """Return whether a polynomial is zero once the sums that have a name are written out.

    An enclosure that excludes zero at a point settles most cases; False past a size limit.
    """
    if len(poly) == 0:
        return True
    named = any(generator.relation is not None for generator in ring.generators)
    if not named or nonzero_somewhere(Polynomial(ring, poly)):
        return False
    try:
        return len(reduce_roots([poly], ring)[1][0]) == 0
    except SizeLimitError:
        return False


def vanishes(node: Expression, domain: Domain) -> bool:
    """Return whether the normal form proves an expression zero; False past a size limit."""
    if nonzero_somewhere(node):
        return False
    try:
        return normal_form(node, domain).is_zero()
    except SizeLimitError:
        return False
