"""The section on control parameters: changes of the rates, limits on the steepness, exact curves.

One subsection for each ``[[control]]`` entry of the file; none of this without entries.
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

from symbolic_response.appendix.control_ends import ends_section
from symbolic_response.appendix.control_entries import ControlEntry, control_entries, located
from symbolic_response.appendix.control_forms import (
    Forces,
    Form,
    at_equal,
    form_equation,
    least,
    steepness_equations,
)
from symbolic_response.appendix.control_pieces import PieceWords, change_text, listed
from symbolic_response.appendix.control_theory import theory
from symbolic_response.appendix.control_values import values_section
from symbolic_response.appendix.paper import Paper
from symbolic_response.control.asked import Asked, observable_values, rescaled
from symbolic_response.control.changes import change_of
from symbolic_response.control.decomposition import (
    Decomposition,
    LinearForm,
    linear_form,
    sparsest,
)
from symbolic_response.control.family import Family, family_of
from symbolic_response.control.steepness import forms
from symbolic_response.errors import EvaluationError
from symbolic_response.expressions.breaking import (
    Equation,
    Piece,
    align,
    fits,
    line_limit,
    product_pieces,
)
from symbolic_response.expressions.latex import fraction_latex
from symbolic_response.network.quantities import Mean, Probability, Response
from symbolic_response.response.quantity_latex import quantity_in

MAX_REACHED = 4


def control_section(paper: Paper, printed: str) -> str:
    """Return the section; empty without ``[[control]]`` entries.

    ``printed``: the section of proofs, whose equations are referred to where they are there.
    Raises DocumentError for an entry that cannot be used, SizeLimitError past the limit of cycles.
    """
    entries = control_entries(paper.analysis)
    if not entries:
        return ""
    family = family_of(paper.analysis)
    parts = [r"\section{Control parameters}", theory(paper, family, printed)]
    for entry in entries:
        with located(entry.place):
            parts.append(_entry(paper, entry, family))
    return "\n\n".join(parts)


def _entry(paper: Paper, entry: ControlEntry, family: Family) -> str:
    analysis, x = paper.analysis, paper.notation.symbols[entry.by.name]
    change = change_of(analysis, entry.by)
    parts = [rf"\subsection{{The parameter ${x}$}}", change_text(paper, change)]
    if not change.parts and not any(change.numbers):
        return "\n\n".join(parts)
    few = sparsest(analysis, change, family)
    parts.append(_decompositions(paper, few, entry.own))
    found = least(paper, forms(analysis, entry.by, family))
    parts.append(_limit(paper, entry, found, few))
    parts.append(ends_section(paper, entry) if entry.values is None else
                 values_section(paper, entry, found, entry.values))
    return "\n\n".join(part for part in parts if part)


def _decompositions(paper: Paper, few: Decomposition, own: Decomposition | None) -> str:
    """Return the change in few pieces, and in those of the file; both sums are checked."""
    words = PieceWords(paper)
    chosen = "decomposition chosen for this network"
    if own == few:
        return (f"In the {chosen} the change consists of {words.text(few)} The sum"
                " equals it identically in all symbols.")
    text = f"In few pieces the change consists of {words.text(few)}"
    if own is None:
        return text
    return (f"{text} The {chosen} consists of {words.text(own)} Either sum equals the change"
            " identically in all symbols.")


# -- the limit -------------------------------------------------------------------------------------


def _limit(
    paper: Paper, entry: ControlEntry, found: Sequence[LinearForm], few: Decomposition
) -> str:
    forces, letter = Forces(paper), paper.letters["steepness"]
    kept = [forces.form(form) for form in found]
    own = None if entry.own is None else forces.form(linear_form(entry.own, paper.analysis))
    parts = [r"\paragraph{Limit.} For all admissible values of the symbols",
             align([_statement(paper, asked, letter) for asked in entry.asked], paper.width),
             "with", steepness_equations(forces, kept, letter),
             forces.text(), _strength(letter, forces, kept), _least_words(forces, kept),
             _ranges(paper, entry.asked), _reached(paper, letter, found, few, entry.own)]
    if own is not None and own not in kept:
        parts += ["The decomposition chosen for this network gives by itself",
                  align([form_equation(forces, own, rf"{letter}_{{\mathrm{{own}}}}")],
                        paper.width)]
    return "\n".join(part for part in parts if part)


def _reached(
    paper: Paper, letter: str, found: Sequence[LinearForm], few: Decomposition,
    own: Decomposition | None,
) -> str:
    """Return the pieces that give each form."""
    words, texts = PieceWords(paper), []
    listed_forms = found[:MAX_REACHED]
    for place, form in enumerate(listed_forms, start=1):
        end = "." if place == len(listed_forms) else ";"
        known = [name for name, other in (("the few pieces above", few),
                                          ("the pieces chosen for this network", own))
                 if other == form.decomposition]
        texts.append(known[0] + end if known else words.text(form.decomposition, end))
    if len(found) == 1:
        return f"This ${letter}$ comes from {texts[0]}"
    which = "The" if len(found) <= MAX_REACHED else f"The first {MAX_REACHED} of the {len(found)}"
    items = "\n".join(rf"\item {text}" for text in texts)
    return (f"{which} forms come, in their order, from\n\\begin{{enumerate}}\n{items}"
            "\n\\end{enumerate}")


def _statement(paper: Paper, asked: Asked, letter: str) -> Equation:
    """Return |d<q>/d ln x| <= H <q>(1 - <q>), for another range rescaled."""
    inner = quantity_in(paper.notation, Response(asked.quantity, asked.by))
    left = rf"\Bigl|{inner}\Bigr|"
    mean = quantity_in(paper.notation, asked.quantity)
    factors = [*_product(letter, mean, isinstance(asked.quantity, Mean | Probability),
                                 _extremes(asked))]
    limit = line_limit(left, paper.width)
    body = r" \, ".join(factors)
    pieces = [Piece("", body)] if fits(body, limit) else product_pieces(factors, limit)
    return Equation(left, tuple(pieces), relation=r"\le")


def _product(
    letter: str, mean: str, atom: bool, extremes: tuple[Fraction, Fraction] | None
) -> list[str]:
    """Return the factors of H (<q> - low)(high - <q>)/(high - low)."""
    shown = mean if atom else f"({mean})"
    if extremes is None:
        low, high = r"q_{\min}", r"q_{\max}"
        factor = rf"\frac{{{letter}}}{{{high} - {low}}}"
        return [factor, f"({shown} - {low})", f"({high} - {shown})"]
    low, high = (fraction_latex(end) for end in extremes)
    above = f"({high} - {shown})"
    below = shown if extremes[0] == 0 else (
        f"({mean} {'+' if extremes[0] < 0 else '-'} {low.removeprefix('-')})")
    width = extremes[1] - extremes[0]
    if width.denominator > 1:
        return [fraction_latex(1 / width), letter, below, above]
    factor = letter if width == 1 else rf"\frac{{{letter}}}{{{width}}}"
    return [factor, below, above]


def _extremes(asked: Asked) -> tuple[Fraction, Fraction] | None:
    """Return the smallest and the largest value, None where they are not known numbers.

    Raises QuantityError for an observable that is the same in every state.
    """
    try:
        values = observable_values(asked)
    except EvaluationError:
        return None
    rescaled(asked, values)
    return min(values), max(values)


def _ranges(paper: Paper, every: Sequence[Asked]) -> str:
    """Return how observables with another range than 0 .. 1 are brought to it."""
    texts = []
    for asked in every:
        extremes, shown = _extremes(asked), quantity_in(paper.notation, asked.quantity)
        if extremes is None:
            texts.append(rf"Of ${shown}$, $q_{{\min}}$ and $q_{{\max}}$ are the smallest and the"
                         " largest value in any state, and it is brought to the range from 0 to 1"
                         " by an affine map.")
        elif extremes != (Fraction(0), Fraction(1)):
            low, high = (fraction_latex(end) for end in extremes)
            texts.append(f"The function whose mean is ${shown}$ runs from ${low}$ to ${high}$; an"
                         r" affine map brings it to the range of Eq.~\eqref{eq:control}.")
    return " ".join(texts)


def _strength(letter: str, forces: Forces, kept: Sequence[Form]) -> str:
    """Return H without forces and at infinite ones."""
    if not forces.places:
        return f"It does not depend on the{' finite' if forces.infinite else ''} forces."
    weak, strong = at_equal(kept, 0), at_equal(kept, 1)
    some = " of the cycles without one-way steps" if forces.infinite else ""
    if weak is None or strong is None:
        names = listed([f"${forces.name(place)}$" for place in range(len(forces.places))])
        verb = "vanish" if len(forces.places) > 1 else "vanishes"
        return f"Without forces{some} {names} {verb}; at infinite forces it is one."
    return (f"Without forces{some} ${letter} = {weak}$; however strong the driving,"
            rf" ${letter} \le {strong}$.")


def _least_words(forces: Forces, kept: Sequence[Form]) -> str:
    """Return in what sense H is the least that the family gives."""
    if any(form.numbers() is None for form in kept):
        return ("The numbers in the change, and what stands beside each other expression in it,"
                " are limited one by one.")
    if len(forces.places) > 1:
        return (f"Where all ${forces.paper.letters['tanh']}_i$ are equal this is the least that the"
                " family gives; elsewhere the family may give less.")
    return ""
