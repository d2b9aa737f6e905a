"""Families of pieces. Oracle for the bundles: ranks of all subsets of the transitions."""

from itertools import combinations

import pytest
from hypothesis import given, settings
from proof_networks import analysis_of, strong_graphs

from symbolic_response.bounds.bundle import rank
from symbolic_response.control.family import family_of
from symbolic_response.control.separations import separations
from symbolic_response.topology import Graph, blocks

Part = tuple[int, ...]


def undirected(size: int, ends: list[tuple[int, int]]) -> Graph:
    return Graph(size, tuple(ends), (False,) * len(ends))


def ring(size: int) -> Graph:
    return undirected(size, [(k, (k + 1) % size) for k in range(size)])


CUBE = undirected(8, [(k, k | bit) for k in range(8) for bit in (1, 2, 4) if not k & bit])
LADDER = undirected(6, [(0, 1), (1, 2), (3, 4), (4, 5), (0, 3), (1, 4), (2, 5)])
TWO_TRIANGLES = undirected(5, [(0, 1), (1, 2), (2, 0), (0, 3), (3, 4), (4, 0)])


def excess(part: set[int], graph: Graph) -> int:
    """Return by how much the number of a set's transitions in a spanning tree varies."""
    rest = set(range(len(graph.ends))) - part
    return rank(part, graph) + rank(rest, graph) - (graph.size - 1)


def by_ranks(graph: Graph) -> list[Part]:
    """Return one side of every separation of order 1 within a block, by trying all subsets."""
    found = []
    for block in blocks(graph):
        for size in range(1, len(block) // 2 + 1):
            for part in combinations(block, size):
                if 2 * size == len(block) and block[0] not in part:
                    continue
                if len(block) > 1 and excess(set(part), graph) == 1:
                    found.append(part)
    return sorted(found, key=lambda part: (len(part), part))


@settings(max_examples=150, deadline=None)
@given(strong_graphs(max_size=6, extra=5))
def test_bundles_are_those_that_ranks_give(graph: Graph) -> None:
    assert separations(graph, 10**6) == (tuple(by_ranks(graph)), True)


@settings(max_examples=40, deadline=None)
@given(strong_graphs(max_size=5, extra=3))
def test_every_bundle_is_one_of_the_family_up_to_blocks(graph: Graph) -> None:
    family = family_of(analysis_of(graph))
    for size in range(1, len(graph.ends)):
        for part in map(set, combinations(range(len(graph.ends)), size)):
            cut = [block for block in family.blocks if part & set(block) and set(block) - part]
            if excess(part, graph) == 0:
                assert not cut
            elif excess(part, graph) == 1:
                (block,) = cut
                inside = part & set(block)
                sides = {tuple(sorted(inside)), tuple(sorted(set(block) - inside))}
                assert sides & set(family.bundles)


@pytest.mark.parametrize("graph", [ring(2), ring(7), CUBE, LADDER, TWO_TRIANGLES,
                                   undirected(2, [(0, 1)] * 6),
                                   undirected(3, [(0, 1), (0, 1), (1, 2), (1, 2), (2, 0), (2, 0)])])
def test_known_graphs(graph: Graph) -> None:
    assert separations(graph, 10**6) == (tuple(by_ranks(graph)), True)


def test_numbers_of_bundles() -> None:
    """A ring: every part and its rest; the cube, three-connected: single transitions alone."""
    for size in range(3, 10):
        assert len(separations(ring(size), 10**6)[0]) == 2 ** (size - 1) - 1
    assert separations(CUBE, 100) == (tuple((e,) for e in range(12)), True)


def test_a_large_ring_is_cut_off_in_order() -> None:
    found, complete = separations(ring(24), 2_000)
    assert len(found) == 2_000 and not complete
    expected = [part for size in (1, 2, 3) for part in combinations(range(24), size)]
    assert list(found) == expected[:2_000]
    assert separations(ring(24), 0) == (tuple((e,) for e in range(24)), False)
    long_ladder = undirected(40, [
        *((k, k + 1) for k in range(19)), *((k, k + 1) for k in range(20, 39)),
        *((k, k + 20) for k in range(20))])
    parts, whole = separations(long_ladder, 10**5)
    assert whole and all(excess(set(part), long_ladder) == 1 for part in parts)


def test_the_statement_names_the_family() -> None:
    analysis = analysis_of(ring(4))
    assert "all bundles;" in family_of(analysis).words()
    assert "the first 5 bundles" in family_of(analysis, most=5).words()
    small = family_of(analysis, single=True, directed=False)
    assert small.words() == ("energies of the states; unions of blocks; single transitions, no"
                             " other bundles; drives")
    assert small.data()["bundles"] == 4 and small.data()["words"] == small.words()
    assert family_of(analysis).data()["complete"] is True
