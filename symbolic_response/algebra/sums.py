"""Adding factored products: common factors out, the rest expanded where that is shorter."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from math import gcd, lcm

from symbolic_response.algebra.factored import (
    ZERO,
    Base,
    Context,
    Factored,
    FactoredSum,
    constant,
    from_polynomial,
    product,
    trimmed,
)
from symbolic_response.algebra.vanishing import polynomial_vanishes
from symbolic_response.expressions.ring import (
    Poly,
    Polynomial,
    Ring,
    common_divisor,
    factors_of,
    lift,
    lift_exponents,
    product_of,
    union,
)

MAX_EXPANDED_PRODUCTS = 400_000


def total(values: Sequence[Factored], context: Context) -> Factored:
    """Return the sum of products, in factored form.

    The common factors are taken out; what remains is expanded, reduced against the denominator
    and factored, or left as a sum of products where that is shorter.
    """
    terms = [value for value in values if not value.is_zero()]
    if not terms:
        return ZERO
    if len(terms) == 1:
        return terms[0]
    common = _common_factor(terms)
    rest = [product([_inverse(common), term]) for term in terms]
    opaque = [tuple(pair for pair in term.factors if not _expandable(pair)) for term in rest]
    if any(opaque):
        content = constant(common.coefficient)
        rest = [product([content, term]) for term in rest]
        bare = product([_inverse(content), common])
        gathered = product([bare, _sum_with_functions(rest, opaque, context)])
        apart = Factored(Fraction(1), factors=((FactoredSum(tuple(terms)), Fraction(1)),))
        return gathered if gathered.literals() <= apart.literals() else apart
    kept = Factored(Fraction(1), factors=((FactoredSum(tuple(rest)), Fraction(1)),))
    if sum(_products_needed(term) for term in rest) > MAX_EXPANDED_PRODUCTS:
        return product([common, kept])
    expanded = _expanded(rest, context, common)
    return min([expanded, product([common, kept])], key=Factored.literals)


def _expandable(pair: tuple[Base, Fraction]) -> bool:
    base, exponent = pair
    if exponent.denominator != 1 or exponent < 0:
        return False
    if isinstance(base, Polynomial):
        return True
    return isinstance(base, FactoredSum) and all(
        _expandable(inner) for term in base.terms for inner in term.factors
    )


def _products_needed(term: Factored) -> int:
    size = 1
    for base, exponent in term.factors:
        if isinstance(base, Polynomial):
            length = len(base.poly)
        else:
            assert isinstance(base, FactoredSum)
            length = sum(_products_needed(inner) for inner in base.terms)
        size *= length ** int(exponent)
        if size > MAX_EXPANDED_PRODUCTS:
            break
    return size


def _common_factor(terms: Sequence[Factored]) -> Factored:
    """Return the product of all bases to the smallest exponent they have in any term."""
    ring = union(term.ring for term in terms)
    rows = [lift_exponents(term.monomial, term.ring, ring) for term in terms]
    lowest = tuple(min(column) for column in zip(*rows, strict=True))
    exponents: dict[Base, list[Fraction]] = {}
    for term in terms:
        for base, exponent in term.factors:
            exponents.setdefault(base, []).append(exponent)
    factors = []
    for base, found in exponents.items():
        smallest = min(found if len(found) == len(terms) else [*found, Fraction(0)])
        if smallest:
            factors.append((base, smallest))
    content = Fraction(
        gcd(*(term.coefficient.numerator for term in terms)),
        lcm(*(term.coefficient.denominator for term in terms)),
    )
    return trimmed(Factored(content, ring, lowest, tuple(factors)))


def _inverse(value: Factored) -> Factored:
    return Factored(
        1 / value.coefficient,
        value.ring,
        tuple(-step for step in value.monomial),
        tuple((base, -exponent) for base, exponent in value.factors),
    )


def expand(term: Factored) -> tuple[Ring, Poly]:
    """Return a product with integer coefficient and no denominator as one polynomial."""
    pieces: list[tuple[Ring, Poly, int]] = []
    for base, exponent in term.factors:
        if isinstance(base, Polynomial):
            pieces.append((base.ring, base.poly, int(exponent)))
        else:
            assert isinstance(base, FactoredSum)
            pieces.append((*expand_sum(base.terms), int(exponent)))
    ring = union([term.ring, *(piece[0] for piece in pieces)])
    lead = ring.monomial(lift_exponents(term.monomial, term.ring, ring))
    factors = [(lift(poly, source, ring), exponent) for source, poly, exponent in pieces]
    return ring, product_of([(lead * int(term.coefficient), 1), *factors], ring)


def expand_sum(terms: Sequence[Factored]) -> tuple[Ring, Poly]:
    """Return a sum of such products as one polynomial."""
    expanded = [expand(term) for term in terms]
    ring = union(source for source, _ in expanded)
    return ring, sum((lift(poly, source, ring) for source, poly in expanded), ring.constant(0))


def _expanded(rest: Sequence[Factored], context: Context, common: Factored) -> Factored:
    ring, poly = expand_sum(rest)
    if polynomial_vanishes(poly, ring):
        return ZERO
    lead = from_polynomial(poly, ring, context)
    if not lead.factors:
        return product([lead, common])
    return product([*_reduced(lead, common, context)])


def _reduced(lead: Factored, common: Factored, context: Context) -> list[Factored]:
    """Return the parts of ``lead * common`` after cancelling against its denominators."""
    (base, _), *_ = lead.factors
    assert isinstance(base, Polynomial)
    ring, poly = base.ring, base.poly
    parts = [Factored(lead.coefficient, lead.ring, lead.monomial),
             Factored(common.coefficient, common.ring, common.monomial)]
    for other, exponent in common.factors:
        if isinstance(other, Polynomial) and exponent < 0 and exponent.denominator == 1:
            both = union([ring, other.ring])
            top, bottom = lift(poly, ring, both), lift(other.poly, other.ring, both)
            left = int(-exponent)
            while left and not (shared := common_divisor(top, bottom)).is_constant():
                if len(shared) != len(bottom) or shared.total_degree() != bottom.total_degree():
                    parts.append(_inverse(from_polynomial(bottom // shared, both, context)))
                top, left = top // shared, left - 1
            ring, poly = both, top
            exponent = Fraction(-left)
        if exponent:
            parts.append(Factored(Fraction(1), factors=((other, exponent),)))
    return [*parts, *_irreducible(poly, ring, context)]


def _irreducible(poly: Poly, ring: Ring, context: Context) -> list[Factored]:
    """Return a polynomial in factors, found only while it is short."""
    content, pieces = factors_of(poly)
    parts = [constant(content)]
    for piece, exponent in pieces:
        parts += [from_polynomial(piece, ring, context)] * exponent
    return parts


def _sum_with_functions(
    rest: Sequence[Factored],
    opaque: Sequence[tuple[tuple[Base, Fraction], ...]],
    context: Context,
) -> Factored:
    """Return a sum in which functions occur: one term for each product of functions."""
    groups: dict[frozenset[tuple[Base, Fraction]], list[Factored]] = {}
    for term, functions in zip(rest, opaque, strict=True):
        plain = tuple(pair for pair in term.factors if pair not in functions)
        groups.setdefault(frozenset(functions), []).append(
            Factored(term.coefficient, term.ring, term.monomial, plain)
        )
    gathered = []
    for functions_, plain_terms in groups.items():
        inner = total(plain_terms, context)
        if not inner.is_zero():
            ordered = tuple(pair for names in opaque for pair in names if pair in functions_)
            gathered.append(product([inner, Factored(Fraction(1), factors=_unique(ordered))]))
    if len(gathered) <= 1:
        return gathered[0] if gathered else ZERO
    return Factored(Fraction(1), factors=((FactoredSum(tuple(gathered)), Fraction(1)),))


def _unique(
    pairs: tuple[tuple[Base, Fraction], ...],
) -> tuple[tuple[Base, Fraction], ...]:
    return tuple(dict.fromkeys(pairs))
