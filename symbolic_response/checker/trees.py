"""The list of spanning trees, and polynomials made of it.

A monomial is one integer, with the exponent of rate i in a field of fixed width: a product is a
sum. A polynomial is a dictionary from monomials to coefficients.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from functools import cache

from .network import Graph, Path
from .reading import invalid, items, too_large, whole

Polynomial = dict[int, int]
MAX_TREES, MAX_DIRECTED = 200_000, 500_000  # of a list; directed to all roots, in polynomials
MAX_MEMORY = 4_000_000_000  # bits of one polynomial


def read_trees(value: object, graph: Graph) -> list[int]:
    """Return the list of all spanning trees."""
    found: list[int] = []
    for k, one in enumerate(items(value, "trees", MAX_TREES)):
        entry, mask = f"trees[{k}]", whole(one, f"trees[{k}]")
        if mask >> len(graph.ends) or not (
                mask.bit_count() == graph.states - 1 == len(ahead(graph, mask, 1))):
            raise invalid(entry, "a spanning tree", mask)
        if found and mask <= found[-1]:
            raise invalid(entry, f"more than {found[-1]}", mask)
        found.append(mask)
    if len(found) != graph.number_of_trees():
        raise invalid("trees", f"{graph.number_of_trees()} spanning trees", len(found))
    return found


def ahead(graph: Graph, mask: int, roots: int) -> dict[int, int]:
    """Return for each state but the roots of a forest the rate that leads towards its root."""
    graph.work.charge(10 * len(graph.ends), 0)
    into: list[list[int]] = [[] for _ in range(graph.states)]
    for e, (first, second) in enumerate(graph.ends):
        if mask >> e & 1:
            into[second].append(2 * e)
            into[first].append(2 * e + 1)
    found: dict[int, int] = {}
    waiting = [k for k in range(graph.states) if roots >> k & 1]
    while waiting:
        for i in into[waiting.pop()]:
            state = graph.step(i)[0]
            if state not in found and not roots >> state & 1:
                found[state] = i
                waiting.append(state)
    return found


class Polynomials:
    """Sums over trees of a graph as polynomials in the rates; as residues: :class:`Residues`."""

    def __init__(self, graph: Graph, masks: list[int]) -> None:
        if len(masks) * graph.states > MAX_DIRECTED:
            raise too_large("trees", MAX_DIRECTED // graph.states, len(masks))
        self.graph, self.masks, self.width = graph, masks, (2 * graph.states).bit_length()
        self.most = MAX_MEMORY // (1000 + 2 * self.width * len(graph.ends))
        self._absent = self.monomial(i for i in graph.every if not graph.can_run((i,)))
        self.directed, self._by_side = cache(self._directed), cache(self._all_pairs)

    def monomial(self, rates: Iterable[int]) -> int:
        """Return the product of rates."""
        return sum(1 << self.width * i for i in rates)

    def _directed(self, root: int) -> list[int]:
        """Return the trees directed to a root as monomials, rates that there are not included."""
        return [self.monomial(ahead(self.graph, mask, 1 << root).values()) for mask in self.masks]

    def there(self, monomials: Iterable[int]) -> Polynomial:
        """Return the sum of those monomials that have only rates that there are."""
        return {x: 1 for x in monomials if not x & self._absent}

    def _beside(self, path: Path, root: int, without: int = -1) -> Polynomial:
        """Return the sum over trees to a root that hold some rates, divided by these."""
        self.graph.work.charge(len(self.masks), 0)
        held = self.monomial(path)
        return self.there(x - held for x, mask in zip(self.directed(root), self.masks, strict=True)
                          if x & held == held and (without < 0 or not mask >> without & 1))

    def trees(self, root: int, without: int = -1) -> Polynomial:
        """Return the sum over spanning trees to a root that do not use a transition."""
        return self._beside((), root, without)

    def using(self, rate: int, root: int) -> Polynomial:
        """Return the sum over spanning trees to a root that use a rate, divided by that rate."""
        return self._beside((rate,), root)

    def walk(self, path: Path) -> Polynomial:
        """Return the product of the rates along a path."""
        return self.there([self.monomial(path)])

    def forests(self, path: Path, without: int = -1) -> Polynomial:
        """Return the sum over spanning forests that lead into a path, without a transition."""
        return self._beside(path, self.graph.step(path[-1])[1], without)

    def pairs(self, e: int, side: int) -> Polynomial:
        """Return T_S of transition e for a set S of states."""
        return self._by_side(e).get(side, {})

    def _all_pairs(self, e: int) -> dict[int, Polynomial]:
        """Return T_S by S: rates reversed, each times the trees to the state it came from."""
        first, second = self.graph.ends[e]
        sums = [self.trees(k) for k in range(self.graph.states)]
        groups: dict[int, dict[tuple[int, ...], list[int]]] = {}
        for mask in self.masks:
            if mask >> e & 1:
                rates = ahead(self.graph, mask ^ 1 << e, 1 << first | 1 << second)
                parents = tuple(sorted(self.graph.step(i)[1] for i in rates.values()))
                side = sum(1 << k for k in ahead(self.graph, mask ^ 1 << e, 1 << second))
                groups.setdefault(side | 1 << second, {}).setdefault(parents, []).append(
                    self.monomial(i ^ 1 for i in rates.values()))
        found: dict[int, Polynomial] = {}
        for side, members in groups.items():
            found[side] = {}
            for parents, monomials in members.items():
                self.add(found[side], [self.there(monomials), *(sums[k] for k in parents)])
        return found

    def add(self, total: Polynomial, factors: Sequence[Polynomial], sign: int = 1) -> None:
        """Add a product of polynomials to a sum."""
        result: Polynomial = {0: sign}
        for k, factor in enumerate(factors, 1):
            made: Polynomial = total if k == len(factors) else {}
            self.graph.work.charge(len(result) * len(factor), self.width * len(self.graph.ends))
            for x, c in result.items():
                if len(made) > self.most:
                    raise too_large("proofs", self.most, "polynomials of more terms")
                for y, d in factor.items():
                    made[x + y] = made.get(x + y, 0) + c * d
            result = made

    def equal(self, left: Sequence[Sequence[Polynomial]],
              right: Sequence[Sequence[Polynomial]]) -> bool:
        """Are two sums of products the same?"""
        difference: Polynomial = {}
        for sign, terms in ((1, left), (-1, right)):
            for product in terms:
                self.add(difference, product, sign)
        return not any(difference.values())
