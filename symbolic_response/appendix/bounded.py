"""The bounded responses of a document, and how its tables call them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from symbolic_response.appendix.paper import Paper
from symbolic_response.bounds.claim import Claim
from symbolic_response.bounds.registry import PATH, applicable
from symbolic_response.expressions.tree import Expression
from symbolic_response.expressions.widths import formula_width
from symbolic_response.response.quantity_latex import quantity_in

MAX_SHARE = 0.27


@dataclass(frozen=True, slots=True)
class Bounded:
    """A quantity, its place in the list from 1, and inequalities about one and the same left side.

    The path bounds of a ratio and of its inverse are two entries.
    """

    number: int
    quantity: Expression
    claims: tuple[Claim, ...]


def bounded(paper: Paper, quantities: Sequence[Expression]) -> list[Bounded]:
    """Return the entries of the quantities that are bounded, in their order.

    A ratio that several quantities bound, by itself or under ln, is one entry.
    """
    found: list[Bounded] = []
    ratios = set()
    for number, quantity in enumerate(quantities, start=1):
        claims = applicable(quantity, paper.analysis)
        paths = [claim for claim in claims if claim.name == PATH and claim.left not in ratios]
        found += [Bounded(number, quantity, (claim,)) for claim in paths]
        ratios |= {claim.left for claim in paths}
        others = tuple(claim for claim in claims if claim.name != PATH)
        if others:
            found.append(Bounded(number, quantity, others))
    return found


def shown(paper: Paper, entry: Bounded) -> str:
    """Return the formula that names an entry: the quantity, or its number where that is wide."""
    left = entry.claims[0].left if entry.claims[0].name == PATH else entry.quantity
    latex = quantity_in(paper.notation, left)
    if formula_width(latex) > MAX_SHARE * paper.width:
        return rf"$\mathrm{{quantity\ {entry.number}}}$"
    return rf"$\displaystyle {latex}$"
