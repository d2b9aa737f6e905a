"""Products and sums that stay factored.

A :class:`Factored` is a rational coefficient times a monomial of generators times powers of
bases; a base is a primitive polynomial, a sum that is better left unexpanded, or a function. The
value zero has coefficient 0. Everything is over the user's symbols: rates have been substituted.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from math import gcd

from symbolic_response.expressions.normal_form import reduce_roots
from symbolic_response.expressions.ring import (
    EMPTY_RING,
    Domain,
    Generator,
    Poly,
    Polynomial,
    Ring,
    expression_of,
    lift_exponents,
    monomial_content,
    monomial_expression,
    union,
)
from symbolic_response.expressions.tree import (
    Expression,
    Number,
    Sum,
    add,
    function,
    multiply,
    number,
    power,
)

MAX_SPREAD = 12


@dataclass(frozen=True, slots=True)
class FactoredSum:
    """A sum of two or more products, kept as it is."""

    terms: tuple[Factored, ...]


@dataclass(frozen=True, slots=True)
class FactoredFunction:
    """``exp`` or ``ln`` of a factored argument that has no simpler form."""

    name: str
    argument: Factored


Base = Polynomial | FactoredSum | FactoredFunction


@dataclass(frozen=True, slots=True)
class Factored:
    """``coefficient * monomial * Π base ** exponent``; the monomial's exponents may be negative."""

    coefficient: Fraction
    ring: Ring = EMPTY_RING
    monomial: tuple[int, ...] = ()
    factors: tuple[tuple[Base, Fraction], ...] = ()

    def is_zero(self) -> bool:
        """Return whether this is the number zero (an unexpanded sum may still vanish)."""
        return self.coefficient == 0

    def is_constant(self) -> bool:
        """Return whether this is a rational number."""
        return not self.factors and not any(self.monomial)

    def literals(self) -> int:
        """Return the number of symbols to write down, the measure of length used here."""
        count = sum(1 for exponent in self.monomial if exponent)
        return count + sum(_base_literals(base) for base, _ in self.factors)

    def expression(self) -> Expression:
        """Return the product as a tree whose polynomials are leaves."""
        if _reads_better_spread(self):
            ((base, _),) = self.factors
            if self.coefficient == -1 and isinstance(base, Polynomial):
                return Polynomial(base.ring, -base.poly)
            return add(_spread(self))
        parts = [number(self.coefficient), monomial_expression(self.ring, self.monomial)]
        parts += [power(_base_expression(base), exponent) for base, exponent in self.factors]
        return multiply(parts)


ZERO = Factored(Fraction(0))


def _base_literals(base: Base) -> int:
    match base:
        case Polynomial():
            return sum(sum(1 for e in exponents if e) for exponents in base.poly.monoms())
        case FactoredSum(terms):
            return sum(term.literals() for term in terms)
        case FactoredFunction(_, argument):
            return argument.literals()


def _base_expression(base: Base) -> Expression:
    match base:
        case Polynomial():
            return base
        case FactoredSum(terms):
            return add([piece for term in terms for piece in _spread(term)])
        case FactoredFunction(name, argument):
            return function(name, argument.expression())


def _reads_better_spread(value: Factored) -> bool:
    """Return whether ``-(a - b)`` or ``(2*a + b)/2`` stands alone: ``-a + b``, ``a + b/2``."""
    if len(value.factors) != 1 or any(value.monomial) or abs(value.coefficient.numerator) != 1:
        return False
    ((base, exponent),) = value.factors
    if not isinstance(base, Polynomial) or exponent != 1 or len(base.poly) > MAX_SPREAD:
        return False
    bottom = value.coefficient.denominator
    if bottom == 1:
        return value.coefficient < 0
    return any(coefficient % bottom == 0 for coefficient in base.poly.coeffs())


def _spread(term: Factored) -> list[Expression]:
    """Return a term of a sum; a number times a polynomial as its separate terms."""
    if len(term.factors) == 1 and not any(term.monomial):
        ((base, exponent),) = term.factors
        if isinstance(base, Polynomial) and exponent == 1 and len(base.poly) <= MAX_SPREAD:
            plain = expression_of(base.ring, base.poly)
            pieces = plain.terms if isinstance(plain, Sum) else (plain,)
            return [multiply([number(term.coefficient), piece]) for piece in pieces]
    return [term.expression()]


@dataclass(frozen=True, slots=True)
class Context:
    """The symbols in use, and sums that occur in rates and are written as one factor.

    ``named`` maps such a sum (a primitive polynomial) to the generator that stands for it.
    """

    domain: Domain
    named: dict[Polynomial, Generator]


def constant(value: int | Fraction) -> Factored:
    """Return a rational number."""
    return Factored(Fraction(value))


def monomial_of(generator: Generator, exponent: Fraction) -> Factored:
    """Return a power of one generator."""
    ring = Ring([generator], [exponent.denominator])
    return Factored(Fraction(1), ring, (exponent.numerator,))


def from_polynomial(poly: Poly, ring: Ring, context: Context) -> Factored:
    """Return a polynomial as content times monomial times its primitive part, roots reduced."""
    ring, (poly,) = reduce_roots([poly], ring, lowest=2)
    if len(poly) == 0:
        return ZERO
    exponents = monomial_content(poly)
    content = int(poly.primitive()[0])
    rest = poly // (ring.monomial(exponents) * content)
    if rest.leading_coefficient() < 0:
        rest, content = -rest, -content
    lead = Factored(Fraction(content), ring, exponents)
    if rest.is_one():
        return trimmed(lead)
    base = _trimmed_polynomial(rest, ring)
    if base in context.named:
        return product([trimmed(lead), monomial_of(context.named[base], Fraction(1))])
    return Factored(lead.coefficient, *_trim(ring, exponents), ((base, Fraction(1)),))


def trimmed(value: Factored) -> Factored:
    """Return the same product with its monomial over the generators that occur."""
    return Factored(value.coefficient, *_trim(value.ring, value.monomial), value.factors)


def _trim(ring: Ring, exponents: Sequence[int]) -> tuple[Ring, tuple[int, ...]]:
    powers = ring.powers(exponents)
    small = Ring([g for g, _ in powers], [e.denominator for _, e in powers])
    return small, tuple(e.numerator for _, e in powers)


def _trimmed_polynomial(poly: Poly, ring: Ring) -> Polynomial:
    """Return the polynomial over the smallest ring that holds it, so that equals compare equal."""
    shrink = [gcd(int(step), root) for step, root in zip(poly.deflation()[1], ring.roots,
                                                          strict=True)]
    used = [place for place, degree in enumerate(poly.degrees()) if degree]
    if len(used) == len(ring.generators) and all(factor == 1 for factor in shrink):
        return Polynomial(ring, poly)
    if any(shrink[place] > 1 for place in used):
        shrink = [factor if place in used else 1 for place, factor in enumerate(shrink)]
        poly = poly.deflate(shrink)
    small = Ring(
        [ring.generators[place] for place in used],
        [ring.roots[place] // shrink[place] for place in used],
    )
    return Polynomial(small, poly.project_to_context(small.context))


def product(values: Sequence[Factored]) -> Factored:
    """Return the product, equal bases gathered."""
    coefficient = Fraction(1)
    ring = union(value.ring for value in values)
    exponents = [0] * len(ring.generators)
    gathered: dict[Base, Fraction] = {}
    for value in values:
        coefficient *= value.coefficient
        for place, step in enumerate(lift_exponents(value.monomial, value.ring, ring)):
            exponents[place] += step
        for base, exponent in value.factors:
            gathered[base] = gathered.get(base, Fraction(0)) + exponent
    if coefficient == 0:
        return ZERO
    kept = tuple((base, exponent) for base, exponent in gathered.items() if exponent)
    coefficient *= _whole_roots(ring, exponents)
    return Factored(coefficient, *_trim(ring, exponents), kept)


def _whole_roots(ring: Ring, exponents: list[int]) -> Fraction:
    """Take the whole powers of roots of numbers out of a monomial, and return their product."""
    taken = Fraction(1)
    for place, (generator, root) in enumerate(zip(ring.generators, ring.roots, strict=True)):
        if generator.kind == "root" and isinstance(generator.base, Number):
            whole, exponents[place] = divmod(exponents[place], root)
            taken *= generator.base.value**whole
    return taken


def integer_power(value: Factored, exponent: int) -> Factored:
    """Return an integer power of a product that is not zero."""
    return Factored(
        value.coefficient**exponent,
        value.ring,
        tuple(step * exponent for step in value.monomial),
        tuple((base, power_ * exponent) for base, power_ in value.factors),
    )


def scaled(value: Factored, factor: Fraction) -> Factored:
    """Return the product times a rational number."""
    if factor == 0:
        return ZERO
    return Factored(value.coefficient * factor, value.ring, value.monomial, value.factors)
