"""Where the states of a graph are drawn: candidates, and the best of them.

Coordinates are in units of the mean length of a transition. Candidates: for each face of a plane
embedding the drawing with that face as its outer polygon and every other state in the middle of
its neighbours (Tutte, Proc. London Math. Soc. 13, 743 (1963)); each Hamiltonian cycle as a
polygon; least stress, distances being those in the graph (Kamada and Kawai, Inf. Process. Lett.
31, 7 (1989)); a circle in file order. Iterations have a fixed number of steps and coordinates are
rounded before they are compared, so that every machine draws the same.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Iterator, Sequence
from functools import lru_cache
from typing import TypeAlias

import networkx as nx
import numpy as np

from symbolic_response.figures.diagrams.geometry import cross, distance
from symbolic_response.figures.diagrams.orientation import oriented, uprightness
from symbolic_response.topology import Graph

Positions: TypeAlias = tuple[complex, ...]
Pairs: TypeAlias = tuple[tuple[int, int], ...]

DIGITS = 6
CAREFUL = 12
CYCLES, STEPS = 40, 20_000
SWEEPS = 300
EQUALS = 24
SHORTEST = 0.05
SPREADS = (1.0, 1.25, 1.5)
POLYGON_BONUS, GRID_BONUS = 0.3, 0.45


def positions(graph: Graph) -> Positions:
    """Return where the states are drawn, the mean length of a transition being 1.

    >>> square = Graph(4, ((0, 1), (1, 2), (2, 3), (3, 0), (0, 2)), (False,) * 5)
    >>> places = positions(square)
    >>> round(abs(places[0] - places[2]) / abs(places[0] - places[1]), 4)
    1.4142
    """
    pairs = tuple(sorted({(min(ends), max(ends)) for ends in graph.ends}))
    return _positions(graph.size, pairs)


@lru_cache(maxsize=64)
def _positions(size: int, pairs: Pairs) -> Positions:
    best: list[Positions] = []
    least = math.inf
    for places, bonus in _with_leaves(size, pairs):
        tidy = _tidy(places, pairs)
        cost = round(_cost(tidy, pairs) - bonus, 4)
        if cost < least:
            best, least = [], cost
        if cost == least and len(best) < EQUALS:
            best.append(tidy)
    turned = [oriented(places, pairs) for places in best]
    return max(turned, key=lambda places: uprightness(places, pairs))


def _tidy(places: Sequence[complex], pairs: Pairs) -> Positions:
    """Return positions around 0 with lines of mean length 1, rounded."""
    middle = sum(places) / len(places)
    mean = sum(abs(places[a] - places[b]) for a, b in pairs) / len(pairs) or 1.0
    return tuple(
        complex(round(z.real, DIGITS), round(z.imag, DIGITS))
        for z in ((place - middle) / mean for place in places)
    )


# -- the best --------------------------------------------------------------------------------------


def _cost(places: Positions, pairs: Pairs) -> float:
    """Return how bad a drawing is: crossings, narrow places, uneven lengths, sharp angles."""
    lengths = [abs(places[a] - places[b]) for a, b in pairs]
    if min(lengths) < SHORTEST:
        return 1000.0
    crossings = sum(
        cross(places[a], places[b], places[c], places[d])
        for place, (a, b) in enumerate(pairs) for c, d in pairs[:place]
    )
    clear = min(
        [distance(z, places[a], places[b])
         for k, z in enumerate(places) for a, b in pairs if k not in (a, b)]
        + [abs(z - w) for k, z in enumerate(places) for w in places[:k]]
    )
    spread = math.sqrt(sum((length - 1) ** 2 for length in lengths) / len(lengths))
    angle = _sharpest(places, pairs)
    return (
        crossings
        + (50 if clear < 0.1 else 0) + 4 * max(0.0, 0.4 - clear)
        + 1.5 * spread + 0.5 * max(0.0, max(lengths) / min(lengths) - 2.2)
        + max(0.0, (35 - angle) / 35)
    )


def _sharpest(places: Positions, pairs: Pairs) -> float:
    """Return the smallest angle between two lines of a state, in degrees."""
    smallest = 360.0
    for k, z in enumerate(places):
        angles = sorted(
            math.degrees(cmath.phase(places[a + b - k] - z)) for a, b in pairs if k in (a, b)
        )
        turned = [*angles[1:], angles[0] + 360]
        smallest = min(
            smallest, *(after - before for before, after in zip(angles, turned, strict=True))
        )
    return smallest


# -- candidates ------------------------------------------------------------------------------------


def _candidates(size: int, pairs: Pairs) -> Iterator[tuple[Sequence[complex], float]]:
    """Yield positions and their bonus."""
    if len(pairs) == size - 1 and (row := _row(size, pairs)):
        yield row, GRID_BONUS
    if size <= CAREFUL:
        for face in _faces(size, pairs):
            for outer, bonus in _outlines(len(face)):
                places = _inside(size, pairs, dict(zip(face, outer, strict=True)))
                for spread in SPREADS if len(face) < size else (1.0,):
                    yield _spread(places, frozenset(face), spread), bonus
    for cycle in _hamiltonian(size, pairs):
        sparse = size <= CAREFUL and len(pairs) < 2 * size
        for outer, bonus in _outlines(size) if sparse else [(_polygon(size), POLYGON_BONUS)]:
            by_state = dict(zip(cycle, outer, strict=True))
            yield [by_state[k] for k in range(size)], bonus
    yield _least_stress(size, pairs), 0.0
    yield _polygon(size), 0.0


def _with_leaves(size: int, pairs: Pairs) -> Iterator[tuple[Sequence[complex], float]]:
    """Yield candidates, and those of the graph without its dead ends, which are then put on."""
    yield from _candidates(size, pairs)
    core, leaves = set(range(size)), []
    while True:
        near = {k: [a + b - k for a, b in pairs if k in (a, b) and {a, b} <= core] for k in core}
        found = [k for k in sorted(core) if len(near[k]) == 1]
        if not found or len(core) <= 3:
            break
        leaves.append((found[-1], near[found[-1]][0]))
        core.remove(found[-1])
    if not leaves or len(core) < 3:
        return
    place = {k: i for i, k in enumerate(sorted(core))}
    inner = tuple((place[a], place[b]) for a, b in pairs if {a, b} <= core)
    for places, bonus in _candidates(len(core), inner):
        tidy = _tidy(places, inner)
        if min(abs(tidy[a] - tidy[b]) for a, b in inner) < SHORTEST:
            continue
        for straight in (False, True):
            known = {k: tidy[place[k]] for k in core}
            for leaf, at in reversed(leaves):
                known[leaf] = known[at] + _outwards(at, known, pairs, straight)
            yield [known[k] for k in range(size)], bonus


def _outwards(at: int, known: dict[int, complex], pairs: Pairs, straight: bool) -> complex:
    """Return a free direction at a state: straight on, or into the middle of the widest gap."""
    near = [a + b - at for a, b in pairs if at in (a, b)]
    steps = [known[k] - known[at] for k in near if k in known]
    angles = sorted(round(cmath.phase(step), DIGITS) for step in steps)
    turned = [*angles[1:], angles[0] + 2 * math.pi]
    gap, before = max(
        (round(after - before, 4), before) for before, after in zip(angles, turned, strict=True)
    )
    if straight and len(steps) == 2 and gap > 1.2 * math.pi:
        return -steps[0] / abs(steps[0])
    return cmath.rect(1, before + gap / 2)


def _polygon(size: int) -> list[complex]:
    return [1j * cmath.exp(-2j * math.pi * k / size) for k in range(size)]


def _row(size: int, pairs: Pairs) -> list[complex] | None:
    """Return a chain of states along a line, None if the tree is not a chain."""
    near: dict[int, list[int]] = {k: [] for k in range(size)}
    for a, b in pairs:
        near[a].append(b)
        near[b].append(a)
    if any(len(others) > 2 for others in near.values()):
        return None
    chain = [min(k for k in range(size) if len(near[k]) == 1)]
    while len(chain) < size:
        chain.append(next(k for k in near[chain[-1]] if k not in chain[-2:-1]))
    return [complex(chain.index(k), 0) for k in range(size)]


def _outlines(size: int) -> Iterator[tuple[list[complex], float]]:
    """Yield polygons of so many corners: a regular one, and rectangles with states on the sides."""
    yield _polygon(size), POLYGON_BONUS
    if size % 2 or size < 6:
        return
    for across in range(1, size // 2):
        down = size // 2 - across
        corner = complex(across, down)
        sides = [complex(k, down) for k in range(across)]
        sides += [complex(across, down - k) for k in range(down)]
        around = [*sides, *(corner - z for z in sides)]
        for shift in range(size // 2):
            yield around[shift:] + around[:shift], GRID_BONUS


def _faces(size: int, pairs: Pairs) -> list[tuple[int, ...]]:
    """Return the faces of a plane embedding that are cycles, those of low states first.

    Where there is no plane embedding, a shortest cycle through each line.
    """
    graph = nx.Graph()
    graph.add_nodes_from(range(size))
    graph.add_edges_from(pairs)
    planar, embedding = nx.check_planarity(graph)
    if not planar:
        return _short_cycles(graph, pairs)
    seen: set[tuple[int, int]] = set()
    faces = []
    for a, b in sorted(embedding.edges()):
        if (a, b) not in seen:
            face = tuple(embedding.traverse_face(a, b, mark_half_edges=seen))
            if len(face) >= 3 and len(set(face)) == len(face):
                faces.append(face)
    return sorted(faces, key=lambda face: (sorted(face), face))


def _short_cycles(graph: nx.Graph, pairs: Pairs) -> list[tuple[int, ...]]:
    found: dict[frozenset[int], tuple[int, ...]] = {}
    for a, b in pairs:
        rest = graph.copy()
        rest.remove_edge(a, b)
        if nx.has_path(rest, a, b):
            cycle = tuple(nx.shortest_path(rest, a, b))
            found.setdefault(frozenset(cycle), cycle)
    return sorted(found.values(), key=lambda cycle: (sorted(cycle), cycle))


def _inside(size: int, pairs: Pairs, outer: dict[int, complex]) -> list[complex]:
    """Return the drawing in which each state not on the outline is the mean of its neighbours."""
    inner = [k for k in range(size) if k not in outer]
    if not inner:
        return [outer[k] for k in range(size)]
    place = {k: i for i, k in enumerate(inner)}
    matrix = np.zeros((len(inner), len(inner)))
    right = np.zeros(len(inner), dtype=complex)
    for pair in pairs:
        for k, other in (pair, pair[::-1]):
            if k in place:
                matrix[place[k], place[k]] += 1
                if other in place:
                    matrix[place[k], place[other]] -= 1
                else:
                    right[place[k]] += outer[other]
    solved = np.linalg.solve(matrix, right)
    return [outer[k] if k in outer else complex(solved[place[k]]) for k in range(size)]


def _spread(places: list[complex], outer: frozenset[int], factor: float) -> list[complex]:
    """Return positions with the inner ones moved away from the middle of the outline."""
    middle = sum(places[k] for k in outer) / len(outer)
    return [z if k in outer else middle + factor * (z - middle) for k, z in enumerate(places)]


def _hamiltonian(size: int, pairs: Pairs) -> list[list[int]]:
    """Return the first Hamiltonian cycles, at most ``CYCLES``, each once."""
    near: list[list[int]] = [[] for _ in range(size)]
    for a, b in pairs:
        near[a].append(b)
        near[b].append(a)
    found: list[list[int]] = []
    path, waiting = [0], [iter(sorted(near[0]))]
    for _ in range(STEPS):
        if not waiting or len(found) == CYCLES:
            break
        step = next(waiting[-1], None)
        if step is None:
            waiting.pop()
            path.pop()
        elif step not in path:
            path.append(step)
            waiting.append(iter(sorted(near[step])))
            if len(path) == size and 0 in near[step] and size > 2 and path[1] < path[-1]:
                found.append(list(path))
    return found


def _least_stress(size: int, pairs: Pairs) -> list[complex]:
    """Return positions whose distances are near those in the graph, from a circle on.

    Each step puts every state where its pull is balanced (de Leeuw's majorisation).
    """
    graph = nx.Graph()
    graph.add_nodes_from(range(size))
    graph.add_edges_from(pairs)
    far = dict(nx.all_pairs_shortest_path_length(graph))
    places = [z * size / 6 for z in _polygon(size)]
    for _ in range(SWEEPS if size <= 30 else 60):
        moved = []
        for k, z in enumerate(places):
            pull, weights = 0j, 0.0
            for other, w in enumerate(places):
                if other != k:
                    weight = far[k][other] ** -2.0
                    gap = abs(z - w) or 1e-9
                    pull += weight * (w + far[k][other] * (z - w) / gap)
                    weights += weight
            moved.append(pull / weights)
        places = moved
    return places
