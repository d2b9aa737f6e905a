"""The graph itself: what is refused, and which states can be reached."""

import subprocess
import sys

import networkx as nx
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from symbolic_response.topology import Graph, is_connected, is_strongly_connected, unreachable


@st.composite
def multigraphs(draw):
    size = draw(st.integers(2, 6))
    pairs = st.tuples(st.integers(0, size - 1), st.integers(1, size - 1), st.booleans())
    drawn = draw(st.lists(pairs, max_size=9))
    ends = tuple((first, (first + shift) % size) for first, shift, _ in drawn)
    return Graph(size, ends, tuple(single for _, _, single in drawn))


@given(multigraphs())
@settings(max_examples=150, deadline=None)
def test_connectivity_against_networkx(graph):
    drawn = nx.DiGraph(graph.ends)
    drawn.add_nodes_from(range(graph.size))
    for (first, second), single in zip(graph.ends, graph.one_way, strict=True):
        if not single:
            drawn.add_edge(second, first)
    every = set(range(graph.size))
    assert unreachable(graph) == (
        tuple(sorted(every - nx.descendants(drawn, 0) - {0})),
        tuple(sorted(every - nx.ancestors(drawn, 0) - {0})),
    )
    assert is_strongly_connected(graph) == nx.is_strongly_connected(drawn)
    assert is_connected(graph) == nx.is_weakly_connected(drawn)


@pytest.mark.parametrize(
    ("parts", "words"),
    [
        ((0, (), ()), "at least one state"),
        ((2, ((0, 1),), ()), "differ in length"),
        ((2, ((0, 2),), (False,)), "no such state"),
        ((2, ((-1, 0),), (False,)), "no such state"),
        ((2, ((1, 1),), (False,)), "to itself"),
    ],
)
def test_contradictory_data_are_refused(parts, words):
    with pytest.raises(ValueError, match=words):
        Graph(*parts)


def test_networkx_is_not_loaded_with_the_package():
    code = "import sys, symbolic_response.topology; sys.exit('networkx' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
