"""Putting values in a closed form: tidied where that is quick, term by term where it is not.

``exp(E)`` at E = 3.14159 makes polynomials of degree 314159 in ``exp(1/100000)``. They are not
worth factoring: the values are then written into the form as it stands.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace
from fractions import Fraction
from math import lcm

from symbolic_response.algebra.specialise import specialise
from symbolic_response.expressions.ring import Domain, Polynomial, plain
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Sum,
    substitute,
    symbols_of,
    walk,
)
from symbolic_response.response.closed_form import ClosedForm

MAX_DEGREE = 1_000


def placed(form: ClosedForm, values: Mapping[str, Expression], domain: Domain) -> ClosedForm | None:
    """Return a closed form at the given values, None where its exponents are too many or long."""
    if exponent_degree(form.expression, dict(values)) > MAX_DEGREE:
        return None
    return replace(form, form=specialise(form.form, dict(values), domain))


def placed_as_it_stands(form: ClosedForm, values: Mapping[str, Expression]) -> Expression:
    """Return the tree of a closed form with values written in.

    Raises EvaluationError for a division by the number zero.
    """
    return substitute(plain(form.expression), dict(values))


def exponent_degree(node: Expression, values: dict[str, Expression]) -> Fraction:
    """Return how large the numbers in exponents become, over their common denominator."""
    arguments = [
        substitute(argument, values)
        for argument in exponents_of(node)
        if symbols_of(argument) & values.keys()
    ]
    for value in values.values():
        arguments += exponents_of(value)
    found = [number for argument in arguments for number in _numbers(argument)]
    common = lcm(*(number.denominator for number in found))
    return max((abs(number) * common for number in found), default=Fraction(0))


def exponents_of(node: Expression) -> Iterator[Expression]:
    """Yield the arguments of all exponentials of a tree, those in its polynomials included."""
    for part in walk(node):
        if isinstance(part, Function) and part.name == "exp":
            yield part.argument
        elif isinstance(part, Polynomial):
            for generator in part.ring.generators:
                if generator.kind == "exp":
                    yield generator.base
                yield from exponents_of(generator.base)


def _numbers(argument: Expression) -> Iterator[Fraction]:
    for term in argument.terms if isinstance(argument, Sum) else (argument,):
        parts = list(walk(term))
        if not any(isinstance(part, Function) and part.name == "ln" for part in parts):
            yield from (part.value for part in parts if isinstance(part, Number))
