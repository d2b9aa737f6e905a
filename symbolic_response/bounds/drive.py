"""Responses to a drive."""

from __future__ import annotations

from fractions import Fraction

from symbolic_response.bounds.claim import Claim, Question, Term
from symbolic_response.bounds.target import spread_factor
from symbolic_response.expressions.tree import multiply, number
from symbolic_response.network.quantities import DriveOf


def drive(question: Question) -> Claim | None:
    """|d ln(p_i/p_j)/d drive[e]| <= 1, |d p(U)/d drive[e]| <= p(U)(1 - p(U)); one-way: half."""
    perturbation, analysis = question.response.perturbation, question.analysis
    if not isinstance(perturbation, DriveOf):
        return None
    e = perturbation.transition
    one_way = analysis.graph.one_way[e]
    factor = multiply([number(Fraction(1, 2 if one_way else 1)), spread_factor(question.target)])
    return Claim(
        "drive", question.response, (Term(factor),),
        {"transition": analysis.network.transitions[e].name, "one_way": one_way}, "any network",
        "Owen, Gingrich & Horowitz, Phys. Rev. X 10, 011066 (2020)",
    )
