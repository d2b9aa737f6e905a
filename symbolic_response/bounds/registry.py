"""The catalogue: every inequality by its stable name, in the order in which they are shown."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from symbolic_response.bounds.barrier import barrier
from symbolic_response.bounds.bundle import bundle, directed_bundle
from symbolic_response.bounds.claim import Claim, Question
from symbolic_response.bounds.currents import current_exact, current_range
from symbolic_response.bounds.drive import drive
from symbolic_response.bounds.end_pair import end_pair
from symbolic_response.bounds.energy import energy_covariance, energy_range
from symbolic_response.bounds.finite_change import finite_changes
from symbolic_response.bounds.local import local_change, local_end_pair
from symbolic_response.bounds.parameter import parameter, support
from symbolic_response.bounds.path import path_bounds
from symbolic_response.bounds.second_order import second_order
from symbolic_response.bounds.sides import quantity_text
from symbolic_response.bounds.splitting import (
    splitting_barrier,
    splitting_drive,
    splitting_end_pair,
)
from symbolic_response.bounds.target import Target, depends_on, extreme, may_be_negative, target_of
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.names import nearest
from symbolic_response.expressions.tree import ONE, ZERO, Expression
from symbolic_response.network.quantities import BySymbol, Change, Response
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
    "local-end-pair": local_end_pair,
    "local-change": local_change,
    "bundle": bundle,
    "parameter": parameter,
    "directed-bundle": directed_bundle,
    "support": support,
    "current-exact": current_exact,
    "current-range": current_range,
}
ABOUT_CURRENTS = ("current-exact", "current-range")
PATH = "path"
NAMES = (*CATALOGUE, "second-order", "finite-end-pair", "finite-change", PATH)
SPEAKS_OF = (
    "the catalogue speaks of responses d X / d PERTURBATION, X a probability p[A], a set p[A, B], a"
    " mean, a ratio of two of them or its ln; of d current[e] / d barrier[e] and / d drive[e], the"
    " same transition; of the second derivative of ln of a ratio by one barrier, and of its"
    " change(..., barrier[e], AMOUNT); and, for the path bound, of p[A]/p[B] and its ln"
)
BY_RANGE = (
    "energy-range", "end-pair", "barrier", "drive", "local-end-pair", "local-change", "bundle",
    "parameter", "directed-bundle", "support",
)


def claims_for(
    quantity: Expression, analysis: Analysis, only: str | None = None
) -> tuple[Claim, ...]:
    """Return every inequality of the catalogue that applies to a response.

    ``only``: the name of one. Raises QuantityError for an unknown name, or if the quantity is
    neither a response of probabilities nor a ratio of two of them.
    """
    found = applicable(quantity, analysis)
    chosen = tuple(claim for claim in found if only is None or claim.name == only)
    if chosen:
        return chosen
    those = ", ".join(dict.fromkeys(claim.name for claim in found))
    applying = f"; those that apply: {those}" if found else f"; {_why_none(quantity, analysis)}"
    if only is None:
        raise QuantityError(f"no bound of the catalogue applies to this quantity{applying}")
    if only not in NAMES:
        raise QuantityError(f"there is no bound {only!r}{nearest(only, NAMES)}{applying}")
    raise QuantityError(f"the bound {only!r} does not apply to this quantity{applying}")


def _why_none(quantity: Expression, analysis: Analysis) -> str:
    """Say which hypothesis fails, else what the catalogue speaks of."""
    by = quantity.perturbation if isinstance(quantity, Response) else None
    inner = quantity
    while isinstance(inner, Response | Change):
        inner = inner.quantity
    target = target_of(inner, analysis.network)
    if target is not None and isinstance(by, BySymbol) and depends_on(target, by.name):
        return f"the observable itself depends on {by.name}, which no bound allows"
    if target is None and inner != quantity and may_be_negative(inner, analysis.network):
        return (
            "a mean may be negative (or is zero): in a ratio or under ln an observable must be"
            " certainly not negative in every state"
        )
    return SPEAKS_OF


def applicable(quantity: Expression, analysis: Analysis) -> list[Claim]:
    """Return the inequalities that apply to a quantity, none if it is no such response."""
    if isinstance(quantity, Change):
        return finite_changes(quantity, analysis)
    if not isinstance(quantity, Response):
        return path_bounds(quantity, analysis)
    target = target_of(quantity.quantity, analysis.network)
    if target is None:
        return second_order(quantity, analysis)
    question = Question(analysis, quantity, target)
    about_current = target.asked.kind == "current"
    rules = [rule for name, rule in CATALOGUE.items()
             if (name in ABOUT_CURRENTS) == about_current]
    found = [claim for rule in rules if (claim := rule(question)) is not None]
    return [_with_range(claim, target, analysis) for claim in found]


def _with_range(claim: Claim, target: Target, analysis: Analysis) -> Claim:
    """Say so where a mean was rescaled affinely to 0 .. 1."""
    if claim.name not in BY_RANGE or target.below is not None:
        return claim
    low, high = extreme("min", target.values), extreme("max", target.values)
    if (low, high) == (ZERO, ONE):
        return claim
    shown = [quantity_text(end, analysis.network) for end in (low, high)]
    words = f"; its values, from {shown[0]} to {shown[1]}, are rescaled affinely to 0 .. 1"
    return replace(claim, data={**claim.data, "range": shown}, hypotheses=claim.hypotheses + words)
