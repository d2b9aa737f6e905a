"""A bound on the ratio of two probabilities by the paths between the states."""

from __future__ import annotations

from symbolic_response.bounds.claim import Claim, Term
from symbolic_response.bounds.target import extreme
from symbolic_response.expressions.tree import Expression, Function, divide, multiply
from symbolic_response.network.quantities import DirectedRate, Probability
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import can_run_path, simple_paths

SOURCE = (
    "Maes & Netocny, Ann. Henri Poincare 14, 1193 (2013);"
    " Liang, De Los Rios & Busiello, Phys. Rev. Lett. 132, 228402 (2024)"
)


def path_bounds(quantity: Expression, analysis: Analysis) -> list[Claim]:
    """p_y/p_x <= max over simple paths from x to y of the product of W forward/W backward.

    And the same for p_x/p_y; for a quantity p_y/p_x or its logarithm. A bound that a one-way step
    makes infinite is left out.
    """
    pair = _states(quantity)
    if pair is None:
        return []
    found = [_claim(pair[0], pair[1], analysis), _claim(pair[1], pair[0], analysis)]
    return [claim for claim in found if claim is not None]


def _states(quantity: Expression) -> tuple[int, int] | None:
    from symbolic_response.expressions.tree import Power, Product

    inner = quantity.argument if isinstance(quantity, Function) else quantity
    match inner:
        case Product((Probability((y,)), Power(Probability((x,)), exponent))) if exponent == -1:
            return y, x
    return None


def _claim(y: int, x: int, analysis: Analysis) -> Claim | None:
    paths = simple_paths(analysis.graph, x, y)
    ratios = []
    for path in paths:
        if not can_run_path(analysis.graph, path, False):
            return None
        if can_run_path(analysis.graph, path, True):
            along = [DirectedRate(e, not ahead) for e, ahead in path]
            against = [DirectedRate(e, ahead) for e, ahead in path]
            ratios.append(divide(multiply(along), multiply(against)))
    if not ratios:
        return None
    names = [state.name for state in analysis.network.states]
    transitions = [t.name for t in analysis.network.transitions]
    left = divide(Probability((y,)), Probability((x,)))
    return Claim(
        "path", left, (Term(extreme("max", tuple(ratios))),),
        {"from": names[x], "to": names[y],
         "paths": [[transitions[e] for e, _ in path] for path in paths]},
        "any network; paths that can be run neither way are left out", SOURCE,
    )
