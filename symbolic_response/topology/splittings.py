"""Divisions of the states into two connected parts, as bit masks of states."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from symbolic_response.errors import SizeLimitError
from symbolic_response.topology.graph import (
    Graph,
    Progress,
    breadth_first,
    check_mask_size,
    members,
    neighbours,
    reach,
)

Masks: TypeAlias = NDArray[np.uint64]


def connected_bipartitions(
    graph: Graph, *, limit: int = 200_000, progress: Progress | None = None
) -> Masks:
    """Divisions of the states into two connected parts: uint64[M], the part with state 0.

    In increasing order; directions are ignored, one-way transitions count. The time is bounded by
    a polynomial in the size for each division found. SizeLimitError past ``limit`` or above 64
    states; ValueError if the graph is not connected. ``progress`` gets the number found and the
    limit.

    >>> connected_bipartitions(Graph(3, ((0, 1), (1, 2)), (False, False))).tolist()
    [1, 3]
    """

    # The first state in breadth-first order outside the part with state 0 tells the cases apart:
    # those before it are a connected set inside.
    def sides() -> Iterator[int]:
        inside = 0
        for outside, _ in breadth_first(graph):
            if inside:
                yield from _sides(neighbours(graph), inside, outside)
            inside |= 1 << outside

    return _collect(graph, sides(), limit, progress)


def splittings(
    graph: Graph, transition: int, *, limit: int = 200_000, progress: Progress | None = None
) -> Masks:
    """Divisions into two connected parts that separate the ends of a transition: uint64[M].

    Each mask S holds the first end and not the second one; increasing order; errors and progress
    as for ``connected_bipartitions``.

    >>> splittings(Graph(3, ((0, 1), (1, 2), (2, 0)), (False,) * 3), 1).tolist()
    [2, 3]
    """
    first, second = graph.ends[transition]
    return _collect(graph, _sides(neighbours(graph), 1 << first, second), limit, progress)


def _collect(graph: Graph, sides: Iterator[int], limit: int, progress: Progress | None) -> Masks:
    check_mask_size(graph.size, "states")
    if len(breadth_first(graph)) < graph.size:
        raise ValueError("the graph is not connected")
    found: list[int] = []
    for side in sides:
        found.append(side)
        if len(found) > limit:
            raise SizeLimitError(
                f"more than {limit} divisions of the states into two connected parts; exact values"
                " at given points (--at) of quantities that need no splittings still work"
            )
        if progress is not None and len(found) % 1000 == 0:
            progress(len(found), limit)
    return np.array(sorted(found), dtype=np.uint64)


def _sides(steps: Sequence[int], start: int, outside: int) -> Iterator[int]:
    """Connected sets that contain the connected set ``start`` and whose complement is connected
    and contains ``outside``.

    The smallest one is everything that the rest cannot reach from ``outside`` without passing
    through ``start``. The others add a neighbouring state: those with the first neighbour, those
    with the second but not the first, and so on. Every set that comes up is one of those sought.
    """
    every = (1 << len(steps)) - 1

    def smallest(inside: int) -> int:
        return every & ~reach(steps, 1 << outside, every & ~inside)

    waiting = [(smallest(start), 1 << outside)]
    while waiting:
        inside, barred = waiting.pop()
        yield inside
        border = 0
        for state in members(inside):
            border |= steps[state]
        for state in members(border & ~inside & ~barred):
            larger = smallest(inside | 1 << state)
            if not larger & barred:
                waiting.append((larger, barred))
            barred |= 1 << state
