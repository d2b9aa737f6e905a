"""What depends on the graph of a network alone: trees, forests, cycles, splittings, blocks."""

from symbolic_response.topology.graph import (
    Graph,
    Progress,
    is_connected,
    is_strongly_connected,
    unreachable,
)
from symbolic_response.topology.trees import (
    SpanningTrees,
    count_rooted_trees,
    count_undirected_trees,
    rooted,
    spanning_trees,
    two_tree_forests,
)

__all__ = [
    "Graph",
    "Progress",
    "SpanningTrees",
    "count_rooted_trees",
    "count_undirected_trees",
    "is_connected",
    "is_strongly_connected",
    "rooted",
    "spanning_trees",
    "two_tree_forests",
    "unreachable",
]
