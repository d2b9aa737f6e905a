"""The graph of a network: numbered states, numbered transitions between them, one-way marks.

Sets of states or of transitions are bit masks: bit i of the integer says whether i is in the set.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import TypeAlias

from symbolic_response.errors import SizeLimitError

Progress: TypeAlias = Callable[[int, int], None]
"""Called with (done, total) now and then during a long enumeration."""

MASK_BITS = 64


@dataclass(frozen=True, slots=True)
class Graph:
    """States 0 .. size-1 and transitions; transition e joins ``ends[e]`` = (first, second).

    Parallel transitions are allowed, self loops are not. ``one_way[e]``: e runs only from its
    first to its second state. Raises ValueError if the data contradict each other.

    >>> triangle = Graph(3, ((0, 1), (1, 2), (2, 0)), (False, False, True))
    >>> triangle.size, len(triangle.ends)
    (3, 3)
    """

    size: int
    ends: tuple[tuple[int, int], ...]
    one_way: tuple[bool, ...]

    def __post_init__(self) -> None:
        if self.size < 1:
            raise ValueError("a graph needs at least one state")
        if len(self.one_way) != len(self.ends):
            raise ValueError("ends and one_way differ in length")
        for first, second in self.ends:
            if not (0 <= first < self.size and 0 <= second < self.size):
                raise ValueError(f"no such state in transition ({first}, {second})")
            if first == second:
                raise ValueError(f"a transition joins state {first} to itself")


def check_mask_size(number: int, name: str) -> None:
    """Raise SizeLimitError if a set of ``number`` things, called ``name``, exceeds 64 bits.

    >>> check_mask_size(64, "states")
    """
    if number > MASK_BITS:
        raise SizeLimitError(
            f"{number} {name} are more than the {MASK_BITS} that an enumeration can take;"
            " exact values at given points (--at) still work"
        )


def members(mask: int) -> Iterator[int]:
    """The elements of a set given as a mask, in increasing order.

    >>> list(members(0b10110))
    [1, 2, 4]
    """
    while mask:
        lowest = mask & -mask
        yield lowest.bit_length() - 1
        mask ^= lowest


def neighbours(graph: Graph) -> tuple[int, ...]:
    """For each state the mask of the states it shares a transition with, directions ignored.

    >>> neighbours(Graph(3, ((0, 1), (1, 2)), (True, False)))
    (2, 5, 2)
    """
    return tuple(a | b for a, b in zip(successors(graph), predecessors(graph), strict=True))


def successors(graph: Graph) -> tuple[int, ...]:
    """For each state the mask of the states that one allowed step leads to.

    >>> successors(Graph(3, ((0, 1), (1, 2)), (True, False)))
    (2, 4, 2)
    """
    masks = [0] * graph.size
    for (first, second), one_way in zip(graph.ends, graph.one_way, strict=True):
        masks[first] |= 1 << second
        if not one_way:
            masks[second] |= 1 << first
    return tuple(masks)


def predecessors(graph: Graph) -> tuple[int, ...]:
    """For each state the mask of the states from which one allowed step leads to it.

    >>> predecessors(Graph(3, ((0, 1), (1, 2)), (True, False)))
    (0, 5, 2)
    """
    masks = [0] * graph.size
    for (first, second), one_way in zip(graph.ends, graph.one_way, strict=True):
        masks[second] |= 1 << first
        if not one_way:
            masks[first] |= 1 << second
    return tuple(masks)


def reach(steps: Sequence[int], start: int, within: int) -> int:
    """Mask of the states in ``within`` that steps inside ``within`` lead to from ``start``.

    ``steps[i]`` is the mask of the states one step away from i; only the part of ``start`` that
    lies in ``within`` counts.

    >>> path = neighbours(Graph(4, ((0, 1), (1, 2), (2, 3)), (False,) * 3))
    >>> reach(path, 0b0001, 0b1011)
    3
    """
    reached = frontier = start & within
    while frontier:
        lowest = frontier & -frontier
        new = steps[lowest.bit_length() - 1] & within & ~reached
        reached |= new
        frontier = (frontier ^ lowest) | new
    return reached


def unreachable(graph: Graph) -> tuple[tuple[int, ...], tuple[int, ...]]:
    """States that state 0 does not lead to, and states that do not lead to state 0.

    Both are empty exactly if the graph is strongly connected.

    >>> unreachable(Graph(3, ((0, 1), (2, 1)), (False, True)))
    ((2,), ())
    """
    every = (1 << graph.size) - 1
    from_start = reach(successors(graph), 1, every)
    to_start = reach(predecessors(graph), 1, every)
    return tuple(members(every & ~from_start)), tuple(members(every & ~to_start))


def is_strongly_connected(graph: Graph) -> bool:
    """Whether allowed steps lead from each state to each other state.

    >>> is_strongly_connected(Graph(3, ((0, 1), (1, 2), (2, 0)), (True, True, True)))
    True
    >>> is_strongly_connected(Graph(2, ((0, 1),), (True,)))
    False
    """
    return unreachable(graph) == ((), ())


def is_connected(graph: Graph) -> bool:
    """Whether the graph is connected when directions are ignored.

    >>> is_connected(Graph(2, ((0, 1),), (True,)))
    True
    """
    every = (1 << graph.size) - 1
    return reach(neighbours(graph), 1, every) == every


def incident(graph: Graph) -> tuple[tuple[tuple[int, int], ...], ...]:
    """For each state its transitions as (transition, other end), in order of the transitions.

    >>> incident(Graph(3, ((0, 1), (1, 2)), (False, False)))
    (((0, 1),), ((0, 0), (1, 2)), ((1, 1),))
    """
    lists: list[list[tuple[int, int]]] = [[] for _ in range(graph.size)]
    for transition, (first, second) in enumerate(graph.ends):
        lists[first].append((transition, second))
        lists[second].append((transition, first))
    return tuple(tuple(entries) for entries in lists)


def breadth_first(graph: Graph) -> tuple[tuple[int, int], ...]:
    """States in breadth-first order from state 0, each with the transition it was found by.

    State 0 comes first, with -1; neighbours are taken in order of the transitions, directions
    ignored. Only the states connected to state 0 appear.

    >>> breadth_first(Graph(3, ((1, 2), (0, 2)), (False, False)))
    ((0, -1), (2, 1), (1, 0))
    """
    adjacent = incident(graph)
    found = {0: -1}
    order = [0]
    for state in order:
        for transition, other in adjacent[state]:
            if other not in found:
                found[other] = transition
                order.append(other)
    return tuple((state, found[state]) for state in order)
