"""Spanning trees and spanning forests of two trees, as bit masks of transitions.

A tree directed towards its root is written as two masks: the transitions it uses from first to
second state (``forward``), and those it uses from second to first (``backward``).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
from flint import fmpz_mat
from numpy.typing import NDArray

from symbolic_response.errors import SizeLimitError
from symbolic_response.topology.graph import (
    Graph,
    Progress,
    breadth_first,
    check_mask_size,
    incident,
)

Masks: TypeAlias = NDArray[np.uint64]


@dataclass(frozen=True, slots=True, eq=False)
class SpanningTrees:
    """All T spanning trees of a graph, and how each is directed towards each root.

    ``masks``: uint64[T], bit e set where the tree uses transition e, in increasing order, so that
    trees of low-numbered transitions come first. ``forward``: uint64[size, T], row k has bit e
    set where the tree directed towards state k uses e from first to second state. One-way
    transitions are not yet taken into account: see ``rooted``.
    """

    graph: Graph
    masks: Masks
    forward: Masks


def count_undirected_trees(graph: Graph) -> int:
    """Number of spanning trees, directions ignored; exact, for graphs of any size.

    Determinant of the graph Laplacian without row and column 0 (Kirchhoff 1847).

    >>> count_undirected_trees(Graph(3, ((0, 1), (1, 2), (2, 0)), (False, False, True)))
    3
    """
    return _count(graph, 0, (False,) * len(graph.ends))


def count_rooted_trees(graph: Graph, root: int) -> int:
    """Number of spanning trees directed towards ``root`` that run no one-way transition backwards.

    Determinant of the Laplacian of the allowed steps without row and column ``root`` (Tutte
    1948); exact, for graphs of any size.

    >>> ring = Graph(3, ((0, 1), (1, 2), (2, 0)), (False, False, True))
    >>> [count_rooted_trees(ring, root) for root in range(3)]
    [3, 2, 1]
    """
    return _count(graph, root, graph.one_way)


def _count(graph: Graph, root: int, one_way: tuple[bool, ...]) -> int:
    laplacian = [[0] * graph.size for _ in range(graph.size)]
    for (first, second), single in zip(graph.ends, one_way, strict=True):
        steps = [(first, second)] if single else [(first, second), (second, first)]
        for tail, head in steps:
            laplacian[tail][tail] += 1
            laplacian[tail][head] -= 1
    kept = [state for state in range(graph.size) if state != root]
    entries = [laplacian[row][column] for row in kept for column in kept]
    return int(fmpz_mat(len(kept), len(kept), entries).det())


def spanning_trees(
    graph: Graph, *, limit: int = 2_000_000, progress: Progress | None = None
) -> SpanningTrees:
    """All spanning trees, each once, with their directions towards every root.

    The trees are counted first: if T times ``graph.size`` is above ``limit``, or the graph has
    more than 64 states or transitions, SizeLimitError. Time and memory grow as T times size (at
    most about 30 bytes for each of the T * size masks). ``count_undirected_trees`` gives T by
    another route.

    >>> trees = spanning_trees(Graph(3, ((0, 1), (1, 2), (2, 0)), (False,) * 3))
    >>> trees.masks.tolist(), trees.forward.tolist()
    ([3, 5, 6], [[0, 4, 6], [1, 5, 0], [3, 0, 2]])
    """
    count = count_undirected_trees(graph)
    if count * graph.size > limit:
        raise SizeLimitError(
            f"{count * graph.size} rooted spanning trees ({count} without direction) are more than"
            f" the limit of {limit}; exact values at given points (--at) still work, or a higher"
            " limit"
        )
    check_mask_size(graph.size, "states")
    check_mask_size(len(graph.ends), "transitions")
    partial = _enumerate(graph, count, progress) if count else _Partial.empty(graph.size, 0)
    order = np.argsort(partial.used)
    masks = partial.used[order]
    forward = partial.forward[order] ^ partial.paths[:, order]
    masks.setflags(write=False)
    forward.setflags(write=False)
    return SpanningTrees(graph, masks, forward)


@dataclass(frozen=True, slots=True, eq=False)
class _Partial:
    """P forests in which some states have chosen their way out, as columns of arrays.

    The way out of a state is its first transition on the way to state 0. Each tree of the forest
    has one state without a way out, its root. ``labels``: uint8[size, P], the root of the tree
    that holds each state; ``paths``: uint64[size, P], the transitions between a state and its
    root; ``used``, ``forward``: uint64[P], the transitions used, and those of them that lead from
    first to second state.
    """

    labels: NDArray[np.uint8]
    paths: Masks
    used: Masks
    forward: Masks

    @staticmethod
    def empty(size: int, number: int) -> _Partial:
        labels = np.repeat(np.arange(size, dtype=np.uint8)[:, None], number, axis=1)
        paths = np.zeros((size, number), dtype=np.uint64)
        return _Partial(labels, paths, paths[0], paths[0])


def _enumerate(graph: Graph, count: int, progress: Progress | None) -> _Partial:
    # States choose their way out in reverse breadth-first order. Those that have not chosen yet
    # are connected by the transitions they were found by, so every partial choice without a
    # circuit can be completed: nothing is built in vain. Every tree arises once, because its
    # direction towards state 0 fixes the way out of each state.
    adjacent = incident(graph)
    partial = _Partial.empty(graph.size, 1)
    for state, _ in reversed(breadth_first(graph)[1:]):
        partial = _join(
            [
                _choose(partial, state, transition, other, graph.ends[transition][0] == state)
                for transition, other in adjacent[state]
            ]
        )
        if progress is not None:
            progress(partial.used.size, count)
    return partial


def _choose(
    partial: _Partial, state: int, transition: int, head: int, is_forward: bool
) -> _Partial:
    bit = np.uint64(1 << transition)
    columns = np.flatnonzero(partial.labels[head] != state)
    labels = partial.labels[:, columns]
    paths = partial.paths[:, columns]
    moved = labels == state
    paths ^= (paths[head] | bit) * moved
    labels += (labels[head] - np.uint8(state)) * moved
    forward = partial.forward[columns]
    return _Partial(
        labels, paths, partial.used[columns] | bit, forward | bit if is_forward else forward
    )


def _join(parts: list[_Partial]) -> _Partial:
    return _Partial(
        np.concatenate([part.labels for part in parts], axis=1),
        np.concatenate([part.paths for part in parts], axis=1),
        np.concatenate([part.used for part in parts]),
        np.concatenate([part.forward for part in parts]),
    )


def rooted(
    trees: SpanningTrees, root: int, allowed_back: int | None = None
) -> tuple[Masks, Masks]:
    """Spanning trees directed towards ``root``: (forward uint64[T_k], backward uint64[T_k]).

    Only those that run no one-way transition backwards (other than ``allowed_back``), in the order
    of ``trees.masks``.
    N_k = sum over them of the product of their rates; T_k = ``count_rooted_trees(graph, root)``.

    >>> ring = Graph(3, ((0, 1), (1, 2), (2, 0)), (False, False, True))
    >>> forward, backward = rooted(spanning_trees(ring), 2)
    >>> forward.tolist(), backward.tolist()
    ([3], [0])
    """
    forward = trees.forward[root]
    backward = trees.masks & ~forward
    barred = _one_way_mask(trees.graph)
    if allowed_back is not None:
        barred &= ~np.uint64(1 << allowed_back)
    allowed = (backward & barred) == 0
    return forward[allowed], backward[allowed]


def two_tree_forests(
    trees: SpanningTrees, transition: int, state: int
) -> tuple[NDArray[np.int8], Masks, Masks]:
    """Forests of Phi_{k,e}, e = ``transition``, k = ``state``: (sign, forward, backward).

    Each spanning tree that contains e falls into two without it. The one that holds k is directed
    towards k, the other one towards each of its states l: M entries in order of l, then of the
    trees, as int8[M], uint64[M], uint64[M]. The sign is +1 if the second end of e is in k's tree,
    -1 if the first is. Forests that run a one-way transition backwards are left out.
    Phi_{k,e} = sum of sign times product of rates; d pi_k / d barrier[e] = -(C_e/D) (Phi_{k,e}/D)
    with C_e/D the current of e: a higher barrier holds back what e brings to its second end.

    >>> ring = Graph(3, ((0, 1), (1, 2), (2, 0)), (False,) * 3)
    >>> [part.tolist() for part in two_tree_forests(spanning_trees(ring), 0, 0)]
    [[-1, -1, -1], [0, 4, 2], [2, 0, 0]]
    """
    graph = trees.graph
    bit = np.uint64(1 << transition)
    holders = (trees.masks & bit) != 0
    masks = trees.masks[holders] & ~bit
    forward = trees.forward[:, holders]
    # A tree directed towards r uses e forward exactly if r is on the side of e's second end.
    on_second = (forward & bit) != 0
    towards_k_and_e = forward[state] ^ forward[graph.ends[transition][0]]
    signs = np.where(on_second[state], 1, -1).astype(np.int8)
    parts: list[tuple[NDArray[np.int8], Masks, Masks]] = []
    for other in range(graph.size):
        apart = np.flatnonzero(on_second[other] != on_second[state])
        # Both trees directed towards e are forward[first end], e itself left aside. In k's tree
        # that agrees with forward[l], in l's tree with forward[k]: the exclusive or of the three
        # leaves forward[k] in k's tree and forward[l] in l's tree.
        directed = (towards_k_and_e[apart] ^ forward[other][apart]) & ~bit
        against = masks[apart] & ~directed
        allowed = (against & _one_way_mask(graph)) == 0
        parts.append((signs[apart][allowed], directed[allowed], against[allowed]))
    sign, ahead, back = (np.concatenate(column) for column in zip(*parts, strict=True))
    return sign, ahead, back


def _one_way_mask(graph: Graph) -> np.uint64:
    return np.uint64(sum(1 << e for e, one_way in enumerate(graph.one_way) if one_way))
