"""Responses to a barrier: tanh of a quarter of the largest cycle force."""

from __future__ import annotations

from symbolic_response.bounds.claim import Claim, CycleMaximum, Question, Term
from symbolic_response.bounds.target import spread_factor
from symbolic_response.bounds.topological import transition_data
from symbolic_response.network.quantities import BarrierOf


def barrier(question: Question) -> Claim | None:
    """|d ln(p_i/p_j)/d barrier[e]| <= tanh(F_max(e)/4), |d p(U)| <= p(U)(1 - p(U)) tanh(...).

    For <Q> with lo <= Q <= hi the factor is (<Q> - lo)(hi - <Q>)/(hi - lo), for ratios of
    non-negative observables 1.
    """
    perturbation = question.response.perturbation
    if not isinstance(perturbation, BarrierOf):
        return None
    e = perturbation.transition
    return Claim(
        "barrier", question.response,
        (Term(spread_factor(question.target), CycleMaximum(e)),),
        transition_data(e, question.analysis), "any network; a bridge has no response",
        "Owen, Gingrich & Horowitz, Phys. Rev. X 10, 011066 (2020)",
    )
