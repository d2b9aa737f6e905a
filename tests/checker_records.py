"""Records for the tests of the checker, made by other means than the checker's.

Rates and their derivatives come from SymPy, the steady state and its derivative from lists of
spanning trees, cycles from NetworkX, splittings from all sets of states.
"""

from __future__ import annotations

import itertools
import math
from fractions import Fraction
from typing import Any

import networkx
import sympy

Point = dict[str, str]
Json = dict[str, Any]


def network(title: str, states: str, transitions: list[tuple[Any, ...]],
            symbols: str = "", real: str = "") -> Json:
    """Make the network of a record; a transition is (name, first, second, rate[, rate])."""
    listed = [{"name": s, "sign": "positive", "range": ["1/1000", "1000"]} for s in symbols.split()]
    listed += [{"name": s, "sign": "real", "range": ["-5", "5"]} for s in real.split()]
    steps = [{"name": t[0], "between": [t[1], t[2]], "forward": t[3],
              "backward": t[4] if len(t) > 4 else None} for t in transitions]
    return {"title": title, "symbols": listed, "states": states.split(), "transitions": steps}


def energy(state: str) -> Json:
    return {"kind": "energy", "state": state}


def barrier(transition: str) -> Json:
    return {"kind": "barrier", "transition": transition}


def drive(transition: str) -> Json:
    return {"kind": "drive", "transition": transition}


def symbol(name: str, logarithmic: bool = True) -> Json:
    return {"kind": "symbol", "symbol": name, "logarithmic": logarithmic}


def target(kind: str, above: Json, below: Json | None = None) -> Json:
    return {"kind": kind, "above": above, "below": below}


def record(net: Json, points: list[Point], names: list[str], aim: Json | None = None,
           moved: Json | None = None, path: Json | None = None, parts: Json | None = None) -> Json:
    """Make a whole record whose sides come from the oracle."""
    solved = [Oracle(net, point, moved) for point in points]
    made = {"format": "symbolic-response-certificate", "version": 1, "kind": "points",
            "network": net, "response": "made for a test",
            "domain": "all admissible values of the symbols", "target": aim,
            "perturbation": moved, "path": path,
            "sampling": {"rule": "dyadic-strata-1", "seed": "1", "count": len(points)},
            "points": points, "claims": []}
    for name in names:
        own = parts if name == "parameter" else None
        places = [one.sides(name, aim, moved, path, own) for one in solved]
        shares = [share(left, right) for left, right in places]
        at = shares.index(max(shares))
        left, right = places[at]
        made["claims"].append({
            "name": name, "parts": own, "holds": len(points),
            "worst": {"point": at, "left": str(left), "ratio": str(shares[at]),
                      "right": [{"factor": str(f), "g": None if g is None else str(g)}
                                for f, g in right]}})
    return made


def share(left: Fraction, right: list[tuple[Fraction, Fraction | None]]) -> Fraction:
    total = Fraction(0)
    for factor, g in right:
        strength = Fraction(1)
        if g is not None:
            a, b = g.numerator, g.denominator
            root = Fraction(math.isqrt(a * b << 256), b << 128)
            strength = (root - 1) / (root + 1)
        total += factor * strength
    return left / total if left else Fraction(0)


def value_of(text: str, point: Point) -> Any:
    names = {name: sympy.sympify(value, locals={"ln": sympy.log}) for name, value in point.items()}
    symbols = {name: sympy.Symbol(name, positive=True) for name in names}
    tree = sympy.sympify(text, locals={**symbols, "ln": sympy.log}, rational=True)
    return tree, symbols, {symbols[name]: value for name, value in names.items()}


def fraction(tree: Any, values: Any) -> Fraction:
    found = sympy.simplify(sympy.sympify(tree).subs(values))
    assert found.is_Rational, found
    return Fraction(int(found.p), int(found.q))


class Oracle:
    """Sides at one point, by lists of trees, cycles and sets."""

    def __init__(self, net: Json, point: Point, moved: Json | None) -> None:
        self.net, self.point = net, point
        self.states: list[str] = net["states"]
        self.rates: list[tuple[int, int, Fraction, Fraction]] = []  # from, to, rate, d ln rate
        for step in net["transitions"]:
            a, b = (self.states.index(end) for end in step["between"])
            for source, sink, text, first in ((a, b, step["forward"], True),
                                              (b, a, step["backward"], False)):
                rate, change = (self.rate(text, moved) if text is not None
                                else (Fraction(0), Fraction(0)))
                if moved and text is not None:
                    change += self.elementary(step["name"], source, first, moved)
                self.rates.append((source, sink, rate, change))
        n = range(len(self.states))
        sums = [self.trees(k) for k in n]
        total = sum(s for s, _ in sums)
        change = sum(d for _, d in sums)
        self.p = [s / total for s, _ in sums]
        self.dp = [(d * total - s * change) / total**2 for s, d in sums]

    def rate(self, text: str, moved: Json | None) -> tuple[Fraction, Fraction]:
        tree, symbols, values = value_of(text, self.point)
        change = Fraction(0)
        if moved and moved["kind"] == "symbol":
            theta = symbols[moved["symbol"]]
            slope = sympy.diff(tree, theta) / tree * (theta if moved["logarithmic"] else 1)
            change = fraction(slope, values)
        return fraction(tree, values), change

    def elementary(self, name: str, source: int, first: bool, moved: Json) -> Fraction:
        if moved["kind"] == "energy":
            return Fraction(int(self.states[source] == moved["state"]))
        if moved["kind"] == "symbol" or name not in moved.get("transitions",
                                                              [moved.get("transition")]):
            return Fraction(0)
        return Fraction(-1) if moved["kind"] != "drive" else Fraction(1 if first else -1, 2)

    def trees(self, root: int, without: int = -1) -> tuple[Fraction, Fraction]:
        """Sum over trees towards the root of the product of rates, and its derivative."""
        others = [k for k in range(len(self.states)) if k != root]
        leaving = [[r for i, r in enumerate(self.rates)
                    if r[0] == k and r[2] and i // 2 != without] for k in others]
        total = slope = Fraction(0)
        for steps in itertools.product(*leaving):
            ahead = {source: sink for source, sink, _, _ in steps}
            if all(self.arrives(k, root, ahead) for k in others):
                product = math.prod((r for _, _, r, _ in steps), start=Fraction(1))
                total += product
                slope += product * sum(v for _, _, _, v in steps)
        return total, slope

    @staticmethod
    def arrives(state: int, root: int, ahead: dict[int, int]) -> bool:
        for _ in range(len(ahead) + 1):
            if state == root:
                return True
            state = ahead[state]
        return state == root

    def observable(self, expressions: Json | None) -> list[Fraction]:
        values = []
        for state in self.states:
            tree, _, at = value_of((expressions or {})[state], self.point)
            values.append(fraction(tree, at))
        return values

    def mean(self, values: list[Fraction], weights: list[Fraction]) -> Fraction:
        return sum((v * w for v, w in zip(values, weights, strict=True)), Fraction(0))

    def scale(self, aim: Json) -> tuple[Fraction, Fraction, Fraction | None, list[Fraction]]:
        """Return left, Y, S and the observable of S."""
        q = self.observable(aim["above"])
        mean, slope = self.mean(q, self.p), self.mean(q, self.dp)
        if aim["kind"] == "mean":
            return abs(slope), self.spread(q), Fraction(1), q
        r = self.observable(aim["below"])
        other, bend = self.mean(r, self.p), self.mean(r, self.dp)
        factor = mean / other if aim["kind"] == "ratio" else Fraction(1)
        left = abs(slope / mean - bend / other) * factor
        if len(set(aim["below"].values())) == 1:
            return left, self.spread(q) / mean * factor, factor / mean, q
        if len(set(aim["above"].values())) == 1:
            return left, self.spread(r) / other * factor, factor / other, r
        return left, factor, None, q

    def spread(self, q: list[Fraction]) -> Fraction:
        mean, low, high = self.mean(q, self.p), min(q), max(q)
        return Fraction(0) if low == high else (mean - low) * (high - mean) / (high - low)

    def sides(self, name: str, aim: Json | None, moved: Json | None, path: Json | None,
              parts: Json | None) -> tuple[Fraction, list[tuple[Fraction, Fraction | None]]]:
        if path is not None:
            a, b = self.states.index(path["from"]), self.states.index(path["to"])
            return self.p[b] / self.p[a], [(self.largest_path(a, b), None)]
        assert aim is not None and moved is not None
        if aim["kind"] == "current":
            return self.current(name, aim["transition"], moved["kind"])
        left, y, s, q = self.scale(aim)
        if name == "energy-covariance":
            j = self.states.index(moved["state"])
            assert s is not None
            return left, [(s * abs(self.p[j] * (q[j] - self.mean(q, self.p))), None)]
        if name == "energy-range":
            return left, [(y, None)]
        if name == "support":
            leaving = {r[0] for r in self.rates if r[3]}
            return left, [(y * len(leaving) * max(abs(r[3]) for r in self.rates), None)]
        if name.endswith("bundle"):
            return left, self.bundle(name, y)
        if name == "parameter":
            assert parts is not None
            return left, self.pieces(y, parts)
        e = [t["name"] for t in self.net["transitions"]].index(moved["transition"])
        factor = y
        if name.startswith("splitting"):
            assert s is not None
            factor = s * max(abs(self.covariance(q, inside)) for inside in self.splittings(e))
        if moved["kind"] == "drive":
            return left, [(factor / (1 if self.rates[2 * e + 1][2] else 2), None)]
        return left, [(factor, self.end_pair(e) if "end-pair" in name else self.force(e))]

    def current(self, name: str, transition: str, kind: str) -> tuple[
            Fraction, list[tuple[Fraction, Fraction | None]]]:
        e = [t["name"] for t in self.net["transitions"]].index(transition)
        (m, n, along, u), (_, _, back, v) = self.rates[2 * e : 2 * e + 2]
        left = abs(along * (u * self.p[m] + self.dp[m]) - back * (v * self.p[n] + self.dp[n]))
        flows = along * self.p[m], back * self.p[n]
        right = abs(flows[0] - flows[1]) if kind == "barrier" else sum(flows) / 2
        if name == "current-exact":
            states = range(len(self.states))
            right *= sum(self.trees(k, e)[0] for k in states) / sum(
                self.trees(k)[0] for k in states)
        return left, [(right, None)]

    def bundle(self, name: str, y: Fraction) -> list[tuple[Fraction, Fraction | None]]:
        """Count the rates that change in all trees, and try all cycles with others."""
        kappa = max(abs(r[3]) for r in self.rates)
        uses = set()
        for root in range(len(self.states)):
            others = [k for k in range(len(self.states)) if k != root]
            for steps in itertools.product(*[[r for r in self.rates if r[0] == k and r[2]]
                                             for k in others]):
                ahead = {source: sink for source, sink, _, _ in steps}
                if all(self.arrives(k, root, ahead) for k in others):
                    uses.add(sum(r[3] != 0 for r in steps))
        if name == "directed-bundle":
            return [(y * kappa * (max(uses) - min(uses)), None)]
        inside = {i // 2 for i, r in enumerate(self.rates) if r[3]}
        assert max(uses) - min(uses) < 2
        if max(uses) == min(uses):
            return [(Fraction(0), None)]
        forces = [self.force(e, inside) for e in inside]
        return [(y * kappa, None if None in forces else max(f for f in forces if f is not None))]

    def pieces(self, y: Fraction, parts: Json) -> list[tuple[Fraction, Fraction | None]]:
        def found(text: str) -> Fraction:
            tree, _, values = value_of(text, self.point)
            return fraction(tree, values)

        heights = [found(parts["energies"].get(state, "0")) for state in self.states]
        first = max(heights) - min(heights) + sum(found(t) for t in parts["singles"].values())
        terms: list[tuple[Fraction, Fraction | None]] = [(y * first, None)]
        for e, step in enumerate(self.net["transitions"]):
            if step["name"] in parts["barriers"]:
                terms.append((y * found(parts["barriers"][step["name"]]), self.force(e)))
        return terms

    def covariance(self, q: list[Fraction], inside: set[int]) -> Fraction:
        both = sum(self.p[k] * q[k] for k in inside)
        return both - self.mean(q, self.p) * sum(self.p[k] for k in inside)

    def splittings(self, e: int) -> list[set[int]]:
        graph = networkx.Graph([(a, b) for a, b, _, _ in self.rates])
        m, n = self.rates[2 * e][:2]
        found = []
        for size in range(1, len(self.states)):
            for inside in itertools.combinations(range(len(self.states)), size):
                rest = set(graph) - set(inside)
                if m in inside and n in rest and networkx.is_connected(graph.subgraph(inside)) and (
                        networkx.is_connected(graph.subgraph(rest))):
                    found.append(set(inside))
        return found

    def walks(self, start: int, goal: int, without: int = -1) -> list[list[int]]:
        """Return simple paths as lists of numbers of rates."""
        graph = networkx.MultiDiGraph()
        graph.add_nodes_from(range(len(self.states)))
        for i, (a, b, _, _) in enumerate(self.rates):
            if i // 2 != without:
                graph.add_edge(a, b, key=i)
        return [[step[2] for step in walk]
                for walk in networkx.all_simple_edge_paths(graph, start, goal)]

    def quotient(self, walk: list[int]) -> tuple[Fraction, Fraction]:
        return (math.prod((self.rates[i][2] for i in walk), start=Fraction(1)),
                math.prod((self.rates[i ^ 1][2] for i in walk), start=Fraction(1)))

    def force(self, e: int, inside: set[int] | None = None) -> Fraction | None:
        """Return exp(F_max) of e, of cycles that leave a set of transitions if one is given."""
        best = Fraction(1)
        for walk in self.walks(self.rates[2 * e][1], self.rates[2 * e][0], e):
            if inside is not None and {i // 2 for i in walk} <= inside:
                continue
            along, against = self.quotient([2 * e, *walk])
            if along and against:
                best = max(best, along / against, against / along)
            elif along or against:
                return None
        return best

    def end_pair(self, e: int) -> Fraction | None:
        m, n = self.rates[2 * e][:2]
        top = self.rates[2 * e][2] * self.trees(m, e)[0]
        low = self.rates[2 * e + 1][2] * self.trees(n, e)[0]
        if not top and not low:
            return Fraction(1)
        return max(top / low, low / top) if top and low else None

    def largest_path(self, start: int, goal: int) -> Fraction:
        ratios = [self.quotient(walk) for walk in self.walks(start, goal)]
        return max(along / against for along, against in ratios if along)
