"""The catalogue: every inequality by its stable name, in the order in which they are shown."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from symbolic_response.bounds.barrier import barrier
from symbolic_response.bounds.claim import Claim, Question
from symbolic_response.bounds.drive import drive
from symbolic_response.bounds.end_pair import end_pair
from symbolic_response.bounds.energy import energy_covariance, energy_range
from symbolic_response.bounds.parameter import parameter, support
from symbolic_response.bounds.path import path_bounds
from symbolic_response.bounds.sides import quantity_text
from symbolic_response.bounds.splitting import (
    splitting_barrier,
    splitting_drive,
    splitting_end_pair,
)
from symbolic_response.bounds.target import Target, extreme, target_of
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.names import nearest
from symbolic_response.expressions.tree import ONE, ZERO, Expression
from symbolic_response.network.quantities import Response
from symbolic_response.response.analysis import Analysis

Rule = Callable[[Question], Claim | None]

CATALOGUE: dict[str, Rule] = {
    "energy-covariance": energy_covariance,
    "energy-range": energy_range,
    "splitting-end-pair": splitting_end_pair,
    "end-pair": end_pair,
    "splitting-barrier": splitting_barrier,
    "barrier": barrier,
    "splitting-drive": splitting_drive,
    "drive": drive,
    "parameter": parameter,
    "support": support,
}
PATH = "path"
BY_RANGE = ("energy-range", "end-pair", "barrier", "drive", "parameter", "support")


def claims_for(
    quantity: Expression, analysis: Analysis, only: str | None = None
) -> tuple[Claim, ...]:
    """Return every inequality of the catalogue that applies to a response.

    ``only``: the name of one. Raises QuantityError for an unknown name, or if the quantity is
    neither a response of probabilities nor a ratio of two of them.
    """
    names = [*CATALOGUE, PATH]
    if only is not None and only not in names:
        hint = nearest(only, names) or f"; known: {', '.join(names)}"
        raise QuantityError(f"there is no bound {only!r}{hint}")
    found = applicable(quantity, analysis)
    chosen = tuple(claim for claim in found if only is None or claim.name == only)
    if not chosen:
        what = "no bound of the catalogue" if only is None else f"the bound {only!r} does not"
        raise QuantityError(f"{what} applies to this quantity".replace("not applies", "not apply"))
    return chosen


def applicable(quantity: Expression, analysis: Analysis) -> list[Claim]:
    """Return the inequalities that apply to a quantity, none if it is no such response."""
    if not isinstance(quantity, Response):
        return path_bounds(quantity, analysis)
    target = target_of(quantity.quantity, analysis.network)
    if target is None:
        return []
    question = Question(analysis, quantity, target)
    found = [claim for rule in CATALOGUE.values() if (claim := rule(question)) is not None]
    return [_with_range(claim, target, analysis) for claim in found]


def _with_range(claim: Claim, target: Target, analysis: Analysis) -> Claim:
    """Say so where a mean was rescaled affinely to 0 .. 1."""
    low, high = extreme("min", target.values), extreme("max", target.values)
    if claim.name not in BY_RANGE or target.below is not None or (low, high) == (ZERO, ONE):
        return claim
    shown = [quantity_text(end, analysis.network) for end in (low, high)]
    words = f"; its values, from {shown[0]} to {shown[1]}, are rescaled affinely to 0 .. 1"
    return replace(claim, data={**claim.data, "range": shown}, hypotheses=claim.hypotheses + words)
