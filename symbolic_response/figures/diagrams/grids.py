"""What the grids of small pictures show: cycles, trees, splittings, forests."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from symbolic_response.errors import InputError
from symbolic_response.figures.diagrams.pictures import Picture
from symbolic_response.figures.diagrams.small import Small
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import rooted, splittings, two_tree_forests
from symbolic_response.topology.graph import members


@dataclass(frozen=True, slots=True)
class Asked:
    """What a grid is asked for; states and transitions by place."""

    root: int | None
    transition: int | None
    limit: int
    letter: str


@dataclass(frozen=True, slots=True)
class Shown:
    """Pictures, and how many things there are in all."""

    pictures: tuple[Picture, ...]
    total: int


def _cycles(analysis: Analysis, base: Small, asked: Asked) -> Shown:
    found = analysis.cycles
    if not found:
        raise InputError(f"network {analysis.network.title!r} has no cycles to draw")
    shown = found if len(found) <= asked.limit else found[:1]
    pictures = tuple(
        base.cycle(cycle, f"{asked.letter}_{{{number}}}")
        for number, cycle in enumerate(shown, start=1)
    )
    return Shown(pictures, len(found))


def _trees(analysis: Analysis, base: Small, asked: Asked) -> Shown:
    root = asked.root or 0
    total = analysis.tree_counts[root]
    if total > asked.limit:
        return Shown((base.tree(*_example(analysis, root), root),), total)
    forward, backward = rooted(analysis.trees, root)
    found = list(zip(forward.tolist(), backward.tolist(), strict=True))
    if asked.transition is not None:  # those that use it last
        found.sort(key=lambda tree: (tree[0] | tree[1]) >> (asked.transition or 0) & 1)
    return Shown(tuple(base.tree(ahead, back, root) for ahead, back in found), total)


def _example(analysis: Analysis, root: int) -> tuple[int, int]:
    """Return a tree of shortest ways to the root, each along allowed steps."""
    graph, forward, backward = analysis.graph, 0, 0
    reached = {root}
    order = [root]
    for state in order:
        for e, (first, second) in enumerate(graph.ends):
            if second == state and first not in reached:
                forward |= 1 << e
                reached.add(first)
                order.append(first)
            elif first == state and second not in reached and not graph.one_way[e]:
                backward |= 1 << e
                reached.add(second)
                order.append(second)
    return forward, backward


def _splittings(analysis: Analysis, base: Small, asked: Asked) -> Shown:
    found = splittings(analysis.graph, _transition(asked)).tolist()
    shown = found if len(found) <= asked.limit else found[:1]
    return Shown(tuple(base.splitting(side) for side in shown), len(found))


def _forests(analysis: Analysis, base: Small, asked: Asked) -> Shown:
    transition, root = _transition(asked), asked.root or 0
    signs, forward, backward = two_tree_forests(analysis.trees, transition, root)
    rows = list(zip(signs.tolist(), forward.tolist(), backward.tolist(), strict=True))
    shown = rows if len(rows) <= asked.limit else rows[:1]
    return Shown(
        tuple(
            base.forest(ahead, back, root, _other_root(analysis, ahead, back, root),
                        "+" if sign > 0 else "-")
            for sign, ahead, back in shown
        ),
        len(rows),
    )


def _other_root(analysis: Analysis, forward: int, backward: int, root: int) -> int:
    """Return the state other than ``root`` that no transition of the forest leaves."""
    ends = analysis.graph.ends
    left = {ends[e][0] for e in members(forward)} | {ends[e][1] for e in members(backward)}
    return next(k for k in range(analysis.graph.size) if k != root and k not in left)


def _transition(asked: Asked) -> int:
    if asked.transition is None:
        raise InputError("splittings and forests are those of a transition; name one")
    return asked.transition


KINDS: Mapping[str, Callable[[Analysis, Small, Asked], Shown]] = {
    "cycles": _cycles, "trees": _trees, "splittings": _splittings, "forests": _forests,
}
"""The grids by name."""
