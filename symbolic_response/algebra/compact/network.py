"""All sums of a network together: tree sums, normalisation, currents, forest differences."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace

from symbolic_response.algebra.compact.factor import factored_with_leaves
from symbolic_response.algebra.compact.measure import Width, default_width
from symbolic_response.algebra.compact.relations import along, spanning
from symbolic_response.algebra.compact.shifts import path_sum
from symbolic_response.algebra.compact.states import eliminated
from symbolic_response.algebra.compact.together import (
    CompactSums,
    Target,
    compact_together,
    key_of,
)
from symbolic_response.expressions.ring import Poly, Ring
from symbolic_response.expressions.tree import Expression, Symbol, add, multiply, negate
from symbolic_response.topology import Graph

KERNEL_TREES = 60
ELIMINATION_TREES = 100


@dataclass(frozen=True, slots=True)
class NetworkSums:
    """The sums of a network over one ring, of rates or of the user's symbols.

    ``rates``: forward and backward rate of each transition, None for the missing one; ``trees``:
    N_k; ``total``: D; ``currents``: C_e; ``forests``: Phi_{k,e} by (k, e), both as in
    ``Analysis``. A factor common to all sums may have been divided out of all of them.
    """

    graph: Graph
    ring: Ring
    rates: Sequence[tuple[Poly, Poly | None]]
    trees: Sequence[Poly]
    total: Poly | None = None
    currents: Mapping[int, Poly] = field(default_factory=dict)
    forests: Mapping[tuple[int, int], Poly] = field(default_factory=dict)


def compact_network(
    sums: NetworkSums, width: Width = default_width, *, name_factors: bool = True,
    relations: bool = True, elimination: bool | None = None,
) -> CompactSums:
    """Return short forms of all the sums given, keys ``#tree[k]``, ``#total[]``, ``#current[e]``,
    ``#forest[k, e]`` and ``#factor[i]``.

    The N_k are written without division up to 60 trees, by elimination (``eliminated``) beyond 100,
    in between whichever is shorter; ``elimination`` says otherwise. With ``relations`` a sum may be
    given by others where that is shorter: D = sum of N_k, C_e = w+ N_m - w- N_n, and for the forest
    differences, D times the solution x of W x = d_n - d_m with sum 0: they add up to 0 over k, and
    along each cycle of transitions. Without them every sum has a form of its own. By elimination
    forest differences are D y_k - N_k Y, with ``#source``, ``#shift`` = y and ``#shifts`` = Y.
    """
    trees = _trees(sums, width, name_factors, elimination)
    given = {key_of("tree", k): poly for k, poly in enumerate(sums.trees)}
    targets = [] if trees else [Target(key, poly) for key, poly in given.items()]
    if sums.total is not None and not (trees and sums.forests):
        whole = add(Symbol(key) for key in given)
        targets.append(Target(key_of("total"), sums.total, (whole,)))
    targets += [_current(sums, e, width) for e in sorted(sums.currents)]
    targets += [] if trees else _forests(sums)
    if not relations:
        targets = [Target(t.key, t.poly) for t in targets]
    if trees is None:
        return compact_together(sums.ring, targets, width, name_factors=name_factors)
    first = 1 + sum(d.kind == "factor" for d in trees.definitions)
    rest = compact_together(sums.ring, targets, width, name_factors=name_factors, given=given,
                            first_factor=first)
    leaves = {**trees.leaves, **rest.leaves}
    return replace(trees, definitions=(*trees.definitions, *rest.definitions), leaves=leaves)


def _trees(
    sums: NetworkSums, width: Width, name_factors: bool, elimination: bool | None
) -> CompactSums | None:
    """Return the tree sums by elimination, None where kernel division serves better."""
    size = max(len(tree) for tree in sums.trees)
    if elimination is False or (elimination is None and size <= KERNEL_TREES):
        return None
    found = eliminated(sums.graph, sums.ring, sums.rates, width, trees=sums.trees,
                       forests=sorted(sums.forests))
    if elimination or size > ELIMINATION_TREES:
        return found
    targets = [Target(key_of("tree", k), poly) for k, poly in enumerate(sums.trees)]
    targets += _forests(sums)
    plain = compact_together(sums.ring, targets, width, name_factors=name_factors)
    return found if found.characters(width) < plain.characters(width) else None


def _current(sums: NetworkSums, e: int, width: Width) -> Target:
    """Return C_e, also as w+ N_m - w- N_n."""
    forward, backward = sums.rates[e]
    first, second = sums.graph.ends[e]
    ahead, leaves = factored_with_leaves(forward, sums.ring, width)
    terms = [multiply([ahead, Symbol(key_of("tree", first))])]
    if backward is not None:
        back, more = factored_with_leaves(backward, sums.ring, width)
        terms.append(negate(multiply([back, Symbol(key_of("tree", second))])))
        leaves |= more
    return Target(key_of("current", e), sums.currents[e], (add(terms),), leaves)


def _forests(sums: NetworkSums) -> list[Target]:
    """Return the forest differences, those first in which others are given."""
    rows = {
        k: sorted(e for state, e in sums.forests if state == k) for k in range(sums.graph.size)
    }
    trees = {k: _shortest_tree(sums, k, row) for k, row in rows.items()}
    lengths = {k: sum(_length(sums.forests[(k, e)]) for e in trees[k]) for k in rows}
    order = sorted(rows, key=lambda k: (lengths[k], k))
    targets = []
    for place, k in enumerate(order):
        tree = trees[k]
        for e in sorted(rows[k], key=lambda e: (e not in tree, e)):
            relations = []
            if place == sums.graph.size - 1 and all(e in rows[other] for other in order):
                others = sorted(set(order) - {k})
                relations.append(_minus_all([key_of("forest", other, e) for other in others]))
            if e not in tree:
                relations.append(path_sum(k, along(sums.graph, e, tree)))
            targets.append(
                Target(key_of("forest", k, e), sums.forests[(k, e)], tuple(relations))
            )
    return targets


def _minus_all(keys: Sequence[str]) -> Expression:
    """Return minus the sum of names."""
    return add(negate(Symbol(key)) for key in keys)


def _length(poly: Poly) -> int:
    return len(poly) * (int(poly.total_degree()) if len(poly) else 0)


def _shortest_tree(sums: NetworkSums, k: int, row: Sequence[int]) -> list[int]:
    """Return a spanning forest of transitions whose forest differences are short."""
    ordered = sorted(row, key=lambda e: (_length(sums.forests[(k, e)]), e))
    return spanning(sums.graph, ordered)
