"""Responses of a current to the barrier or the drive of its own transition."""

from __future__ import annotations

from fractions import Fraction

from symbolic_response.bounds.claim import Claim, Question, Term
from symbolic_response.bounds.target import Absolute, ShareWithout
from symbolic_response.expressions.tree import Expression, multiply, number
from symbolic_response.network.quantities import BarrierOf, Current, DriveOf, Traffic

RANGE_SOURCE = "Aslyamov & Esposito, Phys. Rev. Lett. 132, 037101 (2024)"


def current_exact(question: Question) -> Claim | None:
    """|d J_e/d barrier[e]| = |J_e| S_a/D and |d J_e/d drive[e]| = (tau_e/2) S_a/D, identities.

    S_a is the sum over the rooted spanning trees that do not use e, D that over all of them.
    Derived here: J_e D has every term once in one of the rates of e, D = S_a + (terms with e).
    """
    size = _size(question)
    if size is None:
        return None
    e, largest = size
    return Claim(
        "current-exact", question.response, (Term(multiply([largest, ShareWithout(e)])),),
        _data(e, question), "any network", "derived here; see DEVELOPERS.md", equality=True,
    )


def current_range(question: Question) -> Claim | None:
    """|d J_e/d barrier[e]| <= |J_e| and |d J_e/d drive[e]| <= tau_e/2."""
    size = _size(question)
    if size is None:
        return None
    e, largest = size
    return Claim(
        "current-range", question.response, (Term(largest),), _data(e, question), "any network",
        RANGE_SOURCE,
    )


def _size(question: Question) -> tuple[int, Expression] | None:
    """Return the transition and |J_e| or tau_e/2, None for a response to anything else."""
    e = question.target.asked.transition
    match question.response.perturbation:
        case BarrierOf(transition) if transition == e:
            return transition, Absolute(Current(transition))
        case DriveOf(transition) if transition == e:
            return transition, multiply([number(Fraction(1, 2)), Traffic(transition)])
    return None


def _data(e: int, question: Question) -> dict[str, object]:
    transition = question.analysis.network.transitions[e]
    return {"transition": transition.name, "one_way": transition.backward is None}
