"""Simple paths with the forests that lead into them: what edge and path proofs are made of.

Every spanning tree towards ``goal`` holds one path from ``start``; the rest is a forest that leads
into it. Hence N_goal = sum of w(path) Sigma_path and N_start = sum of w(path reversed) Sigma_path:
their ratio is a mediant of the ratios of the paths.
"""

from __future__ import annotations

from dataclasses import dataclass

from flint import fmpz_mat

from symbolic_response.network.model import Network
from symbolic_response.topology.graph import Graph
from symbolic_response.topology.paths import Step, simple_paths
from symbolic_response.topology.trees import count_undirected_trees

EXPANDED_PRODUCTS = 5_000_000
EXPANDED_TREES = 20_000
MOST_ROWS = 100_000


@dataclass(frozen=True, slots=True)
class Row:
    """A simple path as the numbers of its rates, and how many forests lead into it.

    The forward rate of transition i has the number 2i, the backward one 2i + 1.
    """

    steps: tuple[int, ...]
    weight: int


def undirected(graph: Graph, without: int | None = None) -> Graph:
    """Return the graph with all steps allowed, without one transition."""
    ends = tuple(pair for e, pair in enumerate(graph.ends) if e != without)
    return Graph(graph.size, ends, (False,) * len(ends))


def path_rows(graph: Graph, start: int, goal: int, without: int | None = None) -> tuple[Row, ...]:
    """Return a row for each simple path from ``start`` to ``goal``, directions ignored.

    Raises SizeLimitError past 100,000 paths.
    """
    smaller = undirected(graph, without)
    kept = [e for e in range(len(graph.ends)) if e != without]
    rows = []
    for path in simple_paths(smaller, start, goal, limit=MOST_ROWS):
        steps = tuple(2 * kept[e] + (0 if ahead else 1) for e, ahead in path)
        rows.append(Row(steps, _forests_into(smaller, _states(smaller, start, path))))
    return tuple(rows)


def _states(graph: Graph, start: int, path: tuple[Step, ...]) -> set[int]:
    return {start, *(graph.ends[e][1 if ahead else 0] for e, ahead in path)}


def _forests_into(graph: Graph, states: set[int]) -> int:
    """Return the number of spanning forests whose trees each hold one of the states."""
    place = {k: i for i, k in enumerate(k for k in range(graph.size) if k not in states)}
    matrix = [[0] * len(place) for _ in place]
    for first, second in graph.ends:
        for a, b in ((first, second), (second, first)):
            if a in place:
                matrix[place[a]][place[a]] += 1
                if b in place:
                    matrix[place[a]][place[b]] -= 1
    return int(fmpz_mat(len(place), len(place), [x for row in matrix for x in row]).det())


@dataclass(frozen=True, slots=True)
class PathsProof:
    """All simple paths between two states, with the forests that lead into them."""

    start: int
    goal: int
    expanded: bool
    rows: tuple[Row, ...]

    def subject(self, network: Network) -> str:
        """Return what the proof is about in the words of the file."""
        return f"{network.states[self.start].name} to {network.states[self.goal].name}"


def paths_proof(graph: Graph, start: int, goal: int) -> PathsProof:
    """Return the proof of the path bound for p_goal/p_start; SizeLimitError past 100,000 paths."""
    trees = count_undirected_trees(undirected(graph))
    return PathsProof(start, goal, trees <= EXPANDED_TREES, path_rows(graph, start, goal))
