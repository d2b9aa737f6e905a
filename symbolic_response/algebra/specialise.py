"""Putting values in for symbols in a factored form."""

from __future__ import annotations

from fractions import Fraction

from symbolic_response.algebra.factored import (
    Base,
    Factored,
    FactoredFunction,
    FactoredSum,
    product,
)
from symbolic_response.algebra.simplify import exponential_of, logarithm_of, raised
from symbolic_response.algebra.substitution import Substitution
from symbolic_response.algebra.sums import total
from symbolic_response.expressions.ring import Domain, Generator, Polynomial
from symbolic_response.expressions.tree import Expression, substitute


def specialise(value: Factored, values: dict[str, Expression], domain: Domain) -> Factored:
    """Return ``value`` with symbols replaced by expressions.

    Raises EvaluationError where a divisor becomes zero, or a logarithm or root does not exist.
    """

    def image(generator: Generator, root: int) -> Expression:
        return substitute(generator.expression(Fraction(1, root)), values)

    return _specialised(value, Substitution(domain, image))


def _specialised(value: Factored, substitution: Substitution) -> Factored:
    parts = [substitution.monomial(value)]
    for base, exponent in value.factors:
        image = _base(base, substitution)
        parts.append(raised(image, exponent, substitution.context))
    return product(parts)


def _base(base: Base, substitution: Substitution) -> Factored:
    match base:
        case Polynomial():
            return substitution.apply(base.poly, base.ring)
        case FactoredSum(terms):
            parts = [_specialised(term, substitution) for term in terms]
            return total(parts, substitution.context)
        case FactoredFunction(name, argument):
            inner = _specialised(argument, substitution)
            apply = exponential_of if name == "exp" else logarithm_of
            return apply(inner, substitution.context)
