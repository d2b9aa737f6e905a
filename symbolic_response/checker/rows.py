"""Rows of a proof: all simple paths between two states, with the forests that lead into them."""

from __future__ import annotations

from itertools import pairwise

from .algebra import Algebra, X
from .coefficients import number_of_trees
from .network import Graph, Path
from .reading import invalid, items, members, numbers, whole

MAX_ROWS = 200_000


def read_rows(value: object, entry: str, graph: Graph, start: int, goal: int,
              without: int = -1) -> list[Path]:
    """Read paths with weights, and check that none is missing: weights add up to all trees."""
    found: set[Path] = set()
    weights: dict[int, int] = {}
    total = 0
    for k, row in enumerate(items(value, entry, MAX_ROWS, 0)):
        here = f"{entry}[{k}]"
        steps, weight = members(row, here, "steps", "weight")
        path = numbers(steps, f"{here}.steps", 2 * len(graph.ends))
        graph.work.charge(10 * len(path), 0)
        if _simple(graph, path) != (start, goal) or any(i >> 1 == without for i in path):
            raise invalid(f"{here}.steps", "a simple path between the right states", steps)
        if path in found:
            raise invalid(f"{here}.steps", "each path once", "one of the paths before")
        found.add(path)
        states = graph.visited(path)
        if states not in weights:
            weights[states] = number_of_trees(graph, without, states)
        if whole(weight, f"{here}.weight") != weights[states]:
            raise invalid(f"{here}.weight", str(weights[states]), weight)
        total += weights[states]
    if total != number_of_trees(graph, without):
        raise invalid(entry, f"weights that add up to {number_of_trees(graph, without)}", total)
    return sorted(found)


def _simple(graph: Graph, path: Path) -> tuple[int, int] | None:
    """Return the ends of a path that passes no state twice."""
    steps = [graph.step(i) for i in path]
    states = {state for step in steps for state in step}
    joined = all(a[1] == b[0] for a, b in pairwise(steps))
    return (steps[0][0], steps[-1][1]) if joined and len(states) == len(path) + 1 else None


def check_rows(algebra: Algebra[X], rows: list[Path], start: int, goal: int, entry: str,
               without: int = -1) -> None:
    """Check that trees to both ends are a path each, and a forest that leads into it."""
    forests = [algebra.forests(path, without) for path in rows]
    back = [tuple(i ^ 1 for i in reversed(path)) for path in rows]
    for root, paths in ((goal, rows), (start, back)):
        algebra.require(entry, "trees that are paths with forests",
                        [[algebra.trees(root, without)]],
                        [[algebra.walk(path), forest]
                         for path, forest in zip(paths, forests, strict=True)])
