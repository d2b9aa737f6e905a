"""The proof of the splittings of a transition: the weights of its response, in closed form."""

from __future__ import annotations

from .algebra import Algebra, X
from .coefficients import number_of_trees
from .network import Graph, determinant, generator, minor
from .reading import invalid, items, members, whole
from .rows import MAX_ROWS


def read_splittings(value: object, entry: str, graph: Graph, e: int) -> list[int]:
    """Read sets of states with weights, and check that none is missing."""
    first, second = graph.ends[e]
    ends, total = 1 << first | 1 << second, 0
    found: dict[int, None] = {}
    for k, row in enumerate(items(value, entry, MAX_ROWS)):
        here = f"{entry}[{k}]"
        given, weight = members(row, here, "side", "weight")
        side = whole(given, f"{here}.side")
        if side >> graph.states or side & ends != 1 << second:
            raise invalid(f"{here}.side", "states with the second end, without the first", side)
        if side in found:
            raise invalid(f"{here}.side", "each set once", side)
        found[side] = None
        inner = set(graph.inner(side))
        unit = [int(i in inner) for i in range(2 * len(graph.ends))]
        rows = minor(generator(graph.states, graph.ends, unit), ends)
        wanted = int(determinant(rows, graph.work))
        if not wanted:
            raise invalid(f"{here}.side", "a connected set whose rest is connected", side)
        if whole(weight, f"{here}.weight") != wanted:
            raise invalid(f"{here}.weight", str(wanted), weight)
        total += wanted
    if total != number_of_trees(graph, roots=ends):
        raise invalid(entry, f"weights that add up to {number_of_trees(graph, roots=ends)}", total)
    return list(found)


def check_splitting(algebra: Algebra[X], e: int, sides: list[int], entry: str) -> None:
    """Check that the weights T_S give the trees that use a transition, state by state."""
    first, second = algebra.graph.ends[e]
    sums = [algebra.trees(k) for k in range(algebra.graph.states)]
    others = [k for k in range(algebra.graph.states) if k not in (first, second)]
    weights = {side: algebra.pairs(e, side) for side in sides}
    for k in others:
        rest = [sums[second], *(sums[j] for j in others if j != k)]
        algebra.require(entry, "weights of the sets with a state that add up to its trees",
                        [[weights[side]] for side in sides if side >> k & 1],
                        [[algebra.using(2 * e, k), *rest]])
    algebra.require(entry, "weights that add up to phi", [[weights[side]] for side in sides],
                    [[algebra.using(2 * e, second), *(sums[j] for j in others)]])
