"""Expressions with their sums in a short nested form, each proved equal to the sum it replaces."""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction

from symbolic_response.algebra.compact.factor import factored
from symbolic_response.algebra.compact.measure import characters
from symbolic_response.expressions.ring import Polynomial
from symbolic_response.expressions.tree import Expression, rebuild

MAX_TERMS = 400
"""Longer sums stay as they are: a short form of one has no use for a reader."""
EXPONENTIALS = Fraction(1, 2)
"""Sums of exponentials read well as they are; a nested form must be shorter by this factor."""


class ShortForms:
    """The short forms of polynomials, each made once; ``names``: the LaTeX of symbols."""

    def __init__(self, names: Mapping[str, str]) -> None:
        self.names = names
        self._made: dict[Polynomial, Expression] = {}

    def of(self, node: Expression) -> Expression:
        """Return an expression with its polynomials in short form."""
        return rebuild(node, self._leaf)

    def _leaf(self, leaf: Expression) -> Expression:
        if not isinstance(leaf, Polynomial) or not 2 < len(leaf.poly) <= MAX_TERMS:
            return leaf
        if leaf not in self._made:
            short = factored(leaf.poly, leaf.ring, self._width)
            exponentials = any(g.kind == "exp" for g in leaf.ring.generators)
            most = characters(leaf, self._width) * (EXPONENTIALS if exponentials else 1)
            self._made[leaf] = short if characters(short, self._width) < most else leaf
        return self._made[leaf]

    def _width(self, name: str) -> int:
        return len(self.names.get(name, name))
