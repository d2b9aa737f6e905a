"""The catalogue: every inequality by its stable name, in the order in which they are shown."""

from __future__ import annotations

from collections.abc import Callable

from symbolic_response.bounds.barrier import barrier
from symbolic_response.bounds.claim import Claim, Question
from symbolic_response.bounds.drive import drive
from symbolic_response.bounds.end_pair import end_pair
from symbolic_response.bounds.energy import energy_covariance, energy_range
from symbolic_response.bounds.parameter import parameter, support
from symbolic_response.bounds.path import path_bounds
from symbolic_response.bounds.splitting import (
    splitting_barrier,
    splitting_drive,
    splitting_end_pair,
)
from symbolic_response.bounds.target import target_of
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.names import nearest
from symbolic_response.expressions.tree import Expression
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
    found = _claims(quantity, analysis)
    chosen = tuple(claim for claim in found if only is None or claim.name == only)
    if not chosen:
        what = "no bound of the catalogue" if only is None else f"the bound {only!r} does not"
        raise QuantityError(f"{what} applies to this quantity".replace("not applies", "not apply"))
    return chosen


def _claims(quantity: Expression, analysis: Analysis) -> list[Claim]:
    if not isinstance(quantity, Response):
        return path_bounds(quantity, analysis)
    target = target_of(quantity.quantity, analysis.network)
    if target is None:
        return []
    question = Question(analysis, quantity, target)
    return [claim for rule in CATALOGUE.values() if (claim := rule(question)) is not None]
