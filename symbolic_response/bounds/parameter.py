"""Responses to a control parameter that enters several rates, or to several barriers."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.bounds.claim import Claim, CycleMaximum, Question, Term
from symbolic_response.bounds.sides import quantity_text
from symbolic_response.bounds.target import absolute, depends_on, extreme, size_of, spread_factor
from symbolic_response.expressions.signs import certain_sign
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    Number,
    add,
    multiply,
    negate,
    number,
)
from symbolic_response.network.quantities import BarriersOf, BySymbol
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_trees import RateChanges, rate_changes, uniform_states

SOURCE = (
    "Owen, Gingrich & Horowitz, Phys. Rev. X 10, 011066 (2020), summed over energies and"
    " transitions"
)


@dataclass(frozen=True, slots=True)
class Decomposition:
    """d/d theta as energies, barriers and single rates.

    ``energies[j]``: the common change of the logarithms of all rates out of state j, 0 if they do
    not change alike. ``barriers``: per transition the size of what both its rates share.
    ``singles``: per transition what is left for one rate, or for the two in opposite directions.
    """

    energies: tuple[Expression, ...]
    barriers: dict[int, Expression]
    singles: dict[int, Expression]


def decompose(changes: RateChanges, analysis: Analysis) -> Decomposition:
    """Return the decomposition of the changes of the logarithms of the rates.

    With the energies of all states whose rates change alike, or with barriers and single rates
    alone where that limits the response no less, however large the forces.
    """
    left = dict(changes)
    energies: list[Expression] = [ZERO] * analysis.graph.size
    for state, change, leaving in uniform_states(changes, analysis):
        energies[state] = change
        for place in leaving:
            del left[place]
    first = _with_energies(energies, left, analysis)
    other = _with_energies([ZERO] * analysis.graph.size, changes, analysis)
    size, other_size = _largest(first), _largest(other)
    if not other.barriers or size is None or other_size is None:
        return first
    return other if other_size <= size else first


def _largest(parts: Decomposition) -> Fraction | None:
    """Return H where every tanh is one, None if a piece is not a number."""
    fixed = [extreme("max", parts.energies), negate(extreme("min", parts.energies))]
    total = add([*fixed, *parts.barriers.values(), *parts.singles.values()])
    return total.value if isinstance(total, Number) else None


def _with_energies(
    energies: list[Expression], left: RateChanges, analysis: Analysis
) -> Decomposition:
    """Return the decomposition, given the energies and the changes that are left."""
    barriers: dict[int, Expression] = {}
    singles: dict[int, Expression] = {}
    for e, forward in enumerate(analysis.rates.forward):
        back = analysis.rates.backward[e]
        ahead = left.get(forward, ZERO)
        behind = ZERO if back is None else left.get(back, ZERO)
        shared, rest = _shared(ahead, behind, analysis.domain.positive)
        if shared != ZERO:
            barriers[e] = shared
        if rest != ZERO:
            singles[e] = rest
    return Decomposition(tuple(energies), barriers, singles)


def _shared(
    ahead: Expression, behind: Expression, positive: frozenset[str]
) -> tuple[Expression, Expression]:
    """Return the sizes of the barrier part and of the rest of two changes."""
    difference = size_of(add([ahead, negate(behind)]), positive)
    if ahead == behind:
        return size_of(ahead, positive), ZERO
    if ZERO in (ahead, behind):
        return ZERO, difference
    signs = certain_sign(ahead, positive), certain_sign(behind, positive)
    if None not in signs and signs[0] == signs[1]:
        return extreme("min", (size_of(ahead, positive), size_of(behind, positive))), difference
    if None not in signs:
        return ZERO, difference
    half = multiply([number(Fraction(1, 2)), add([ahead, behind])])
    return absolute(half), difference


def parameter(question: Question) -> Claim | None:
    """|d<Q>/dx| <= H <Q>(1 - <Q>) for 0 <= Q <= 1 that does not depend on x.

    H = (max a - min a) + sum |b_e| tanh(F_max(e)/4) + sum |single rates|: the changes of ln of the
    rates written as energies a, barriers b and single rates, of which each counts at most 1.
    """
    perturbation, analysis = question.response.perturbation, question.analysis
    if not isinstance(perturbation, BySymbol | BarriersOf):
        return None
    if isinstance(perturbation, BySymbol) and depends_on(question.target, perturbation.name):
        return None
    parts = decompose(rate_changes(perturbation, analysis), analysis)
    factor = spread_factor(question.target)
    positive = analysis.domain.positive
    ends = [extreme(name, _not_beaten(name, parts.energies, positive)) for name in ("max", "min")]
    fixed = add([ends[0], negate(ends[1]), *_counted(parts.singles.values())])
    terms = [Term(multiply([factor, fixed]))]
    terms += [
        Term(multiply([factor, size]), CycleMaximum(e)) for e, size in parts.barriers.items()
    ]
    return Claim(
        "parameter", question.response, tuple(terms),
        _data(parts, analysis), "the observable does not depend on the parameter", SOURCE,
    )


def _not_beaten(
    name: str, nodes: tuple[Expression, ...], positive: frozenset[str]
) -> tuple[Expression, ...]:
    """Return the candidates for a maximum or minimum that no other one certainly beats."""
    kept: list[Expression] = []
    wanted = 1 if name == "max" else -1

    def beats(one: Expression, other: Expression) -> bool:
        return certain_sign(add([one, negate(other)]), positive) in (0, wanted)

    for node in dict.fromkeys(nodes):
        if not any(beats(other, node) for other in kept):
            kept = [other for other in kept if not beats(node, other)]
            kept.append(node)
    return tuple(kept)


def _counted(nodes: Iterable[Expression]) -> list[Expression]:
    """Return terms of a sum, equal ones as multiples."""
    return [multiply([number(count), node]) for node, count in Counter(nodes).items()]


def _data(parts: Decomposition, analysis: Analysis) -> dict[str, object]:
    states = [state.name for state in analysis.network.states]
    names = [t.name for t in analysis.network.transitions]

    def shown(sizes: dict[int, Expression]) -> dict[str, str]:
        return {names[e]: quantity_text(size, analysis.network) for e, size in sizes.items()}

    return {
        "energies": {
            name: quantity_text(change, analysis.network)
            for name, change in zip(states, parts.energies, strict=True) if change != ZERO
        },
        "barriers": shown(parts.barriers),
        "single_rates": shown(parts.singles),
    }


def support(question: Question) -> Claim | None:
    """|d ln(p_i/p_j)/d ln x| <= m if x multiplies some of the rates that leave m states."""
    perturbation, analysis = question.response.perturbation, question.analysis
    if not isinstance(perturbation, BySymbol) or depends_on(question.target, perturbation.name):
        return None
    changes = rate_changes(perturbation, analysis)
    if len(set(changes.values())) != 1:
        return None
    directions = analysis.rates.directions()
    sources = sorted({
        analysis.graph.ends[directions[place][0]][1 if directions[place][1] else 0]
        for place in changes
    })
    power = size_of(next(iter(changes.values())), analysis.domain.positive)
    factor = multiply([number(len(sources)), power, spread_factor(question.target)])
    names = [analysis.network.states[k].name for k in sources]
    return Claim(
        "support", question.response, (Term(factor),), {"states": names},
        "the parameter multiplies rates by one common power and changes nothing else",
        "Owen & Horowitz, Nat. Commun. 14, 1280 (2023)",
    )
