"""Paths of transitions: forest differences add up along them."""

from __future__ import annotations

from collections.abc import Sequence

from symbolic_response.topology import Graph


def spanning(graph: Graph, transitions: Sequence[int]) -> list[int]:
    """Return the transitions that close no cycle with those before them (Kruskal)."""
    label = list(range(graph.size))
    chosen = []
    for e in transitions:
        one, other = (label[end] for end in graph.ends[e])
        if one != other:
            chosen.append(e)
            label = [other if entry == one else entry for entry in label]
    return chosen


def along(graph: Graph, e: int, tree: Sequence[int]) -> list[tuple[int, bool]]:
    """Return the path in a tree from e's first to its second end: (transition, backward).

    >>> along(Graph(3, ((0, 1), (2, 1), (0, 2)), (False,) * 3), 2, [0, 1])
    [(0, False), (1, True)]
    """
    start, goal = graph.ends[e]
    ways: dict[int, list[tuple[int, bool]]] = {start: []}
    waiting = [start]
    while goal not in ways:
        state = waiting.pop(0)
        for step in tree:
            first, second = graph.ends[step]
            for tail, head, backward in ((first, second, False), (second, first, True)):
                if tail == state and head not in ways:
                    ways[head] = [*ways[state], (step, backward)]
                    waiting.append(head)
    return ways[goal]
