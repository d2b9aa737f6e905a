"""Spanning trees and two-tree forests against published counts and brute force."""

from itertools import combinations

import networkx as nx
import numpy as np
import pytest
import sympy
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from symbolic_response.errors import SizeLimitError
from symbolic_response.topology import (
    Graph,
    count_rooted_trees,
    count_undirected_trees,
    rooted,
    spanning_trees,
    two_tree_forests,
)


def graph_of(drawn):
    drawn = nx.convert_node_labels_to_integers(drawn, ordering="sorted")
    ends = tuple(sorted(drawn.edges()))
    return Graph(len(drawn), ends, (False,) * len(ends))


@st.composite
def multigraphs(draw, max_size=5, max_transitions=8):
    """Small graphs, connected or not, with parallel and one-way transitions."""
    size = draw(st.integers(1, max_size))
    number = draw(st.integers(0, max_transitions)) if size > 1 else 0
    ends, one_way = [], []
    for _ in range(number):
        first = draw(st.integers(0, size - 1))
        second = (first + draw(st.integers(1, size - 1))) % size
        ends.append((first, second))
        one_way.append(draw(st.booleans()))
    return Graph(size, tuple(ends), tuple(one_way))


def components(size, pairs):
    """Component label of each state, or None if the pairs close a circuit."""
    label = list(range(size))
    for first, second in pairs:
        if label[first] == label[second]:
            return None
        label = [label[second] if entry == label[first] else entry for entry in label]
    return label


def directed(graph, chosen, roots):
    """Masks (forward, backward) of a forest directed towards its roots, by removing leaves."""
    forward = backward = 0
    left = set(chosen)
    while left:
        for e in sorted(left):
            for here, there, ahead in (
                (graph.ends[e][0], graph.ends[e][1], True),
                (graph.ends[e][1], graph.ends[e][0], False),
            ):
                is_leaf = sum(here in graph.ends[f] for f in left) == 1
                if e in left and is_leaf and here not in roots:
                    assert there != here
                    left.discard(e)
                    forward, backward = (
                        (forward | 1 << e, backward) if ahead else (forward, backward | 1 << e)
                    )
    return forward, backward


def allowed(graph, backward):
    return not any(backward >> e & 1 for e, single in enumerate(graph.one_way) if single)


def trees_by_trial(graph):
    for chosen in combinations(range(len(graph.ends)), graph.size - 1):
        if components(graph.size, [graph.ends[e] for e in chosen]) is not None:
            yield chosen


# OEIS A000272, A072590, A004146, A006235, A007341, A006237, A001353; Petersen, octahedron, Wagner
# graph and square with diagonal: standard values.
PUBLISHED = [
    *((f"K{n}", nx.complete_graph(n), n ** (n - 2)) for n in range(2, 9)),
    *(
        (f"K{m},{n}", nx.complete_bipartite_graph(m, n), m ** (n - 1) * n ** (m - 1))
        for m in range(1, 5)
        for n in range(m, 6)
    ),
    *(
        (f"wheel {r}", nx.wheel_graph(r + 1), t)
        for r, t in zip((3, 4, 5, 6), (16, 45, 121, 320), strict=True)
    ),
    *(
        (f"prism {n}", nx.circular_ladder_graph(n), t)
        for n, t in zip((3, 4, 5), (75, 384, 1805), strict=True)
    ),
    *((f"grid {n}", nx.grid_2d_graph(n, n), t) for n, t in enumerate((1, 4, 192, 100352), 1)),
    *((f"hypercube {n}", nx.hypercube_graph(n), t) for n, t in enumerate((1, 4, 384), 1)),
    *((f"ladder {n}", nx.ladder_graph(n), t) for n, t in enumerate((1, 4, 15, 56), 1)),
    ("Petersen", nx.petersen_graph(), 2000),
    ("octahedron", nx.octahedral_graph(), 384),
    ("Wagner", nx.circulant_graph(8, [1, 4]), 392),
    ("square with diagonal", nx.Graph([(0, 1), (1, 2), (2, 3), (3, 0), (0, 2)]), 8),
    ("one state", nx.complete_graph(1), 1),
]


@pytest.mark.parametrize(("name", "drawn", "number"), PUBLISHED, ids=[p[0] for p in PUBLISHED])
def test_published_numbers_of_trees(name, drawn, number):
    graph = graph_of(drawn)
    assert count_undirected_trees(graph) == number
    assert {count_rooted_trees(graph, root) for root in range(graph.size)} == {number}
    trees = spanning_trees(graph, limit=10**7)
    assert len(trees.masks) == number
    assert trees.forward.shape == (graph.size, number)
    assert trees.masks.dtype == trees.forward.dtype == np.uint64
    assert (np.diff(trees.masks.astype(object)) > 0).all()


def test_large_numbers_of_trees_are_exact():
    assert count_undirected_trees(graph_of(nx.hypercube_graph(4))) == 42467328  # A006237
    assert count_undirected_trees(graph_of(nx.complete_graph(18))) == 18**16  # A000272
    assert count_undirected_trees(graph_of(nx.complete_graph(70))) == 70**68  # above 64 states


@pytest.mark.parametrize(
    "drawn", [g for g in nx.graph_atlas_g() if 0 < len(g) <= 5 and nx.is_connected(g)]
)
def test_trees_of_every_small_connected_graph(drawn):
    graph = graph_of(drawn)
    found = {
        frozenset(graph.ends[e] for e in range(len(graph.ends)) if mask >> e & 1)
        for mask in spanning_trees(graph).masks.tolist()
    }
    expected = set()
    if len(drawn) > 1:
        for tree in nx.SpanningTreeIterator(drawn):
            expected.add(frozenset(tuple(sorted(pair)) for pair in tree.edges()))
    else:
        expected.add(frozenset())
    assert found == expected
    assert len(found) == len(spanning_trees(graph).masks)


@given(multigraphs())
@settings(max_examples=150, deadline=None)
def test_trees_and_directions_by_trial(graph):
    expected = list(trees_by_trial(graph))
    trees = spanning_trees(graph)
    assert trees.masks.tolist() == sorted(sum(1 << e for e in chosen) for chosen in expected)
    assert count_undirected_trees(graph) == len(expected)
    for root in range(graph.size):
        pairs = [directed(graph, chosen, {root}) for chosen in expected]
        by_mask = {ahead | back: (ahead, back) for ahead, back in pairs}
        assert trees.forward[root].tolist() == [by_mask[m][0] for m in trees.masks.tolist()]
        possible = [by_mask[m] for m in sorted(by_mask) if allowed(graph, by_mask[m][1])]
        ahead, back = rooted(trees, root)
        assert list(zip(ahead.tolist(), back.tolist(), strict=True)) == possible
        assert count_rooted_trees(graph, root) == len(possible)


def test_transition_number_63():
    # 63 parallel transitions and one more make a path of three states with 63 trees.
    graph = Graph(3, ((0, 1),) * 63 + ((2, 1),), (False,) * 63 + (True,))
    ahead, back = rooted(spanning_trees(graph), 0)
    assert ahead.tolist() == [1 << 63] * 63
    assert back.tolist() == [1 << e for e in range(63)]
    assert len(rooted(spanning_trees(graph), 2)[0]) == 0


def forests_by_trial(graph, transition, state):
    """(sign, forward, backward) of every pair of rooted trees that ``transition`` would join."""
    first, second = graph.ends[transition]
    others = [e for e in range(len(graph.ends)) if e != transition]
    for chosen in combinations(others, graph.size - 2):
        label = components(graph.size, [graph.ends[e] for e in chosen])
        if label is None or label[first] == label[second]:
            continue
        for root in range(graph.size):
            if label[root] != label[state]:
                ahead, back = directed(graph, chosen, {state, root})
                if allowed(graph, back):
                    yield (1 if label[second] == label[state] else -1), ahead, back


@given(multigraphs(), st.data())
@settings(max_examples=150, deadline=None)
def test_two_tree_forests_by_trial(graph, data):
    assume(graph.ends)
    transition = data.draw(st.integers(0, len(graph.ends) - 1))
    state = data.draw(st.integers(0, graph.size - 1))
    found = two_tree_forests(spanning_trees(graph), transition, state)
    assert [part.dtype for part in found] == [np.int8, np.uint64, np.uint64]
    entries = zip(*(part.tolist() for part in found), strict=True)
    # Without the roots the same pair of masks comes once for each root: compare as multisets.
    assert sorted(entries) == sorted(forests_by_trial(graph, transition, state))


@pytest.mark.parametrize(
    "graph",
    [
        Graph(3, ((0, 1), (1, 2), (2, 0)), (False, False, False)),
        Graph(3, ((0, 1), (1, 2), (0, 2), (1, 0)), (False, False, True, False)),
        Graph(4, ((0, 1), (1, 2), (2, 3), (3, 0), (0, 2)), (False,) * 5),
    ],
)
def test_phi_gives_the_response_to_a_barrier(graph):
    # The other side comes from W p = 0, differentiated: W dp = -(dW) p, sum of dp = 0.
    ahead = [sympy.Rational(2 * e + 3, e + 1) for e in range(len(graph.ends))]
    back = [
        sympy.Integer(0) if single else sympy.Rational(e + 5, 3)
        for e, single in enumerate(graph.one_way)
    ]

    def generator(parts):
        matrix = sympy.zeros(graph.size, graph.size)
        for e in parts:
            i, j = graph.ends[e]
            matrix[j, i] += ahead[e]
            matrix[i, i] -= ahead[e]
            matrix[i, j] += back[e]
            matrix[j, j] -= back[e]
        return matrix

    def product(forward, backward):
        value = sympy.Integer(1)
        for e in range(len(graph.ends)):
            value *= (ahead[e] if forward >> e & 1 else 1) * (back[e] if backward >> e & 1 else 1)
        return value

    matrix = generator(range(len(graph.ends)))
    bordered = matrix[:-1, :].col_join(sympy.ones(1, graph.size))
    unit = sympy.zeros(graph.size - 1, 1).col_join(sympy.ones(1, 1))
    steady = bordered.LUsolve(unit)
    trees = spanning_trees(graph)
    total = sum(
        product(int(a), int(b))
        for root in range(graph.size)
        for a, b in zip(*rooted(trees, root), strict=True)
    )
    for e, (first, second) in enumerate(graph.ends):
        change = (generator([e]) * steady)[:-1, :].col_join(sympy.zeros(1, 1))
        slope = bordered.LUsolve(change)
        current = ahead[e] * steady[first] - back[e] * steady[second]
        for state in range(graph.size):
            phi = sum(
                int(sign) * product(int(a), int(b))
                for sign, a, b in zip(*two_tree_forests(trees, e, state), strict=True)
            )
            assert slope[state] == -current * phi / total


def test_disconnected_graph_has_no_trees():
    graph = Graph(3, ((0, 1),), (False,))
    trees = spanning_trees(graph)
    assert trees.masks.shape == (0,)
    assert trees.forward.shape == (3, 0)
    assert [len(part) for part in two_tree_forests(trees, 0, 0)] == [0, 0, 0]


def test_limits_name_the_number_and_the_way_out():
    with pytest.raises(SizeLimitError, match=rf"{42467328 * 16}.*42467328.*2000000.*--at"):
        spanning_trees(graph_of(nx.hypercube_graph(4)))
    assert len(spanning_trees(graph_of(nx.cycle_graph(5)), limit=25).masks) == 5
    with pytest.raises(SizeLimitError, match=r"^25 "):
        spanning_trees(graph_of(nx.cycle_graph(5)), limit=24)
    with pytest.raises(SizeLimitError, match="65 states"):
        spanning_trees(graph_of(nx.path_graph(65)))
    with pytest.raises(SizeLimitError, match="65 transitions"):
        spanning_trees(Graph(2, ((0, 1),) * 65, (False,) * 65))
    assert len(spanning_trees(graph_of(nx.cycle_graph(64))).masks) == 64


def test_progress_ends_at_the_number_of_trees():
    calls = []
    spanning_trees(graph_of(nx.petersen_graph()), progress=lambda *call: calls.append(call))
    assert calls[-1] == (2000, 2000)
    assert calls == sorted(calls)


def test_results_cannot_be_written_to():
    trees = spanning_trees(graph_of(nx.cycle_graph(4)))
    for array in (trees.masks, trees.forward):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 0
