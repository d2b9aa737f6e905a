"""Derivatives of expression trees."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

from symbolic_response.expressions.tree import (
    ONE,
    ZERO,
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    add,
    divide,
    multiply,
    number,
    power,
)

LeafDerivative = Callable[[Expression], Expression]


def derivative(node: Expression, leaf: LeafDerivative) -> Expression:
    """Return the derivative of a tree, given the derivatives of its leaves.

    Sum, product, power and chain rule; ``leaf(x)`` is asked for every leaf but numbers.
    """
    match node:
        case Number():
            return ZERO
        case Sum(terms):
            return add([derivative(term, leaf) for term in terms])
        case Product(factors):
            return add(
                [
                    multiply([*factors[:place], change, *factors[place + 1 :]])
                    for place, factor in enumerate(factors)
                    if (change := derivative(factor, leaf)) != ZERO
                ]
            )
        case Power(base, exponent):
            change = derivative(base, leaf)
            return multiply([number(exponent), power(base, exponent - Fraction(1)), change])
        case Function("exp", argument):
            return multiply([node, derivative(argument, leaf)])
        case Function(_, argument):
            return divide(derivative(argument, leaf), argument)
    return leaf(node)


def by_symbol(node: Expression, name: str) -> Expression:
    """Return the derivative of a tree by a symbol.

    >>> from symbolic_response.expressions.reader import read_expression
    >>> by_symbol(read_expression("a*c**2"), "c")
    Product(factors=(Number(value=Fraction(2, 1)), Symbol(name='a'), Symbol(name='c')))
    """

    def leaf(part: Expression) -> Expression:
        return ONE if part == Symbol(name) else ZERO

    return derivative(node, leaf)
