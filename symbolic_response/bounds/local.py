"""Parameters that change the rates of one transition only, each rate by its own power.

Derived here: the responses of all ln p_k lie between those of the two ends of the transition, whose
shares of trees through it have the cross ratio r = w+ a_m/(w- a_n), exp(-F_max) <= r <= exp(F_max).
"""

from __future__ import annotations

from fractions import Fraction

from symbolic_response.bounds.claim import Claim, CycleMaximum, EndPair, Question, Term
from symbolic_response.bounds.curves import LocalChange
from symbolic_response.bounds.target import depends_on, spread_factor
from symbolic_response.bounds.topological import end_pair_data, transition_data
from symbolic_response.expressions.text import fraction_text
from symbolic_response.expressions.tree import Number, multiply, number
from symbolic_response.network.quantities import BySymbol
from symbolic_response.response.closed_trees import rate_changes

SOURCE = "derived here; see DEVELOPERS.md, The end-pair theorem"
PSI = (
    "psi(u, v, F) = (sqrt(u*R) - sqrt(v))**2/(R - 1) with R = exp(F) where v*R >= u and R > 1, and"
    " u - v elsewhere"
)
HYPOTHESES = "the parameter changes the rates of this transition only, each by a constant power"
Powers = tuple[int, Fraction, Fraction]


def local_change(question: Question) -> Claim | None:
    """|d ln(p_i/p_j)/d theta| <= psi(u, v, F_max(e)) if ln of e's rates changes by +-u and +-v.

    u >= v; for changes of opposite signs, or of one rate alone, u + v.
    """
    found = powers_of(question)
    if found is None:
        return None
    e, ahead, behind = found
    if ahead * behind <= 0:
        return _without_force(question, found)
    return _claim("local-change", question, found, CycleMaximum(e),
                  transition_data(e, question.analysis))


def local_end_pair(question: Question) -> Claim | None:
    """The same with |ln r| of the two ends of the transition; only where the force matters."""
    found = powers_of(question)
    if found is None or found[1] * found[2] <= 0:
        return None
    e, _, _ = found
    return _claim("local-end-pair", question, found, EndPair(e),
                  end_pair_data(e, question.analysis))


def powers_of(question: Question) -> Powers | None:
    """Return the one transition whose rates change, and by how much ln of each: numbers."""
    by, analysis = question.response.perturbation, question.analysis
    if not isinstance(by, BySymbol) or depends_on(question.target, by.name):
        return None
    changes = rate_changes(by, analysis)
    directions = analysis.rates.directions()
    touched = {directions[place][0] for place in changes}
    if len(touched) != 1:
        return None
    powers = [Fraction(0), Fraction(0)]
    for place, change in changes.items():
        if not isinstance(change, Number):
            return None
        powers[directions[place][1]] = change.value
    return touched.pop(), powers[0], powers[1]


def _without_force(question: Question, powers: Powers) -> Claim:
    """Return the claim for changes of opposite signs, or of one rate alone."""
    e, ahead, behind = powers
    factor = multiply([number(abs(ahead) + abs(behind)), spread_factor(question.target)])
    return Claim(
        "local-change", question.response, (Term(factor),),
        {"transition": question.analysis.network.transitions[e].name,
         "changes": [fraction_text(ahead), fraction_text(behind)]},
        HYPOTHESES, SOURCE, has_points=False,
    )


def _claim(
    name: str,
    question: Question,
    powers: Powers,
    force: CycleMaximum | EndPair,
    data: dict[str, object],
) -> Claim:
    _, ahead, behind = powers
    larger, smaller = max(abs(ahead), abs(behind)), min(abs(ahead), abs(behind))
    factor = spread_factor(question.target)
    shown: dict[str, object] = {"changes": [fraction_text(ahead), fraction_text(behind)]}
    if larger == smaller:
        term = Term(multiply([number(larger), factor]), force)
    else:
        term = Term(factor, force, LocalChange(larger, smaller))
        shown["psi"] = PSI
    return Claim(
        name, question.response, (term,), {**data, **shown},
        HYPOTHESES, SOURCE, has_points=False,
    )
