"""What the two printers share: products as fractions, sums as signed terms."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.expressions.ring import Generator, Polynomial
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    add,
    multiply,
    number,
)


@dataclass(frozen=True, slots=True)
class FractionLayout:
    """``sign * top * Π above / (bottom * Π below)``, all exponents positive."""

    negative: bool
    top: int
    bottom: int
    above: tuple[tuple[Expression, Fraction], ...]
    below: tuple[tuple[Expression, Fraction], ...]


def fraction_layout(node: Expression) -> FractionLayout:
    """Return any node other than a sum as a fraction; exponentials stay above."""
    factors = node.factors if isinstance(node, Product) else (node,)
    coefficient = Fraction(1)
    above: list[tuple[Expression, Fraction]] = []
    below: list[tuple[Expression, Fraction]] = []
    for factor in factors:
        if isinstance(factor, Number):
            coefficient *= factor.value
        elif isinstance(factor, Power):
            (above if factor.exponent > 0 else below).append((factor.base, abs(factor.exponent)))
        else:
            above.append((factor, Fraction(1)))
    return FractionLayout(
        coefficient < 0,
        abs(coefficient.numerator),
        coefficient.denominator,
        tuple(above),
        tuple(below),
    )


def without_sign(node: Expression) -> tuple[bool, Expression]:
    """Return whether a term shows a minus sign in front, and the term without it."""
    if isinstance(node, Number) and node.value < 0:
        return True, Number(-node.value)
    if isinstance(node, Product) and isinstance(node.factors[0], Number):
        lead = node.factors[0].value
        if lead < 0:
            return True, multiply([number(-lead), *node.factors[1:]])
    if isinstance(node, Polynomial) and len(node.poly) == 1 and node.poly.coeffs()[0] < 0:
        return True, Polynomial(node.ring, -node.poly)
    return False, node


def shown_terms(node: Sum) -> tuple[Expression, ...]:
    """Return the terms of a sum in the order they are shown: ``1 - a`` rather than ``-a + 1``."""
    first, last = node.terms[0], node.terms[-1]
    if without_sign(first)[0] and isinstance(last, Number) and last.value > 0:
        return (last, *node.terms[:-1])
    return node.terms


def printed_terms(
    leaf: Polynomial, factor: Callable[[Expression, Fraction], str]
) -> list[tuple[int, list[str]]]:
    """Return the terms of a polynomial leaf as coefficient and printed factors.

    ``factor(base, exponent)`` prints one factor; each is asked for once, so that polynomials of
    many terms print in time proportional to their size. Exponentials of a term are gathered.
    """
    printed: dict[tuple[int, int], str] = {}
    ring = leaf.ring
    exponential = [generator.kind == "exp" for generator in ring.generators]
    terms = []
    for exponents, coefficient in leaf.poly.terms():
        texts, argument = [], []
        for place, raw in enumerate(exponents):
            if not raw:
                continue
            exponent = int(raw)
            if exponential[place]:
                power_ = number(Fraction(exponent, ring.roots[place]))
                argument.append(multiply([power_, ring.generators[place].base]))
                continue
            key = (place, exponent)
            if key not in printed:
                printed[key] = factor(
                    *_printed_power(ring.generators[place], Fraction(exponent, ring.roots[place]))
                )
            texts.append(printed[key])
        if argument:
            texts.append(factor(Function("exp", add(argument)), Fraction(1)))
        terms.append((int(coefficient), texts))
    return terms


def _printed_power(generator: Generator, exponent: Fraction) -> tuple[Expression, Fraction]:
    if generator.kind == "ln":
        return Function("ln", generator.base), exponent
    if isinstance(generator.base, Power) and exponent.denominator == 1:  # sqrt(x**2) is not x
        return generator.base.base, generator.base.exponent * exponent
    return generator.base, exponent
