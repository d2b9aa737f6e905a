"""Responses to the energy of a state: exact, and bounded however far from equilibrium."""

from __future__ import annotations

from symbolic_response.bounds.claim import Claim, Question, Term
from symbolic_response.bounds.target import absolute, covariance, spread_factor
from symbolic_response.expressions.tree import multiply
from symbolic_response.network.quantities import EnergyOf

SOURCE = "Owen, Gingrich & Horowitz, Phys. Rev. X 10, 011066 (2020)"


def energy_covariance(question: Question) -> Claim | None:
    """d<Q>/d energy[j] = -Cov(Q, 1_j), an identity (item 5 of the exact forms)."""
    perturbation, target = question.response.perturbation, question.target
    if not isinstance(perturbation, EnergyOf) or target.below is not None:
        return None
    right = multiply([
        absolute(target.prefactor), absolute(covariance(target, (perturbation.state,)))
    ])
    state = question.analysis.network.states[perturbation.state].name
    return Claim(
        "energy-covariance", question.response, (Term(right),), {"state": state},
        "any network; the observable does not depend on the energy", SOURCE, equality=True,
    )


def energy_range(question: Question) -> Claim | None:
    """|d ln(<Q>/<R>)/d energy[j]| <= 1, and <Q>(1 - <Q>) for 0 <= Q <= 1."""
    perturbation = question.response.perturbation
    if not isinstance(perturbation, EnergyOf):
        return None
    state = question.analysis.network.states[perturbation.state].name
    return Claim(
        "energy-range", question.response, (Term(spread_factor(question.target)),),
        {"state": state}, "any network", SOURCE,
    )
