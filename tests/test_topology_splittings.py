"""Connected bipartitions and splittings against published counts and all subsets."""

import time

import networkx as nx
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from symbolic_response.errors import SizeLimitError
from symbolic_response.topology import Graph, connected_bipartitions, cycles, splittings


def graph_of(drawn):
    drawn = nx.convert_node_labels_to_integers(drawn, ordering="sorted")
    ends = tuple(sorted(drawn.edges()))
    return Graph(len(drawn), ends, (False,) * len(ends))


@st.composite
def connected_graphs(draw, max_size=7):
    """Connected graphs with parallel and one-way transitions, in any order."""
    size = draw(st.integers(1, max_size))
    names = draw(st.permutations(range(size)))
    ends = [(names[draw(st.integers(0, i - 1))], names[i]) for i in range(1, size)]
    for _ in range(draw(st.integers(0, 6)) if size > 1 else 0):
        first = draw(st.integers(0, size - 1))
        ends.append((first, (first + draw(st.integers(1, size - 1))) % size))
    one_way = draw(st.lists(st.booleans(), min_size=len(ends), max_size=len(ends)))
    return Graph(size, tuple(ends), tuple(one_way))


def connected_halves(graph):
    """Masks of all sets of states that are connected and have a connected complement."""
    drawn = nx.MultiGraph(graph.ends)
    drawn.add_nodes_from(range(graph.size))
    for mask in range(1, (1 << graph.size) - 1):
        inside = [i for i in range(graph.size) if mask >> i & 1]
        outside = [i for i in range(graph.size) if not mask >> i & 1]
        if nx.is_connected(drawn.subgraph(inside)) and nx.is_connected(drawn.subgraph(outside)):
            yield mask


# Complete graphs and rings: every proper subset, and two cuts of a ring. Grids: OEIS A068416.
# Cube, octahedron: cycles of the dual graph. Petersen graph: all subsets tried (below as well).
PUBLISHED = [
    *((f"K{n}", nx.complete_graph(n), 2 ** (n - 1) - 1) for n in range(2, 11)),
    *((f"ring {n}", nx.cycle_graph(n), n * (n - 1) // 2) for n in (3, 4, 10, 30, 64)),
    *((f"grid {n}", nx.grid_2d_graph(n, n), c) for n, c in enumerate((0, 6, 53, 627), 1)),
    ("cube", nx.hypercube_graph(3), 63),
    ("octahedron", nx.octahedral_graph(), 28),
    ("Petersen", nx.petersen_graph(), 191),
    ("path", nx.path_graph(12), 11),
]


@pytest.mark.parametrize(("name", "drawn", "number"), PUBLISHED, ids=[p[0] for p in PUBLISHED])
def test_published_numbers_of_connected_bipartitions(name, drawn, number):
    begin = time.perf_counter()
    found = connected_bipartitions(graph_of(drawn))
    assert time.perf_counter() - begin < 2
    assert len(found) == number
    assert found.dtype == np.uint64
    assert found.tolist() == sorted(set(found.tolist()))
    assert all(mask & 1 for mask in found.tolist())


def test_planar_dual():
    cube, octahedron = graph_of(nx.hypercube_graph(3)), graph_of(nx.octahedral_graph())
    assert len(connected_bipartitions(cube)) == len(cycles(octahedron))
    assert len(connected_bipartitions(octahedron)) == len(cycles(cube))


@pytest.mark.parametrize(
    "drawn",
    [g for g in nx.graph_atlas_g() if 0 < len(g) <= 5 and nx.is_connected(g)]
    + [nx.petersen_graph(), nx.grid_2d_graph(3, 3), nx.barbell_graph(4, 1)],
)
def test_bipartitions_of_every_small_connected_graph(drawn):
    graph = graph_of(drawn)
    expected = [mask for mask in connected_halves(graph) if mask & 1]
    assert connected_bipartitions(graph).tolist() == expected


@given(connected_graphs())
@settings(max_examples=100, deadline=None)
def test_splittings_by_trial(graph):
    halves = list(connected_halves(graph))
    assert connected_bipartitions(graph).tolist() == [mask for mask in halves if mask & 1]
    for e, (first, second) in enumerate(graph.ends):
        expected = [m for m in halves if m >> first & 1 and not m >> second & 1]
        assert splittings(graph, e).tolist() == expected


def test_splittings_of_large_rings_and_state_63():
    graph = graph_of(nx.cycle_graph(64))
    assert len(splittings(graph, 5)) == 63  # one cut on the transition, one on any other
    assert max(connected_bipartitions(graph).tolist()) >= 1 << 63


def test_limits_and_errors():
    graph = graph_of(nx.complete_graph(6))
    assert len(connected_bipartitions(graph, limit=31)) == 31
    with pytest.raises(SizeLimitError, match=r"more than 30 .*--at"):
        connected_bipartitions(graph, limit=30)
    with pytest.raises(SizeLimitError, match="200000"):  # the 435 transitions do not matter
        connected_bipartitions(graph_of(nx.complete_graph(30)))
    with pytest.raises(SizeLimitError, match="65 states"):
        splittings(graph_of(nx.cycle_graph(65)), 0)
    with pytest.raises(ValueError, match="connected"):
        connected_bipartitions(Graph(3, ((0, 1),), (False,)))


def test_progress_is_reported():
    calls = []
    graph = graph_of(nx.complete_graph(12))
    connected_bipartitions(graph, progress=lambda *call: calls.append(call))
    assert calls == [(1000, 200_000), (2000, 200_000)]
