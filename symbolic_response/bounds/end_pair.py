"""The sharper barrier bound from the two ends of the transition alone."""

from __future__ import annotations

from symbolic_response.bounds.claim import Claim, EndPair, Question, Term
from symbolic_response.bounds.target import spread_factor
from symbolic_response.bounds.topological import end_pair_data
from symbolic_response.network.quantities import BarrierOf


def end_pair(question: Question) -> Claim | None:
    """|d ln(p_i/p_j)/d barrier[e]| <= tanh(|ln r|/4) <= tanh(F_max(e)/4).

    r = w+ a_m/(w- a_n), a_k the trees towards k without e: a mediant of the ratios of the cycles
    through e. The other factors are those of the barrier bound.
    """
    perturbation = question.response.perturbation
    if not isinstance(perturbation, BarrierOf):
        return None
    e = perturbation.transition
    return Claim(
        "end-pair", question.response, (Term(spread_factor(question.target), EndPair(e)),),
        end_pair_data(e, question.analysis), "any network",
        "derived here; see DEVELOPERS.md, The end-pair theorem",
    )
