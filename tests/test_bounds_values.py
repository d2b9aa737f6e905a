"""Both sides of every inequality of the catalogue, against a computation that shares no code.

Here: rates by evaluating their text over fractions and formal logarithms, the steady state and its
derivative from W p = 0 by elimination on fractions, cycles and paths by NetworkX on the graph with
transitions as nodes, splittings and trees by trying all subsets.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import cached_property
from itertools import combinations
from math import isqrt
from typing import Any

import mpmath
import networkx as nx
import pytest
import sympy

from symbolic_response.bounds.claim import Claim
from symbolic_response.bounds.decide import Weighted, holds
from symbolic_response.bounds.evaluate import ClaimPoint, Evaluated
from symbolic_response.bounds.registry import ABOUT_CURRENTS, CATALOGUE, claims_for
from symbolic_response.certificates.axes import value_text
from symbolic_response.certificates.sampling import Sampler
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import ZERO, number
from symbolic_response.network import Barrier, Network, Rates, build_network
from symbolic_response.network.model import Observable
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.values import Point

# -- arithmetic: fractions and formal sums of logarithms ------------------------------------


@dataclass(frozen=True)
class Logs:
    """A formal sum of rational multiples of logarithms."""

    parts: dict[Fraction, Fraction]

    def __add__(self, other: Any) -> Logs:
        parts = dict(self.parts)
        if isinstance(other, Logs):
            for q, m in other.parts.items():
                parts[q] = parts.get(q, Fraction(0)) + m
        else:
            assert other == 0
        return Logs(parts)

    __radd__ = __add__

    def __mul__(self, factor: Any) -> Logs:
        return Logs({q: m * Fraction(factor) for q, m in self.parts.items()})

    __rmul__ = __mul__

    def __neg__(self) -> Logs:
        return self * -1

    def __sub__(self, other: Any) -> Logs:
        return self + -other

    def __rsub__(self, other: Any) -> Logs:
        return -self + other

    def __truediv__(self, other: Any) -> Logs:
        return self * (1 / Fraction(other))


def root(value: Fraction) -> Fraction:
    found = Fraction(isqrt(value.numerator), isqrt(value.denominator))
    assert found**2 == value
    return found


def exponential(value: Any) -> Fraction:
    result = Fraction(1)
    for q, m in (value.parts.items() if isinstance(value, Logs) else ()):
        assert m.denominator in (1, 2)
        result *= q ** int(m) if m.denominator == 1 else root(q) ** m.numerator
    return result


def evaluate(text: str, at: dict[str, Any]) -> Any:
    """Evaluate a text of the network file, or of SymPy, at exact values."""
    wrapped = re.sub(r"(?<![\w.])(\d+)(?![\w.])", r"Q(\1)", text)
    names = {"Q": Fraction, "exp": exponential, "sqrt": root,
             "ln": lambda q: Logs({Fraction(q): Fraction(1)})}
    return eval(wrapped, {"__builtins__": {}}, {**names, **at})


# -- the network at a point -----------------------------------------------------------------


def solve(matrix: list[list[Fraction]], right: list[Fraction]) -> list[Fraction]:
    rows = [[*row, b] for row, b in zip(matrix, right, strict=True)]
    for column in range(len(rows)):
        pivot = next(i for i in range(column, len(rows)) if rows[i][column])
        rows[column], rows[pivot] = rows[pivot], rows[column]
        rows[column] = [x / rows[column][column] for x in rows[column]]
        for i in range(len(rows)):
            if i != column and rows[i][column]:
                factor = rows[i][column]
                rows[i] = [x - factor * y for x, y in zip(rows[i], rows[column], strict=True)]
    return [row[-1] for row in rows]


Moves = list[list[Fraction]]


class Oracle:
    """One network at one point; a directed rate is (transition, 0 forward or 1 backward)."""

    def __init__(self, network: Network, point: dict[str, str]) -> None:
        self.network = network
        self.at = {name: evaluate(text, {}) for name, text in point.items()}
        self.size = len(network.states)
        self.ends = [(t.first, t.second) for t in network.transitions]
        self.texts = [[None if rate is None else expression_text(rate)
                       for rate in (t.forward, t.backward)] for t in network.transitions]
        self.rates = [[Fraction(0) if text is None else evaluate(text, self.at) for text in pair]
                      for pair in self.texts]
        self.p = self.solved([[Fraction(0), Fraction(0)] for _ in self.ends], None)

    def flows(self, weights: list[list[Fraction]]) -> list[list[Fraction]]:
        matrix = [[Fraction(0)] * self.size for _ in range(self.size)]
        for (first, second), pair in zip(self.ends, weights, strict=True):
            for tail, head, rate in ((first, second, pair[0]), (second, first, pair[1])):
                matrix[head][tail] += rate
                matrix[tail][tail] -= rate
        return matrix

    def solved(self, moves: Moves, p: list[Fraction] | None) -> list[Fraction]:
        """Return p, or with p given dp/d theta for the changes of ln of the rates."""
        system = self.flows(self.rates)
        system[-1] = [Fraction(1)] * self.size
        if p is None:
            return solve(system, [Fraction(0)] * (self.size - 1) + [Fraction(1)])
        changed = self.flows([[w * v for w, v in zip(pair, move, strict=True)]
                              for pair, move in zip(self.rates, moves, strict=True)])
        right = [-sum(row[k] * p[k] for k in range(self.size)) for row in changed]
        return solve(system, [*right[:-1], Fraction(0)])

    def moves(self, by: str) -> Moves:
        """Return d ln w/d theta of every directed rate."""
        found = [[Fraction(0), Fraction(0)] for _ in self.ends]
        named = re.fullmatch(r"(energy|barrier|drive)\[(\w+(?:, \w+)*)\]", by)
        if named is None:
            for e, pair in enumerate(self.texts):
                for side, text in enumerate(pair):
                    found[e][side] = self.slope(text, by.removeprefix("ln "), by.startswith("ln"))
            return found
        kind, name = named.groups()
        for e, transition in enumerate(self.network.transitions):
            for side in (0, 1):
                if kind == "energy":
                    source = self.network.states[self.ends[e][side]].name
                    found[e][side] = Fraction(int(source == name))
                elif transition.name in name.split(", "):
                    found[e][side] = (Fraction(-1) if kind == "barrier"
                                      else Fraction(1 - 2 * side, 2))
        return found

    def slope(self, text: str | None, name: str, logarithmic: bool) -> Fraction:
        if text is None:
            return Fraction(0)
        symbols = {entry.name: sympy.Symbol(entry.name, positive=entry.positive or None, real=True)
                   for entry in self.network.symbols}
        rate = sympy.sympify(text.replace("ln(", "log("), locals=symbols)
        slope = sympy.diff(rate, symbols[name])
        value = evaluate(str(slope).replace("log(", "ln("), self.at)
        value = value / evaluate(text, self.at)
        return Fraction(value * self.at[name] if logarithmic else value)

    # -- graph --------------------------------------------------------------------------

    @cached_property
    def subdivided(self) -> Any:
        graph = nx.Graph()
        graph.add_nodes_from(range(self.size))
        for e, (first, second) in enumerate(self.ends):
            graph.add_edges_from([(first, ("t", e)), (("t", e), second)])
        return graph

    def ratio(self, walk: list[Any]) -> tuple[Fraction, Fraction]:
        """Return the products of rates along and against a walk through states and transitions."""
        along = against = Fraction(1)
        for place in range(1, len(walk) - 1, 2):
            e = walk[place][1]
            ahead = self.ends[e][0] == walk[place - 1]
            along *= self.rates[e][0 if ahead else 1]
            against *= self.rates[e][1 if ahead else 0]
        return along, against

    def cycle_force(self, e: int | Callable[[set[int]], bool]) -> Fraction | None:
        """Return exp(F_max(e)), or of the cycles that a condition accepts; None if infinite."""
        best = Fraction(1)
        for cycle in nx.simple_cycles(self.subdivided):
            through = {node[1] for node in cycle if isinstance(node, tuple)}
            if not (e(through) if callable(e) else e in through):
                continue
            start = next(i for i, node in enumerate(cycle) if not isinstance(node, tuple))
            turned = cycle[start:] + cycle[:start]
            along, against = self.ratio([*turned, turned[0]])
            if not along and not against:
                continue
            if not along or not against:
                return None
            best = max(best, along / against, against / along)
        return best

    def trees(self, target: int, without: int) -> Fraction:
        """Return the sum over spanning trees towards a state, by trying all sets."""
        total = Fraction(0)
        usable = [e for e in range(len(self.ends)) if e != without]
        for chosen in combinations(usable, self.size - 1):
            graph = nx.MultiGraph()
            graph.add_nodes_from(range(self.size))
            graph.add_edges_from((*self.ends[e], e) for e in chosen)
            if not nx.is_connected(graph):
                continue
            product = Fraction(1)
            for e in chosen:
                first, second = self.ends[e]
                cut = graph.copy()
                cut.remove_edge(first, second, key=e)
                product *= self.rates[e][0 if nx.has_path(cut, second, target) else 1]
            total += product
        return total

    def cross_ratio(self, e: int) -> Fraction | None:
        first, second = self.ends[e]
        above = self.rates[e][0] * self.trees(first, e)
        below = self.rates[e][1] * self.trees(second, e)
        if above == below:
            return Fraction(1)
        return max(above / below, below / above) if above and below else None

    def splittings(self, e: int) -> Iterator[set[int]]:
        graph = nx.Graph(self.ends)
        first, second = self.ends[e]
        others = [k for k in range(self.size) if k not in (first, second)]
        for count in range(len(others) + 1):
            for more in combinations(others, count):
                inside = {first, *more}
                outside = set(range(self.size)) - inside
                if nx.is_connected(graph.subgraph(inside)) and nx.is_connected(
                        graph.subgraph(outside)):
                    yield inside

    def largest_path(self, start: int, goal: int) -> Fraction | None:
        best = Fraction(0)
        for walk in nx.all_simple_paths(self.subdivided, start, goal):
            along, against = self.ratio(walk)
            if along and not against:
                return None
            if along:
                best = max(best, along / against)
        return best

    # -- both sides -----------------------------------------------------------------------

    def mean(self, values: Iterable[Fraction], weights: list[Fraction] | None = None) -> Fraction:
        return sum((q * p for q, p in zip(values, weights or self.p, strict=True)), Fraction(0))

    def expected(self, name: str, target: Target, by: str) -> list[Weighted]:
        """Return the terms of the right side of a bound, from its statement."""
        y, s, q = target.factors(self)
        _, _, where = by.rstrip("]").partition("[")
        names = [t.name for t in self.network.transitions]
        e = names.index(where) if where in names else -1
        centred = [p * (value - self.mean(q)) for p, value in zip(self.p, q, strict=True)]
        if name == "energy-covariance":
            j = [state.name for state in self.network.states].index(where)
            return [Weighted(s * abs(centred[j]))]
        if name == "energy-range":
            return [Weighted(y)]
        if name in ("parameter", "support"):
            return self.of_parameter(name, y, self.moves(by))
        if name.endswith("bundle"):
            return [self.of_bundle(name, y, self.moves(by))]
        if name.startswith("local"):
            return self.of_local(name, y, self.moves(by))
        factor = y
        if name.startswith("splitting"):
            factor = s * max(abs(sum(centred[k] for k in side)) for side in self.splittings(e))
        if name.endswith("drive"):
            return [Weighted(factor / 2 if self.texts[e][1] is None else factor)]
        force = self.cross_ratio(e) if name.endswith("end-pair") else self.cycle_force(e)
        return [Weighted(factor, force)]

    def all_trees(self) -> Iterator[tuple[int, ...]]:
        """Yield every spanning tree that can be directed to some root, by trying all sets."""
        for chosen in combinations(range(len(self.ends)), self.size - 1):
            graph = nx.MultiGraph([self.ends[e] for e in chosen])
            if len(graph) == self.size and nx.is_connected(graph):
                yield chosen

    def of_bundle(self, name: str, y: Fraction, moves: Moves) -> Weighted:
        """Derived here; bundles by counting in all trees, forces over all cycles."""
        moved = {(e, side): v for e, pair in enumerate(moves) for side, v in enumerate(pair) if v}
        (kappa,) = {abs(v) for v in moved.values()}
        inside = {e for e, _ in moved}
        if name == "bundle":
            uses = [len(inside & set(tree)) for tree in self.all_trees()]
            assert max(uses) - min(uses) <= 1
            if max(uses) == min(uses):
                return Weighted(Fraction(0))
            return Weighted(y * kappa, self.cycle_force(
                lambda cycle: bool(inside & cycle) and bool(cycle - inside)))
        uses = []
        for tree in self.all_trees():
            for root_state in range(self.size):
                graph = nx.Graph([self.ends[e] for e in tree])
                sides = [(e, 0 if nx.shortest_path_length(graph, self.ends[e][1], root_state)
                          < nx.shortest_path_length(graph, self.ends[e][0], root_state) else 1)
                         for e in tree]
                if all(self.texts[e][side] is not None for e, side in sides):
                    uses.append(sum(step in moved for step in sides))
        return Weighted(y * kappa * (max(uses) - min(uses)))

    def of_local(self, name: str, y: Fraction, moves: Moves) -> list[Weighted]:
        """Derived here; psi as the largest of its own variational form, by its closed form."""
        (e,) = {e for e, pair in enumerate(moves) if any(pair)}
        u, v = sorted(map(abs, moves[e]), reverse=True)
        if moves[e][0] * moves[e][1] <= 0:
            return [Weighted(y * (u + v))]
        r = self.cross_ratio(e) if name == "local-end-pair" else self.cycle_force(e)
        if r is None:
            return [Weighted(y * u)]
        if r == 1 or v * r <= u:
            return [Weighted(y * (u - v))]
        if u == v:
            return [Weighted(y * u, r)]
        return [Weighted(y * (u - v)), Weighted(y * (v * r - u) / (r - 1), v * r / u)]

    def of_parameter(self, name: str, y: Fraction, moves: Moves) -> list[Weighted]:
        leaving: dict[int, list[Fraction]] = {k: [] for k in range(self.size)}
        for (first, second), pair, texts in zip(self.ends, moves, self.texts, strict=True):
            leaving[first].append(pair[0])
            if texts[1] is not None:
                leaving[second].append(pair[1])
        if name == "support":
            moved = [k for k in leaving if any(leaving[k])]
            (size,) = {abs(v) for k in moved for v in leaving[k] if v}
            return [Weighted(y * size * len(moved))]
        heights = [leaving[k][0] if len(set(leaving[k])) == 1 else Fraction(0) for k in leaving]
        options = [self.pieces(y, moves, h) for h in (heights, [Fraction(0)] * self.size)]
        totals = [sum((t.factor for t in option), Fraction(0)) for option in options]
        return options[1] if len(options[1]) > 1 and totals[1] <= totals[0] else options[0]

    def pieces(self, y: Fraction, moves: Moves, heights: list[Fraction]) -> list[Weighted]:
        fixed, shared = max(heights) - min(heights), []
        for e, (first, second) in enumerate(self.ends):
            x, z = moves[e][0] - heights[first], moves[e][1] - heights[second]
            if self.texts[e][1] is None:
                x, z = x, Fraction(0)
            if x == z or x * z > 0:
                fixed += abs(x - z)
                if x:
                    shared.append(Weighted(y * min(abs(x), abs(z)), self.cycle_force(e)))
            else:
                fixed += abs(x - z)
        return [Weighted(y * fixed), *shared]


@dataclass(frozen=True)
class Target:
    """A quantity with its kind and the values of Q and R, as texts for each state."""

    text: str
    kind: str
    above: tuple[str, ...]
    below: tuple[str, ...] | None = None

    def values(self, oracle: Oracle) -> tuple[list[Fraction], list[Fraction] | None]:
        above = [evaluate(text, oracle.at) for text in self.above]
        below = None if self.below is None else [evaluate(x, oracle.at) for x in self.below]
        return above, below

    def left(self, oracle: Oracle, by: str) -> Fraction:
        q, r = self.values(oracle)
        dp = oracle.solved(oracle.moves(by), oracle.p)
        if r is None:
            return abs(oracle.mean(q, dp))
        top, bottom = oracle.mean(q), oracle.mean(r)
        slope = oracle.mean(q, dp) / top - oracle.mean(r, dp) / bottom
        return abs(slope * (top / bottom if self.kind == "ratio" else 1))

    def factors(self, oracle: Oracle) -> tuple[Fraction, Fraction, list[Fraction]]:
        """Return Y, S and the observable that S goes with."""
        q, r = self.values(oracle)
        scale = Fraction(1)
        if r is not None:
            top, bottom = oracle.mean(q), oracle.mean(r)
            if self.kind == "ratio":
                scale = top / bottom
            if len(set(r)) == 1:
                scale /= top
            elif len(set(q)) == 1:
                scale, q = scale / bottom, r
            else:
                return scale, Fraction(0), q
        low, high, mean = min(q), max(q), oracle.mean(q)
        spread = (mean - low) * (high - mean) / (high - low) if low < high else Fraction(0)
        return scale * spread, scale, q


# -- the networks ---------------------------------------------------------------------------


def _net(title: str, states: Any, transitions: list[Any], **more: Any) -> Network:
    return build_network(title, states=states, transitions=transitions, **more)


NETWORKS: dict[str, Callable[[], Network]] = {
    "triangle": lambda: _net("triangle", "A B C", [
        Rates("A", "B", "k*c", "u", name="e"), Rates("B", "C", "k", "u*c", name="f"),
        Rates("C", "A", "v", "w", name="g")]),
    "square with chord": lambda: _net("square with chord", "A B C D", [
        Rates("A", "B", "c", "k1", name="e"), Rates("B", "C", "k2", "k3", name="f"),
        Rates("C", "D", "k4", "k5", name="g"), Rates("D", "A", "k6", "k7", name="h"),
        Rates("A", "C", "k8*c", "k9", name="i")]),
    "parallel pair": lambda: _net("parallel pair", "A B", [
        Rates("A", "B", "c", "k", name="e"), Rates("B", "A", "u", "v*c", name="f")]),
    "bridge": lambda: _net("bridge", "A B", [Rates("A", "B", "2*c", "k/3", name="e")]),
    "one-way ring": lambda: _net("one-way ring", "A B C", [
        Rates("A", "B", "c", "k", name="e"), Rates("B", "C", "u", name="f"),
        Rates("C", "A", "v", "w", name="g"), Rates("A", "C", "c*w", name="h")]),
    "multigraph": lambda: _net("multigraph", "A B C", [
        Rates("A", "B", "c", "k", name="e"), Rates("A", "B", "u", "v", name="f"),
        Rates("B", "A", "w*c", "k", name="g"), Rates("B", "C", "u", "c", name="h"),
        Rates("C", "A", "v", "w", name="i"), Rates("B", "C", "k", name="j")]),
    "energy form": lambda: _net("energy form", {"A": "E_A", "B": "0", "C": "E_C"}, [
        Barrier("A", "B", "B_1", "F", name="e"), Barrier("B", "C", "B_2", "F/2", name="f"),
        Barrier("C", "A", "B_3", name="g"), Barrier("A", "C", "B_2", "G", name="h")]),
    "mixed form": lambda: _net("mixed form", {"A": "E_A", "B": "0", "C": "0"}, [
        Barrier("A", "B", "0", "F", name="e"), Rates("B", "C", "c", "k*c", name="f"),
        Rates("C", "A", "2*c*exp(F/2)", "k*exp(-F)", name="g")],
        symbols={"E_A": "real", "F": "real", "c": "positive", "k": "positive"}),
    "numbers only": lambda: _net("numbers only", "A B C D", [
        Rates("A", "B", 2, 1, name="e"), Rates("B", "C", "1/3", 5, name="f"),
        Rates("C", "D", 7, "0.25", name="g"), Rates("D", "A", 1, 1, name="h"),
        Rates("A", "C", 3, name="i")]),
    "sums": lambda: _net("sums", "A B C", [
        Rates("A", "B", "u + k*c", "k", name="e"), Rates("B", "C", "k/(1+c)", "u", name="f"),
        Rates("C", "A", "v", "u + v", name="g")]),
    "tree": lambda: _net("tree", "A B C D", [
        Rates("A", "B", "c", "k", name="e"), Rates("A", "C", "u", "c**2", name="f"),
        Rates("D", "A", "v", "w", name="g")]),
    "scaled": lambda: _net("scaled", "A B C D", [
        Rates("A", "B", "c*k", "c*u", name="e"), Rates("B", "C", "v*k**2", "k", name="f"),
        Rates("C", "A", "c", name="g"), Rates("C", "D", "u", "v", name="h"),
        Rates("C", "D", "v**3*u", "v", name="i")]),
    "two powers": lambda: _net("two powers", "A B C", [
        Rates("A", "B", "2*c**2", "c", name="e"), Rates("B", "C", "k/3", "5*k**2", name="f"),
        Rates("C", "A", "u**2", "u/7", name="g"), Rates("A", "C", "1", "3", name="h")]),
    "roots": lambda: _net("roots", "A B C", [
        Rates("A", "B", "sqrt(c)", "k", name="e"), Rates("B", "C", "k*sqrt(u)", "c", name="f"),
        Rates("C", "A", "u", "v/c**2", name="g")]),
}


def with_observable(network: Network) -> Network:
    values = [number(1), number(Fraction(1, 3)), *([ZERO] * (len(network.states) - 2))]
    return replace(network, observables=(Observable("q", tuple(values)),))


def targets(size: int) -> list[Target]:
    def of(**values: str) -> tuple[str, ...]:
        return tuple(values.get(name, "0") for name in "ABCD"[:size])

    ones = ("1",) * size
    return [
        Target("p[A]", "mean", of(A="1")),
        Target("mean[q]", "mean", of(A="1", B="1/3")),
        Target("2*p[A] - 3*p[B]", "mean", of(A="2", B="-3")),
        Target("ln(p[A]/p[B])", "log-ratio", of(A="1"), of(B="1")),
        Target("p[B]/p[A]", "ratio", of(B="1"), of(A="1")),
        Target("ln(p[B])", "log-ratio", of(B="1"), ones),
        Target("1/p[A]", "ratio", ones, of(A="1")),
        Target("mean[q]/p[B]", "ratio", of(A="1", B="1/3"), of(B="1")),
    ]


def perturbations(network: Network) -> list[str]:
    found = ["energy[A]", "energy[B]"]
    for transition in network.transitions[:3]:
        found += [f"barrier[{transition.name}]", f"drive[{transition.name}]"]
    chosen = [transition.name for transition in network.transitions]
    found += [f"barrier[{', '.join(part)}]" for part in (chosen[:2], chosen[1:], chosen)
              if len(part) > 1]
    for entry in network.symbols[:3]:
        found.append(f"ln {entry.name}" if entry.positive else entry.name)
    return found


def merged(terms: Iterable[Weighted]) -> list[Weighted]:
    """Return the terms with those of factor 0 left out: they are a matter of presentation."""
    return [term for term in terms if term.factor]


def independent_verdict(left: Fraction, right: list[Weighted]) -> bool:
    with mpmath.workdps(80):
        total = mpmath.mpf(0)
        for term in right:
            factor = mpmath.mpf(term.factor.numerator) / term.factor.denominator
            if term.g is not None:
                g = mpmath.mpf(term.g.numerator) / term.g.denominator
                factor *= mpmath.tanh(mpmath.log(g) / 4)
            total += factor
        gap = total - mpmath.mpf(left.numerator) / left.denominator
        return bool(gap >= -mpmath.mpf(10) ** -60 * (1 + total))


@pytest.mark.parametrize("title", NETWORKS)
def test_both_sides_of_every_claim(title: str) -> None:
    network = with_observable(NETWORKS[title]())
    analysis = Analysis(network)
    sampler = Sampler(analysis, f"oracle {title}")
    points = [sampler.point(index) for index in range(4 if network.symbols else 1)]
    checked = 0
    for by_place, by in enumerate(perturbations(network)):
        for place, target in enumerate(targets(len(network.states))):
            quantity = read_quantity(f"d {target.text} / d {by}", network)
            claims = claims_for(quantity, analysis)
            values = points[(place + by_place) % len(points)]
            oracle = Oracle(network, {name: value_text(v) for name, v in values.items()})
            at = ClaimPoint(analysis, Point(network, values))
            left = target.left(oracle, by)
            for claim in claims:
                compare(claim, at.evaluate(claim), left, oracle.expected(claim.name, target, by))
                checked += 1
    assert checked >= 40


def compare(claim: Claim, found: Evaluated, left: Fraction, right: list[Weighted]) -> None:
    assert found.left == left, claim.name
    assert merged(found.right) == merged(right), claim.name
    assert found.holds is True
    if claim.equality:
        assert left == sum(term.factor for term in right)
    else:
        assert independent_verdict(left, right)


def test_every_name_of_the_catalogue_is_compared() -> None:
    seen = set()
    for make in NETWORKS.values():
        network = with_observable(make())
        analysis = Analysis(network)
        for by in perturbations(network):
            for target in targets(len(network.states))[:3]:
                quantity = read_quantity(f"d {target.text} / d {by}", network)
                seen |= {claim.name for claim in claims_for(quantity, analysis)}
    assert seen | set(ABOUT_CURRENTS) == set(CATALOGUE)


@pytest.mark.parametrize("title", NETWORKS)
def test_path_bounds(title: str) -> None:
    network = NETWORKS[title]()
    analysis = Analysis(network)
    sampler = Sampler(analysis, "paths")
    for index in range(3):
        values = sampler.point(index)
        oracle = Oracle(network, {name: value_text(v) for name, v in values.items()})
        at = ClaimPoint(analysis, Point(network, values))
        expected = {}
        for x, y in ((0, 1), (1, 0)):
            largest = oracle.largest_path(x, y)
            if largest is not None and largest > 0:
                expected["AB"[x]] = (oracle.p[y] / oracle.p[x], largest)
        try:
            claims = claims_for(read_quantity("p[B]/p[A]", network), analysis)
        except QuantityError:
            assert not expected
            continue
        assert {claim.data["from"] for claim in claims} == set(expected)
        for claim in claims:
            found = at.evaluate(claim)
            assert (found.left, found.right[0].factor) == expected[str(claim.data["from"])]
            assert found.holds is True
            assert len(claim.right) == 1


def evaluated(network: Network, text: str, only: str) -> Evaluated:
    analysis = Analysis(network)
    (claim,) = claims_for(read_quantity(text, network), analysis, only)
    return ClaimPoint(analysis, Point(network, {})).evaluate(claim)


def test_parallel_pair_saturates() -> None:
    """Rates 4, 1 and 1, 4: g = 16 and the response is 3/5 = tanh(ln(16)/4)."""
    pair = _net("pair of channels", "A B", [
        Rates("A", "B", 4, 1, name="one"), Rates("A", "B", 1, 4, name="two")])
    for name in ("barrier", "end-pair"):
        found = evaluated(pair, "d ln(p[A]/p[B]) / d barrier[one]", name)
        assert (found.left, found.right_value(), found.holds) == (
            Fraction(3, 5), Fraction(3, 5), True)
        assert found.ratio() == 1


@pytest.mark.parametrize("title", ["bridge", "tree"])
def test_bridges_have_no_response(title: str) -> None:
    network = NETWORKS[title]()
    analysis = Analysis(network)
    values = Sampler(analysis, "0").point(0)
    for transition in network.transitions:
        for claim in claims_for(
                read_quantity(f"d p[B] / d barrier[{transition.name}]", network), analysis):
            found = ClaimPoint(analysis, Point(network, values)).evaluate(claim)
            assert (found.left, found.right_value(), found.holds) == (0, 0, True)


def test_detailed_balance_has_no_barrier_response() -> None:
    ring = _net("balanced", {"A": "E_A", "B": "E_B", "C": "0"}, [
        Barrier("A", "B", "B_1", name="e"), Barrier("B", "C", "B_2", name="f"),
        Barrier("C", "A", "B_3", name="g")])
    analysis = Analysis(ring)
    sampler = Sampler(analysis, "0")
    for index in range(5):
        for claim in claims_for(read_quantity("d p[A] / d barrier[f]", ring), analysis):
            found = ClaimPoint(analysis, Point(ring, sampler.point(index))).evaluate(claim)
            assert (found.left, found.right_value(), found.holds) == (0, 0, True)


def test_both_conditions_belong_to_the_verdict() -> None:
    """Y = 1, |X| = 2, g = 9: (Y + X)^2 <= g (Y - X)^2, yet 2 > tanh(ln(9)/4)."""
    assert (1 + 2) ** 2 <= 9 * (1 - 2) ** 2
    assert holds(Fraction(2), [Weighted(Fraction(1), Fraction(9))]) is False
    assert holds(Fraction(-2), [Weighted(Fraction(1), Fraction(9))]) is False
    assert holds(Fraction(1, 2), [Weighted(Fraction(1), Fraction(9))]) is True
    above = Fraction(1, 2) + Fraction(1, 10**30)
    assert holds(above, [Weighted(Fraction(1), Fraction(9))]) is False
