"""Sums over trees as values at one random point modulo a prime, from determinants."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import cache
from math import prod

from .network import Graph, Path

PRIME = 2**61 - 1


class Residues:
    """Sums over trees of a graph; :class:`Polynomials` has the same methods."""

    def __init__(self, graph: Graph, draw: Callable[[], int]) -> None:
        self.graph = graph
        self.rates = [draw() if graph.can_run((i,)) else 0 for i in graph.every]
        self.trees, self._into = cache(self._trees), cache(self._sum)

    def _sum(self, roots: int, without: int = -1, rates: Sequence[int] = ()) -> int:
        return int(self.graph.forests(rates or self.rates, roots, without)) % PRIME

    def _trees(self, root: int, without: int = -1) -> int:
        """Return the sum over spanning trees to a root that do not use a transition."""
        return self._sum(1 << root, without)

    def using(self, rate: int, root: int) -> int:
        """Return the sum over spanning trees to a root that use a rate, divided by that rate."""
        rates = list(self.rates)
        rates[rate], rates[rate ^ 1] = 1, 0
        return (self._sum(1 << root, rates=rates) - self.trees(root, rate >> 1)) % PRIME

    def walk(self, path: Path) -> int:
        """Return the product of the rates along a path."""
        return prod(self.rates[i] for i in path) % PRIME

    def forests(self, path: Path, without: int = -1) -> int:
        """Return the sum over spanning forests that lead into a path, without a transition."""
        return self._into(self.graph.visited(path), without)

    def pairs(self, e: int, side: int) -> int:
        """Return T_S of transition e for a set S of states."""
        rates = [self.rates[i ^ 1] * self.trees(b) % PRIME if side >> a & 1 == side >> b & 1 else 0
                 for i in self.graph.every for a, b in [self.graph.step(i)]]
        first, second = self.graph.ends[e]
        return self._sum(1 << first | 1 << second, rates=rates)

    def equal(self, left: Sequence[Sequence[int]], right: Sequence[Sequence[int]]) -> bool:
        """Are two sums of products the same?"""
        totals = [sum(prod(term) % PRIME for term in terms) for terms in (left, right)]
        return (totals[0] - totals[1]) % PRIME == 0
