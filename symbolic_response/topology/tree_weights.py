"""The range of a sum of weights over the rates of a rooted spanning tree, without the trees."""

from __future__ import annotations

import math
from collections.abc import Mapping

from flint import fmpz_mat

from symbolic_response.topology.graph import Graph


def tree_weights(graph: Graph, weights: Mapping[tuple[int, bool], int]) -> tuple[int, int]:
    """Return the least and largest sum of weights over the rates of a tree to any root.

    Every rate is a power of one integer above the number of trees; the sum over trees towards a
    root, a determinant (Tutte 1948), is then read digit by digit. The weights are shifted by the
    least of them, which shifts every tree alike.

    >>> ring = Graph(3, ((0, 1), (1, 2), (2, 0)), (False,) * 3)
    >>> tree_weights(ring, {(0, False): 1, (1, True): 1})
    (0, 2)
    """
    existing = [(e, back) for e, single in enumerate(graph.one_way)
                for back in ((False,) if single else (False, True))]
    shift = min(weights.get(key, 0) for key in existing)
    degrees = [sum(key in ends for ends in graph.ends) for key in range(graph.size)]
    bits = math.prod(degrees).bit_length() + 1
    found: list[int] = []
    for root in range(graph.size):
        total = _sum_towards(graph, root, {
            key: 1 << bits * (weights.get(key, 0) - shift) for key in existing})
        if total:
            found += [(total & -total).bit_length() - 1, total.bit_length() - 1]
    offset = shift * (graph.size - 1)
    return min(found) // bits + offset, max(found) // bits + offset


def _sum_towards(graph: Graph, root: int, rates: Mapping[tuple[int, bool], int]) -> int:
    kept = [k for k in range(graph.size) if k != root]
    place = {k: i for i, k in enumerate(kept)}
    matrix = [[0] * len(kept) for _ in kept]
    for (e, back), rate in rates.items():
        tail, head = reversed(graph.ends[e]) if back else graph.ends[e]
        if tail in place:
            matrix[place[tail]][place[tail]] += rate
            if head in place:
                matrix[place[tail]][place[head]] -= rate
    return int(fmpz_mat(len(kept), len(kept), [x for row in matrix for x in row]).det())
