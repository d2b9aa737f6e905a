"""The networks that are timed: every rate its own symbol W_ij, from j to i."""

from __future__ import annotations

import networkx as nx

from symbolic_response.network import Network, Rates, build_network


def network_of(graph: nx.Graph, title: str) -> Network:
    """Return a network with one transition for each edge of a simple graph."""
    graph = nx.convert_node_labels_to_integers(graph, first_label=1)
    transitions = [
        Rates(f"s{i}", f"s{j}", f"W_{j}_{i}", f"W_{i}_{j}", name=f"e{i}_{j}")
        for i, j in sorted(tuple(sorted(edge)) for edge in graph.edges())
    ]
    states = {f"s{k}": {"latex": str(k)} for k in graph.nodes()}
    symbols = {
        name: {"latex": f"W_{{{i}{j}}}" if len(graph) < 10 else f"W_{{{i},{j}}}"}
        for a, b in graph.edges()
        for i, j in ((a, b), (b, a))
        for name in (f"W_{i}_{j}",)
    }
    return build_network(title, states=states, transitions=transitions, symbols=symbols)


def complete(n: int) -> Network:
    """Return the complete graph on n states."""
    return network_of(nx.complete_graph(n), f"complete graph on {n} states")


def cube() -> Network:
    """Return the cube: eight states, twelve transitions, 384 spanning trees."""
    return network_of(nx.hypercube_graph(3), "cube")


def ladder(rungs: int) -> Network:
    """Return the ladder of 2 x rungs states."""
    return network_of(nx.grid_2d_graph(2, rungs), f"ladder 2x{rungs}")


def square_with_chord() -> Network:
    """Return the square with a chord: 8 spanning trees."""
    graph = nx.cycle_graph(4)
    graph.add_edge(0, 2)
    return network_of(graph, "square with chord")
