"""Printing expressions in the syntax of the network file, so that they read back."""

from __future__ import annotations

from fractions import Fraction

import flint

from symbolic_response.expressions.layout import (
    fraction_layout,
    printed_terms,
    shown_terms,
    without_sign,
)
from symbolic_response.expressions.reader import MAX_EXPONENT
from symbolic_response.expressions.ring import Polynomial
from symbolic_response.expressions.tree import Expression, Function, Number, Sum, Symbol


def expression_text(node: Expression) -> str:
    """Return ``node`` in the syntax that :func:`read_expression` reads.

    >>> from symbolic_response.expressions.reader import read_expression
    >>> expression_text(read_expression("k1*c/(k2+k1*c)**2 - 1/2"))
    'k1*c/(k2 + k1*c)**2 - 1/2'
    """
    if isinstance(node, Sum):
        return _join([(neg, _product(term)) for neg, term in map(without_sign, shown_terms(node))])
    if isinstance(node, Polynomial):
        return _polynomial(node)
    negative, rest = without_sign(node)
    return ("-" if negative else "") + _product(rest)


def fraction_text(value: Fraction) -> str:
    """Return an exact fraction as ``12/35``, of any length."""
    top, bottom = flint.fmpz(value.numerator), flint.fmpz(value.denominator)
    return str(top) if value.denominator == 1 else f"{top}/{bottom}"


def _join(terms: list[tuple[bool, str]]) -> str:
    parts = []
    for place, (negative, text) in enumerate(terms):
        if place:
            parts.append(" - " if negative else " + ")
        elif negative:
            parts.append("-")
        parts.append(text)
    return "".join(parts)


def _polynomial(leaf: Polynomial) -> str:
    terms = []
    for coefficient, factors in printed_terms(leaf, _factor):
        size = abs(coefficient)
        pieces = [str(flint.fmpz(size))] if size != 1 or not factors else []
        terms.append((coefficient < 0, "*".join(pieces + factors)))
    return _join(terms) if terms else "0"


def _product(node: Expression) -> str:
    if isinstance(node, Sum) or (isinstance(node, Polynomial) and len(node.poly) > 1):
        return f"({expression_text(node)})"
    if isinstance(node, Polynomial):
        return expression_text(node)
    layout = fraction_layout(node)
    above = [_factor(base, exponent) for base, exponent in layout.above]
    below = [_factor(base, exponent) for base, exponent in layout.below]
    if layout.top != 1 or not above:
        above.insert(0, str(flint.fmpz(layout.top)))
    if layout.bottom != 1:
        below.insert(0, str(flint.fmpz(layout.bottom)))
    text = "*".join(above)
    if not below:
        return text
    bottom = below[0] if len(below) == 1 else f"({'*'.join(below)})"
    return f"{text}/{bottom}"


def _factor(base: Expression, exponent: Fraction) -> str:
    if exponent == Fraction(1, 2):
        return f"sqrt({expression_text(base)})"
    body = _atom(base)
    if exponent == 1:
        return body
    if exponent.denominator > MAX_EXPONENT:  # the reader knows no such root
        return f"exp({fraction_text(exponent)}*ln({expression_text(base)}))"
    if exponent > MAX_EXPONENT:
        return f"({_large_power(body, exponent)})"
    shown = fraction_text(exponent)
    return f"{body}**{shown}" if exponent.denominator == 1 else f"{body}**({shown})"


def _large_power(body: str, exponent: Fraction) -> str:
    """Write a power in steps of exponents that the reader takes."""
    high, low = divmod(exponent, MAX_EXPONENT)
    inner = body if high == 1 else f"{body}**{high}"
    if high > MAX_EXPONENT:
        inner = _large_power(body, Fraction(high))
    text = f"{body}**{MAX_EXPONENT}" if high == 1 else f"({inner})**{MAX_EXPONENT}"
    if low in (0, 1):
        return f"{text}*{body}" if low else text
    rest = fraction_text(low)
    return f"{text}*{body}**" + (rest if low.denominator == 1 else f"({rest})")


def _atom(base: Expression) -> str:
    match base:
        case Symbol(name):
            return name
        case Function(name, argument):
            return f"{name}({expression_text(argument)})"
        case Number(value) if value >= 0 and value.denominator == 1:
            return fraction_text(value)
    return f"({expression_text(base)})"
