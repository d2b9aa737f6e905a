"""Separations of order 1 of a block: sets of transitions of which every tree uses r or r + 1.

A separation of a block (two-connected) into E' and the rest has order 1 exactly if both sides
consist of the same number c of connected pieces that follow each other around a ring, E' and the
rest in turn. For c = 1 the sides meet in two states, and E' is a union of the bridges of that pair
(what is connected without passing through it). For c > 1 the pieces are unions of neighbours in the
ring that two chains of blocks between the states of such a pair make. Cunningham & Edmonds, Canad.
J. Math. 32, 734 (1980).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import combinations

from symbolic_response.topology import Graph, blocks

Part = tuple[int, ...]


def separations(graph: Graph, most: int) -> tuple[tuple[Part, ...], bool]:
    """Return separations of order 1 inside a block, one for each pair of a set and its rest.

    Of the two sides, the one with fewer transitions, then the one with the first transition; in the
    order of their number of transitions, then of these. At the most ``most`` (single transitions
    always), and whether these are all.

    >>> ring = Graph(4, ((0, 1), (1, 2), (2, 3), (3, 0)), (False,) * 4)
    >>> separations(ring, 100)
    (((0,), (1,), (2,), (3,), (0, 1), (0, 2), (0, 3)), True)
    """
    places = [(block, _groups(graph, block)) for block in blocks(graph) if len(block) > 1]
    found: list[Part] = []
    for size in range(1, max((len(block) // 2 for block, _ in places), default=0) + 1):
        new: set[Part] = set()
        for block, groups in places:
            for group in groups:
                new |= {part for part in _unions(group, size) if _leads(part, block)}
        kept = len(new) if size == 1 else most - len(found)
        if kept < len(new):
            return (*found, *sorted(new)[: max(kept, 0)]), False
        found += sorted(new)
    return tuple(found), True


def _leads(part: Part, block: Part) -> bool:
    """Return whether a set stands for itself and its rest."""
    return 2 * len(part) < len(block) or (2 * len(part) == len(block) and part[0] == block[0])


def _groups(graph: Graph, block: Part) -> set[tuple[Part, ...]]:
    """Return divisions of a block of which every union of parts is a separation of order 1."""
    found: set[tuple[Part, ...]] = set()
    states = sorted({state for e in block for state in graph.ends[e]})
    for first, second in combinations(states, 2):
        sides = _bridges(graph, block, first, second)
        if len(sides) < 2:
            continue
        found.add(tuple(sorted(sides)))
        for side in sides:
            chain = _chain(graph, side)
            if len(chain) == 1:
                continue
            others = [other for other in sides if other != side]
            rest = _chain(graph, others[0]) if len(others) == 1 else [
                tuple(sorted(e for other in others for e in other))]
            found.add(tuple(sorted([*chain, *rest])))
    return found


def _bridges(graph: Graph, block: Part, first: int, second: int) -> list[Part]:
    """Return the transitions of a block in classes that two states separate."""
    label = {state: state for e in block for state in graph.ends[e]}
    own = {first, second}
    for e in block:
        if not own & set(graph.ends[e]):
            one, other = (label[state] for state in graph.ends[e])
            label = {state: one if mark == other else mark for state, mark in label.items()}
    classes: dict[tuple[str, int], list[int]] = {}
    for e in block:
        inner = set(graph.ends[e]) - own
        key = ("inside", label[inner.pop()]) if inner else ("direct", e)
        classes.setdefault(key, []).append(e)
    return [tuple(part) for part in classes.values()]


def _chain(graph: Graph, part: Part) -> list[Part]:
    """Return the blocks of a set of transitions."""
    inner = Graph(graph.size, tuple(graph.ends[e] for e in part), (False,) * len(part))
    return [tuple(part[i] for i in group) for group in blocks(inner)]


def _unions(parts: Sequence[Part], size: int) -> Iterator[Part]:
    """Yield every union of parts that has ``size`` elements, in all."""
    ordered = sorted(parts, key=len)

    def extend(place: int, left: int, chosen: Part) -> Iterator[Part]:
        if left == 0:
            yield tuple(sorted(chosen))
            return
        for following in range(place, len(ordered)):
            part = ordered[following]
            if len(part) > left:
                return
            yield from extend(following + 1, left - len(part), (*chosen, *part))

    return extend(0, size, ())
