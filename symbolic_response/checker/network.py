"""Graphs of networks: simple paths, cycles and splittings; linear algebra in exact integers.

A rate has the number 2e (forward) or 2e + 1 (backward) for transition e, so that i ^ 1 is the
opposite of i. Sets of states are bit masks.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from fractions import Fraction
from math import lcm
from typing import TypeVar

from .reading import Work, too_large

MAX_LISTED = 200_000  # paths, cycles and splittings of one record, together
Path = tuple[int, ...]
Number = TypeVar("Number", int, Fraction)


class Graph:
    """States by number, transitions as pairs of states, and which of them are one-way."""

    def __init__(self, states: int, ends: list[tuple[int, int]], one_way: list[bool],
                 work: Work) -> None:
        self.states, self.ends, self.one_way, self.work = states, ends, one_way, work
        self.listed = 0
        self._cycles: dict[int, list[Path]] = {}
        self._paths: dict[tuple[int, int], list[Path]] = {}
        self._splittings: dict[int, list[int]] = {}

    def strongly_connected(self) -> bool:
        """Can every state be reached from the first, and the first from every state?"""
        ahead, behind = [0] * self.states, [0] * self.states
        for (first, second), single in zip(self.ends, self.one_way, strict=True):
            for a, b in [(first, second)] if single else [(first, second), (second, first)]:
                ahead[a] |= 1 << b
                behind[b] |= 1 << a
        every = (1 << self.states) - 1
        return reached(ahead, 0, every) == every == reached(behind, 0, every)

    def neighbours(self, without: int = -1) -> list[int]:
        """Return for each state the mask of the states that transitions join it to."""
        masks = [0] * self.states
        for e, (a, b) in enumerate(self.ends):
            if e != without:
                masks[a] |= 1 << b
                masks[b] |= 1 << a
        return masks

    def paths(self, start: int, goal: int, without: int = -1) -> list[Path]:
        """Return all simple paths, as the rates along them, that avoid one transition."""
        steps: list[list[tuple[int, int]]] = [[] for _ in range(self.states)]
        for e, (a, b) in enumerate(self.ends):
            if e != without:
                steps[a].append((2 * e, b))
                steps[b].append((2 * e + 1, a))
        masks, found = self.neighbours(without), []
        waiting: list[tuple[int, int, Path]] = [(start, (1 << self.states) - 1, ())]
        while waiting:
            here, free, path = waiting.pop()
            self.work.charge(self.states, 0)
            if here == goal:
                found.append(path)
                self._count()
            elif reached(masks, here, free) >> goal & 1:  # no search without a find
                free &= ~(1 << here)
                waiting += [(b, free, (*path, i)) for i, b in steps[here] if free >> b & 1]
        return found

    def cycles(self, e: int) -> list[Path]:
        """Return the cycles through transition e, each once, along its forward direction."""
        if e not in self._cycles:
            first, second = self.ends[e]
            self._cycles[e] = [(2 * e, *path) for path in self.paths(second, first, e)]
        return self._cycles[e]

    def paths_between(self, start: int, goal: int) -> list[Path]:
        """Return all simple paths between two states, listed once."""
        if (start, goal) not in self._paths:
            self._paths[start, goal] = self.paths(start, goal)
        return self._paths[start, goal]

    def can_run(self, path: Iterable[int]) -> bool:
        """Has every step of the path a rate?"""
        return not any(i & 1 and self.one_way[i >> 1] for i in path)

    def step(self, i: int) -> tuple[int, int]:
        """Return the states that rate i leads from and to."""
        first, second = self.ends[i >> 1]
        return (second, first) if i & 1 else (first, second)

    def visited(self, path: Path) -> int:
        """Return the states on a path, its first one included."""
        mask = 1 << self.step(path[0])[0]
        for i in path:
            mask |= 1 << self.step(i)[1]
        return mask

    def rates(self) -> list[int]:
        """Return the numbers of the rates there are."""
        return [i for i in range(2 * len(self.ends)) if self.can_run((i,))]

    def inner(self, side: int) -> list[int]:
        """Return the numbers of the rates within a set of states and within the rest."""
        return [2 * e + k for e, (a, b) in enumerate(self.ends) for k in (0, 1)
                if side >> a & 1 == side >> b & 1]

    def mixed_cycles(self, chosen: Iterable[int]) -> list[Path]:
        """Return the cycles that have transitions inside and outside a set of transitions."""
        inside = set(chosen)
        return [cycle for e in sorted(inside) for cycle in self.cycles(e)
                if any(i >> 1 not in inside for i in cycle)]

    def splittings(self, e: int) -> list[int]:
        """Return the sets with the first end of e, without its second, connected like the rest."""
        if e in self._splittings:
            return self._splittings[e]
        masks, (first, second) = self.neighbours(), self.ends[e]
        every = (1 << self.states) - 1
        found = self._splittings[e] = []
        waiting = [(1 << first, 0)]
        while waiting:
            inside, outside = waiting.pop()
            self.work.charge(self.states, 0)
            rest = reached(masks, second, every & ~inside)
            inside = every & ~rest  # what the rest cannot hold belongs to the set
            if inside & outside:
                continue
            edge = union(masks, inside) & rest & ~outside & ~(1 << second)
            if edge:
                state = edge & -edge
                waiting += [(inside | state, outside), (inside, outside | state)]
            else:
                found.append(inside)
                self._count()
        return found

    def _count(self) -> None:
        self.listed += 1
        if self.listed > MAX_LISTED:
            raise too_large("network", MAX_LISTED, "more paths, cycles and splittings")


def union(masks: list[int], states: int) -> int:
    """Return all neighbours of a set."""
    found = 0
    while states:
        lowest = states & -states
        found |= masks[lowest.bit_length() - 1]
        states ^= lowest
    return found


def reached(masks: list[int], start: int, within: int) -> int:
    """Return what can be reached from a state inside a set that holds it."""
    found, new = 0, 1 << start
    while new:
        found |= new
        new = union(masks, new) & within & ~found
    return found


def rank(states: int, ends: Iterable[tuple[int, int]]) -> int:
    """Return how many of these transitions a forest can have."""
    ahead, found = list(range(states)), 0

    def top(k: int) -> int:
        while ahead[k] != k:
            ahead[k] = k = ahead[ahead[k]]
        return k

    for a, b in ends:
        a, b = top(a), top(b)
        found += a != b
        ahead[a] = b
    return found


def generator(states: int, ends: Sequence[tuple[int, int]], rates: Sequence[Number],
              without: int = -1) -> list[list[Number]]:
    """Return W with W[i][j] the rate from j to i, its columns summing to 0."""
    matrix = [[rates[0] * 0] * states for _ in range(states)]
    for e, (first, second) in enumerate(ends):
        if e != without:
            for a, b, rate in ((first, second, rates[2 * e]), (second, first, rates[2 * e + 1])):
                matrix[b][a] += rate
                matrix[a][a] -= rate
    return matrix


def minor(matrix: list[list[Number]], roots: int) -> list[list[Number]]:
    """Return -W without some states: its determinant is the sum over forests that lead to them."""
    kept = [k for k in range(len(matrix)) if not roots >> k & 1]
    return [[-matrix[i][j] for j in kept] for i in kept]


def eliminate(rows: list[list[int]], work: Work) -> int:
    """Make integer rows triangular in place, without fractions; return the sign, 0 if singular.

    The last pivot is then the determinant up to the sign (Bareiss).
    """
    sign, previous = 1, 1
    for k in range(len(rows)):
        pivot = next((i for i in range(k, len(rows)) if rows[i][k]), None)
        if pivot is None:
            return 0
        if pivot != k:
            rows[k], rows[pivot], sign = rows[pivot], rows[k], -sign
        top, head = rows[k], rows[k][k]
        work.charge(len(rows) * len(top), 2 * head.bit_length())
        for row in rows[k + 1 :]:
            factor = row[k]
            row[k:] = [(head * x - factor * y) // previous
                       for x, y in zip(row[k:], top[k:], strict=True)]
        previous = head
    return sign


def _whole_row(row: Sequence[int | Fraction]) -> tuple[list[int], int]:
    scale = lcm(*(x.denominator for x in row))
    return [x.numerator * (scale // x.denominator) for x in row], scale


def determinant(matrix: Sequence[Sequence[int | Fraction]], work: Work) -> Fraction:
    """Return the determinant (1 of an empty matrix)."""
    scaled = [_whole_row(row) for row in matrix]
    rows, scale = [row for row, _ in scaled], 1
    for _, factor in scaled:
        scale *= factor
    sign = eliminate(rows, work)
    return Fraction(sign * (rows[-1][-1] if rows else 1), scale)


def solve(matrix: list[list[Fraction]], right: list[Fraction], work: Work) -> list[Fraction]:
    """Solve a system of equations whose matrix is not singular."""
    rows = [_whole_row([*row, b])[0] for row, b in zip(matrix, right, strict=True)]
    eliminate(rows, work)
    size = len(rows)
    last = rows[-1][size - 1]
    found = [0] * size  # solution times the last pivot: integers, by Cramer's rule
    for i in reversed(range(size)):
        known = sum(rows[i][j] * found[j] for j in range(i + 1, size))
        found[i] = (rows[i][size] * last - known) // rows[i][i]
    return [Fraction(x, last) for x in found]
