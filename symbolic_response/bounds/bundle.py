"""Parameters that scale the rates of a set of transitions, or a set of rates, by one power.

Derived here. Let every spanning tree use r or r + 1 transitions of a set E', both of whose rates
are scaled by z. Then N_k = z^r (a_k + z b_k), and b_i a_j <= exp(F) a_i b_j with F the largest
force of a cycle inside and outside E': |d ln(p_i/p_j)/d ln z| <= tanh(F/4). For any set of rates of
which a tree towards any root uses between lo and hi, d ln N_k/d ln z lies between them.
"""

from __future__ import annotations

from collections.abc import Iterable

from symbolic_response.bounds.claim import Claim, MixedCycles, Question, Term
from symbolic_response.bounds.target import depends_on, size_of, spread_factor
from symbolic_response.expressions.tree import ZERO, Expression, multiply, number
from symbolic_response.network.quantities import BarriersOf, BySymbol
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_trees import RateChanges, rate_changes
from symbolic_response.topology import Graph
from symbolic_response.topology.tree_weights import tree_weights

SOURCE = "derived here; see DEVELOPERS.md"


def bundle(question: Question) -> Claim | None:
    """|d ln(p_i/p_j)/d ln z| <= tanh(F/4), z a factor of all rates of the transitions of a set E'.

    Every spanning tree uses r or r + 1 of E'; F is the largest force of a cycle with transitions
    inside and outside E'. Where every tree uses r there is no response.
    """
    analysis, changes = question.analysis, alike(question)
    transitions = None if changes is None else _whole(changes, analysis)
    if changes is None or transitions is None:
        return None
    least, most = uses(transitions, analysis.graph)
    if most > least + 1:
        return None
    names = [analysis.network.transitions[e].name for e in transitions]
    data: dict[str, object] = {"transitions": names, "used": [least, most]}
    term = Term(ZERO)
    if most > least:
        force = MixedCycles(transitions)
        term = Term(_factor(question, changes), force)
    return Claim(
        "bundle", question.response, (term,), data,
        "all rates of these transitions change by one common factor and no others; every spanning"
        f" tree uses {least if most == least else f'{least} or {most}'} of them", SOURCE,
    )


def directed_bundle(question: Question) -> Claim | None:
    """|d ln(p_i/p_j)/d ln z| <= hi - lo, z a factor of rates of which a tree uses lo to hi."""
    changes = alike(question)
    if changes is None:
        return None
    analysis = question.analysis
    directions = analysis.rates.directions()
    rates = [directions[place] for place in changes]
    least, most = tree_weights(analysis.graph, dict.fromkeys(rates, 1))
    names = [analysis.network.transitions[e].name for e, _ in rates]
    return Claim(
        "directed-bundle", question.response,
        (Term(multiply([number(most - least), _factor(question, changes)])),),
        {"rates": [f"{'backward' if back else 'forward'}[{name}]"
                   for name, (_, back) in zip(names, rates, strict=True)],
         "used": [least, most]},
        "these rates change by one common factor and no others; a spanning tree towards any state"
        f" uses between {least} and {most} of them", SOURCE,
    )


def alike(question: Question) -> RateChanges | None:
    """Return the rates that a symbol or several barriers change, None if not all change alike."""
    by = question.response.perturbation
    if not isinstance(by, BySymbol | BarriersOf):
        return None
    if isinstance(by, BySymbol) and depends_on(question.target, by.name):
        return None
    changes = rate_changes(by, question.analysis)
    return changes if len(set(changes.values())) == 1 else None


def _factor(question: Question, changes: RateChanges) -> Expression:
    power = size_of(next(iter(changes.values())), question.analysis.domain.positive)
    return multiply([power, spread_factor(question.target)])


def _whole(changes: RateChanges, analysis: Analysis) -> tuple[int, ...] | None:
    """Return the transitions that change, None if one of them has a rate that does not."""
    chosen = sorted({analysis.rates.directions()[place][0] for place in changes})
    both = sum(1 if analysis.graph.one_way[e] else 2 for e in chosen)
    return tuple(chosen) if both == len(changes) else None


def uses(transitions: Iterable[int], graph: Graph) -> tuple[int, int]:
    """Return how many of some transitions a spanning tree uses, directions ignored: least and most.

    >>> uses([0, 1], Graph(3, ((0, 1), (1, 2), (2, 0)), (False,) * 3))
    (1, 2)
    """
    chosen = set(transitions)
    others = set(range(len(graph.ends))) - chosen
    return graph.size - 1 - rank(others, graph), rank(chosen, graph)


def rank(transitions: Iterable[int], graph: Graph) -> int:
    """Return how many of some transitions a forest can hold at the most.

    >>> rank([0, 1, 2], Graph(3, ((0, 1), (0, 1), (1, 2)), (False,) * 3))
    2
    """
    part = list(range(graph.size))
    found = 0
    for e in transitions:
        first, second = (part[state] for state in graph.ends[e])
        if first != second:
            found += 1
            part = [second if own == first else own for own in part]
    return found
