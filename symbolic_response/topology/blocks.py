"""Blocks (biconnected components) and bridges."""

from __future__ import annotations

from symbolic_response.topology.graph import Graph


def blocks(graph: Graph) -> tuple[tuple[int, ...], ...]:
    """Transitions that share a simple cycle, directions ignored, grouped; a bridge is alone.

    Each group is increasing, and groups are ordered by their first transition. Parallel
    transitions belong together.

    >>> blocks(Graph(4, ((0, 1), (1, 2), (2, 3), (1, 3)), (False,) * 4))
    ((0,), (1, 2, 3))
    """
    import networkx

    simple = networkx.Graph(graph.ends)
    number = {
        frozenset(pair): index
        for index, component in enumerate(networkx.biconnected_component_edges(simple))
        for pair in component
    }
    groups: dict[int, list[int]] = {}
    for transition, pair in enumerate(graph.ends):
        groups.setdefault(number[frozenset(pair)], []).append(transition)
    return tuple(tuple(group) for group in groups.values())


def bridges(graph: Graph) -> tuple[int, ...]:
    """Transitions that are in no cycle, directions ignored, in increasing order.

    >>> bridges(Graph(4, ((0, 1), (1, 2), (2, 3), (1, 3)), (False,) * 4))
    (0,)
    """
    return tuple(group[0] for group in blocks(graph) if len(group) == 1)
