"""Responses of observables bounded by covariances with connected splittings."""

from __future__ import annotations

from fractions import Fraction

from symbolic_response.bounds.claim import Claim, CycleMaximum, EndPair, Question, Term
from symbolic_response.bounds.target import Target, absolute, covariance, extreme
from symbolic_response.bounds.topological import end_pair_data, splitting_data, transition_data
from symbolic_response.expressions.tree import Expression, multiply, number
from symbolic_response.network.quantities import BarrierOf, DriveOf
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import splittings
from symbolic_response.topology.graph import members

SOURCE = "Fernandes Martins & Horowitz, Phys. Rev. E 108, 044113 (2023)"


def largest_covariance(target: Target, e: int, analysis: Analysis) -> Expression:
    """Return the largest |Cov(Q, 1_S)| over the splittings of a transition, as a quantity."""
    parts = tuple(
        absolute(covariance(target, tuple(members(int(mask)))))
        for mask in splittings(analysis.graph, e)
    )
    return multiply([absolute(target.prefactor), extreme("max", parts)])


def splitting_barrier(question: Question) -> Claim | None:
    """|d<Q>/d barrier[e]| <= tanh(F_max(e)/4) max over splittings |Cov(Q, 1_S)|."""
    perturbation, target = question.response.perturbation, question.target
    if not isinstance(perturbation, BarrierOf) or target.below is not None:
        return None
    e = perturbation.transition
    factor = largest_covariance(target, e, question.analysis)
    data = {**transition_data(e, question.analysis), **splitting_data(e, question.analysis)}
    return Claim(
        "splitting-barrier", question.response, (Term(factor, CycleMaximum(e)),), data,
        "any network; the observable does not depend on the barrier", SOURCE,
    )


def splitting_drive(question: Question) -> Claim | None:
    """|d<Q>/d drive[e]| <= max over splittings |Cov(Q, 1_S)|; one-way: half of it."""
    perturbation, target = question.response.perturbation, question.target
    if not isinstance(perturbation, DriveOf) or target.below is not None:
        return None
    e = perturbation.transition
    share = Fraction(1, 2 if question.analysis.graph.one_way[e] else 1)
    factor = multiply([number(share), largest_covariance(target, e, question.analysis)])
    return Claim(
        "splitting-drive", question.response, (Term(factor),),
        splitting_data(e, question.analysis),
        "any network; the observable does not depend on the drive", SOURCE,
    )


def splitting_end_pair(question: Question) -> Claim | None:
    """|d<Q>/d barrier[e]| <= tanh(|ln r|/4) max over splittings |Cov(Q, 1_S)|."""
    perturbation, target = question.response.perturbation, question.target
    if not isinstance(perturbation, BarrierOf) or target.below is not None:
        return None
    e = perturbation.transition
    factor = largest_covariance(target, e, question.analysis)
    data = {**end_pair_data(e, question.analysis), **splitting_data(e, question.analysis)}
    return Claim(
        "splitting-end-pair", question.response, (Term(factor, EndPair(e)),), data,
        "any network; the observable does not depend on the barrier",
        "derived here; see DEVELOPERS.md, The end-pair theorem",
    )
