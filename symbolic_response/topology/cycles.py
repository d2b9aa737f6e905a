"""Simple cycles of a graph, parallel transitions and one-way steps included.

A cycle repeats no state and no transition; two parallel transitions are a cycle of length two.
Up to orientation it is counted once. Its reference orientation starts at its lowest state and goes
to the lower of that state's two neighbours; for length two, along the lower transition.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations, product

from symbolic_response.errors import SizeLimitError
from symbolic_response.topology.graph import (
    Graph,
    Progress,
    breadth_first,
    members,
    neighbours,
    predecessors,
    reach,
    successors,
)


@dataclass(frozen=True, slots=True)
class Cycle:
    """A closed walk: step i uses ``transitions[i]`` from ``states[i]`` to ``states[(i+1) % L]``.

    ``along[i]``: step i runs its transition from first to second state.

    >>> cycle = Cycle((0, 1, 2), (0, 2, 1), (True, False, True))
    >>> cycle.forward, cycle.backward
    (3, 4)
    """

    states: tuple[int, ...]
    transitions: tuple[int, ...]
    along: tuple[bool, ...]

    def __post_init__(self) -> None:
        if not 2 <= len(self.states) == len(self.transitions) == len(self.along):
            raise ValueError("a cycle has as many states as transitions, and at least two")
        if len(set(self.states)) < len(self.states):
            raise ValueError("a cycle repeats no state")
        if len(set(self.transitions)) < len(self.transitions):
            raise ValueError("a cycle repeats no transition")

    @property
    def forward(self) -> int:
        """Mask of the transitions that the cycle runs from first to second state.

        The product of rates along the cycle takes their forward rates, the one against it their
        backward rates.
        """
        return sum(1 << e for e, ahead in zip(self.transitions, self.along, strict=True) if ahead)

    @property
    def backward(self) -> int:
        """Mask of the transitions that the cycle runs from second to first state.

        The product of rates along the cycle takes their backward rates, the one against it their
        forward rates.
        """
        return sum(
            1 << e for e, ahead in zip(self.transitions, self.along, strict=True) if not ahead
        )


def can_run_along(graph: Graph, cycle: Cycle) -> bool:
    """Whether one-way transitions let the cycle be run in its own orientation.

    >>> ring = Graph(3, ((0, 1), (1, 2), (2, 0)), (False, False, True))
    >>> (cycle,) = cycles(ring)
    >>> can_run_along(ring, cycle), can_run_against(ring, cycle)
    (True, False)
    """
    return not any(graph.one_way[e] for e in members(cycle.backward))


def can_run_against(graph: Graph, cycle: Cycle) -> bool:
    """Whether one-way transitions let the cycle be run against its own orientation.

    >>> pair = Graph(2, ((0, 1), (1, 0)), (True, True))
    >>> can_run_against(pair, cycles(pair)[0])
    False
    """
    return not any(graph.one_way[e] for e in members(cycle.forward))


def cycles(
    graph: Graph,
    *,
    limit: int = 200_000,
    undirected: bool = False,
    progress: Progress | None = None,
) -> tuple[Cycle, ...]:
    """All simple cycles, each once, ordered by length, then states, then transitions.

    Cycles that can be run neither way are left out unless ``undirected``. More than ``limit``:
    SizeLimitError. The time is bounded by a polynomial in the size for each cycle found, however
    many paths the graph has. The number of cycles is not known beforehand: ``progress`` gets the
    number found and the limit.

    >>> square = Graph(4, ((0, 1), (1, 2), (2, 3), (3, 0), (0, 2)), (False,) * 5)
    >>> [cycle.states for cycle in cycles(square)]
    [(0, 1, 2), (0, 2, 3), (0, 1, 2, 3)]
    """
    if undirected:
        graph = Graph(graph.size, graph.ends, (False,) * len(graph.ends))
    found: list[Cycle] = []
    for cycle in _every_cycle(graph, limit):
        found.append(cycle)
        if len(found) > limit:
            raise _beyond(limit)
        if progress is not None and len(found) % 1000 == 0:
            progress(len(found), limit)
    found.sort(key=lambda cycle: (len(cycle.states), cycle.states, cycle.transitions))
    return tuple(found)


def _beyond(limit: int) -> SizeLimitError:
    return SizeLimitError(
        f"more than {limit} cycles; exact values at given points (--at) of quantities that need no"
        " cycles still work"
    )


def _every_cycle(graph: Graph, limit: int) -> Iterator[Cycle]:
    parallel: dict[tuple[int, int], list[int]] = {}
    steps: dict[tuple[int, int], list[int]] = {}
    for transition, (first, second) in enumerate(graph.ends):
        parallel.setdefault((min(first, second), max(first, second)), []).append(transition)
        steps.setdefault((first, second), []).append(transition)
        if not graph.one_way[transition]:
            steps.setdefault((second, first), []).append(transition)
    for ends, group in parallel.items():
        for two in combinations(group, 2):
            cycle = _cycle(graph, ends, two)
            if can_run_along(graph, cycle) or can_run_against(graph, cycle):
                yield cycle
    mixed = any(graph.one_way)
    for states in _state_sequences(graph, limit):
        turned = states[1:] + states[:1]
        ahead = (steps.get(pair, ()) for pair in zip(states, turned, strict=True))
        for choice in product(*ahead):
            yield _cycle(graph, states, choice)
        if mixed:
            back = (steps.get(pair, ()) for pair in zip(turned, states, strict=True))
            for choice in product(*back):
                if any(graph.one_way[e] for e in choice):
                    yield _cycle(graph, states, choice)


def _cycle(graph: Graph, states: tuple[int, ...], transitions: tuple[int, ...]) -> Cycle:
    ends = graph.ends
    along = tuple([ends[e][0] == i for e, i in zip(transitions, states, strict=True)])
    return Cycle(states, transitions, along)


def _state_sequences(graph: Graph, limit: int) -> Iterable[tuple[int, ...]]:
    # States of the cycles of three or more states, in reference orientation: those that allowed
    # steps can run along it, and those they can run against it.
    if not any(graph.one_way):
        both = neighbours(graph)
        return _closed_paths(both, both)
    out, into = successors(graph), predecessors(graph)
    sequences: set[tuple[int, ...]] = set()
    for walks in (_closed_paths(out, into), _closed_paths(into, out)):
        for states in walks:
            sequences.add(states)
            if len(sequences) > limit:
                raise _beyond(limit)
    return sorted(sequences)


def _closed_paths(out: Sequence[int], into: Sequence[int]) -> Iterator[tuple[int, ...]]:
    """Closed paths of at least three states whose steps are in ``out`` (``into`` its reverse).

    Each starts at its lowest state, and its second state is lower than its last one.
    """
    for start in range(len(out)):
        higher = (1 << len(out)) - (2 << start)
        for second in members(out[start] & higher):
            last = into[start] & higher & -(2 << second)
            yield from _paths(out, into, [start, second], higher & ~(1 << second), last)


def _paths(
    out: Sequence[int], into: Sequence[int], path: list[int], free: int, last: int
) -> Iterator[tuple[int, ...]]:
    # Extends the path through free states to each state in last. A step is taken only where some
    # state in last can still be reached, so every path that is tried completes to a cycle.
    waiting = [_useful_steps(out, into, path[-1], free, last)]
    while waiting:
        steps = waiting[-1]
        if not steps:
            waiting.pop()
            free |= 1 << path.pop()
            continue
        step = steps & -steps
        waiting[-1] ^= step
        free ^= step
        path.append(step.bit_length() - 1)
        if step & last:
            yield tuple(path)
        waiting.append(_useful_steps(out, into, path[-1], free, last))


def _useful_steps(out: Sequence[int], into: Sequence[int], state: int, free: int, last: int) -> int:
    steps = out[state] & free
    return steps & reach(into, last, free) if steps and last & free else 0


def fundamental_cycles(graph: Graph) -> tuple[Cycle, ...]:
    """One cycle for each transition outside the breadth-first spanning tree from state 0.

    In order of those transitions (chords), E - V + 1 of them, whether or not one-way transitions
    let them be run. Each starts with its chord, run from first to second state, and returns through
    the tree: the chord is ``transitions[0]``. Every cycle force is an integer combination of these.
    ValueError if the graph is not connected.

    >>> square = Graph(4, ((0, 1), (1, 2), (2, 3), (3, 0), (0, 2)), (False,) * 5)
    >>> [(cycle.states, cycle.transitions) for cycle in fundamental_cycles(square)]
    [((1, 2, 0), (1, 4, 0)), ((2, 3, 0), (2, 3, 4))]
    """
    found = breadth_first(graph)
    if len(found) < graph.size:
        raise ValueError("the graph is not connected")
    by = dict(found)
    tree = set(by.values())
    result = []
    for chord, (first, second) in enumerate(graph.ends):
        if chord not in tree:
            down, up = _to_root(graph, by, first), _to_root(graph, by, second)
            while down and up and down[-1] == up[-1]:
                down.pop()
                up.pop()
            result.append(_walk(graph, first, [chord, *up, *reversed(down)]))
    return tuple(result)


def _to_root(graph: Graph, by: dict[int, int], state: int) -> list[int]:
    path = []
    while state:
        path.append(by[state])
        state = sum(graph.ends[by[state]]) - state
    return path


def _walk(graph: Graph, start: int, transitions: list[int]) -> Cycle:
    states = [start]
    for transition in transitions[:-1]:
        states.append(sum(graph.ends[transition]) - states[-1])
    return _cycle(graph, tuple(states), tuple(transitions))
