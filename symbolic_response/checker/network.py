"""Graphs of networks: simple paths, cycles and splittings; linear algebra in exact integers.

A rate has the number 2e (forward) or 2e + 1 (backward) for transition e, so that i ^ 1 is the
opposite of i. Sets of states are bit masks.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from fractions import Fraction
from functools import cache
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
        self.every = range(2 * len(ends))  # the rates, those of one-way transitions included
        self.rates = [i for i in self.every if self.can_run((i,))]
        self.listed = 0
        self.paths, self.splittings = cache(self._paths), cache(self._splittings)
        self.cycles = cache(self._cycles)

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

    def next_states(self, rates: Iterable[int]) -> list[int]:
        """Return for each state the mask of the states that some rates lead to from there."""
        masks = [0] * self.states
        for i in rates:
            a, b = self.step(i)
            masks[a] |= 1 << b
        return masks

    def strongly_connected(self) -> bool:
        """Can every state be reached from the first, and the first from every state?"""
        every = (1 << self.states) - 1
        return all(reached(self.next_states(i ^ back for i in self.rates), 0, every) == every
                   for back in (0, 1))

    def _paths(self, start: int, goal: int, without: int = -1) -> list[Path]:
        """Return all simple paths, as the rates along them, that avoid one transition."""
        usable = [i for i in self.every if i >> 1 != without]
        steps = [[(i, b) for i in usable for a, b in [self.step(i)] if a == k]
                 for k in range(self.states)]
        masks, found = self.next_states(usable), []
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

    def _cycles(self, e: int) -> list[Path]:
        """Return the cycles through transition e, each once, along its forward direction."""
        first, second = self.ends[e]
        return [(2 * e, *path) for path in self.paths(second, first, e)]

    def mixed_cycles(self, chosen: Iterable[int]) -> list[Path]:
        """Return the cycles that have transitions inside and outside a set of transitions."""
        inside = set(chosen)
        return [cycle for e in sorted(inside) for cycle in self.cycles(e)
                if any(i >> 1 not in inside for i in cycle)]

    def _splittings(self, e: int) -> list[int]:
        """Return the sets with the first end of e, without its second, connected like the rest."""
        masks, (first, second) = self.next_states(self.every), self.ends[e]
        every, found = (1 << self.states) - 1, []
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

    def generator(self, rates: Sequence[Number], without: int = -1) -> list[list[Number]]:
        """Return W with W[i][j] the rate from j to i, its columns summing to 0."""
        matrix = [[rates[0] * 0] * self.states for _ in range(self.states)]
        for i in self.every:
            if i >> 1 != without:
                a, b = self.step(i)
                matrix[b][a] += rates[i]
                matrix[a][a] -= rates[i]
        return matrix

    def forests(self, rates: Sequence[Number], roots: int, without: int = -1) -> Fraction:
        """Return the sum over spanning forests that lead into a set of states: a minor of -W."""
        kept = [k for k in range(self.states) if not roots >> k & 1]
        matrix = self.generator(rates, without)
        return determinant([[-matrix[i][j] for j in kept] for i in kept], self.work)

    def number_of_trees(self, without: int = -1, roots: int = 1) -> int:
        """Return the number of spanning forests, directions left aside, with one root a tree."""
        return int(self.forests([1] * len(self.every), roots, without))


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
    parts = list(range(states))  # the part of the graph that each state is in
    for a, b in ends:
        parts = [parts[b] if part == parts[a] else part for part in parts]
    return states - len(set(parts))


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
