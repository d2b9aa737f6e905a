"""Substituting expressions for generators, each as a coefficient times a monomial.

A sum that is put in for a generator, such as the rate ``k1 + k2*c``, is not multiplied out: it
becomes a generator of its own whose relation says what it stands for.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from fractions import Fraction
from typing import Any

import numpy as np
from numpy.typing import NDArray

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
from symbolic_response.algebra.vanishing import polynomial_vanishes
from symbolic_response.errors import EvaluationError
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.ring import (
    Domain,
    Generator,
    Poly,
    Polynomial,
    Ring,
    common_denominator,
    expression_of,
    factors_of,
    key_of,
    lift_exponents,
    union,
)
from symbolic_response.expressions.signs import certain_sign
from symbolic_response.expressions.tree import Expression


class Substitution:
    """A substitution of generators; sums met on the way are named once for all uses.

    ``image(generator, root)`` is the expression put in for the generator to the power 1/root.
    """

    def __init__(
        self, domain: Domain, image: Callable[[Generator, int], Expression]
    ) -> None:
        self.context = Context(domain, {})
        self._image = image
        self._images: dict[tuple[Generator, int], Factored] = {}

    def image(self, generator: Generator, root: int) -> Factored:
        """Return what stands for a ring's variable, a single product of generators."""
        key = (generator, root)
        if key not in self._images:
            self._images[key] = self._monomial(self._image(generator, root))
        return self._images[key]

    def apply(self, poly: Poly, ring: Ring) -> Factored:
        """Return a polynomial with every generator replaced, in factored form."""
        if len(poly) == 0:
            return ZERO
        images = [self.image(g, root) for g, root in zip(ring.generators, ring.roots, strict=True)]
        exponents = np.array(poly.monoms(), dtype=np.int64).reshape(len(poly), len(images))
        values = _coefficients(exponents, poly, images)
        target = union(image.ring for image in images)
        rows = [lift_exponents(image.monomial, image.ring, target) for image in images]
        mapped = exponents @ np.array(rows, dtype=np.int64).reshape(len(rows), -1)
        lowest = mapped.min(axis=0)
        scale = common_denominator(values)
        terms: dict[tuple[int, ...], int] = {}
        for key, value in zip(map(tuple, (mapped - lowest).tolist()), values, strict=True):
            terms[key] = terms.get(key, 0) + int(value * scale)
        gathered = target.context.from_dict({k: v for k, v in terms.items() if v})
        if polynomial_vanishes(gathered, target):
            return ZERO
        lead = Factored(Fraction(1, scale), target, tuple(int(step) for step in lowest))
        return product([lead, from_polynomial(gathered, target, self.context)])

    def monomial(self, value: Factored) -> Factored:
        """Return coefficient and monomial of a product with every generator replaced.

        Raises EvaluationError if what stands in a denominator becomes zero.
        """
        parts = [constant(value.coefficient)]
        for generator, root, exponent in zip(
            value.ring.generators, value.ring.roots, value.monomial, strict=True
        ):
            if exponent:
                image = self.image(generator, root)
                if image.is_zero() and exponent < 0:
                    raise EvaluationError("division by zero")
                parts.append(integer_power(image, exponent) if not image.is_zero() else ZERO)
        return product(parts)

    def _monomial(self, expression: Expression) -> Factored:
        form = normal_form(expression, self.context.domain)
        if form.is_zero():
            return ZERO
        parts = []
        for poly, sign in ((form.numerator, 1), (form.denominator, -1)):
            content, pieces = factors_of(poly)
            parts.append(integer_power(constant(content), sign))
            for piece, exponent in pieces:
                parts.append(integer_power(self._named(piece, form.ring), exponent * sign))
        return product(parts)

    def _named(self, piece: Poly, ring: Ring) -> Factored:
        value = from_polynomial(piece, ring, Context(self.context.domain, {}))
        parts = [scaled(Factored(Fraction(1), value.ring, value.monomial), value.coefficient)]
        for base, exponent in value.factors:
            assert isinstance(base, Polynomial)
            if base not in self.context.named:
                self.context.named[base] = self._generator_for(base)
            parts.append(monomial_of(self.context.named[base], exponent))
        return product(parts)

    def _generator_for(self, base: Polynomial) -> Generator:
        expression = expression_of(base.ring, base.poly)
        positive = certain_sign(expression, self.context.domain.positive) == 1
        rank = len(self.context.named)
        return Generator("root", rank, key_of(expression), expression, positive, base)


def _coefficients(
    exponents: NDArray[np.int64], poly: Poly, images: Sequence[Factored]
) -> list[Fraction]:
    values: list[Any] = [Fraction(int(c)) for c in poly.coeffs()]
    for place, image in enumerate(images):
        if image.coefficient != 1:
            powers: dict[int, Fraction] = {}
            for index, step in enumerate(exponents[:, place].tolist()):
                if step not in powers:
                    powers[step] = image.coefficient**step
                values[index] *= powers[step]
    return values
