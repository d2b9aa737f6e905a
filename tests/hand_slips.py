"""Hand formulas with one slip each, built without the package; values by elimination.

Formulas are texts made from spanning trees found by brute force over sets of transitions (King and
Altman, J. Phys. Chem. 60, 1375 (1956); Hill, J. Theor. Biol. 10, 442 (1966): one product for each
tree directed to a state). Values of probabilities and their responses at a point come from W p = 0
and W p' = -W' p by Gaussian elimination in fractions.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import combinations
from math import prod
from random import Random
from typing import Any

from symbolic_response.network.build import Barrier, Rates, build_network
from symbolic_response.network.model import Network
from tests.random_networks import eliminated

Rate = tuple[int, bool]
Tree = tuple[Rate, ...]


@dataclass(frozen=True)
class Graph:
    """A network as data of its own: states, and (name, first, second, forward, backward)."""

    title: str
    states: tuple[str, ...]
    transitions: tuple[tuple[str, str, str, str, str | None], ...]
    network: Network

    def rate(self, rate: Rate) -> str:
        """Return a directed rate as text."""
        text = self.transitions[rate[0]][4 if rate[1] else 3]
        assert text is not None
        return text

    def ends(self, rate: Rate) -> tuple[str, str]:
        """Return the state a directed rate leads out of, and the one it leads to."""
        first, second = self.transitions[rate[0]][1:3]
        return (second, first) if rate[1] else (first, second)

    def rates(self) -> list[Rate]:
        """Return all directed rates."""
        return [(e, back) for e, entry in enumerate(self.transitions) for back in (False, True)
                if entry[4 if back else 3] is not None]

    def product(self, rates: Sequence[Rate]) -> str:
        """Return a product of rates as text."""
        texts = (self.rate(rate) for rate in rates)
        return "*".join(f"({t})" if re.search(r"[-+] ", t) and "exp" not in t else t for t in texts)

    def trees(self, root: str) -> list[Tree]:
        """Return the spanning trees directed to a state, by brute force over sets of rates."""
        others = [state for state in self.states if state != root]
        found = []
        for chosen in combinations(self.rates(), len(others)):
            ways = {self.ends(rate)[0]: self.ends(rate)[1] for rate in chosen}
            if set(ways) == set(others) and all(self._leads(ways, s, root) for s in others):
                found.append(chosen)
        return found

    @staticmethod
    def _leads(ways: Mapping[str, str], start: str, root: str) -> bool:
        for _ in ways:
            start = ways.get(start, start)
        return start == root

    def sums(self) -> dict[str, list[Tree]]:
        """Return the trees by root."""
        return {state: self.trees(state) for state in self.states}

    def total(self) -> list[Tree]:
        """Return the trees towards all states."""
        return [tree for trees in self.sums().values() for tree in trees]

    def text(self, trees: Sequence[Tree]) -> str:
        """Return a sum over trees."""
        return " + ".join(self.product(tree) for tree in trees)


def _graph(title: str, states: str, *transitions: tuple[str, str, str, str, str | None],
           **entries: Any) -> Graph:
    built = [Rates(a, b, w, v, name) for name, a, b, w, v in transitions]
    network = build_network(title, states=states, transitions=built, **entries)
    return Graph(title, tuple(states.split()), transitions, network)


def _pairs(states: str) -> list[tuple[str, str, str, str, str | None]]:
    return [(f"{a}{b}", a, b, f"w{a}{b}", f"w{b}{a}") for a, b in combinations(states, 2)]


THREE = _graph(
    "ring of three", "A B C", ("one", "A", "B", "a1", "b1"), ("two", "B", "C", "a2", "b2"),
    ("three", "C", "A", "a3", "b3"), observables={"Q": {"A": 1, "B": "1/2", "C": 3}})
FOUR = _graph(
    "ring of four", "A B C D", ("one", "A", "B", "a1", "b1"), ("two", "B", "C", "a2", "b2"),
    ("three", "C", "D", "a3", "b3"), ("four", "D", "A", "a4", "b4"))
CHORD = _graph(
    "square with a chord", "A B C D", ("ab", "A", "B", "u1", "v1"), ("bc", "B", "C", "u2", "v2"),
    ("cd", "C", "D", "u3", "v3"), ("da", "D", "A", "u4", "v4"), ("ac", "A", "C", "u5", "v5"))
K4 = _graph("all pairs of four", "A B C D", *_pairs("ABCD"))
CHANNELS = _graph(
    "two channels", "A B C", ("hot", "A", "B", "h1", "h2"), ("cold", "A", "B", "c1", "c2"),
    ("bc", "B", "C", "r1", "s1"), ("ca", "C", "A", "r2", "s2"))
SHARED = _graph(
    "enzyme with an inhibitor", "E S P X", ("bind", "E", "S", "k1*c", "m1"),
    ("turn", "S", "P", "k2", "m2"), ("leave", "P", "E", "k3", "m3*x"),
    ("block", "E", "X", "k1*y", "m1"), ("slip", "S", "X", "k4*y", "m4"))
ONE_WAY = _graph(
    "reset", "A B C D", ("ab", "A", "B", "k1*c", "m1"), ("bc", "B", "C", "k2", "m2"),
    ("cd", "C", "D", "k3", "m3"), ("da", "D", "A", "r", None), ("ac", "A", "C", "q", "z"))


def _energy() -> Graph:
    energies = {"A": "E_A", "B": "E_B", "C": "E_C"}
    network = build_network("energies", states=energies, transitions=[
        Barrier("A", "B", "B_1", "F", name="one"), Barrier("B", "C", "B_2", name="two"),
        Barrier("C", "A", "B_3", name="three")])
    rows = (("one", "A", "B", "exp(E_A - B_1 + F/2)", "exp(E_B - B_1 - F/2)"),
            ("two", "B", "C", "exp(E_B - B_2)", "exp(E_C - B_2)"),
            ("three", "C", "A", "exp(E_C - B_3)", "exp(E_A - B_3)"))
    return Graph("energies", ("A", "B", "C"), rows, network)


ENERGY = _energy()
GRAPHS = (THREE, FOUR, CHORD, K4, CHANNELS, SHARED, ENERGY, ONE_WAY)


# -- values ----------------------------------------------------------------------------------------


def exponential(x: Fraction) -> Fraction:
    """Stand for exp, to the base 4: rational at halves of whole numbers."""
    double = 2 * Fraction(x)
    assert double.denominator == 1, x
    return Fraction(2) ** double.numerator


def point_of(graph: Graph, seed: int) -> dict[str, Fraction]:
    """Return values of the symbols: small fractions, whole numbers where they are exponents."""
    rng = Random(f"{graph.title} {seed}")
    if graph is ENERGY:
        return {s.name: Fraction(rng.randint(-3, 3)) for s in graph.network.symbols}
    return {s.name: Fraction(rng.randint(1, 9), rng.randint(1, 5)) for s in graph.network.symbols}


def value(text: str, at: Mapping[str, Any], exp: Callable[[Any], Any] = exponential) -> Any:
    """Return the value of a text made in this file, whole numbers read as fractions."""
    exact = re.sub(r"(?<![\w.])(\d+)(?![\w.])", r"Fraction(\1)", text)
    kind = Fraction if exp is exponential else type(next(iter(at.values())))
    return eval(exact, {"Fraction": kind, "exp": exp}, dict(at))


class Steady:
    """Probabilities and responses of a graph at a point, by elimination."""

    def __init__(self, graph: Graph, at: Mapping[str, Any],
                 exp: Callable[[Any], Any] = exponential, without: Sequence[Rate] = ()) -> None:
        self.graph, self.at = graph, at
        self.rates = {r: value(graph.rate(r), at, exp) for r in graph.rates() if r not in without}
        self.zero = 0 * next(iter(self.rates.values()))
        self.p = self._solved(self._generator(lambda _: 1), [self.zero] * len(graph.states), 1)

    def _generator(self, weight: Callable[[Rate], Any]) -> list[list[Any]]:
        place = {state: k for k, state in enumerate(self.graph.states)}
        matrix = [[self.zero] * len(place) for _ in place]
        for rate, size in self.rates.items():
            tail, head = (place[state] for state in self.graph.ends(rate))
            matrix[head][tail] += size * weight(rate)
            matrix[tail][tail] -= size * weight(rate)
        return matrix

    def _solved(self, matrix: list[list[Any]], right: list[Any], total: int) -> dict[str, Any]:
        rows = [[*row, x] for row, x in zip(matrix, right, strict=True)]
        rows[-1] = [self.zero + 1] * len(matrix) + [self.zero + total]
        return dict(zip(self.graph.states, eliminated(rows), strict=True))

    def response(self, weight: Callable[[Rate], Any]) -> dict[str, Any]:
        """Return dp for d ln w = weight(rate)."""
        p = [self.p[state] for state in self.graph.states]
        right = [-sum(x * y for x, y in zip(row, p, strict=True))
                 for row in self._generator(weight)]
        return self._solved(self._generator(lambda _: 1), right, 0)

    def current(self, e: int) -> Any:
        """Return the net current of a transition."""
        return self.flow((e, False)) - self.flow((e, True))

    def flow(self, rate: Rate) -> Any:
        """Return a directed flow."""
        return self.rates.get(rate, 0) * self.p[self.graph.ends(rate)[0]]


def barrier(e: int) -> Callable[[Rate], Fraction]:
    """Return d ln w by the barrier of a transition."""
    return lambda rate: Fraction(-1 if rate[0] == e else 0)


def drive(e: int) -> Callable[[Rate], Fraction]:
    """Return d ln w by the drive of a transition."""
    return lambda rate: Fraction(0 if rate[0] != e else -1 if rate[1] else 1, 2)


def energy(graph: Graph, state: str) -> Callable[[Rate], Fraction]:
    """Return d ln w by the energy of a state."""
    return lambda rate: Fraction(int(graph.ends(rate)[0] == state))


def single(chosen: Rate) -> Callable[[Rate], Fraction]:
    """Return d ln w by the logarithm of one rate."""
    return lambda rate: Fraction(int(rate == chosen))


def symbol(graph: Graph, name: str) -> Callable[[Rate], Fraction]:
    """Return d ln w by the logarithm of a symbol, for rates that are products."""
    return lambda rate: Fraction(graph.rate(rate).split("*").count(name))


def response_text(graph: Graph, state: str, weight: Callable[[Rate], Fraction]) -> str:
    """Return d p[state] for d ln w = weight(rate): (N' D - N D')/D^2, term by term."""
    above, total = graph.trees(state), graph.total()

    def changed(trees: Sequence[Tree]) -> str:
        terms = [(sum(map(weight, tree)), tree) for tree in trees]
        return " + ".join(f"({w})*{graph.product(t)}" for w, t in terms if w) or "0"

    n, d = graph.text(above), graph.text(total)
    return f"(({changed(above)})*({d}) - ({n})*({changed(total)}))/({d})**2"


def current_text(graph: Graph, e: int, sign: str = "-") -> str:
    """Return the current or, with a plus sign, the traffic of a transition."""
    first, second = graph.ends((e, False))
    terms = [graph.product(((e, False), *tree)) for tree in graph.trees(first)]
    ahead = " + ".join(terms)
    back = " + ".join(graph.product(((e, True), *tree)) for tree in graph.trees(second))
    return f"({ahead} {sign} ({back}))/({graph.text(graph.total())})"


def quotient(graph: Graph, above: Sequence[Tree], below: Sequence[Tree]) -> str:
    """Return a quotient of two sums over trees."""
    return f"({graph.text(above)})/({graph.text(below)})"


def weight_at(graph: Graph, tree: Tree, at: Mapping[str, Fraction]) -> Fraction:
    """Return the product of rates at a point."""
    return prod((value(graph.rate(rate), at) for rate in tree), start=Fraction(1))


# -- slips -----------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Slip:
    """A hand formula with one slip. ``expected``: patterns, all of which one finding matches;
    ``right``: the quantity asked for, by elimination; ``exact``: False where it holds a force
    outside exponents."""

    kind: str
    graph: Graph
    quantity: str
    hand: str
    expected: tuple[str, ...]
    right: Callable[[Steady], Any]
    exact: bool = True


def all_slips() -> list[Slip]:
    """Return all slips, the same ones at every run."""
    makers = (missing_trees, extra_terms, coefficients, factors, exchanges, other_atoms,
              other_responses, smaller, limits, other_forms, other_rates)
    return [slip for make in makers for slip in make()]


def _p(state: str) -> Callable[[Steady], Any]:
    return lambda steady: steady.p[state]


def _shown(graph: Graph, tree: Tree) -> tuple[str, ...]:
    """Return patterns for the rates of a tree, with their directions."""
    words = ((graph.transitions[e][0], "backward" if back else "forward") for e, back in tree)
    return tuple(rf"\b{name} {word} \(" for name, word in words)


def missing_trees() -> Iterator[Slip]:
    """A spanning tree forgotten in the numerator, the normalisation or both."""
    rng = Random("missing")
    for graph in GRAPHS:
        sums, total = graph.sums(), graph.total()
        state = rng.choice(graph.states)
        lost = rng.choice(total)
        below = [tree for tree in total if tree != lost]
        root = next(s for s, trees in sums.items() if lost in trees)
        yield Slip("tree missing below", graph, f"p[{state}]", quotient(graph, sums[state], below),
                   (r"normalisation lacks", rf"towards {root}",
                    *_shown(graph, lost)), _p(state))
        lost = rng.choice(sums[state])
        above = [tree for tree in sums[state] if tree != lost]
        yield Slip("tree missing above", graph, f"p[{state}]", quotient(graph, above, total),
                   (r"numerator .*lacks?", *_shown(graph, lost)), _p(state))
        below = [tree for tree in total if tree != lost]
        yield Slip("tree missing in both", graph, f"p[{state}]", quotient(graph, above, below),
                   (r"numerator and the normalisation", *_shown(graph, lost)), _p(state))
    pair = [tree for s in "AB" for tree in K4.trees(s)]
    yield Slip("tree missing above", K4, "p[A, B]", quotient(K4, pair[1:], K4.total()),
               (r"numerator .*lacks?", *_shown(K4, pair[0])), lambda s: s.p["A"] + s.p["B"])
    for graph, e in ((FOUR, 1), (CHORD, 4)):
        text = current_text(graph, e)
        first = graph.ends((e, False))[0]
        lost = next(t for t in graph.trees(first) if (e, True) not in t)
        hand = text.replace(graph.product(((e, False), *lost)) + " ", "0 ", 1)
        yield Slip("tree missing above", graph, f"current[{graph.transitions[e][0]}]", hand,
                   (r"numerator .*lacks?", *_shown(graph, lost)),
                   lambda s, e=e: s.current(e))


def extra_terms() -> Iterator[Slip]:
    """A product of rates that is no spanning tree, or one with a wrong root."""
    rng = Random("extra")
    for graph in (THREE, CHORD, CHANNELS, ENERGY):
        size, sums, total = len(graph.states), graph.sums(), graph.total()
        state = graph.states[0]
        sets = list(combinations(graph.rates(), size - 1))
        tails = [{graph.ends(rate)[0] for rate in chosen} for chosen in sets]
        double = [c for c, t in zip(sets, tails, strict=True) if len(t) < size - 1]
        cyclic = [c for c, t in zip(sets, tails, strict=True)
                  if len(t) == size - 1 and c not in total]
        others = [t for s in graph.states[1:] for t in sums[s]]
        few = list(combinations(graph.rates(), size - 2))
        many = list(combinations(graph.rates(), size))
        choices = [("two rates out", double, "two rates out of"), ("cycle", cyclic, "the cycle"),
                   ("wrong root", others, "wrong root"), ("too few", few, "too few"),
                   ("too many", many, "too many")]
        for name, among, words in choices:
            if graph is ENERGY and name != "wrong root":
                continue
            extra = rng.choice(among)
            if name == "wrong root":
                above, below = [*sums[state], extra], total
            else:
                above, below = sums[state], [*total, extra]
            yield Slip(f"extra: {name}", graph, f"p[{state}]", quotient(graph, above, below),
                       (words, *_shown(graph, extra)), _p(state))


def coefficients() -> Iterator[Slip]:
    """One coefficient, sign or exponent."""
    rng = Random("coefficients")
    for graph in GRAPHS:
        state = rng.choice(graph.states)
        sums, total = graph.sums(), graph.total()
        above, below = graph.text(sums[state]), [graph.product(tree) for tree in total]
        single_ = [text for text in below if below.count(text) == 1]
        term = rng.choice(single_)
        place = below.index(term)

        def hand(new: str, above: str = above, below: list[str] = below,
                 place: int = place) -> str:
            return f"({above})/({' + '.join([*below[:place], new, *below[place + 1 :]])})"

        yield Slip("coefficient", graph, f"p[{state}]", hand(f"3*{term}"),
                   (r"coefficient 1, not 3",), _p(state))
        yield Slip("sign", graph, f"p[{state}]", hand(f"(-1)*{term}"), (r"sign of the term",),
                   _p(state))
        if graph is not ENERGY:
            name = re.split(r"\*", term)[0]
            yield Slip("exponent", graph, f"p[{state}]", hand(f"{name}*{term}"),
                       (rf"should be|{name}\*\*2", rf"{name}\*\*2"), _p(state))
    nested = "1/(1 + (a1*b2 + a1*a3 + b2*b3)/({A}) + (a1*a2 + b1*b3 + a2*b3)/({A}))"
    right = nested.format(A="b1*b2 + b1*a3 + a2*a3")
    for wrong, words in ((right.replace("a1*b2", "2*a1*b2"), "coefficient 1, not 2"),
                         (right.replace("+ b2*b3", "- b2*b3"), "sign of the term"),
                         (right.replace("a1*a2", "a1*a2**2"), r"a2\*\*2")):
        yield Slip("nested coefficient", THREE, "p[A]", wrong, (words,), _p("A"))


def factors() -> Iterator[Slip]:
    """An overall factor, and the normalisation left out or squared."""
    for graph in (THREE, ENERGY, ONE_WAY):
        state = graph.states[1]
        right, d = quotient(graph, graph.trees(state), graph.total()), graph.text(graph.total())
        rate = graph.rate((0, False))
        last = graph.network.symbols[-1].name
        named = f"exp({last})" if graph is ENERGY else last
        for factor, words in (("2", r"\b2 times|not 2"), ("1/2", r"1/2 times|not 1/2"),
                              (rate, "times the derived"), (named, re.escape(named) + " times")):
            yield Slip("overall factor", graph, f"p[{state}]", f"({factor})*{right}", (words,),
                       _p(state))
        yield Slip("sign of all", graph, f"p[{state}]", f"-{right}", ("sign|minus",), _p(state))
        yield Slip("normalisation left out", graph, f"p[{state}]",
                   f"({graph.text(graph.trees(state))})", ("normalisation is left out",),
                   _p(state))
        yield Slip("normalisation squared", graph, f"p[{state}]", f"{right}/({d})",
                   ("normalisation once too often|exponent of the sum",), _p(state))


def exchanges() -> Iterator[Slip]:
    """Symbols, rates or states exchanged throughout."""
    for graph, one, other in ((THREE, "a1", "b2"), (CHORD, "u1", "u3"), (SHARED, "m1", "k2"),
                              (ENERGY, "E_A", "E_B"), (ENERGY, "B_1", "B_3"), (ONE_WAY, "k2", "q"),
                              (K4, "wAB", "wCD")):
        state = graph.states[0]
        right = quotient(graph, graph.trees(state), graph.total())
        yield Slip("symbols exchanged", graph, f"p[{state}]", swapped(right, {one: other}),
                   (rf"\b{one} and {other} are|\({re.escape(one)}\) and .*\({re.escape(other)}\)",),
                   _p(state))
    for graph, e in ((THREE, 0), (FOUR, 2), (CHORD, 4), (CHANNELS, 1), (SHARED, 1), (ENERGY, 1)):
        state = graph.states[-1]
        name, _, _, ahead, back = graph.transitions[e]
        rows = [*graph.transitions]
        rows[e] = (*rows[e][:3], back or "", ahead)
        turned = Graph(graph.title, graph.states, tuple(rows), graph.network)
        yield Slip("rates of one exchanged", graph, f"p[{state}]",
                   quotient(turned, turned.trees(state), turned.total()),
                   (rf"rates? of {name} are exchanged|{ahead} and {back} are",), _p(state))
    for graph in (THREE, FOUR, CHORD, K4, CHANNELS, SHARED):
        state = graph.states[0]
        rows = [(n, a, b, v or "", w) for n, a, b, w, v in graph.transitions]
        turned = Graph(graph.title, graph.states, tuple(rows), graph.network)
        yield Slip("all rates exchanged", graph, f"p[{state}]",
                   quotient(turned, turned.trees(state), turned.total()),
                   ("rates of all transitions are exchanged",), _p(state))
    for one, other in (("A", "B"), ("A", "D")):
        right = quotient(K4, K4.trees("A"), K4.total())
        turn = {one: other, other: one}
        hand = re.sub(r"w([A-D])([A-D])", lambda m, turn=turn: "w" + "".join(
            turn.get(x, x) for x in m.groups()), right)
        yield Slip("states exchanged", K4, "p[A]", hand,
                   (rf"states {one} and {other}|p\[{other}\]",), _p("A"))


def swapped(text: str, pair: Mapping[str, str]) -> str:
    """Return a text with names exchanged."""
    both = {**pair, **{b: a for a, b in pair.items()}}
    return re.sub(r"[A-Za-z]\w*", lambda m: both.get(m.group(), m.group()), text)


def other_atoms() -> Iterator[Slip]:
    """Right for another state, set, transition or direction."""
    for graph in GRAPHS:
        asked, given = graph.states[0], graph.states[2]
        yield Slip("other state", graph, f"p[{asked}]",
                   quotient(graph, graph.trees(given), graph.total()), (rf"p\[{given}\]",),
                   _p(asked))
        e = 1
        name, first, second = graph.transitions[e][:3]
        yield Slip("opposite current", graph, f"current[{name}]", f"-{current_text(graph, e)}",
                   ("opposite direction", rf"{second} to {first}"), lambda s: s.current(1))
        yield Slip("flow for current", graph, f"current[{name}]",
                   f"{graph.rate((e, False))}*{quotient(graph, graph.trees(first), graph.total())}",
                   (f"forward flow of {name}",), lambda s: s.current(1))
    for graph in (CHORD, K4, CHANNELS, SHARED):
        name, other = graph.transitions[0][0], graph.transitions[2][0]
        yield Slip("other transition", graph, f"current[{name}]", current_text(graph, 2),
                   (rf"current\[{other}\]",), lambda s: s.current(0))
        yield Slip("traffic for current", graph, f"current[{name}]", current_text(graph, 0, "+"),
                   (rf"traffic\[{name}\]",), lambda s: s.current(0))
    some = [tree for s in "BC" for tree in CHORD.trees(s)]
    yield Slip("other set", CHORD, "p[A, B]", quotient(CHORD, some, CHORD.total()),
               (r"p\[B, C\]",), lambda s: s.p["A"] + s.p["B"])
    yield Slip("other set", CHORD, "p[B, C]", quotient(CHORD, CHORD.trees("B"), CHORD.total()),
               (r"p\[B\]",), lambda s: s.p["B"] + s.p["C"])
    d = THREE.text(THREE.total())
    n = {state: THREE.text(THREE.trees(state)) for state in "ABC"}
    mean = f"3*({n['A']}) + ({n['B']})/2 + ({n['C']})"
    yield Slip("other mean", THREE, "mean[Q]", f"({mean})/({d})",
               ("values in A and C exchanged",), _mean)
    mean = f"({n['A']}) + ({n['B']})/2 + 2*({n['C']})"
    yield Slip("other mean", THREE, "mean[Q]", f"({mean})/({d})", ("coefficient 3, not 2",), _mean)
    mean = f"({n['A']}) + 3*({n['C']})"
    yield Slip("other mean", THREE, "mean[Q]", f"({mean})/({d})", ("value in B left out",), _mean)


def _mean(steady: Steady) -> Any:
    return steady.p["A"] + steady.p["B"] / 2 + 3 * steady.p["C"]


def other_responses() -> Iterator[Slip]:
    """Right for another response."""
    for graph in (THREE, CHANNELS):
        state, e = graph.states[0], 1
        name, first = graph.transitions[e][:2]
        by_drive, by_barrier = (response_text(graph, state, by(e)) for by in (drive, barrier))

        def right(by: Callable[[Rate], Fraction], state: str = state) -> Callable[[Steady], Any]:
            return lambda s: s.response(by)[state]

        asked = f"d p[{state}] / d drive[{name}]"
        one = response_text(graph, state, single((e, False)))
        back = response_text(graph, state, single((e, True)))
        yield Slip("missing half", graph, asked, f"2*{by_drive}", ("1/2",), right(drive(e)))
        yield Slip("barrier for drive", graph, asked, by_barrier, (rf"barrier\[{name}\]",),
                   right(drive(e)))
        yield Slip("forward alone", graph, asked, one, ("forward rate of .* alone",),
                   right(drive(e)))
        yield Slip("backward alone", graph, asked, back, ("backward rate of .* alone",),
                   right(drive(e)))
        asked = f"d p[{state}] / d barrier[{name}]"
        yield Slip("sign of barrier", graph, asked, f"-{by_barrier}", ("sign is opposite",),
                   right(barrier(e)))
        yield Slip("energy for barrier", graph, asked,
                   response_text(graph, state, energy(graph, first)), (rf"energy\[{first}\]",),
                   right(barrier(e)))
        n, d = graph.text(graph.trees(state)), graph.text(graph.total())
        yield Slip("logarithm of p", graph, asked, f"{by_barrier}*({d})/({n})",
                   (rf"d ln\(p\[{state}\]\)",), right(barrier(e)))
        other = graph.states[1]
        yield Slip("response of another state", graph, asked,
                   response_text(graph, other, barrier(e)), (rf"p\[{other}\]",),
                   right(barrier(e)))
    for graph, name in ((SHARED, "c"), (ONE_WAY, "c"), (ONE_WAY, "r")):
        state = graph.states[1]
        logarithmic = response_text(graph, state, symbol(graph, name))
        at = symbol(graph, name)
        yield Slip("ln x for x", graph, f"d p[{state}] / d {name}", logarithmic,
                   (rf"d ln {name}\b",),
                   lambda s, at=at, state=state, name=name: s.response(at)[state] / s.at[name])
        yield Slip("x for ln x", graph, f"d p[{state}] / d ln {name}", f"{logarithmic}/{name}",
                   (rf"/ d {name}\b",), lambda s, at=at, state=state: s.response(at)[state])
        n, d = graph.text(graph.trees(state)), graph.text(graph.total())
        yield Slip("derivative for logarithmic", graph, f"d ln p[{state}] / d ln {name}",
                   logarithmic, (rf"d p\[{state}\] / d ln {name}",),
                   lambda s, at=at, state=state: s.response(at)[state] / s.p[state])


def smaller() -> Iterator[Slip]:
    """Right for the network without a transition, a channel or a direction."""
    for graph, e in ((THREE, 2), (FOUR, 1), (CHORD, 4), (K4, 3), (CHANNELS, 0), (CHANNELS, 3),
                     (SHARED, 4), (ENERGY, 1)):
        name = graph.transitions[e][0]
        state = graph.states[1]

        def kept(trees: Sequence[Tree], e: int = e) -> list[Tree]:
            return [tree for tree in trees if all(other != e for other, _ in tree)]

        yield Slip("without a transition", graph, f"p[{state}]",
                   quotient(graph, kept(graph.trees(state)), kept(graph.total())),
                   (rf"without the (transition|channel) {name}",), _p(state))
    for graph, rate in ((THREE, (0, True)), (FOUR, (2, False)), (CHORD, (1, True)),
                        (K4, (5, False)), (CHANNELS, (2, True)), (SHARED, (2, True)),
                        (ENERGY, (2, False)), (ONE_WAY, (4, True))):
        name, word = graph.transitions[rate[0]][0], "backward" if rate[1] else "forward"
        state = graph.states[0]
        some, every = ([t for t in trees if rate not in t]
                       for trees in (graph.trees(state), graph.total()))
        yield Slip("one way", graph, f"p[{state}]", quotient(graph, some, every),
                   (rf"without the rate {name} {word}",), _p(state))


def limits() -> Iterator[Slip]:
    """Right at detailed balance only, to first order, or where a symbol is 0 or 1."""
    balance = {"A": "1", "B": "a1/b1", "C": "a1*a2/(b1*b2)"}
    for state in "ABC":
        total = " + ".join(balance.values())
        yield Slip("detailed balance", THREE, f"p[{state}]", f"({balance[state]})/({total})",
                   ("detailed balance",), _p(state))
    boltzmann = {s: f"exp(-E_{s})" for s in "ABC"}
    for state in "ABC":
        yield Slip("detailed balance", ENERGY, f"p[{state}]",
                   f"{boltzmann[state]}/({' + '.join(boltzmann.values())})",
                   ("detailed balance|F = 0",), _p(state))
    n = "exp(E_A+E_B+E_C-B_1-B_2-B_3)"
    d = ("(exp(-E_A) + exp(-E_B) + exp(-E_C))*(exp(E_A+E_B+E_C))"
         "*(exp(-B_1-B_2) + exp(-B_2-B_3) + exp(-B_1-B_3))")
    yield Slip("first order in a force", ENERGY, "current[two]", f"F*{n}/({d})",
               ("first order in F",), lambda s: s.current(1), exact=False)
    yield Slip("first order in a force", ENERGY, "current[one]", f"F*{n}/({d})",
               ("first order in F",), lambda s: s.current(0), exact=False)
    for graph, name, state in ((ONE_WAY, "c", "B"), (THREE, "a1", "B"), (CHORD, "u5", "C")):
        trees, total = graph.trees(state), graph.total()

        def split(trees: Sequence[Tree], graph: Graph = graph,
                  name: str = name) -> tuple[str, str]:
            texts = [graph.product(tree).split("*") for tree in trees]
            free = [t for t in texts if name not in t]
            used = [[x for x in t if x != name] for t in texts if name in t]
            return tuple(" + ".join("*".join(t) for t in group) or "0"
                         for group in (free, used))  # type: ignore[return-value]

        (n0, n1), (d0, d1) = split(trees), split(total)
        yield Slip("first order in a symbol", graph, f"p[{state}]",
                   f"({n0})/({d0}) + {name}*(({n1})*({d0}) - ({n0})*({d1}))/({d0})**2",
                   (f"first order in {name}",), _p(state))
    for graph, name in ((SHARED, "c"), (SHARED, "x"), (ONE_WAY, "c")):
        right = quotient(graph, graph.trees("E" if graph is SHARED else "A"), graph.total())
        yield Slip("symbol left out", graph, "p[E]" if graph is SHARED else "p[A]",
                   re.sub(rf"\b{name}\b", "1", right), (rf"{name} = 1|\*{name}\) is put as",),
                   _p("E" if graph is SHARED else "A"))


def other_forms() -> Iterator[Slip]:
    """Slips in formulas written in other ways than one sum over another."""
    rng = Random("forms")
    for graph in (THREE, CHORD, ENERGY, ONE_WAY):
        state = graph.states[1]
        own, total = graph.trees(state), graph.total()
        rest = [tree for tree in total if tree not in own]
        n, d = graph.text(own), graph.text(total)
        lost = rng.choice(rest)
        less = graph.text([tree for tree in rest if tree != lost])
        yield Slip("complement", graph, f"p[{state}]", f"1 - ({less})/({d})",
                   ("numerator has|missing", *_shown(graph, lost)), _p(state))
        yield Slip("nested", graph, f"p[{state}]", f"1/(1 + ({less})/({n}))",
                   ("lacks", *_shown(graph, lost)), _p(state))
        by = graph.rate(rng.choice(graph.rates()))
        above = " + ".join(f"{graph.product(tree)}/({by})" for tree in own)
        below = " + ".join(f"{graph.product(tree)}/({by})" for tree in total if tree != lost)
        yield Slip("divided", graph, f"p[{state}]", f"({above})/({below})",
                   ("lacks", *_shown(graph, lost)), _p(state))
        term = graph.product(rng.choice(rest))
        wrong = d.replace(term, f"2*{term}", 1)
        asked = f"d p[{state}] / d energy[{state}]"
        yield Slip("in a response", graph, asked, f"-({n})*({d} - ({n}))/({wrong})**2",
                   ("coefficient 1, not 2",),
                   lambda s, state=state: -s.p[state] * (1 - s.p[state]))
        yield Slip("power in a response", graph, asked, f"-({n})*({d} - ({n}))/({d})",
                   ("exponent of|normalisation is left out",),
                   lambda s, state=state: -s.p[state] * (1 - s.p[state]))
        other = graph.states[0]
        over = graph.text(graph.trees(other)[1:])
        yield Slip("ratio", graph, f"p[{state}]/p[{other}]", f"({n})/({over})",
                   ("denominator lacks", *_shown(graph, graph.trees(other)[0])),
                   lambda s, state=state, other=other: s.p[state] / s.p[other])
    yield Slip("grouped", THREE, "p[A]", "(b1*(b2 + a3) + a2*a3)/((b1 + a1)*(b2 + 2*a3)"
               " + (a2 + b2)*a3 - a3*b2 + b2*b3 + a1*a2 + b1*b3 + a2*b3)",
               ("a3|a1", "coefficient 1, not 2"), _p("A"))
    yield Slip("grouped", THREE, "p[B]", "(a1*(b2 + a3) + b2*b3)/((b1 + a1)*(b2 + a3)"
               " + a2*a3 + b2*(b3 + a1) + a1*a2 + b1*b3 + a2*b3)",
               ("a1|should not be there",), _p("B"))


def other_rates() -> Iterator[Slip]:
    """One rate or one symbol written differently throughout."""
    for graph, e, wrong, words in (
        (SHARED, 0, "k1", r"rate bind forward \(k1\*c\) is put as k1\b|c = 1"),
        (SHARED, 3, "k1", r"rate block forward \(k1\*y\) is put as k1\b"),
        (ONE_WAY, 0, "2*k1*c", r"2\*(c|k1)\b.* is put|put as 2\*"),
        (CHORD, 4, "u5/2", r"u5/2"), (ENERGY, 1, "exp(-B_2)", "put as 1/exp"),
        (ENERGY, 0, "exp(E_A - B_1 + F)", r"put as exp\(")):
        rows = [*graph.transitions]
        rows[e] = (*rows[e][:3], wrong, rows[e][4])
        changed = Graph(graph.title, graph.states, tuple(rows), graph.network)
        state = graph.states[0]
        yield Slip("other rate", graph, f"p[{state}]",
                   quotient(changed, changed.trees(state), changed.total()), (words,), _p(state))
    right = quotient(ENERGY, ENERGY.trees("A"), ENERGY.total())
    for old, new, words in (("F/2", "F", "factor 1/2 of the drive"),
                            ("F/2", "(-F)/2", "opposite sign|rate of one are exchanged|F"),
                            ("B_2", "(-B_2)", "-B_2 is put for B_2")):
        yield Slip("other symbol", ENERGY, "p[A]", right.replace(old, new), (words,), _p("A"))
