r"""Differences of forest sums in terms of others: over the states, and along cycles.

The probabilities sum to one, so that :math:`\sum_k \Phi_{k,e} = 0`. For one state k the numbers
:math:`\Phi_{k,e}`, e from m to n, are differences of one function of states between n and m (the
solution of W x = d_n - d_m depends on e by its ends alone, and linearly), so that they add up to
zero along every cycle. Each relation is checked exactly where it is used.
"""

from __future__ import annotations

from collections.abc import Iterator, Set

from symbolic_response.algebra.compact.together import key_of
from symbolic_response.appendix.named_sums import NamedSum
from symbolic_response.appendix.paper import Paper
from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.tree import Expression, Symbol, negate
from symbolic_response.response.analysis import Analysis

MAX_CYCLES = 100
WORDS = r"""For one transition the $@forest@_{k,e}$ add up to zero over the states, for one state
along every cycle, with a minus sign for a transition against its direction; the shorter form is
given."""

Signed = tuple[int, int, int]
"""A sign, a state and a transition."""


def relation(paper: Paper, named: NamedSum, known: Set[str]) -> list[Expression] | None:
    """Return a difference of forest sums as a sum of known ones, None where there is no such."""
    if named.kind != "forest":
        return None
    state, e = named.place
    for others in sorted(_relations(paper.analysis, state, e), key=len):
        keys = [key_of("forest", k, f) for _, k, f in others]
        if known >= set(keys) and _holds(paper.analysis, (1, state, e), others):
            return [
                negate(Symbol(key)) if sign > 0 else Symbol(key)
                for key, (sign, _, _) in zip(keys, others, strict=True)
            ]
    return None


def _relations(analysis: Analysis, state: int, e: int) -> Iterator[list[Signed]]:
    """Yield sets of signed sums that make zero together with that of (state, e)."""
    yield [(1, k, e) for k in range(analysis.graph.size) if k != state]
    try:
        cycles = analysis.cycles
    except SizeLimitError:
        return
    for cycle in cycles[:MAX_CYCLES]:
        if e not in cycle.transitions:
            continue
        signs = dict(zip(cycle.transitions, cycle.along, strict=True))
        own = signs[e]
        yield [(1 if ahead == own else -1, state, f) for f, ahead in signs.items() if f != e]


def _holds(analysis: Analysis, own: Signed, others: list[Signed]) -> bool:
    total = analysis.rates.ring.constant(0)
    for sign, k, e in (own, *others):
        total = total + analysis.forest_difference(k, e) * sign
    return len(total) == 0
