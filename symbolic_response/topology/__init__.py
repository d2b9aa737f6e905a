"""What depends on the graph of a network alone: trees, forests, cycles, splittings, blocks."""

from symbolic_response.topology.blocks import blocks, bridges
from symbolic_response.topology.cycles import (
    Cycle,
    can_run_against,
    can_run_along,
    cycles,
    fundamental_cycles,
)
from symbolic_response.topology.graph import (
    Graph,
    Progress,
    is_connected,
    is_strongly_connected,
    unreachable,
)
from symbolic_response.topology.paths import can_run_path, simple_paths
from symbolic_response.topology.splittings import connected_bipartitions, splittings
from symbolic_response.topology.trees import (
    SpanningTrees,
    count_rooted_trees,
    count_undirected_trees,
    rooted,
    spanning_trees,
    two_tree_forests,
)

__all__ = [
    "Cycle",
    "Graph",
    "Progress",
    "SpanningTrees",
    "blocks",
    "bridges",
    "can_run_against",
    "can_run_along",
    "can_run_path",
    "connected_bipartitions",
    "count_rooted_trees",
    "count_undirected_trees",
    "cycles",
    "fundamental_cycles",
    "is_connected",
    "is_strongly_connected",
    "rooted",
    "simple_paths",
    "spanning_trees",
    "splittings",
    "two_tree_forests",
    "unreachable",
]
