"""Numerators and denominators as sums over spanning trees, each term with the trees behind it.

p(U) = N(U)/D, <Q> = (sum of Q_k N_k)/D, J_e = (w+ N_m - w- N_n)/D, and quotients of two
probabilities: N_k the sum over spanning trees towards k, D the sum of all (King and Altman 1956;
Hill 1966).
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import reduce

from symbolic_response.expressions.ring import Ring, union
from symbolic_response.expressions.tree import (
    Expression,
    Number,
    Power,
    Product,
)
from symbolic_response.hand.diagnosis.written import (
    Terms,
    Written,
    product_of_terms,
    scaled,
    sum_of_terms,
    written,
)
from symbolic_response.network.quantities import Current, Mean, Probability, Traffic
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import rooted

MAX_TREES = 3_000
MAX_MONOMIALS = 30_000

Rate = tuple[int, bool]
"""A directed rate: the transition, and whether it is run backward."""


@dataclass(frozen=True, slots=True)
class Origin:
    """A spanning tree, with a rate in front for flows, and what it adds to a sum."""

    root: int
    rates: tuple[Rate, ...]
    leading: Rate | None
    product: Terms


@dataclass(frozen=True, slots=True)
class Slot:
    """A sum over trees: its name, the roots that are right in it, the trees, the whole sum."""

    name: str
    roots: frozenset[int]
    origins: tuple[Origin, ...]
    terms: Terms


@dataclass(frozen=True, slots=True)
class Reference:
    """What a numerator and a denominator should be, over a ring; ``rates`` as sums of terms."""

    ring: Ring
    top: Slot
    bottom: Slot
    rates: Mapping[Rate, Terms]


def reference(quantity: Expression, analysis: Analysis, hand: Ring) -> Reference | None:
    """Return numerator and denominator of a quantity over trees, in a ring that holds ``hand``.

    None for other quantities, for rates that are no sums of products, and for many trees.
    """
    weights = _weights(quantity, analysis)
    if weights is None or sum(analysis.tree_counts) > MAX_TREES:
        return None
    forms = {rate: written(analysis.rate_expression(*rate), analysis.domain)
             for rate in analysis.rates.directions()}
    ring = union([hand, *(form.ring for form in forms.values())])
    rates: dict[Rate, Terms] = {}
    for rate, form in forms.items():
        if len(form.bottom.poly) > 1:
            return None
        rates[rate] = form.top.over(form.ring, ring).terms()
    if sum(analysis.tree_counts) * max(map(len, rates.values())) > MAX_MONOMIALS:
        return None
    names = ("numerator", "normalisation" if weights[2] else "denominator")
    slots = [_slot(name, parts, rates, analysis)
             for name, parts in zip(names, weights[:2], strict=True)]
    return Reference(ring, slots[0], slots[1], rates)


@dataclass(frozen=True, slots=True)
class _Part:
    """A tree sum in a numerator or denominator: towards ``root``, times a number and a rate."""

    root: int
    weight: Fraction
    leading: Rate | None = None


def _weights(
    quantity: Expression, analysis: Analysis
) -> tuple[list[_Part], list[_Part], bool] | None:
    """Return the tree sums above and below, and whether those below are all of them."""
    every = [_Part(k, Fraction(1)) for k in range(analysis.graph.size)]
    match quantity:
        case Probability(states):
            return [_Part(k, Fraction(1)) for k in states], every, True
        case Mean(place):
            values = analysis.network.observables[place].values
            numbers = [value.value for value in values if isinstance(value, Number)]
            if len(numbers) == len(values):
                return [_Part(k, q) for k, q in enumerate(numbers) if q], every, True
        case Current(e):
            return _flows(e, -1, analysis), every, True
        case Traffic(e):
            return _flows(e, 1, analysis), every, True
        case Product((Probability(above), Power(Probability(below), exponent))) if exponent == -1:
            return ([_Part(k, Fraction(1)) for k in above],
                    [_Part(k, Fraction(1)) for k in below], False)
    return None


def _flows(e: int, sign: int, analysis: Analysis) -> list[_Part]:
    first, second = analysis.graph.ends[e]
    parts = [_Part(first, Fraction(1), (e, False))]
    if not analysis.graph.one_way[e]:
        parts.append(_Part(second, Fraction(sign), (e, True)))
    return parts


def _slot(
    name: str, parts: Sequence[_Part], rates: Mapping[Rate, Terms], analysis: Analysis
) -> Slot:
    origins = []
    for part in parts:
        forward, backward = rooted(analysis.trees, part.root)
        for ahead, back in zip(forward.tolist(), backward.tolist(), strict=True):
            tree = tuple((e, bool(back >> e & 1)) for e in range(len(analysis.graph.ends))
                         if (ahead | back) >> e & 1)
            chosen = tree if part.leading is None else (part.leading, *tree)
            product = reduce(product_of_terms, (rates[rate] for rate in chosen))
            zero = (0,) * len(next(iter(product)))
            origins.append(Origin(part.root, tree, part.leading,
                                  scaled(product, zero, part.weight)))
    return Slot(name, frozenset(part.root for part in parts), tuple(origins),
                sum_of_terms(origin.product for origin in origins))


def over_common_ring(form: Written, other: Written) -> tuple[Written, Written]:
    """Return two quotients over one ring."""
    ring = union([form.ring, other.ring])
    return form.over(ring), other.over(ring)
