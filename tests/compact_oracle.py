"""Polynomials as dictionaries and trees by brute force: nothing shared with what is tested."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from fractions import Fraction
from itertools import combinations

import networkx as nx

from symbolic_response.expressions.ring import Poly, Ring
from symbolic_response.expressions.tree import Expression, Number, Power, Product, Sum, Symbol
from symbolic_response.network import Network
from symbolic_response.topology import Graph

Powers = tuple[tuple[str, int], ...]
Sparse = dict[Powers, Fraction]


def times(left: Sparse, right: Sparse) -> Sparse:
    result: Sparse = {}
    for one, c in left.items():
        for other, d in right.items():
            powers = dict(one)
            for name, exponent in other:
                powers[name] = powers.get(name, 0) + exponent
            key = tuple(sorted(powers.items()))
            result[key] = result.get(key, Fraction(0)) + c * d
    return {key: c for key, c in result.items() if c}


def plus(left: Sparse, right: Sparse, scale: int = 1) -> Sparse:
    result = dict(left)
    for key, c in right.items():
        result[key] = result.get(key, Fraction(0)) + scale * c
    return {key: c for key, c in result.items() if c}


ONE: Sparse = {(): Fraction(1)}


def multiplied_out(node: Expression, known: Mapping[str, Sparse] | None = None) -> Sparse:
    """Expand sums, products and whole positive powers; ``known`` are names."""
    match node:
        case Number(value):
            return {(): value} if value else {}
        case Symbol(name):
            return (known or {}).get(name, {((name, 1),): Fraction(1)})
        case Sum(terms):
            total: Sparse = {}
            for term in terms:
                total = plus(total, multiplied_out(term, known))
            return total
        case Product(factors):
            result = ONE
            for factor in factors:
                result = times(result, multiplied_out(factor, known))
            return result
        case Power(base, exponent) if exponent.denominator == 1 and exponent > 0:
            result = ONE
            for _ in range(int(exponent)):
                result = times(result, multiplied_out(base, known))
            return result
    raise AssertionError(f"unexpected {node!r}")


def value_at(node: Expression, point: Mapping[str, Fraction]) -> Fraction:
    """Evaluate with Fractions, divisions included."""
    match node:
        case Number(value):
            return value
        case Symbol(name):
            return point[name]
        case Sum(terms):
            return sum((value_at(term, point) for term in terms), Fraction(0))
        case Product(factors):
            result = Fraction(1)
            for factor in factors:
                result *= value_at(factor, point)
            return result
        case Power(base, exponent):
            assert exponent.denominator == 1
            return value_at(base, point) ** int(exponent)
    raise AssertionError(f"unexpected {node!r}")


def sparse(poly: Poly, ring: Ring) -> Sparse:
    """Return a FLINT polynomial over symbols and rates as a dictionary."""
    names = []
    for generator in ring.generators:
        assert isinstance(generator.base, Symbol)
        names.append(generator.base.name)
    return {
        tuple(sorted((n, int(e)) for n, e in zip(names, exponents, strict=True) if e)):
            Fraction(int(c))
        for exponents, c in poly.terms()
    }


def rate(graph: Graph, network: Network, tail: int, e: int) -> str | None:
    """Return the name of the rate of transition e out of a state, None where there is none."""
    name = network.transitions[e].name
    if graph.ends[e][0] == tail:
        return f"forward[{name}]"
    return None if graph.one_way[e] else f"backward[{name}]"


def tree_sum(graph: Graph, network: Network, root: int) -> Sparse:
    """Sum over all subsets of transitions that are spanning trees, directed to the root."""
    total: Sparse = {}
    for chosen in combinations(range(len(graph.ends)), graph.size - 1):
        shape = nx.MultiGraph()
        shape.add_nodes_from(range(graph.size))
        shape.add_edges_from((*graph.ends[e], e) for e in chosen)
        if not nx.is_connected(shape):
            continue
        parents = nx.predecessor(nx.Graph(shape), root)
        names = []
        for child, above in parents.items():
            if child != root:
                (e,) = shape[child][above[0]]
                names.append(rate(graph, network, child, e))
        if None not in names:
            total = plus(total, {tuple(sorted((name, 1) for name in names if name)): Fraction(1)})
    return total


def connected_graphs(largest: int) -> Iterator[nx.Graph]:
    """All connected graphs with 2 to ``largest`` nodes (networkx's atlas: Read & Wilson 1998)."""
    for graph in nx.graph_atlas_g():
        if 2 <= len(graph) <= largest and nx.is_connected(graph):
            yield graph
