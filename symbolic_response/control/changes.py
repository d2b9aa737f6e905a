"""How the logarithms of the rates change with a control parameter, numbers apart from the rest."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.expressions.derivative import by_symbol
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.ring import Domain
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    Number,
    add,
    divide,
    multiply,
    negate,
    number,
    symbols_of,
)
from symbolic_response.network.quantities import Perturbation
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_trees import rate_changes

Vector = tuple[Fraction, ...]
"""One number for each directed rate, by place in the ring of rates."""


@dataclass(frozen=True, slots=True)
class Change:
    """d ln W/d x = ``numbers`` + sum over ``parts`` of s * u, s an expression, u numbers.

    ``by``: x, a symbol or its logarithm (or another perturbation).
    """

    by: Perturbation
    numbers: Vector
    parts: tuple[tuple[Expression, Vector], ...]

    def expression(self, place: int) -> Expression:
        """Return the change of ln of one rate."""
        return add([number(self.numbers[place]),
                    *(multiply([number(u[place]), s]) for s, u in self.parts)])


def change_of(analysis: Analysis, by: Perturbation) -> Change:
    """Return the changes of ln of the directed rates with a parameter.

    A change that is a number plus a multiple of one found before (k1/(k1 + k2*c) beside
    k2*c/(k1 + k2*c)) is written with that one. Every change is checked symbolically.
    """
    found = rate_changes(by, analysis)
    numbers: dict[int, Fraction] = {}
    parts: list[tuple[Expression, dict[int, Fraction]]] = []
    for place, change in found.items():
        if isinstance(change, Number):
            numbers[place] = change.value
            continue
        for expression, vector in parts:
            pair = _in_terms_of(change, expression, analysis.domain)
            if pair is not None:
                numbers[place], vector[place] = pair
                break
        else:
            parts.append((change, {place: Fraction(1)}))
    result = Change(by, _vector(numbers, analysis),
                    tuple((s, _vector(u, analysis)) for s, u in parts))
    for place in range(len(result.numbers)):
        difference = add([result.expression(place), negate(found.get(place, ZERO))])
        if not normal_form(difference, analysis.domain).is_zero():
            raise AssertionError("the parts of a change do not add up to it")
    return result


def _vector(entries: dict[int, Fraction], analysis: Analysis) -> Vector:
    return tuple(entries.get(r, Fraction(0)) for r in range(len(analysis.rates.directions())))


def _in_terms_of(
    change: Expression, known: Expression, domain: Domain
) -> tuple[Fraction, Fraction] | None:
    """Return (a, b) with change = a + b * known, None if there are no such numbers.

    b is the ratio of the derivatives by a symbol of ``known``, or of both themselves.
    """
    symbols = [name for name in domain.names if name in symbols_of(known)]
    sides = ((by_symbol(change, symbols[0]), by_symbol(known, symbols[0])) if symbols
             else (change, known))
    factor = normal_form(divide(*sides), domain).as_fraction()
    if factor is None:
        return None
    rest = add([change, multiply([number(-factor), known])])
    constant = normal_form(rest, domain).as_fraction()
    return None if constant is None else (constant, factor)
