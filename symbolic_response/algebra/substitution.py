"""From rates to the user's symbols: each rate as a coefficient times a monomial.

A sum that occurs in a rate, such as ``k1 + k2*c``, is not multiplied out: it becomes a generator
of its own whose relation says what it stands for.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from symbolic_response.algebra.factored import (
    ZERO,
    Context,
    Factored,
    constant,
    from_polynomial,
    integer_power,
    monomial_of,
    product,
    scaled,
)
from symbolic_response.algebra.rates import RateRing
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.ring import (
    Domain,
    Generator,
    Poly,
    Polynomial,
    common_denominator,
    expression_of,
    lift_exponents,
    union,
)
from symbolic_response.expressions.signs import certain_sign
from symbolic_response.expressions.tree import Expression


@dataclass(frozen=True, slots=True)
class RateSubstitution:
    """``images[g]``: what generator g of the ring of rates stands for, a single monomial."""

    rates: RateRing
    context: Context
    images: tuple[Factored, ...]

    def apply(self, poly: Poly) -> Factored:
        """Return a polynomial in the rates as a factored expression in the user's symbols."""
        if len(poly) == 0:
            return ZERO
        target = union(image.ring for image in self.images)
        rows = [lift_exponents(image.monomial, image.ring, target) for image in self.images]
        exponents = np.array(poly.monoms(), dtype=np.int64).reshape(len(poly), -1)
        mapped = exponents @ np.array(rows, dtype=np.int64).reshape(len(rows), -1)
        lowest = mapped.min(axis=0) if mapped.size else np.zeros(0, dtype=np.int64)
        values = self._coefficients(exponents, poly)
        scale = common_denominator(values)
        terms: dict[tuple[int, ...], int] = {}
        for key, value in zip(map(tuple, (mapped - lowest).tolist()), values, strict=True):
            terms[key] = terms.get(key, 0) + int(value * scale)
        gathered = target.context.from_dict({k: v for k, v in terms.items() if v})
        lead = Factored(Fraction(1, scale), target, tuple(int(step) for step in lowest))
        return product([lead, from_polynomial(gathered, target, self.context)])

    def _coefficients(self, exponents: np.ndarray, poly: Poly) -> list[Fraction]:
        values = [Fraction(int(c)) for c in poly.coeffs()]
        for place, image in enumerate(self.images):
            if image.coefficient != 1:
                steps = exponents[:, place].tolist()
                values = [
                    value * image.coefficient**step
                    for value, step in zip(values, steps, strict=True)
                ]
        return values


def rate_substitution(
    rates: RateRing, expressions: Sequence[Expression], domain: Domain
) -> RateSubstitution:
    """Return the substitution of rates by expressions in the symbols of ``domain``.

    ``expressions``: one for each generator of the ring of rates, in order.
    """
    named: dict[Polynomial, Generator] = {}
    images = [_image(expression, domain, named) for expression in expressions]
    return RateSubstitution(rates, Context(domain, named), tuple(images))


def _image(
    expression: Expression, domain: Domain, named: dict[Polynomial, Generator]
) -> Factored:
    form = normal_form(expression, domain)
    plain = Context(domain, {})
    parts = []
    for poly, sign in ((form.numerator, 1), (form.denominator, -1)):
        content, pieces = poly.factor()
        parts.append(integer_power(constant(int(content)), sign))
        for piece, exponent in pieces:
            value = from_polynomial(piece, form.ring, plain)
            parts.append(_named(value, int(exponent) * sign, domain, named))
    return product(parts)


def _named(
    value: Factored, exponent: int, domain: Domain, named: dict[Polynomial, Generator]
) -> Factored:
    lead = scaled(Factored(Fraction(1), value.ring, value.monomial), value.coefficient)
    parts = [lead]
    for base, power_ in value.factors:
        assert isinstance(base, Polynomial)
        if base not in named:
            named[base] = _generator_for(base, domain, len(named))
        parts.append(monomial_of(named[base], power_))
    return integer_power(product(parts), exponent)


def _generator_for(base: Polynomial, domain: Domain, rank: int) -> Generator:
    expression = expression_of(base.ring, base.poly)
    positive = certain_sign(expression, domain.positive) == 1
    return Generator("root", rank, repr(expression), expression, positive, base)
