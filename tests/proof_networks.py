"""Random strongly connected networks, and brute force over their trees, for tests of proofs."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import combinations

from hypothesis import assume
from hypothesis import strategies as st

from symbolic_response.network import Network, Rates, build_network
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import Graph
from symbolic_response.topology.graph import is_strongly_connected

Rate = tuple[int, bool]


def network_on(graph: Graph, title: str = "drawn") -> Network:
    """Return a network whose rates are all symbols of their own."""
    transitions = [
        Rates(f"s{a}", f"s{b}", f"u{e}", None if single else f"v{e}", name=f"t{e}")
        for e, ((a, b), single) in enumerate(zip(graph.ends, graph.one_way, strict=True))
    ]
    return build_network(title, states=[f"s{k}" for k in range(graph.size)],
                         transitions=transitions)


@st.composite
def strong_graphs(draw: st.DrawFn, max_size: int = 4, extra: int = 3) -> Graph:
    """Strongly connected multigraphs with parallel transitions, bridges and one-way steps."""
    size = draw(st.integers(2, max_size))
    ends, one_way = [], []
    for k in range(1, size):  # a tree first, so that few draws are thrown away
        other = draw(st.integers(0, k - 1))
        ends.append((k, other) if draw(st.booleans()) else (other, k))
    for _ in range(draw(st.integers(0, extra))):
        first = draw(st.integers(0, size - 1))
        ends.append((first, (first + draw(st.integers(1, size - 1))) % size))
    for _ in ends:
        one_way.append(draw(st.integers(0, 3)) == 0)
    graph = Graph(size, tuple(ends), tuple(one_way))
    assume(is_strongly_connected(graph))
    return graph


def analysis_of(graph: Graph) -> Analysis:
    return Analysis(network_on(graph))


def rooted_trees(graph: Graph, root: int, also_back: int | None = None) -> Iterator[list[Rate]]:
    """Yield all trees directed to a root: every other state takes one way out, no circuit."""
    others = [k for k in range(graph.size) if k != root]
    exits: dict[int, list[tuple[int, Rate]]] = {k: [] for k in others}
    for e, (first, second) in enumerate(graph.ends):
        if first in exits:
            exits[first].append((second, (e, False)))
        if second in exits and (not graph.one_way[e] or e == also_back):
            exits[second].append((first, (e, True)))

    def extend(place: int, chosen: dict[int, tuple[int, Rate]]) -> Iterator[list[Rate]]:
        if place == len(others):
            if all(leads(chosen, k, root, graph.size) for k in others):
                yield [rate for _, rate in chosen.values()]
            return
        for choice in exits[others[place]]:
            yield from extend(place + 1, {**chosen, others[place]: choice})

    yield from extend(0, {})


def leads(chosen: dict[int, tuple[int, Rate]], start: int, root: int, size: int) -> bool:
    for _ in range(size):
        if start == root:
            return True
        start = chosen[start][0]
    return start == root


def undirected_trees(graph: Graph) -> list[tuple[int, ...]]:
    """Return all spanning trees as sets of transitions."""
    found = []
    for chosen in combinations(range(len(graph.ends)), graph.size - 1):
        label = list(range(graph.size))
        for e in chosen:
            one, other = (label[end] for end in graph.ends[e])
            label = [other if entry == one else entry for entry in label]
        if len(set(label)) == 1:
            found.append(chosen)
    return found
