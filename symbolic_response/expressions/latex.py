"""Printing expressions as LaTeX.

Spacing is chosen so that the text reads back without guessing: a space between a control word and
a letter, ``\\cdot`` before a number and before a parenthesis that follows a function, or that
follows a symbol and holds no sum, parentheses around whatever carries a superscript of its own
before another one, plain parentheses throughout.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction

import flint

from symbolic_response.expressions.layout import (
    FractionLayout,
    fraction_layout,
    printed_terms,
    shown_terms,
    without_sign,
)
from symbolic_response.expressions.ring import Polynomial
from symbolic_response.expressions.tree import Expression, Function, Number, Sum, Symbol

_CALLS = (r"\ln", r"\exp")


@dataclass(frozen=True, slots=True)
class SignedTerm:
    """One term of a sum as it is set: its sign and the LaTeX behind the sign."""

    negative: bool
    body: str


def expression_latex(node: Expression, names: Mapping[str, str]) -> str:
    """Return ``node`` as LaTeX; ``names`` gives the LaTeX of each symbol.

    >>> from symbolic_response.expressions.reader import read_expression
    >>> node = read_expression("k*c/(2*(k*c + 1)) - exp(-F/2)")
    >>> print(expression_latex(node, {"k": "k", "c": "c", "F": "F"}))
    \\frac{k c}{2 (k c + 1)} - e^{-F/2}
    """
    return join_terms(latex_terms(node, names))


def latex_terms(node: Expression, names: Mapping[str, str]) -> list[SignedTerm]:
    """Return the terms of a sum, or the one term of anything else."""
    if isinstance(node, Polynomial):
        return _polynomial_terms(node, names)
    parts = shown_terms(node) if isinstance(node, Sum) else (node,)
    terms = []
    for part in parts:
        negative, rest = without_sign(part)
        terms.append(SignedTerm(negative, _product(rest, names)))
    return terms


def join_terms(terms: Sequence[SignedTerm]) -> str:
    """Return terms on one line."""
    parts = []
    for place, term in enumerate(terms):
        if place:
            parts.append(" - " if term.negative else " + ")
        elif term.negative:
            parts.append("-")
        parts.append(term.body)
    return "".join(parts) or "0"


def fraction_latex(value: Fraction) -> str:
    """Return an exact fraction."""
    top, bottom = flint.fmpz(abs(value.numerator)), flint.fmpz(value.denominator)
    sign = "-" if value < 0 else ""
    return f"{sign}{top}" if value.denominator == 1 else rf"{sign}\frac{{{top}}}{{{bottom}}}"


def join_factors(factors: Sequence[str]) -> str:
    r"""Return a product of printed factors, with ``\cdot`` where juxtaposition could mislead.

    A symbol before a sum in parentheses is read as a product, before a single thing in parentheses
    it could be a function.

    >>> print(join_factors(["k", "(a + b)"]), "or", join_factors(["k", "(a b)^{1/2}"]))
    k (a + b) or k \cdot (a b)^{1/2}
    """
    text, previous = "", ""
    for factor in factors:
        dotted = factor[0].isdigit() or (
            factor[0] == "(" and not previous.startswith("(") and not previous.isdigit()
            and (previous.startswith(_CALLS) or not _holds_a_sum(factor))
        )
        if text:
            text += r" \cdot " if dotted else " "
        text, previous = text + factor, factor
    return text


def _holds_a_sum(factor: str) -> bool:
    """Return whether the parentheses that a factor begins with hold a sum."""
    depth = 0
    for place, character in enumerate(factor):
        depth += {"(": 1, "{": 1, ")": -1, "}": -1}.get(character, 0)
        if depth == 0:
            return False
        if depth == 1 and character in "+-" and factor[place - 1] == " " == factor[place + 1]:
            return True
    return False


def _polynomial_terms(leaf: Polynomial, names: Mapping[str, str]) -> list[SignedTerm]:
    terms = []
    for coefficient, factors in printed_terms(leaf, lambda b, e: _factor(b, e, names)):
        size = abs(coefficient)
        pieces = [str(flint.fmpz(size))] if size != 1 or not factors else []
        terms.append(SignedTerm(coefficient < 0, join_factors(pieces + factors)))
    return terms


def _product(node: Expression, names: Mapping[str, str]) -> str:
    if isinstance(node, Sum) or (isinstance(node, Polynomial) and len(node.poly) > 1):
        return f"({expression_latex(node, names)})"
    if isinstance(node, Polynomial):
        return expression_latex(node, names)
    layout = fraction_layout(node)
    above, below = list(layout.above), list(layout.below)
    if not below and layout.bottom == 1:
        return _side(layout.top, above, names)
    lone = not above and layout.top == 1
    top = "1" if lone else _side(layout.top, above, names)
    return rf"\frac{{{top}}}{{{_side(layout.bottom, below, names)}}}"


def _side(
    coefficient: int, factors: list[tuple[Expression, Fraction]], names: Mapping[str, str]
) -> str:
    """Print one side of a fraction; a lone sum needs no parentheses there."""
    if coefficient == 1 and len(factors) == 1 and factors[0][1] == 1:
        base = factors[0][0]
        if isinstance(base, (Sum, Polynomial)):
            return expression_latex(base, names)
    printed = [_factor(base, exponent, names) for base, exponent in factors]
    if coefficient != 1 or not printed:
        printed.insert(0, str(flint.fmpz(coefficient)))
    return join_factors(printed)


def _factor(base: Expression, exponent: Fraction, names: Mapping[str, str]) -> str:
    if exponent == Fraction(1, 2):
        return rf"\sqrt{{{expression_latex(base, names)}}}"
    body = _atom(base, names)
    if exponent == 1:
        return body
    if isinstance(base, Function) or (isinstance(base, Symbol) and "^" in body):
        body = f"({body})"
    top, bottom = exponent.numerator, exponent.denominator
    shown = f"{flint.fmpz(top)}" if bottom == 1 else f"{flint.fmpz(top)}/{bottom}"
    return f"{body}^{{{shown}}}" if len(shown) > 1 else f"{body}^{shown}"


def _atom(base: Expression, names: Mapping[str, str]) -> str:
    match base:
        case Symbol(name):
            return names[name]
        case Function("exp", argument):
            if any(latex in ("e", r"\mathrm{e}") for latex in names.values()):
                return rf"\exp({expression_latex(argument, names)})"  # e^2 is a power of a symbol
            return f"e^{{{exponent_latex(argument, names)}}}"
        case Function(_, argument):
            inner = expression_latex(argument, names)
            if inner.startswith(r"\frac") and len(latex_terms(argument, names)) == 1:
                return rf"\ln\left({inner}\right)"
            return rf"\ln({inner})"
        case Number(value) if value >= 0 and value.denominator == 1:
            return fraction_latex(value)
    inner = expression_latex(base, names)
    # a sum with a name of its own prints with its parentheses
    return inner if isinstance(base, Polynomial) and _is_wrapped(inner) else f"({inner})"


def _is_wrapped(text: str) -> bool:
    """Return whether a text is one pair of parentheses with something inside."""
    depth = 0
    for place, character in enumerate(text):
        depth += {"(": 1, ")": -1}.get(character, 0)
        if depth == 0:
            return place == len(text) - 1 and place > 0
    return False


def _before_slash(layout: FractionLayout, names: Mapping[str, str]) -> str:
    if layout.top == 1 and len(layout.above) == 1:
        return _factor(*layout.above[0], names)
    return _side(layout.top, list(layout.above), names)


def exponent_latex(argument: Expression, names: Mapping[str, str]) -> str:
    """Return the argument of an exponential, with slashes instead of small fractions."""
    if isinstance(argument, Polynomial):
        return expression_latex(argument, names)
    parts = shown_terms(argument) if isinstance(argument, Sum) else (argument,)
    terms = []
    for part in parts:
        negative, rest = without_sign(part)
        layout = fraction_layout(rest)
        if layout.below or isinstance(rest, (Sum, Polynomial)) or layout.bottom == 1:
            terms.append(SignedTerm(negative, _product(rest, names)))
            continue
        top = _before_slash(layout, names)
        terms.append(SignedTerm(negative, f"{top}/{layout.bottom}"))
    return join_terms(terms)
