"""The diagnosis of a hand result that is known to differ from the derived one."""

from __future__ import annotations

from symbolic_response.expressions.tree import Expression, Function
from symbolic_response.hand.diagnosis.case import TOO_LARGE, Case
from symbolic_response.hand.diagnosis.exchanges import exchange_findings
from symbolic_response.hand.diagnosis.factors import factor_findings
from symbolic_response.hand.diagnosis.finding import (
    EDIT,
    EXCHANGE,
    FACTOR,
    NETWORK,
    PARTIAL,
    QUANTITY,
    SEVERAL,
    SINGLE,
    Finding,
    Ranked,
)
from symbolic_response.hand.diagnosis.limits import limit_findings
from symbolic_response.hand.diagnosis.monomials import Probe
from symbolic_response.hand.diagnosis.other_quantities import quantity_findings
from symbolic_response.hand.diagnosis.rates import rate_findings
from symbolic_response.hand.diagnosis.smaller_networks import network_findings
from symbolic_response.hand.diagnosis.terms import term_findings
from symbolic_response.hand.diagnosis.trees import tree_findings
from symbolic_response.response.analysis import Analysis

MAX_FINDINGS = 5


def diagnose(
    analysis: Analysis, quantity: Expression, hand: Expression
) -> tuple[Finding, ...]:
    """Return what went wrong in a hand result that differs from the derived one.

    Each finding is exact: the quantity changed as it says is proved equal to the hand result, or
    the hand result corrected as it says to the derived one. The most specific come first, five at
    most; none where no single slip explains the difference. The number of hypotheses is bounded;
    in networks of more than 3,000 spanning trees few are tried, beyond 20,000 none.

    >>> from symbolic_response.network.build import build_network
    >>> from symbolic_response.network.quantity_reader import read_quantity
    >>> pair = build_network("pair", states="A B", transitions=[("A", "B", "k*c", "r", "bind")])
    >>> asked, hand = (read_quantity(text, pair) for text in ("p[B]", "k*c/(r + 2*k*c)"))
    >>> for finding in diagnose(Analysis(pair), asked, hand):
    ...     print(finding.text)
    the normalisation is wrong in the term k*c: it should have coefficient 1, not 2
    """
    case = Case(analysis, *_bare(quantity, hand))
    if case.trees > TOO_LARGE:
        return ()
    found = _ordered(_all(case))
    return tuple(ranked.finding for ranked in found[:MAX_FINDINGS])


def _bare(quantity: Expression, hand: Expression) -> tuple[Expression, Expression]:
    """Return both sides, or their arguments where both are logarithms."""
    match quantity, hand:
        case Function("ln", inner), Function("ln", written):
            return inner, written
    return quantity, hand


def _all(case: Case) -> list[Ranked]:
    if case.hand_vanishes:
        return [*network_findings(case), *limit_findings(case)]
    if not case.network.symbols:  # numbers alone: terms have no names
        return [*quantity_findings(case), *network_findings(case)]
    probe = Probe(case)
    by_trees = tree_findings(case)
    found = [*by_trees, *term_findings(case, probe), *quantity_findings(case)]
    if not any(ranked.rank == SINGLE and ranked.small for ranked in by_trees):
        found += [*exchange_findings(case), *network_findings(case)]
    if not any(ranked.rank < FACTOR for ranked in found):
        found += [*rate_findings(case), *factor_findings(case, probe)]
    if not any(ranked.rank < NETWORK or ranked.rank == FACTOR for ranked in found):
        found += limit_findings(case)
    return found


def _ordered(found: list[Ranked]) -> list[Ranked]:
    """Return findings by rank, without those that say the same in a less telling way."""
    by_tree = [ranked for ranked in found if ranked.rank == SINGLE]
    told = {rank for rank in (SINGLE, EDIT, EXCHANGE, QUANTITY, NETWORK)
            if any(ranked.rank == rank for ranked in found)}
    kept: list[Ranked] = []
    for ranked in sorted(found, key=lambda ranked: ranked.rank):
        said_by_trees = by_tree and by_tree[0].small and ranked.small and ranked not in by_tree
        whole = told - {SINGLE if ranked.rank == FACTOR else NETWORK}
        said_by_whole = ranked.rank >= FACTOR and whole
        better = ranked.rank in (SEVERAL, PARTIAL) and kept
        same = any(ranked.finding.text == other.finding.text for other in kept)
        if not (said_by_trees or said_by_whole or better or same):
            kept.append(ranked)
    return kept
