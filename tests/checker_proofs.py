"""Records of proofs for the tests of the checker, by enumeration of all sets and products.

Monomials are sorted tuples of numbers of rates; graphs are NetworkX's.
"""

from __future__ import annotations

import functools
import itertools
from collections import Counter
from fractions import Fraction
from typing import Any

import networkx
from checker_examples import BRIDGE, ODDS, ONE_WAY, RING, SQUARE, parts
from checker_examples import examples as point_examples
from checker_records import Json, barrier, drive, energy, network, symbol, target

K4 = network("complete", "A B C D", [
    (a + b, a.upper(), b.upper(), "x", f"{i + 1}*y")
    for i, (a, b) in enumerate(itertools.combinations("abcd", 2))], "x y")
SQUARE_RING = network("four in a ring", "A B C D", [
    ("ab", "A", "B", "x", "y"), ("bc", "B", "C", "x**2", "x"), ("cd", "C", "D", "y", "2"),
    ("da", "D", "A", "x*y", "x")], "x y")
CHANNELS = network("two channels in a ring", "A B C", [
    ("one", "A", "B", "x*exp(E)", "exp(E)/2"), ("two", "A", "B", "y", "3"),
    ("bc", "B", "C", "z*y", "z/y"), ("ca", "C", "A", "z", "2*z + z*x")], "x y z", "E")
Monomial = tuple[int, ...]


class Enumerated:
    """Everything about the graph of a network, listed."""

    def __init__(self, net: Json) -> None:
        self.net, self.states = net, net["states"]
        self.names = [t["name"] for t in net["transitions"]]
        self.ends = [tuple(self.states.index(s) for s in t["between"]) for t in net["transitions"]]
        self.there = [i for e, t in enumerate(net["transitions"]) for i in (2 * e, 2 * e + 1)
                      if i % 2 == 0 or t["backward"] is not None]
        count, n = len(self.ends), len(self.states)
        self.trees = [chosen for chosen in itertools.combinations(range(count), n - 1)
                      if networkx.is_tree(self.graph(chosen))]
        self.masks = sorted(sum(1 << e for e in tree) for tree in self.trees)

    def graph(self, chosen: Any) -> Any:
        graph = networkx.MultiGraph()
        graph.add_nodes_from(range(len(self.states)))
        for e in chosen:
            graph.add_edge(*self.ends[e], key=e)
        return graph

    def towards(self, tree: Any, root: int) -> Monomial:
        """Return the rates of a tree directed to a root."""
        distance = networkx.single_source_shortest_path_length(self.graph(tree), root)
        return tuple(sorted(2 * e + (distance[self.ends[e][0]] < distance[self.ends[e][1]])
                            for e in tree))

    def rows(self, start: int, goal: int, without: int = -1) -> list[Json]:
        rest = [e for e in range(len(self.ends)) if e != without]
        found = []
        for walk in networkx.all_simple_edge_paths(self.graph(rest), start, goal):
            steps = [2 * e + (self.ends[e][0] != a) for a, _, e in walk]
            used = {i // 2 for i in steps}
            found.append({"steps": steps, "weight": sum(
                1 for tree in self.trees if without not in tree and used <= {*tree})})
        return found

    def edge(self, name: str, form: str) -> Json:
        e = self.names.index(name)
        return {"kind": "edge", "transition": name, "form": form,
                "cycles": self.rows(*self.ends[e][::-1], e)}

    def splitting(self, name: str, form: str) -> Json:
        e = self.names.index(name)
        sides: Counter[int] = Counter()
        for tree in self.trees:
            if e in tree:
                part = networkx.node_connected_component(self.graph({*tree} - {e}), self.ends[e][1])
                sides[sum(1 << k for k in part)] += 1
        return {"kind": "splitting", "transition": name, "form": form,
                "splittings": [{"side": s, "weight": w} for s, w in sorted(sides.items())]}

    def paths(self, start: str, goal: str, form: str) -> Json:
        a, b = self.states.index(start), self.states.index(goal)
        return {"kind": "paths", "from": start, "to": goal, "form": form, "paths": self.rows(a, b)}

    def coefficients(self, v: dict[int, Fraction]) -> Json:
        """Return the proof for changes of rates by number, 0 where not given."""
        sums = [sum((v.get(i, Fraction(0)) for i in rates), Fraction(0)) for tree in self.trees
                for root in range(len(self.states)) for rates in [self.towards(tree, root)]
                if {*rates} <= {*self.there}]
        return {"kind": "coefficients", "low": str(min(sums)), "high": str(max(sums))}

    def transport(self, *names: str) -> Json:
        inside = {self.names.index(name) for name in names}
        uses = [len(inside & {*tree}) for tree in self.trees]
        cycles = self.mixed(inside)
        pairs = []
        for i, j in itertools.combinations(range(len(self.states)), 2):
            def some(k: int, more: int) -> list[Monomial]:
                found = [self.towards(tree, k) for tree, use in zip(self.trees, uses, strict=True)
                         if use == min(uses) + more]
                return [rates for rates in found if {*rates} <= {*self.there}]
            pairs.append({"states": [self.states[i], self.states[j]], "moves": moves(
                products(some(i, 1), some(j, 0)), products(some(i, 0), some(j, 1)), cycles)})
        return {"kind": "transport", "transitions": list(names), "cycles": cycles, "pairs": pairs}

    def mixed(self, inside: set[int]) -> list[list[int]]:
        """Return the mixed cycles, both directions of each."""
        found = []
        for e in sorted(inside):
            for row in self.rows(*self.ends[e][::-1], e):
                cycle = [2 * e, *row["steps"]]
                used = {i // 2 for i in cycle}
                if used - inside and min(used & inside) == e:
                    found += [cycle, [i ^ 1 for i in reversed(cycle)]]
        return found


def products(a: list[Monomial], b: list[Monomial]) -> Counter[Monomial]:
    return Counter(tuple(sorted(x + y)) for x in a for y in b)


def moves(left: Counter[Monomial], right: Counter[Monomial], cycles: list[list[int]]) -> list[Json]:
    """Match two sums of products by a flow: equal ones, and those that differ by one cycle."""
    graph = networkx.DiGraph()
    by: dict[tuple[Monomial, Monomial], tuple[int, list[int]]] = {}
    for x, times in left.items():
        graph.add_edge("from", ("left", x), capacity=times)
        if x in right:
            graph.add_edge(("left", x), ("right", x))
        for k, cycle in enumerate(cycles):
            rest = Counter(x)
            rest.subtract(cycle)
            if min(rest.values()) >= 0:
                others = sorted(rest.elements())
                y = tuple(sorted([*others, *(i ^ 1 for i in cycle)]))
                if y in right:
                    graph.add_edge(("left", x), ("right", y))
                    by[x, y] = k, others
    for y, times in right.items():
        graph.add_edge(("right", y), "to", capacity=times)
    if not left and not right:
        return []
    value, flow = networkx.maximum_flow(graph, "from", "to")
    assert value == sum(left.values()) == sum(right.values())
    return [{"cycle": by[x, y][0], "rest": by[x, y][1], "times": flow["left", x]["right", y]}
            for x, y in by if flow["left", x].get(("right", y)) and x != y]


def proof(net: Json, claims: list[str], proofs: list[Json], aim: Json | None = None,
          moved: Json | None = None, path: Json | None = None, trees: bool = True,
          own: Json | None = None) -> Json:
    return {"format": "symbolic-response-certificate", "version": 1, "kind": "proof",
            "network": net, "response": "made for a test", "domain": "all positive rates",
            "target": aim, "perturbation": moved, "path": path,
            "trees": of(net).masks if trees else None, "proofs": proofs,
            "claims": [{"name": name, "parts": own if name == "parameter" else None}
                       for name in claims]}


_FOUND: dict[str, Enumerated] = {}


def of(net: Json) -> Enumerated:
    if net["title"] not in _FOUND:
        _FOUND[net["title"]] = Enumerated(net)
    return _FOUND[net["title"]]


HALF, ONE = Fraction(1, 2), Fraction(1)
ENDS = ["barrier", "end-pair", "splitting-barrier", "splitting-end-pair"]


def of_states(letters: str, *values: str) -> Json:
    return dict(zip(letters, values, strict=True))


PAIRS = {3: ODDS, 4: target("log-ratio", of_states("ABCD", *"1000"), of_states("ABCD", *"0100"))}
MEANS = {3: target("mean", of_states("ABC", "0", "1/2", "2")),
         4: target("mean", of_states("ABCD", "-1", "x", "2", "0"))}
EDGES = [(RING, "turn"), (SQUARE_RING, "bc"), (SQUARE, "ac"), (CHANNELS, "one"),
         (ONE_WAY, "turn"), (ONE_WAY, "burn"), (BRIDGE, "cd"), (BRIDGE, "ab"), (K4, "bd")]


def of_edges() -> dict[str, Json]:
    """Return records about one transition."""
    made: dict[str, Json] = {}
    for net, name in EDGES:
        one, n, short = of(net), len(net["states"]), f"{net['title']}-{name}"
        for form in ("expanded", "compact"):
            both = [one.edge(name, form), one.splitting(name, form)]
            made[f"{short}-barrier-{form}"] = proof(
                net, ENDS, both, MEANS[n], barrier(name), trees=form == "expanded")
        e = one.names.index(name)
        made[f"{short}-drive"] = proof(
            net, ["drive", "splitting-drive"],
            [one.splitting(name, "compact"), one.coefficients({2 * e: HALF, 2 * e + 1: -HALF})],
            MEANS[n], drive(name))
        for word, moved in (("barrier", barrier(name)), ("drive", drive(name))):
            made[f"{short}-current-{word}"] = proof(
                net, ["current-exact", "current-range"], [one.edge(name, "expanded")],
                {"kind": "current", "transition": name}, moved)
        made[f"{short}-second"] = proof(
            net, ["second-order"], [one.edge(name, "compact")], PAIRS[n],
            {"kind": "second-barrier", "transition": name})
    made["finite"] = proof(
        SQUARE, ["finite-change", "finite-end-pair"], [of(SQUARE).edge("ac", "compact")], PAIRS[4],
        {"kind": "finite-barrier", "transition": "ac", "amount": "2*x"}, trees=False)
    return made


def of_symbols() -> dict[str, Json]:
    """Return records about a symbol, an energy or a path."""
    made: dict[str, Json] = {}
    for net, state in ((SQUARE, "B"), (ONE_WAY, "C")):
        one = of(net)
        leaving = {i: ONE for i in one.there
                   if one.states[one.ends[i // 2][i % 2]] == state}
        made[f"{net['title']}-energy"] = proof(
            net, ["energy-covariance", "energy-range"], [one.coefficients(leaving)],
            MEANS[len(one.states)], energy(state), trees=False)
    made["parameter"] = proof(
        SQUARE_RING, ["parameter"],
        [of(SQUARE_RING).edge("bc", "compact"), of(SQUARE_RING).edge("da", "expanded")],
        target("mean", of_states("ABCD", "0", "y", "1", "3")), symbol("x"),
        own=parts({"C": "0"}, {"bc": "3/2", "da": "1"}, {"bc": "1", "ab": "1"}))
    made["support"] = proof(
        K4, ["support", "directed-bundle"],
        [of(K4).coefficients({2 * k: ONE for k in range(6)})],
        target("ratio", of_states("ABCD", "y", "0", "exp(y)", "1/2"),
               of_states("ABCD", *"1111")), symbol("x"), trees=False)
    made["local"] = proof(CHANNELS, ["local-change", "local-end-pair"],
                          [of(CHANNELS).edge("one", "expanded")], PAIRS[3], symbol("E", False))
    for net, form in itertools.product((RING, SQUARE, CHANNELS, BRIDGE), ("expanded", "compact")):
        ends = net["states"][0], net["states"][-1]
        made[f"{net['title']}-path-{form}"] = proof(
            net, ["path"], [of(net).paths(*ends, form)], path=dict(zip(("from", "to"), ends,
                                                                      strict=True)),
            trees=form == "expanded")
    return made


def of_bundles() -> dict[str, Json]:
    """Return records about transitions that change together."""
    made: dict[str, Json] = {}
    for net, names in ((SQUARE_RING, ("ab", "cd")), (CHANNELS, ("bc", "ca")),
                       (SQUARE, ("ab", "bc")), (BRIDGE, ("ab", "bc")), (BRIDGE, ("bc", "cd"))):
        made[f"{net['title']}-{'-'.join(names)}"] = proof(
            net, ["bundle"], [of(net).transport(*names)], MEANS[len(net["states"])],
            {"kind": "bundle", "transitions": list(names)})
    made["bundle-symbol"] = proof(CHANNELS, ["bundle"], [of(CHANNELS).transport("bc", "ca")],
                                  PAIRS[3], symbol("z"))
    for title, net, names in (("one-way-bundle", ONE_WAY, ("bind", "turn")),
                              ("block", BRIDGE, ("ab", "bc", "ca"))):
        v = {2 * of(net).names.index(name) + k: -ONE for name in names for k in (0, 1)}
        made[title] = proof(net, ["bundle", "directed-bundle"], [of(net).coefficients(v)],
                            PAIRS[len(net["states"])],
                            {"kind": "bundle", "transitions": list(names)}, trees=False)
    return made


@functools.cache
def examples() -> dict[str, Json]:
    """Return all valid records of proofs by name."""
    made = {**of_edges(), **of_symbols(), **of_bundles()}
    head = {key: made["parameter"][key] for key in ("format", "version")}
    made["several"] = {**head, "kind": "several", "records": [
        made["parameter"], point_examples()["pair"]]}
    return made
