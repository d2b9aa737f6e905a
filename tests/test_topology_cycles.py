"""Cycles, fundamental cycles, blocks and bridges against published counts and brute force."""

import time
from itertools import combinations

import networkx as nx
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from symbolic_response.errors import SizeLimitError
from symbolic_response.topology import (
    Cycle,
    Graph,
    blocks,
    bridges,
    can_run_against,
    can_run_along,
    cycles,
    fundamental_cycles,
)


def graph_of(drawn):
    drawn = nx.convert_node_labels_to_integers(drawn, ordering="sorted")
    ends = tuple(sorted(drawn.edges()))
    return Graph(len(drawn), ends, (False,) * len(ends))


@st.composite
def multigraphs(draw, max_size=5, max_transitions=9, connected=False):
    """Small graphs with parallel and one-way transitions."""
    size = draw(st.integers(1, max_size))
    ends = [(draw(st.integers(0, i - 1)), i) for i in range(1, size)] if connected else []
    more = draw(st.integers(0, max_transitions - len(ends))) if size > 1 else 0
    for _ in range(more):
        first = draw(st.integers(0, size - 1))
        ends.append((first, (first + draw(st.integers(1, size - 1))) % size))
    ends = draw(st.permutations(ends))
    one_way = draw(st.lists(st.booleans(), min_size=len(ends), max_size=len(ends)))
    return Graph(size, tuple(ends), tuple(one_way))


def closed_walks_by_trial(graph):
    """Every cycle as (states, transitions) in reference orientation, from sets of transitions."""
    for length in range(2, len(graph.ends) + 1):
        for chosen in combinations(range(len(graph.ends)), length):
            touched = [state for e in chosen for state in graph.ends[e]]
            if any(touched.count(state) != 2 for state in touched):
                continue
            start = min(touched)
            if length == 2:
                yield (start, max(touched)), chosen
                continue
            nearby = {e: sum(graph.ends[e]) - start for e in chosen if start in graph.ends[e]}
            first = min(nearby, key=nearby.__getitem__)
            states, walked = [start], [first]
            state = nearby[first]
            while state != start:
                states.append(state)
                (e,) = [f for f in chosen if f not in walked[-1:] and state in graph.ends[f]]
                walked.append(e)
                state = sum(graph.ends[e]) - state
            if len(walked) == length:
                yield tuple(states), tuple(walked)


def runs(graph, states, transitions):
    """(can be run along, can be run against), from the definition."""
    pairs = list(zip(states, states[1:] + states[:1], strict=True))
    steps = list(zip(transitions, pairs, strict=True))
    return (
        all(not graph.one_way[e] or graph.ends[e] == (i, j) for e, (i, j) in steps),
        all(not graph.one_way[e] or graph.ends[e] == (j, i) for e, (i, j) in steps),
    )


# OEIS A002807 (K_n), A070968 (K_n,n), A085408 (hypercubes), A140517 (grids); Petersen graph and
# octahedron: standard values.
PUBLISHED = [
    *(
        (f"K{n}", nx.complete_graph(n), c)
        for n, c in zip((3, 4, 5, 6, 7), (1, 7, 37, 197, 1172), strict=True)
    ),
    *(
        (f"K{n},{n}", nx.complete_bipartite_graph(n, n), c)
        for n, c in zip((2, 3, 4), (1, 15, 204), strict=True)
    ),
    *(
        (f"hypercube {n}", nx.hypercube_graph(n), c)
        for n, c in zip((2, 3, 4), (1, 28, 14704), strict=True)
    ),
    *(
        (f"grid {n}", nx.grid_2d_graph(n, n), c)
        for n, c in zip((2, 3, 4), (1, 13, 213), strict=True)
    ),
    ("Petersen", nx.petersen_graph(), 57),
    ("octahedron", nx.octahedral_graph(), 63),
    ("tree", nx.star_graph(6), 0),
    ("one state", nx.complete_graph(1), 0),
]


@pytest.mark.parametrize(("name", "drawn", "number"), PUBLISHED, ids=[p[0] for p in PUBLISHED])
def test_published_numbers_of_cycles(name, drawn, number):
    found = cycles(graph_of(drawn))
    assert len(found) == number
    assert len({frozenset(cycle.transitions) for cycle in found}) == number


@pytest.mark.parametrize(
    "drawn", [g for g in nx.graph_atlas_g() if 0 < len(g) <= 5 and nx.is_connected(g)]
)
def test_cycles_of_every_small_connected_graph(drawn):
    graph = graph_of(drawn)
    expected = {
        frozenset(frozenset(pair) for pair in zip(walk, walk[1:] + walk[:1], strict=True))
        for walk in nx.simple_cycles(nx.DiGraph(drawn))
        if len(walk) > 2
    }
    found = [frozenset(frozenset(graph.ends[e]) for e in c.transitions) for c in cycles(graph)]
    assert len(found) == len(set(found))
    assert set(found) == expected


@given(multigraphs())
@settings(max_examples=200, deadline=None)
def test_cycles_by_trial(graph):
    expected = sorted(closed_walks_by_trial(graph), key=lambda walk: (len(walk[0]), *walk))
    every = cycles(graph, undirected=True)
    assert [(cycle.states, cycle.transitions) for cycle in every] == expected
    possible = [walk for walk in expected if any(runs(graph, *walk))]
    found = cycles(graph)
    assert [(cycle.states, cycle.transitions) for cycle in found] == possible
    for cycle in found:
        assert cycle.along == tuple(
            graph.ends[e][0] == i for e, i in zip(cycle.transitions, cycle.states, strict=True)
        )
    for cycle in every:
        along, against = runs(graph, cycle.states, cycle.transitions)
        assert can_run_along(graph, cycle) == along
        assert can_run_against(graph, cycle) == against
        assert cycle.forward & cycle.backward == 0
        assert cycle.forward | cycle.backward == sum(1 << e for e in cycle.transitions)


@given(multigraphs(max_size=6, connected=True))
@settings(max_examples=100, deadline=None)
def test_one_way_cycles_against_directed_enumeration(graph):
    # Each one-way transition gets a state of its own, so that networkx sees parallel ones apart.
    drawn = nx.DiGraph()
    for e, (first, second) in enumerate(graph.ends):
        nx.add_path(drawn, [first, ("step", e), second])
    one_way = Graph(graph.size, graph.ends, (True,) * len(graph.ends))
    expected = {
        frozenset(node[1] for node in walk if isinstance(node, tuple))
        for walk in nx.simple_cycles(drawn)
    }
    assert {frozenset(cycle.transitions) for cycle in cycles(one_way)} == expected


def test_reference_orientation_and_order():
    graph = Graph(3, ((2, 0), (0, 1), (2, 1), (1, 0)), (False,) * 4)
    assert cycles(graph) == (
        Cycle((0, 1), (1, 3), (True, True)),
        Cycle((0, 1, 2), (1, 2, 0), (True, False, True)),
        Cycle((0, 1, 2), (3, 2, 0), (False, False, True)),
    )


@given(multigraphs(max_size=6, max_transitions=10, connected=True))
@settings(max_examples=100, deadline=None)
def test_fundamental_cycles_span_all(graph):
    basis = fundamental_cycles(graph)
    chords = [cycle.transitions[0] for cycle in basis]
    assert len(basis) == len(graph.ends) - graph.size + 1
    assert chords == sorted(chords)
    tree = nx.Graph(pair for e, pair in enumerate(graph.ends) if e not in chords)
    assert graph.size == 1 or (nx.is_tree(tree) and len(tree) == graph.size)
    if graph.size > 1:
        # Breadth-first: distances from state 0 in the tree are those in the graph.
        near = nx.single_source_shortest_path_length(nx.Graph(graph.ends), 0)
        assert dict(nx.single_source_shortest_path_length(tree, 0)) == dict(near)

    def vector(cycle):
        signs = [0] * len(graph.ends)
        for i, (e, ahead) in enumerate(zip(cycle.transitions, cycle.along, strict=True)):
            here = cycle.states[i]
            there = cycle.states[(i + 1) % len(cycle.states)]
            assert graph.ends[e] == ((here, there) if ahead else (there, here))
            signs[e] = 1 if ahead else -1
        return signs

    vectors = [vector(cycle) for cycle in basis]
    assert all(signs[chord] == 1 for signs, chord in zip(vectors, chords, strict=True))
    for cycle in cycles(graph, undirected=True):
        signs = vector(cycle)
        combined = [
            sum(signs[chord] * part[e] for chord, part in zip(chords, vectors, strict=True))
            for e in range(len(graph.ends))
        ]
        assert combined == signs


def test_fundamental_cycles_need_a_connected_graph():
    with pytest.raises(ValueError, match="connected"):
        fundamental_cycles(Graph(3, ((0, 1),), (False,)))


@given(multigraphs())
@settings(max_examples=100, deadline=None)
def test_blocks_are_transitions_that_share_a_cycle(graph):
    walks = [set(transitions) for _, transitions in closed_walks_by_trial(graph)]
    number = len(graph.ends)
    expected = {
        tuple(f for f in range(number) if f == e or any({e, f} <= walk for walk in walks))
        for e in range(number)
    }
    assert blocks(graph) == tuple(sorted(expected))
    assert bridges(graph) == tuple(e for e in range(number) if not any(e in walk for walk in walks))


def test_many_paths_and_few_cycles():
    # Eight complete graphs in a chain: about 300^8 paths from end to end, 8 * 1172 cycles.
    chain = nx.Graph()
    for i in range(8):
        chain.add_edges_from(combinations(range(6 * i, 6 * i + 7), 2))
    # A ring from which one-way layers lead to a dead end: 3^20 paths, one cycle that can be run.
    layers = [(3 * i + a, 3 * i + 3 + b) for i in range(1, 21) for a in range(3) for b in range(3)]
    ends = ((0, 1), (1, 2), (2, 0), (0, 3), (0, 4), (0, 5), *layers)
    begin = time.perf_counter()
    assert len(cycles(graph_of(chain))) == 8 * 1172
    assert len(cycles(Graph(66, ends, (True,) * len(ends)))) == 1
    assert time.perf_counter() - begin < 10


def test_limits():
    graph = graph_of(nx.complete_graph(5))
    assert len(cycles(graph, limit=37)) == 37
    with pytest.raises(SizeLimitError, match="36 cycles"):
        cycles(graph, limit=36)
    for one_way in (False, True):
        ends = graph.ends + tuple((j, i) for i, j in graph.ends)
        limited = Graph(5, ends, (one_way,) * 20)
        with pytest.raises(SizeLimitError, match=r"36 cycles.*--at"):
            cycles(limited, limit=36)
    begin = time.perf_counter()
    with pytest.raises(SizeLimitError, match="200000"):
        cycles(graph_of(nx.complete_graph(16)))
    # 3^20 choices of parallel transitions on one ring.
    ring = tuple((i, (i + 1) % 20) for i in range(20) for _ in range(3))
    with pytest.raises(SizeLimitError, match="1000 cycles"):
        cycles(Graph(20, ring, (False,) * 60), limit=1000)
    assert time.perf_counter() - begin < 15


def test_progress_is_reported():
    calls = []
    cycles(graph_of(nx.complete_graph(7)), progress=lambda *call: calls.append(call))
    assert calls == [(1000, 200_000)]


@pytest.mark.parametrize(
    "parts",
    [
        ((0,), (0,), (True,)),
        ((0, 1), (0,), (True, False)),
        ((0, 0), (0, 1), (True, False)),
        ((0, 1), (2, 2), (True, False)),
    ],
)
def test_what_is_no_cycle_is_refused(parts):
    with pytest.raises(ValueError, match="cycle"):
        Cycle(*parts)
