"""Values of expressions at a point by plain rational arithmetic, without a normal form.

The quick way for what occurs in rates: powers, and exponentials of sums of logarithms.
"""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction
from math import lcm

import flint

from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
)
from symbolic_response.response.jets import Scalar, rational_root

Logarithms = list[tuple[flint.fmpq, flint.fmpq]]


def direct_value(node: Expression, values: Mapping[str, Expression]) -> Scalar:
    """Return the rational value of an expression of symbols, None where this way finds none.

    None decides nothing: the value may be irrational, not exist, or need a normal form.

    >>> from symbolic_response.expressions.reader import read_expression
    >>> at = {"F": read_expression("2*ln(3/2)")}
    >>> print(direct_value(read_expression("5*exp(F/2)"), at))
    15/2
    >>> print(direct_value(read_expression("exp(F/2)"), {"F": read_expression("ln(9/4)")}))
    3/2
    >>> print(direct_value(read_expression("exp(F/2)"), {"F": read_expression("ln(2)")}))
    None
    """
    match node:
        case Number(value):
            return flint.fmpq(value.numerator, value.denominator)
        case Symbol(name):
            return direct_value(values[name], {}) if name in values else None
        case Sum(terms):
            parts = [direct_value(term, values) for term in terms]
            known = [part for part in parts if part is not None]
            return sum(known, flint.fmpq(0)) if len(known) == len(parts) else None
        case Product(factors):
            result = flint.fmpq(1)
            for factor in factors:
                part = direct_value(factor, values)
                if part is None:
                    return None
                result *= part
            return result
        case Power(base, exponent):
            inner = direct_value(base, values)
            if inner is None or inner == 0 or (inner < 0 and exponent.denominator > 1):
                return None
            return rational_root(inner, exponent)
        case Function("exp", argument):
            found = _logarithms(argument, flint.fmpq(1), values)
            return None if found is None else _exponential(found)
    return None


def _logarithms(
    node: Expression, factor: flint.fmpq, values: Mapping[str, Expression]
) -> Logarithms | None:
    """Return ``factor`` times an expression as a sum of rationals times logarithms."""
    match node:
        case Number(value):
            return [] if value == 0 else None
        case Symbol(name):
            return _logarithms(values[name], factor, {}) if name in values else None
        case Sum(terms):
            result: Logarithms = []
            for term in terms:
                part = _logarithms(term, factor, values)
                if part is None:
                    return None
                result += part
            return result
        case Product((Number(value), rest)):
            scaled = factor * flint.fmpq(value.numerator, value.denominator)
            return _logarithms(rest, scaled, values)
        case Function("ln", argument):
            inner = direct_value(argument, values)
            return None if inner is None or inner <= 0 else [(inner, factor)]
    return None


def _exponential(terms: Logarithms) -> Scalar:
    scale = lcm(*(int(factor.q) for _, factor in terms))
    result = flint.fmpq(1)
    for base, factor in terms:
        result *= base ** int((factor * scale).p)
    return rational_root(result, Fraction(1, scale))
