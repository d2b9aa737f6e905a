"""The second derivative of ln of a ratio by one barrier."""

from __future__ import annotations

from fractions import Fraction

from symbolic_response.bounds.claim import Claim, Term
from symbolic_response.bounds.target import target_of
from symbolic_response.expressions.tree import Expression, number
from symbolic_response.network.quantities import BarrierOf, Response
from symbolic_response.response.analysis import Analysis


def second_order(quantity: Expression, analysis: Analysis) -> list[Claim]:
    """|d^2 ln(<Q>/<R>)/d barrier[e]^2| <= 1/4 for non-negative Q and R.

    Derived here: <Q>/<R> = (A + z B)/(A' + z B') with ln z = -barrier; with s = z B/(A + z B) the
    second derivative is s (1 - s) - s' (1 - s'), each between 0 and 1/4.
    """
    match quantity:
        case Response(Response(inner, BarrierOf(first)), BarrierOf(second)) if first == second:
            target = target_of(inner, analysis.network)
        case _:
            return []
    if target is None or target.asked.kind != "log-ratio":
        return []
    return [Claim(
        "second-order", quantity, (Term(number(Fraction(1, 4))),),
        {"transition": analysis.network.transitions[first].name},
        "any network; the observables are not negative and do not depend on the barrier",
        "derived here; see DEVELOPERS.md", has_points=False,
    )]
