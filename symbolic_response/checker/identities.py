"""The identities of proofs, for sums over trees at a random point or as polynomials.

A list of paths, or of sets of states, comes with weights: numbers of forests, which add up to all.
"""

from __future__ import annotations

from collections.abc import Callable, Hashable, Sequence
from itertools import pairwise
from typing import Any, TypeVar

from .algebra import Residues
from .network import Graph, Path
from .reading import compare, invalid, items, members, numbers, whole
from .trees import Polynomials

T = TypeVar("T", bound=Hashable)
Algebra = Residues | Polynomials
Sum = Sequence[Sequence[Any]]  # a sum of products
MAX_ROWS = 200_000


def read_paths(value: object, entry: str, graph: Graph, start: int, goal: int,
               without: int = -1) -> list[Path]:
    """Read all simple paths between two states that avoid a transition."""
    weights: dict[int, int] = {}

    def read(steps: object, here: str) -> tuple[Path, int]:
        path = numbers(steps, here, len(graph.every))
        graph.work.charge(10 * len(path), 0)
        states = graph.visited(path)
        joined = all(graph.step(i)[1] == graph.step(j)[0] for i, j in pairwise(path))
        ends = graph.step(path[0])[0], graph.step(path[-1])[1]
        if not joined or states.bit_count() <= len(path) or ends != (start, goal) or any(
                i >> 1 == without for i in path):
            raise invalid(here, "a simple path between the right states", steps)
        if states not in weights:
            weights[states] = graph.number_of_trees(without, states)
        return path, weights[states]

    total = graph.number_of_trees(without)
    return sorted(_read_all(items(value, entry, MAX_ROWS, 0), entry, "steps", read, total))


def read_sets(value: object, entry: str, graph: Graph, e: int) -> list[int]:
    """Read all sets of states that are connected like the rest and split the ends of e."""
    first, second = graph.ends[e]
    ends = 1 << first | 1 << second

    def read(side: object, here: str) -> tuple[int, int]:
        states = whole(side, here)
        if states >> graph.states or states & ends != 1 << second:
            raise invalid(here, "states with the second end, without the first", states)
        inner = [int(states >> a & 1 == states >> b & 1) for i in graph.every
                 for a, b in [graph.step(i)]]
        weight = int(graph.forests(inner, ends))
        if not weight:
            raise invalid(here, "a connected set whose rest is connected", states)
        return states, weight

    total = graph.number_of_trees(roots=ends)
    return _read_all(items(value, entry, MAX_ROWS), entry, "side", read, total)


def _read_all(rows: list[object], entry: str, key: str,
              read: Callable[[object, str], tuple[T, int]], total: int) -> list[T]:
    """Read rows with weights that add up to a total, so that none is missing."""
    found: dict[T, int] = {}
    for k, row in enumerate(rows):
        here = f"{entry}[{k}]"
        given, weight = members(row, here, key, "weight")
        one, wanted = read(given, f"{here}.{key}")
        if one in found:
            raise invalid(f"{here}.{key}", "each once", given)
        compare(weight, wanted, f"{here}.weight")
        found[one] = wanted
    if sum(found.values()) != total:
        raise invalid(entry, f"weights that add up to {total}", sum(found.values()))
    return list(found)


def _require(algebra: Algebra, entry: str, identity: str, left: Sum, right: Sum) -> None:
    """Refuse a record for which two sums of products differ."""
    if not algebra.equal(left, right):
        raise invalid(entry, identity, "another value")


def check_edge(algebra: Algebra, e: int, cycles: list[Path], entry: str) -> None:
    """Check the identities of an edge: its ends are extremal, and their ratio is a mediant."""
    m, n = algebra.graph.ends[e]
    phi, a_m, a_n = algebra.using(2 * e, n), algebra.trees(m, e), algebra.trees(n, e)
    for i, root, wanted in ((2 * e, m, []), (2 * e + 1, n, []), (2 * e + 1, m, [[phi]])):
        _require(algebra, entry, "f_m = b_n = 0 and f_n = b_m", [[algebra.using(i, root)]], wanted)
    for k in range(algebra.graph.states):
        a, f, b = algebra.trees(k, e), algebra.using(2 * e, k), algebra.using(2 * e + 1, k)
        _require(algebra, entry, "phi a_k = a_m b_k + a_n f_k", [[phi, a]], [[a_m, b], [a_n, f]])
    check_paths(algebra, cycles, n, m, entry, e)


def check_paths(algebra: Algebra, paths: list[Path], start: int, goal: int, entry: str,
                without: int = -1) -> None:
    """Check that trees to both ends are a path each, and a forest that leads into it."""
    forests = [algebra.forests(path, without) for path in paths]
    back = [tuple(i ^ 1 for i in reversed(path)) for path in paths]
    for root, walks in ((goal, paths), (start, back)):
        _require(algebra, entry, "trees that are paths with forests",
                 [[algebra.trees(root, without)]],
                 [[algebra.walk(path), forest]
                  for path, forest in zip(walks, forests, strict=True)])


def check_splitting(algebra: Algebra, e: int, sides: list[int], entry: str) -> None:
    """Check that the weights T_S give the trees that use a transition, state by state."""
    first, second = algebra.graph.ends[e]
    sums = [algebra.trees(k) for k in range(algebra.graph.states)]
    others = [k for k in range(algebra.graph.states) if k not in (first, second)]
    weights = {side: algebra.pairs(e, side) for side in sides}
    for k in others:
        rest = [sums[second], *(sums[j] for j in others if j != k)]
        _require(algebra, entry, "weights of the sets with a state that add up to its trees",
                 [[weights[side]] for side in sides if side >> k & 1],
                 [[algebra.using(2 * e, k), *rest]])
    _require(algebra, entry, "weights that add up to phi", [[weights[side]] for side in sides],
             [[algebra.using(2 * e, second), *(sums[j] for j in others)]])
