"""From nested terms to an expression, and the proof that it stands for the polynomial."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from symbolic_response.algebra.compact.expansion import Quotient, expanded, stands_for
from symbolic_response.algebra.compact.nested import Bracket, Term
from symbolic_response.algebra.compact.packed import Packing
from symbolic_response.expressions.ring import Poly, Polynomial, Ring, monomial_expression
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    Function,
    Power,
    Symbol,
    add,
    multiply,
    number,
    power,
)


class Builder:
    """Expressions over the generators of a ring, and what each of their leaves stands for."""

    def __init__(self, packing: Packing) -> None:
        self.ring = packing.ring
        self.packing = packing
        self.leaves: dict[Expression, Quotient] = {}
        self._monomials: dict[int, list[Expression]] = {}
        self._brackets: dict[Bracket, Expression] = {}

    def expression(self, terms: Sequence[Term]) -> Expression:
        """Return terms as a sum of products."""
        return add(self._term(term) for term in terms) if terms else ZERO

    def _term(self, term: Term) -> Expression:
        parts: list[Expression] = [number(term.coefficient), *self._monomial(term.monomial)]
        parts += [power(self._bracket(bracket), exponent) for bracket, exponent in term.factors]
        return multiply(parts)

    def _bracket(self, bracket: Bracket) -> Expression:
        if bracket.name is not None:
            return Symbol(bracket.name)
        if bracket not in self._brackets:
            self._brackets[bracket] = self.expression(bracket.terms)
        return self._brackets[bracket]

    def _monomial(self, monomial: int) -> list[Expression]:
        if monomial not in self._monomials:
            exponents = self.packing.exponents(monomial)
            exponential = [g.kind == "exp" for g in self.ring.generators]
            parts = [self._leaf({place: e}) for place, e in enumerate(exponents)
                     if e and not exponential[place]]
            together = {p: e for p, e in enumerate(exponents) if e and exponential[p]}
            self._monomials[monomial] = [*parts, self._leaf(together)] if together else parts
        return self._monomials[monomial]

    def _leaf(self, exponents: Mapping[int, int]) -> Expression:
        """Return the product of powers of generators as a leaf of its own."""
        ring = self.ring
        full = [exponents.get(place, 0) for place in range(len(ring.generators))]
        poly = ring.monomial(full)
        leaf = monomial_expression(ring, full)
        if not isinstance(leaf, Symbol | Power | Function):  # a root to a whole power, say
            leaf = Polynomial(ring, poly)
        self.leaves[leaf] = (poly, ring.constant(1))
        return leaf


class InternalError(AssertionError):
    """A compact form does not stand for what it was made from: a fault of this package."""


def require_equal(
    form: Expression, poly: Poly, leaves: Mapping[Expression, Quotient], ring: Ring, what: str
) -> None:
    """Raise InternalError unless an expression stands for a polynomial, by exact expansion."""
    if not stands_for(expanded(form, leaves, ring), poly):
        raise InternalError(f"the compact form of {what} does not stand for it")
