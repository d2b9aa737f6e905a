"""Random small networks as plain numbers, and their steady state by elimination on fractions."""

from __future__ import annotations

import random
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import combinations, permutations

from symbolic_response.network import Network, Rates, build_network

Rate = tuple[int, int, Fraction, Fraction]
Weights = list[tuple[Fraction, Fraction]]


@dataclass(frozen=True)
class Numbers:
    """Transitions (first, second, forward rate, backward rate; 0: one-way) between states."""

    size: int
    transitions: tuple[Rate, ...]

    def network(self, symbol: dict[int, str] | None = None) -> Network:
        """Return the network; ``symbol``: a factor for both rates of some transitions."""
        names = "ABCDEFGH"[: self.size]
        return build_network("random", states=list(names), transitions=[
            Rates(names[a], names[b],
                  f"{(symbol or {}).get(e, '1')}*{w}",
                  f"{(symbol or {}).get(e, '1')}*{v}" if v else None, name=f"t{e}")
            for e, (a, b, w, v) in enumerate(self.transitions)])

    def steady(self, factors: Weights | None = None) -> list[Fraction]:
        """Return p, the rates multiplied by factors."""
        matrix = [[Fraction(0)] * self.size + [Fraction(0)] for _ in range(self.size)]
        for e, (a, b, w, v) in enumerate(self.transitions):
            x, y = (w, v) if factors is None else (w * factors[e][0], v * factors[e][1])
            for tail, head, rate in ((a, b, x), (b, a, y)):
                matrix[head][tail] += rate
                matrix[tail][tail] -= rate
        matrix[-1] = [Fraction(1)] * (self.size + 1)
        return eliminated(matrix)

    def change(self, moves: Weights) -> tuple[list[Fraction], list[Fraction]]:
        """Return p and dp/d theta, ``moves`` the changes of ln of the rates: W p' = -W' p."""
        p = self.steady()
        matrix = [[Fraction(0)] * (self.size + 1) for _ in range(self.size)]
        for (a, b, w, v), (x, y) in zip(self.transitions, moves, strict=True):
            for tail, head, rate, move in ((a, b, w, x), (b, a, v, y)):
                matrix[head][tail] += rate
                matrix[tail][tail] -= rate
                matrix[head][-1] -= rate * move * p[tail]
                matrix[tail][-1] += rate * move * p[tail]
        matrix[-1] = [Fraction(1)] * self.size + [Fraction(0)]
        return p, eliminated(matrix)

    def trees(self) -> list[tuple[int, frozenset[int], Fraction]]:
        """Return every rooted tree: its root, its directed rates (2e, 2e + 1), their product."""
        found = []
        for chosen in combinations(range(len(self.transitions)), self.size - 1):
            for root in range(self.size):
                rates = directed([self.transitions[e][:2] for e in chosen], chosen, root, self.size)
                if rates is None:
                    continue
                product = Fraction(1)
                for rate in rates:
                    product *= self.transitions[rate // 2][2 + rate % 2]
                if product:
                    found.append((root, frozenset(rates), product))
        return found

    def cycles(self) -> list[tuple[frozenset[int], Fraction, Fraction]]:
        """Return every cycle: its transitions and the products of rates along and against it."""
        found = {}
        for length in range(2, self.size + 1):
            for states in permutations(range(self.size), length):
                if states[0] == min(states):
                    self._close(states, 0, (), Fraction(1), Fraction(1), found)
        return [(chosen, *pair) for chosen, pair in found.items()]

    def _close(self, states: Sequence[int], place: int, used: tuple[int, ...],
               along: Fraction, against: Fraction,
               found: dict[frozenset[int], tuple[Fraction, Fraction]]) -> None:
        if place == len(states):
            found.setdefault(frozenset(used), (along, against))
            return
        step = {states[place], states[(place + 1) % len(states)]}
        for e, (a, b, w, v) in enumerate(self.transitions):
            if {a, b} == step and e not in used:
                pair = (w, v) if a == states[place] else (v, w)
                self._close(states, place + 1, (*used, e), along * pair[0], against * pair[1],
                            found)

    def force(self, wanted: object) -> Fraction | None:
        """Return exp of the largest |force| over cycles whose transitions ``wanted`` accepts."""
        best = Fraction(1)
        for chosen, along, against in self.cycles():
            if not wanted(chosen) or not (along or against):  # type: ignore[operator]
                continue
            if not along or not against:
                return None
            best = max(best, along / against, against / along)
        return best


def directed(
    ends: Sequence[tuple[int, int]], chosen: Sequence[int], root: int, size: int
) -> list[int] | None:
    """Return the directed rates of a tree towards a root, None if it is no spanning tree."""
    reached, rates, left = {root}, [], list(zip(chosen, ends, strict=True))
    while left:
        step = next(((e, pair) for e, pair in left
                     if (pair[0] in reached) != (pair[1] in reached)), None)
        if step is None:
            return None
        e, (a, b) = step
        rates.append(2 * e if b in reached else 2 * e + 1)
        reached |= {a, b}
        left.remove(step)
    return rates if len(reached) == size else None


def eliminated(rows: list[list[Fraction]]) -> list[Fraction]:
    """Solve a regular system, its right side in the last column."""
    for column in range(len(rows)):
        pivot = next(i for i in range(column, len(rows)) if rows[i][column])
        rows[column], rows[pivot] = rows[pivot], rows[column]
        rows[column] = [x / rows[column][column] for x in rows[column]]
        for i in range(len(rows)):
            if i != column and rows[i][column]:
                factor = rows[i][column]
                rows[i] = [x - factor * y for x, y in zip(rows[i], rows[column], strict=True)]
    return [row[-1] for row in rows]


def ring(rng: random.Random, size: int) -> Numbers:
    """Return a ring with random rates."""
    return Numbers(size, tuple((k, (k + 1) % size, rate(rng), rate(rng)) for k in range(size)))


def rate(rng: random.Random, octaves: int = 8) -> Fraction:
    return Fraction(2) ** rng.randint(-octaves, octaves) * Fraction(rng.randint(64, 127), 64)


def random_numbers(rng: random.Random, one_way: bool = True) -> Numbers:
    """Return a strongly connected network: parallel transitions, one-way steps, bridges."""
    size = rng.randint(2, 4)
    order = rng.sample(range(size), size)
    pairs = [(order[k], order[rng.randrange(k)]) for k in range(1, size)]
    for _ in range(rng.randint(0, 3)):
        a, b = rng.sample(range(size), 2)
        pairs.append((a, b))
    rng.shuffle(pairs)
    made = [[a, b, rate(rng), rate(rng)] for a, b in pairs]
    for e in rng.sample(range(len(made)), len(made)):
        if one_way and rng.random() < 0.25:
            kept = made[e][3]
            made[e][3] = Fraction(0)
            if not _strongly_connected(size, made):
                made[e][3] = kept
    return Numbers(size, tuple((a, b, w, v) for a, b, w, v in made))


def _strongly_connected(size: int, made: list[list[object]]) -> bool:
    for turned in (False, True):
        reached = {0}
        for _ in range(size):
            for a, b, _, v in made:
                steps = [(a, b)] + ([(b, a)] if v else [])
                for tail, head in steps:
                    x, y = (head, tail) if turned else (tail, head)
                    if x in reached:
                        reached.add(y)  # type: ignore[arg-type]
        if len(reached) < size:
            return False
    return True
