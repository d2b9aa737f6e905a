"""Right only in a limit: detailed balance, a symbol set to 0 or 1, first order in a symbol."""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction
from itertools import islice

import flint

from symbolic_response.expressions.derivative import by_symbol
from symbolic_response.expressions.enclosure import nonzero_somewhere
from symbolic_response.expressions.ring import plain
from symbolic_response.expressions.tree import (
    ONE,
    ZERO,
    Expression,
    Symbol,
    add,
    multiply,
    negate,
    number,
    substitute,
    symbols_of,
    walk,
)
from symbolic_response.hand.diagnosis.case import NO_ANSWER, Case
from symbolic_response.hand.diagnosis.finding import LIMIT, VANISHING, Finding, Ranked
from symbolic_response.hand.judging.conditions import forces_of
from symbolic_response.hand.judging.witness import axes_of, mixed_points
from symbolic_response.response.direct import direct_value

MAX_PARTS = 4_000
MAX_TREES = 1_000
MAX_FOUND = 2


def limit_findings(case: Case) -> list[Ranked]:
    """Return limits in which the hand result is right."""
    if case.derived_form is None or case.plain_hand is None or case.trees > MAX_TREES:
        return []
    derived = plain(case.derived_form)
    if sum(1 for _ in islice(walk(derived), MAX_PARTS + 1)) > MAX_PARTS:
        return []
    found = [*_at_values(case, derived), *_first_orders(case, derived)][:MAX_FOUND]
    return [Ranked(LIMIT, Finding("limit", text)) for text in found] or _at_balance(case, derived)


def _at_values(case: Case, derived: Expression) -> Iterator[str]:
    """Yield symbols that the hand result does without: right where they are 0 or 1."""
    assert case.plain_hand is not None
    absent = symbols_of(derived) - symbols_of(case.plain_hand)
    for entry in case.network.symbols:
        if entry.name not in absent:
            continue
        for value in (ONE, ZERO):
            if _is(case.plain_hand, derived, {entry.name: value}, case):
                limit = "in the limit " if entry.positive and value == ZERO else ""
                yield (f"right only {limit}where {entry.name} = {value.value}: the hand form does"
                       f" not depend on {entry.name}")


def _is(hand: Expression, derived: Expression, at: dict[str, Expression], case: Case) -> bool:
    try:
        return _same(hand, substitute(derived, at), case)
    except NO_ANSWER:
        return False


def _same(left: Expression, right: Expression, case: Case) -> bool:
    return not nonzero_somewhere(add([left, negate(right)])) and case.proved(left, right)


# -- expansions ------------------------------------------------------------------------------------


def _first_orders(case: Case, derived: Expression) -> Iterator[str]:
    """Yield symbols in which the hand result is the first-order expansion about 0."""
    assert case.plain_hand is not None
    for entry in case.network.symbols:
        name = entry.name
        if name not in symbols_of(case.plain_hand) or not _is_linear(case, name):
            continue
        at: dict[str, Expression] = {name: ZERO}
        try:
            zeroth = substitute(derived, at)
            first = substitute(by_symbol(derived, name), at)
        except NO_ANSWER:
            continue
        expanded = add([zeroth, multiply([Symbol(name), first])])
        if _same(case.plain_hand, expanded, case):
            yield (f"right only to first order in {name}: the hand form is the expansion of the"
                   f" derived one about {name} = 0")


def _is_linear(case: Case, name: str) -> bool:
    """Return False where the values of the hand result at three values of a symbol show that it
    is not linear in it."""
    hand = case.plain_hand
    assert hand is not None
    axes = axes_of(case.network, (hand,))
    base = next(iter(mixed_points(axes, 1)))
    values = [direct_value(hand, {**base, name: number(Fraction(q))}) for q in (1, 2, 3)]
    if values[0] is None or values[1] is None or values[2] is None:
        return False
    return bool(values[0] + values[2] == flint.fmpq(2) * values[1])


# -- detailed balance ------------------------------------------------------------------------------


def _at_balance(case: Case, derived: Expression) -> list[Ranked]:
    assert case.plain_hand is not None
    if any(case.analysis.graph.one_way):
        return []
    try:
        solved = forces_of(case.analysis).all_zero
        if not solved:
            return []
        left, right = (substitute(side, dict(solved)) for side in (case.plain_hand, derived))
    except NO_ANSWER:
        return []
    if not _same(left, right, case):
        return []
    if _same(right, ZERO, case):
        text = "both vanish at detailed balance; away from it they differ"
        return [Ranked(VANISHING, Finding("limit", text))]
    text = "right only at detailed balance, where all cycle forces vanish"
    return [Ranked(LIMIT, Finding("limit", text))]
