"""Simple paths between two states, parallel transitions told apart."""

from __future__ import annotations

from symbolic_response.errors import SizeLimitError
from symbolic_response.topology.graph import Graph, incident

Step = tuple[int, bool]
"""A transition and whether it is run from its first to its second state."""


def simple_paths(
    graph: Graph, start: int, end: int, *, limit: int = 20_000
) -> tuple[tuple[Step, ...], ...]:
    """Return all paths from ``start`` to ``end`` that repeat no state, directions ignored.

    Those that one-way transitions let be run neither way are left out. In order of the depth-first
    search that takes transitions in order. Raises SizeLimitError past ``limit`` paths.

    >>> simple_paths(Graph(3, ((0, 1), (1, 2), (2, 0)), (False,) * 3), 0, 2)
    (((0, True), (1, True)), ((2, False),))
    """
    adjacent = incident(graph)
    found: list[tuple[Step, ...]] = []
    stack: list[tuple[int, tuple[Step, ...], int]] = [(start, (), 1 << start)]
    while stack:
        state, path, seen = stack.pop()
        if state == end:
            if can_run_path(graph, path, True) or can_run_path(graph, path, False):
                found.append(path)
                if len(found) > limit:
                    raise SizeLimitError(f"more than {limit} simple paths between two states")
            continue
        for transition, other in reversed(adjacent[state]):
            if not seen >> other & 1:
                ahead = graph.ends[transition][0] == state
                stack.append((other, (*path, (transition, ahead)), seen | 1 << other))
    return tuple(found)


def can_run_path(graph: Graph, path: tuple[Step, ...], along: bool) -> bool:
    """Return whether one-way transitions let a path be run along, or against, its direction."""
    return not any(graph.one_way[e] and ahead != along for e, ahead in path)
