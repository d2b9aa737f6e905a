"""The change of ln of a ratio as one barrier is raised by a finite amount.

Derived here, from the bound on the response by integration: with z the factor of the rates and
F = |ln r| or F_max(e), |d ln(<Q>/<R>)/d barrier| <= sinh(F/2)/(cosh(F/2) + cosh(x)), x the distance
of ln z from the place where it is largest; over an interval of length h it adds up to the most
where the interval is centred.
"""

from __future__ import annotations

from symbolic_response.bounds.claim import Claim, CycleMaximum, EndPair, Term
from symbolic_response.bounds.curves import FiniteChange
from symbolic_response.bounds.target import size_of, target_of
from symbolic_response.bounds.topological import end_pair_data, transition_data
from symbolic_response.expressions.tree import ONE
from symbolic_response.network.quantities import Change
from symbolic_response.response.analysis import Analysis

SOURCE = "derived here; see DEVELOPERS.md, The end-pair theorem"


def finite_changes(quantity: Change, analysis: Analysis) -> list[Claim]:
    """|change of ln(<Q>/<R>)| <= 2 ln(cosh((F + h)/4)/cosh((F - h)/4)), h the size of the amount.

    For non-negative Q and R; F is |ln r| (``finite-end-pair``) or F_max(e) (``finite-change``), h
    the limit of the right side for an infinite F.
    """
    target = target_of(quantity.quantity, analysis.network)
    if target is None or target.asked.kind != "log-ratio":
        return []
    e, curve = quantity.transition, FiniteChange(size_of(quantity.amount, analysis.domain.positive))
    return [
        Claim(name, quantity, (Term(ONE, force, curve),), data,
              "any network; the observables are not negative and do not depend on the barrier",
              SOURCE, has_points=False)
        for name, force, data in (
            ("finite-end-pair", EndPair(e), end_pair_data(e, analysis)),
            ("finite-change", CycleMaximum(e), transition_data(e, analysis)),
        )
    ]
