"""An overall factor that is no monomial: the normalisation, a tree sum, a probability, a rate."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction

import flint

from symbolic_response.errors import SymbolicResponseError
from symbolic_response.expressions.ring import Poly, Polynomial, all_symbols
from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.expressions.tree import (
    Expression,
    Sum,
    add,
    divide,
    multiply,
    negate,
    number,
    power,
)
from symbolic_response.hand.diagnosis.case import Case
from symbolic_response.hand.diagnosis.finding import FACTOR, Finding, Ranked
from symbolic_response.hand.diagnosis.monomials import Column, Monomial, Probe, column_of
from symbolic_response.network.quantities import Probability
from symbolic_response.response.values import Point

MAX_TREES = 3_000
NUMBERS = tuple(Fraction(*pair) for pair in ((2, 1), (1, 2), (4, 1), (1, 4), (3, 1), (1, 3)))


@dataclass(frozen=True, slots=True)
class Candidate:
    """A factor as a quantity of the network, and its name; ``tree_sum`` scales with a term."""

    quantity: Expression
    name: str
    values: Column
    tree_sum: bool = False


def factor_findings(case: Case, probe: Probe) -> list[Ranked]:
    """Return factors by which the hand result is too large or too small."""
    by_hand, derived = (column_of(side, probe) for side in (case.hand, case.quantity))
    if not by_hand or not derived:
        return _by_numbers(case)
    if 0 in by_hand or 0 in derived:
        return []
    ratio = [a / b for a, b in zip(by_hand, derived, strict=True)]
    for candidate in _candidates(case, probe):
        for exponent in (1, -1, 2, -2):
            rest = [r / v**exponent for r, v in zip(ratio, candidate.values, strict=True)]
            monomial = probe.recognised(rest)
            if monomial is None or not (candidate.tree_sum or monomial.is_number()):
                continue
            found = _finding(case, candidate, exponent, monomial)
            if found is not None:
                return [found]
    return []


def _by_numbers(case: Case) -> list[Ranked]:
    """Return a number by which the hand result is too large, where values are irrational."""
    for factor in NUMBERS:
        if case.is_hand(multiply([number(factor), case.quantity])):
            text = (f"an overall factor: the hand form is {fraction_text(factor)} times the derived"
                    " one")
            return [Ranked(FACTOR, Finding("factor", text))]
    return []


def _finding(
    case: Case, candidate: Candidate, exponent: int, monomial: Monomial
) -> Ranked | None:
    form = case.form_of(candidate.quantity)
    if form is None or case.hand_form is None:
        return None
    corrected = divide(case.hand_form, multiply([monomial.expression(), power(form, exponent)]))
    if not case.is_derived(corrected):
        return None
    return Ranked(FACTOR, Finding("factor", _text(candidate, exponent, monomial)))


def _text(candidate: Candidate, exponent: int, monomial: Monomial) -> str:
    name = candidate.name
    scale = expression_text(monomial.expression())
    beside = "" if scale == "1" else f", beside a factor {scale}"
    if candidate.tree_sum and exponent in (1, 2):
        times = "" if exponent == 1 else " twice"
        return (f"{name} is left out{times} as a denominator: the hand form is the derived one"
                f" times {name}{beside}")
    if candidate.tree_sum:
        power_of = "once" if exponent == -1 else "twice"
        return f"the hand form is divided by {name} {power_of} too often{beside}"
    if exponent > 0:
        shown = name if exponent == 1 else f"the square of {name}"
        return f"the hand form is the derived one times {shown}{beside}"
    shown = name if exponent == -1 else f"the square of {name}"
    return f"the hand form lacks the factor {shown}{beside}"


def _candidates(case: Case, probe: Probe) -> Iterator[Candidate]:
    analysis, network = case.analysis, case.network
    if case.hand_form is None or not all_symbols(case.hand_form):
        return  # a number lacks every factor
    if case.trees <= MAX_TREES:
        sums = [_tree_sums(point, len(network.states)) for point in probe.points]
        total = [sum(column, flint.fmpq(0)) for column in sums]
        yield Candidate(_polynomial(case, analysis.normalisation), "the normalisation", total, True)
        for k, state in enumerate(network.states):
            if len(analysis.tree_sum(k)) > 1:  # a single tree is a product of rates like others
                yield Candidate(_polynomial(case, analysis.tree_sum(k)),
                                f"the sum over spanning trees towards {state.name}",
                                [column[k] for column in sums], True)
    for k, state in enumerate(network.states):
        one = Probability((k,))
        for quantity, name in ((one, f"p[{state.name}]"),
                               (add([number(1), negate(one)]), f"1 - p[{state.name}]")):
            values = column_of(quantity, probe)
            if values is not None and 0 not in values:
                yield Candidate(quantity, name, values)
    for t in network.transitions:
        for rate in (t.forward, t.backward):
            values = column_of(rate, probe) if isinstance(rate, Sum) else None
            if rate is not None and values is not None:
                yield Candidate(rate, f"the rate {expression_text(rate)}", values)


def _polynomial(case: Case, poly: Poly) -> Expression:
    try:
        return case.analysis.simplified(Polynomial(case.analysis.rates.ring, poly)).expression()
    except SymbolicResponseError:
        return number(0)


def _tree_sums(point: Point, size: int) -> list[flint.fmpq]:
    """Return the sums over spanning trees at a point: minors of the generator."""
    matrix = flint.fmpq_mat(size, size)
    for e, t in enumerate(point.network.transitions):
        for backward, tail, head in ((False, t.first, t.second), (True, t.second, t.first)):
            rate = Fraction(0) if backward and t.backward is None else point.rate(e, backward)
            value = flint.fmpq(rate.numerator, rate.denominator)
            matrix[tail, tail] += value
            matrix[head, tail] -= value
    return [_minor(matrix, root, size) for root in range(size)]


def _minor(matrix: flint.fmpq_mat, root: int, size: int) -> flint.fmpq:
    kept = [k for k in range(size) if k != root]
    return flint.fmpq_mat(size - 1, size - 1, [matrix[i, j] for i in kept for j in kept]).det()
