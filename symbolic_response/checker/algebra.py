"""Sums over trees in two kinds of values: residues at a random point, polynomials of listed trees.

A proof states its identities once, for values of either kind.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Callable, Sequence
from math import prod
from typing import Generic, TypeVar

from .network import Graph, Path, generator, minor
from .reading import invalid

X = TypeVar("X")
PRIME = 2**61 - 1
Sum = Sequence[Sequence[X]]  # a sum of products


class Algebra(ABC, Generic[X]):
    """Sums over the trees of a graph, and identities between them."""

    def __init__(self, graph: Graph) -> None:
        self.graph = graph

    @abstractmethod
    def trees(self, root: int, without: int = -1) -> X:
        """Return the sum over spanning trees to a root that do not use a transition."""

    @abstractmethod
    def using(self, rate: int, root: int) -> X:
        """Return the sum over spanning trees to a root that use a rate, divided by that rate."""

    @abstractmethod
    def walk(self, path: Path) -> X:
        """Return the product of the rates along a path."""

    @abstractmethod
    def forests(self, path: Path, without: int = -1) -> X:
        """Return the sum over spanning forests that lead into a path, without a transition."""

    @abstractmethod
    def pairs(self, e: int, side: int) -> X:
        """Return T_S of transition e for a set S of states."""

    @abstractmethod
    def equal(self, left: Sum[X], right: Sum[X]) -> bool:
        """Are two sums of products the same?"""

    def require(self, entry: str, identity: str, left: Sum[X], right: Sum[X]) -> None:
        """Refuse a record for which an identity does not hold."""
        if not self.equal(left, right):
            raise invalid(entry, identity, "another value")


class Residues(Algebra[int]):
    """Values at one random point modulo a prime, from determinants."""

    def __init__(self, graph: Graph, draw: Callable[[], int]) -> None:
        super().__init__(graph)
        self.rates = [draw() if graph.can_run((i,)) else 0 for i in range(2 * len(graph.ends))]
        self._forests: dict[tuple[int, int], int] = {}
        self._all = [self.trees(k) for k in range(graph.states)]

    def _sum(self, rates: Sequence[int], roots: int, without: int = -1) -> int:
        rows = minor(generator(self.graph.states, self.graph.ends, rates, without), roots)
        self.graph.work.charge(self.graph.states**2 + len(rows) ** 3, 0)
        return determinant(rows)

    def trees(self, root: int, without: int = -1) -> int:
        return self._sum(self.rates, 1 << root, without)

    def using(self, rate: int, root: int) -> int:
        rates = list(self.rates)
        rates[rate], rates[rate ^ 1] = 1, 0
        return (self._sum(rates, 1 << root) - self.trees(root, rate >> 1)) % PRIME

    def walk(self, path: Path) -> int:
        return prod(self.rates[i] for i in path) % PRIME

    def forests(self, path: Path, without: int = -1) -> int:
        key = self.graph.visited(path), without
        if key not in self._forests:
            self._forests[key] = self._sum(self.rates, *key)
        return self._forests[key]

    def pairs(self, e: int, side: int) -> int:
        rates = [0] * len(self.rates)
        for i in self.graph.inner(side):
            rates[i] = self.rates[i ^ 1] * self._all[self.graph.step(i)[1]] % PRIME
        first, second = self.graph.ends[e]
        return self._sum(rates, 1 << first | 1 << second)

    def equal(self, left: Sum[int], right: Sum[int]) -> bool:
        def total(terms: Sum[int]) -> int:
            return sum(prod(term) % PRIME for term in terms) % PRIME

        return total(left) == total(right)


def determinant(rows: list[list[int]]) -> int:
    """Return the determinant modulo the prime; changes the rows."""
    found = 1
    for k in range(len(rows)):
        pivot = next((i for i in range(k, len(rows)) if rows[i][k] % PRIME), None)
        if pivot is None:
            return 0
        if pivot != k:
            rows[k], rows[pivot], found = rows[pivot], rows[k], -found
        top = rows[k]
        found = found * top[k] % PRIME
        inverse = pow(top[k], -1, PRIME)
        for row in rows[k + 1 :]:
            if factor := row[k] * inverse % PRIME:
                row[k:] = [(x - factor * y) % PRIME for x, y in zip(row[k:], top[k:], strict=True)]
    return found % PRIME
