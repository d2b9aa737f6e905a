"""Sums over the spanning forests directed into a set of states, in the user's rates."""

from __future__ import annotations

from collections.abc import Collection

from symbolic_response.expressions.tree import ONE, Expression, add, multiply
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import Graph, spanning_trees
from symbolic_response.topology.graph import members
from symbolic_response.topology.trees import rooted


def forests_into(analysis: Analysis, states: Collection[int]) -> Expression:
    """Return the sum of the weights of the forests in which all other states lead into a set.

    They are the spanning trees towards the set taken as one state.
    """
    graph = analysis.graph
    place = dict.fromkeys(states, 0)
    place |= {k: i for i, k in enumerate((k for k in range(graph.size) if k not in place), start=1)}
    if max(place.values()) == 0:
        return ONE
    kept = [e for e, (a, b) in enumerate(graph.ends) if place[a] != place[b]]
    ends = tuple((place[graph.ends[e][0]], place[graph.ends[e][1]]) for e in kept)
    one_way = tuple(graph.one_way[e] for e in kept)
    trees = spanning_trees(Graph(1 + max(place.values()), ends, one_way))
    forward, backward = rooted(trees, 0)
    return add([
        multiply([
            *(analysis.rate_expression(kept[i], False) for i in members(ahead)),
            *(analysis.rate_expression(kept[i], True) for i in members(back)),
        ])
        for ahead, back in zip(forward.tolist(), backward.tolist(), strict=True)
    ])
