"""Solving a relation between symbols for one of them, exactly, so that it can be imposed."""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction

from symbolic_response.errors import EvaluationError, SizeLimitError, UndecidedError
from symbolic_response.expressions.normal_form import Quotient, normal_form
from symbolic_response.expressions.ring import (
    Domain,
    Generator,
    Poly,
    Ring,
    all_symbols,
    expression_of,
    factors_of,
)
from symbolic_response.expressions.signs import certain_sign
from symbolic_response.expressions.tree import (
    Expression,
    Symbol,
    divide,
    function,
    multiply,
    negate,
    number,
    power,
    substitute,
)
from symbolic_response.response.analysis import Analysis

Solved = Mapping[str, Expression]
"""Symbols replaced, all at once, by expressions in the other symbols."""



class ContradictionError(Exception):
    """A relation that no admissible values of the symbols satisfy."""


class UnsolvableError(Exception):
    """A relation that was not solved for a symbol; the message says why."""


def impose(relation: Expression, solved: Solved, analysis: Analysis) -> Solved | None:
    """Return ``solved`` with ``relation = 0`` solved for one more symbol; None if it is implied.

    Raises ContradictionError where no positive rates satisfy it, UnsolvableError where no symbol
    can be taken out of it.
    """
    domain = analysis.domain
    try:
        form = normal_form(substitute(relation, dict(solved)), domain)
        if form.is_zero():
            return None
        name, value = _solution(_piece(form, domain), form.ring, domain)
        found = {
            other: normal_form(substitute(old, {name: value}), domain).expression()
            for other, old in solved.items()
        }
        found[name] = value
        _check_signs(found, analysis)
    except (EvaluationError, SizeLimitError, UndecidedError) as error:
        raise UnsolvableError(str(error)) from None
    return found


def _check_signs(solved: Solved, analysis: Analysis) -> None:
    """Raise ContradictionError where a positive symbol or a rate certainly is not positive."""
    positive = analysis.domain.positive
    changed = [value for name, value in solved.items() if name in positive]
    for transition in analysis.network.transitions:
        for rate in (transition.forward, transition.backward):
            if rate is not None and all_symbols(rate) & solved.keys():
                changed.append(substitute(rate, dict(solved)))
    for expression in changed:
        sign = certain_sign(expression, positive)
        if sign is not None and sign <= 0:
            raise ContradictionError


def _piece(form: Quotient, domain: Domain) -> Poly:
    """Return the one factor of a numerator that can vanish."""
    _, factors = factors_of(form.numerator)
    open_ones = [
        poly for poly, _ in factors
        if certain_sign(expression_of(form.ring, poly), domain.positive) not in (1, -1)
    ]
    if not open_ones:
        raise ContradictionError
    if len(open_ones) > 1:
        raise UnsolvableError("it is a product of several factors that can vanish; state one")
    return open_ones[0]


def _solution(poly: Poly, ring: Ring, domain: Domain) -> tuple[str, Expression]:
    """Return a symbol and its value from ``poly = 0``, one that is plainly positive if there is."""
    open_places = [
        place for place, generator in enumerate(ring.generators)
        if isinstance(generator.base, Symbol)
        and _two_terms(poly, place) is not None
        and not _occurs_elsewhere(generator.base.name, poly, ring, place)
    ]
    # a symbol that occurs linearly before one in a power or an exponent, later ones first
    open_places.sort(key=lambda p: (ring.generators[p].kind != "symbol"
                                    or _top_degree(poly, p) != ring.roots[p], -p))
    uncertain = None
    for place in open_places:
        name, value = _solved_for(place, poly, ring, domain)
        if value is None:
            continue
        if name not in domain.positive or certain_sign(value, domain.positive) == 1:
            return name, value
        uncertain = uncertain or (name, value)
    if uncertain is None:
        raise UnsolvableError("no symbol occurs in it in one power alone")
    return uncertain


def _solved_for(
    place: int, poly: Poly, ring: Ring, domain: Domain
) -> tuple[str, Expression | None]:
    generator, split = ring.generators[place], _two_terms(poly, place)
    assert split is not None and isinstance(generator.base, Symbol)
    above, below = (expression_of(ring, part) for part in split)
    exponent = Fraction(_top_degree(poly, place), ring.roots[place])
    value = _value(generator, divide(negate(below), above), exponent, domain)
    return generator.base.name, value


def _two_terms(poly: Poly, place: int) -> tuple[Poly, Poly] | None:
    """Return A and B where ``poly`` is A x**n + B, x the variable at a place and n > 0."""
    degree = _top_degree(poly, place)
    parts: dict[int, dict[tuple[int, ...], int]] = {}
    for exponents, coefficient in poly.terms():
        key = tuple(int(e) for e in exponents)
        without = (*key[:place], 0, *key[place + 1 :])
        parts.setdefault(key[place], {})[without] = int(coefficient)
    if not degree or not {degree} <= parts.keys() <= {0, degree}:
        return None
    context = poly.context()
    return context.from_dict(parts[degree]), context.from_dict(parts.get(0, {}))


def _top_degree(poly: Poly, place: int) -> int:
    return int(poly.degrees()[place])


def _occurs_elsewhere(name: str, poly: Poly, ring: Ring, place: int) -> bool:
    degrees = poly.degrees()
    return any(
        degrees[other] and name in all_symbols(generator.base)
        for other, generator in enumerate(ring.generators) if other != place
    )


def _value(
    generator: Generator, ratio: Expression, exponent: Fraction, domain: Domain
) -> Expression | None:
    """Return the symbol whose generator to the power ``exponent`` is ``ratio``."""
    positive = isinstance(generator.base, Symbol) and generator.base.name in domain.positive
    match generator.kind:
        case "symbol" if positive or exponent == 1:
            value = power(ratio, 1 / exponent)
        case "exp":
            value = multiply([number(1 / exponent), function("ln", ratio)])
        case "ln" if exponent == 1:
            value = function("exp", ratio)
        case _:
            return None
    return normal_form(value, domain).expression()
