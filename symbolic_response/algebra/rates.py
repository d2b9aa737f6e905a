"""The ring of rates: one positive generator for each directed rate of a network."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from symbolic_response.expressions.ring import Generator, Poly, Ring
from symbolic_response.expressions.tree import Symbol
from symbolic_response.topology import Graph


@dataclass(frozen=True, slots=True)
class RateRing:
    """``forward[e]`` and ``backward[e]`` are the places of e's rates; None for one-way."""

    graph: Graph
    ring: Ring
    forward: tuple[int, ...]
    backward: tuple[int | None, ...]

    def place(self, transition: int, backward: bool) -> int | None:
        """Return the place of a directed rate among the generators."""
        return self.backward[transition] if backward else self.forward[transition]

    def generator(self, transition: int, backward: bool = False) -> Poly:
        """Return a directed rate as a polynomial, 0 for the missing rate of a one-way step."""
        place = self.place(transition, backward)
        return self.ring.constant(0) if place is None else self.ring.context.gen(place)

    def directions(self) -> list[tuple[int, bool]]:
        """Return (transition, backward) for each generator, in order."""
        found = []
        for e, single in enumerate(self.graph.one_way):
            found.append((e, False))
            if not single:
                found.append((e, True))
        return found


def rate_ring(graph: Graph, names: tuple[str, ...]) -> RateRing:
    """Return the ring of the rates of a graph whose transitions bear ``names``."""
    generators: list[Generator] = []
    forward: list[int] = []
    backward: list[int | None] = []
    for transition, single in enumerate(graph.one_way):
        forward.append(len(generators))
        generators.append(_generator(f"forward[{names[transition]}]", len(generators)))
        backward.append(None if single else len(generators))
        if not single:
            generators.append(_generator(f"backward[{names[transition]}]", len(generators)))
    ring = Ring(generators, [1] * len(generators))
    return RateRing(graph, ring, tuple(forward), tuple(backward))


def _generator(name: str, place: int) -> Generator:
    return Generator("rate", place, name, Symbol(name), True)


Masks = NDArray[np.uint64]


def polynomial_from_masks(
    rates: RateRing, forward: Masks, backward: Masks, signs: NDArray[np.int8] | None = None
) -> Poly:
    """Return the sum of products of rates that masks of transitions describe.

    ``forward``, ``backward``: uint64[M], the transitions of each product used in either
    direction; ``signs``: int8[M], +1 if left out.
    """
    if not len(forward):
        return rates.ring.constant(0)
    columns = [
        ((backward if is_back else forward) >> np.uint64(transition)) & np.uint64(1)
        for transition, is_back in rates.directions()
    ]
    exponents = np.stack(columns, axis=1).astype(np.int64)
    if signs is None:
        return rates.ring.context.from_dict(dict.fromkeys(map(tuple, exponents.tolist()), 1))
    terms: dict[tuple[int, ...], int] = {}
    for key, sign in zip(map(tuple, exponents.tolist()), signs.tolist(), strict=True):
        terms[key] = terms.get(key, 0) + sign
    return rates.ring.context.from_dict({key: value for key, value in terms.items() if value})


def logarithmic_derivative(poly: Poly, ring: Ring, weights: dict[int, int]) -> Poly:
    """Return the sum over generators of weight * g dP/dg.

    ``weights`` maps places of generators to integers.
    """
    total = ring.constant(0)
    for place, weight in weights.items():
        if weight:
            total = total + ring.context.gen(place) * poly.derivative(place) * weight
    return total
