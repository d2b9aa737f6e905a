"""The list of spanning trees, and polynomials made of it.

A monomial is one integer, with the exponent of rate i in a field of fixed width: a product is a
sum. A polynomial is a dictionary from monomials to coefficients.
"""

from __future__ import annotations

from collections.abc import Iterable

from .algebra import Algebra, Sum
from .coefficients import number_of_trees
from .network import Graph, Path, rank
from .reading import invalid, items, too_large, whole

Polynomial = dict[int, int]
MAX_TREES, MAX_DIRECTED = 200_000, 500_000  # of a list; directed to all roots, in polynomials
MAX_MEMORY = 4_000_000_000  # bits of one polynomial


def read_trees(value: object, graph: Graph) -> list[int]:
    """Return the list of all spanning trees."""
    found: list[int] = []
    for k, one in enumerate(items(value, "trees", MAX_TREES)):
        entry, mask = f"trees[{k}]", whole(one, f"trees[{k}]")
        graph.work.charge(10 * len(graph.ends), 0)
        ends = [pair for e, pair in enumerate(graph.ends) if mask >> e & 1]
        if mask >> len(graph.ends) or len(ends) != graph.states - 1 or (
                rank(graph.states, ends) != graph.states - 1):
            raise invalid(entry, "a spanning tree", mask)
        if found and mask <= found[-1]:
            raise invalid(entry, f"more than {found[-1]}", mask)
        found.append(mask)
    if len(found) != number_of_trees(graph):
        raise invalid("trees", f"{number_of_trees(graph)} spanning trees", len(found))
    return found


def ahead(graph: Graph, mask: int, roots: int) -> dict[int, int]:
    """Return for each state but the roots of a forest the rate that leads towards its root."""
    graph.work.charge(10 * graph.states, 0)
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


class Polynomials(Algebra[Polynomial]):
    """Values that are polynomials in the rates."""

    def __init__(self, graph: Graph, masks: list[int]) -> None:
        super().__init__(graph)
        if len(masks) * graph.states > MAX_DIRECTED:
            raise too_large("trees", MAX_DIRECTED // graph.states, len(masks))
        self.masks, self.width = masks, (2 * graph.states).bit_length()
        self.most = MAX_MEMORY // (1000 + 2 * self.width * len(graph.ends))
        there = set(graph.rates())
        self._absent = self.monomial(i for i in range(2 * len(graph.ends)) if i not in there)
        self._directed: dict[int, list[int]] = {}
        self._rests: dict[tuple[int, int, int], dict[Path, Polynomial]] = {}
        self._pairs: dict[int, dict[int, Polynomial]] = {}

    def monomial(self, rates: Iterable[int]) -> int:
        """Return the product of rates."""
        return sum(1 << self.width * i for i in rates)

    def directed(self, root: int) -> list[int]:
        """Return the trees directed to a root as monomials, rates that there are not included."""
        if root not in self._directed:
            self._directed[root] = [self.monomial(ahead(self.graph, mask, 1 << root).values())
                                    for mask in self.masks]
        return self._directed[root]

    def there(self, monomials: Iterable[int]) -> Polynomial:
        """Return the sum of those monomials that have only rates that there are."""
        return {x: 1 for x in monomials if not x & self._absent}

    def trees(self, root: int, without: int = -1) -> Polynomial:
        return self.there(x for x, mask in zip(self.directed(root), self.masks, strict=True)
                          if without < 0 or not mask >> without & 1)

    def using(self, rate: int, root: int) -> Polynomial:
        one = self.monomial([rate])
        return self.there(x - one for x in self.directed(root) if x & one)

    def walk(self, path: Path) -> Polynomial:
        return self.there([self.monomial(path)])

    def forests(self, path: Path, without: int = -1) -> Polynomial:
        start, goal = self.graph.step(path[0])[0], self.graph.step(path[-1])[1]
        if (start, goal, without) not in self._rests:
            self._rests[start, goal, without] = self._by_path(start, goal, without)
        return self._rests[start, goal, without].get(path, {})

    def _by_path(self, start: int, goal: int, without: int) -> dict[Path, Polynomial]:
        """Return what trees to a goal have beside the path from the start, by that path."""
        found: dict[Path, Polynomial] = {}
        for mask in self.masks:
            if without < 0 or not mask >> without & 1:
                rates, state, path = ahead(self.graph, mask, 1 << goal), start, []
                while state != goal:
                    path.append(rates.pop(state))
                    state = self.graph.step(path[-1])[1]
                found.setdefault(tuple(path), {}).update(
                    self.there([self.monomial(rates.values())]))
        return found

    def pairs(self, e: int, side: int) -> Polynomial:
        if e not in self._pairs:
            self._pairs[e] = self._by_side(e)
        return self._pairs[e].get(side, {})

    def _by_side(self, e: int) -> dict[int, Polynomial]:
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

    def add(self, total: Polynomial, product: Iterable[Polynomial], sign: int = 1) -> None:
        """Add a product of polynomials to a sum."""
        result: Polynomial = {0: sign}
        *others, last = product
        for factor in others:
            inner: Polynomial = {}
            self._accumulate(inner, result, factor)
            result = inner
        self._accumulate(total, result, last)

    def _accumulate(self, total: Polynomial, a: Polynomial, b: Polynomial) -> None:
        self.graph.work.charge(len(a) * len(b), self.width * len(self.graph.ends))
        for x, c in a.items():
            if len(total) > self.most:
                raise too_large("proofs", self.most, "polynomials of more terms")
            for y, d in b.items():
                total[x + y] = total.get(x + y, 0) + c * d

    def equal(self, left: Sum[Polynomial], right: Sum[Polynomial]) -> bool:
        difference: Polynomial = {}
        for sign, terms in ((1, left), (-1, right)):
            for product in terms:
                self.add(difference, product, sign)
        return not any(difference.values())
