"""How the logarithms of the rates change with a control parameter, numbers apart from the rest."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.errors import EvaluationError
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.ring import Domain
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    Number,
    add,
    multiply,
    negate,
    number,
    power,
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

    A change that is a number plus or minus a multiple of one found before (k1/(k1 + k2*c) beside
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
    """Return (a, b) with change = a + b * known for b = 1, -1 or a = 0, None if there are none."""
    for factor in (Fraction(1), Fraction(-1)):
        rest = add([change, multiply([number(-factor), known])])
        constant = normal_form(rest, domain).as_fraction()
        if constant is not None:
            return constant, factor
    try:
        ratio = normal_form(multiply([change, power(known, -1)]), domain).as_fraction()
    except EvaluationError:
        return None
    return None if ratio is None else (Fraction(0), ratio)
