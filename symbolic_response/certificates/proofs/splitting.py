"""The splitting proof: a response as a combination of splittings, with weights in closed form.

With T_S the sum over pairs of a spanning tree of S and one of the rest, directed to e's ends in the
time-reversed network (rates w(l -> k) N_l/N_k from k to l), d p_k = sum of lambda_S p_k (1_S(k) -
p(S)) for every change of e's rates, and all lambda_S, proportional to T_S, have one sign. It is the
all-minors theorem (Chaiken 1982) for the reversed network. See DEVELOPERS.md.
"""

from __future__ import annotations

from dataclasses import dataclass

from symbolic_response.certificates.proofs.rows import EXPANDED_TREES, undirected
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import splittings
from symbolic_response.topology.graph import Graph
from symbolic_response.topology.trees import count_undirected_trees

EXPANDED_PRODUCTS = 1_000_000


@dataclass(frozen=True, slots=True)
class Side:
    """A set of states with the second end and without the first, as a mask, and its weight.

    ``weight``: the number of pairs of a spanning tree of the set and one of the rest.
    """

    mask: int
    weight: int


@dataclass(frozen=True, slots=True)
class SplittingProof:
    """The splittings of a transition with their weights."""

    transition: int
    expanded: bool
    sides: tuple[Side, ...]

    def subject(self, network: Network) -> str:
        """Return what the proof is about in the words of the file."""
        return network.transitions[self.transition].name


def splitting_proof(analysis: Analysis, e: int) -> SplittingProof:
    """Return the splitting proof of a transition; SizeLimitError past 200,000 splittings."""
    graph = analysis.graph
    every = (1 << graph.size) - 1
    sides = []
    for mask in sorted(every ^ int(found) for found in splittings(graph, e)):
        sides.append(Side(mask, _trees_inside(graph, mask) * _trees_inside(graph, every ^ mask)))
    forests = sum(side.weight for side in sides)
    trees = count_undirected_trees(undirected(graph))
    small = trees <= EXPANDED_TREES and trees * graph.size <= analysis.tree_limit
    products = forests * trees ** (graph.size - 2)
    return SplittingProof(e, small and products <= EXPANDED_PRODUCTS, tuple(sides))


def _trees_inside(graph: Graph, mask: int) -> int:
    """Return the number of spanning trees of the part of a graph inside a set of states."""
    place = {k: i for i, k in enumerate(k for k in range(graph.size) if mask >> k & 1)}
    ends = tuple((place[a], place[b]) for a, b in graph.ends if a in place and b in place)
    return count_undirected_trees(Graph(len(place), ends, (False,) * len(ends)))
