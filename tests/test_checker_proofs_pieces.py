"""Parts of the check of proofs by themselves, against SymPy and enumeration; hostile records."""

from __future__ import annotations

import itertools
import json
import math
import random
import subprocess
import sys
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
import sympy

sys.path.insert(0, str(Path(__file__).parent))

from checker_examples import BRIDGE, ONE_WAY, SQUARE
from checker_proofs import CHANNELS, K4, Enumerated, Json, examples, of, proof
from checker_records import barrier, network, symbol

from symbolic_response.checker import check_record, expressions, forms, trees
from symbolic_response.checker.algebra import PRIME, Residues
from symbolic_response.checker.extremes import extremes
from symbolic_response.checker.identities import check_edge, check_splitting
from symbolic_response.checker.network import Graph
from symbolic_response.checker.reading import Rejected, Work
from symbolic_response.checker.record import Perturbation
from symbolic_response.checker.trees import Polynomials

F = Fraction
NETS = [SQUARE, ONE_WAY, BRIDGE, CHANNELS, K4]


def graph_of(net: Json, work: int = 10**9) -> Graph:
    one = of(net)
    single = [t["backward"] is None for t in net["transitions"]]
    return Graph(len(one.states), one.ends, single, Work(work))


def brute(one: Enumerated, graph: Graph, root: int, without: int = -1) -> list[tuple[int, ...]]:
    found = [one.towards(tree, root) for tree in one.trees if without not in tree]
    return [rates for rates in found if {*rates} <= {*one.there}]


@pytest.mark.parametrize("net", NETS, ids=lambda net: net["title"])
def test_sums_over_trees_of_both_kinds(net: Json) -> None:
    one, graph = of(net), graph_of(net)
    source = random.Random(3)
    residues = Residues(graph, lambda: source.randrange(1, PRIME))
    polynomials = Polynomials(graph, one.masks)

    def value(polynomial: dict[int, int]) -> int:
        total = 0
        for monomial, times in polynomial.items():
            for i, rate in enumerate(residues.rates):
                exponent = monomial >> polynomials.width * i & (1 << polynomials.width) - 1
                times = times * pow(rate, exponent, PRIME)
            total += times
        return total % PRIME

    def same(products: list[tuple[int, ...]]) -> int:
        return sum(math.prod(residues.rates[i] for i in rates) for rates in products) % PRIME

    for root, e in itertools.product(range(graph.states), [-1, *range(len(graph.ends))]):
        wanted = same(brute(one, graph, root, e))
        assert wanted == residues.trees(root, e) == value(polynomials.trees(root, e))
        if e >= 0:
            for i in (2 * e, 2 * e + 1):
                found = [tuple(j for j in one.towards(tree, root) if j != i) for tree in one.trees
                         if i in one.towards(tree, root)]
                found = [rates for rates in found if {*rates} <= {*one.there}]
                assert same(found) == residues.using(i, root) == value(polynomials.using(i, root))
            inside = polynomials.pairs(e, 1 << graph.ends[e][1])
            assert value(inside) == residues.pairs(e, 1 << graph.ends[e][1])
        assert polynomials.pairs(0, 0) == {}
    for row in one.rows(0, graph.states - 1):
        path = tuple(row["steps"])
        assert value(polynomials.walk(path)) == residues.walk(path)
        assert value(polynomials.forests(path)) == residues.forests(path)
    assert polynomials.forests((0, 1)) == {}


@pytest.mark.parametrize("net", NETS, ids=lambda net: net["title"])
def test_numbers_of_trees_and_ranges_of_sums(net: Json) -> None:
    one, graph, source = of(net), graph_of(net), random.Random(net["title"])
    assert graph.number_of_trees() == len(one.trees)
    for e in range(len(graph.ends)):
        assert graph.number_of_trees(e) == sum(e not in tree for tree in one.trees)
    for _ in range(20):
        v = [F(source.randint(-5, 5), source.choice([1, 2, 3])) if i in one.there else F(0)
             for i in range(2 * len(graph.ends))]
        sums = [sum((v[i] for i in rates), F(0)) for root in range(graph.states)
                for rates in brute(one, graph, root)]
        assert extremes(graph, v) == (min(sums), max(sums))
    constant = [F(7, 3)] * len(v)
    assert extremes(graph, constant) == (F(7, 3) * (graph.states - 1),) * 2


@pytest.mark.parametrize("form", ["polynomials", "residues"])
@pytest.mark.parametrize("wrong", ["trees", "using", "walk", "forests", "pairs"])
def test_false_identities_are_found(form: str, wrong: str,
                                    monkeypatch: pytest.MonkeyPatch) -> None:
    graph, one = graph_of(SQUARE), of(SQUARE)
    made: Any = (Polynomials(graph, one.masks) if form == "polynomials"
                 else Residues(graph, lambda: 12345))
    rows = [tuple(row["steps"]) for row in one.rows(2, 0, 4)]
    sides = [row["side"] for row in one.splitting("ac", "compact")["splittings"]]
    check_edge(made, 4, rows, "here")
    check_splitting(made, 4, sides, "here")
    right = getattr(made, wrong)

    def another(*arguments: Any) -> Any:
        value = right(*arguments)
        if isinstance(value, int):
            return value + 1
        return {k: 2 * c for k, c in value.items()} | {0: 1}

    monkeypatch.setattr(made, wrong, another)
    with pytest.raises(Rejected) as caught:
        check_edge(made, 4, rows, "here")
        check_splitting(made, 4, sides, "here")
    assert (caught.value.verdict.status, caught.value.verdict.entry) == ("invalid", "here")


def test_the_random_point_is_a_parameter() -> None:
    drawn: list[int] = []

    def draw() -> int:
        drawn.append(len(drawn) + 2)
        return drawn[-1]

    record = examples()["square with chord-ac-barrier-compact"]
    assert check_record(record, draw=draw).status == "valid"
    assert len(drawn) == 10  # one point for both proofs
    assert check_record(examples()["block"], draw=lambda: 1 // 0).status == "valid"


def shown(text: str, known: dict[str, bool], **moved: Any) -> forms.Form:
    return forms.read_form(expressions.read(text, "", known), known,
                           Perturbation("symbol", **moved), Work(10**6))


@pytest.mark.parametrize(("text", "wanted"), [
    ("3", 0), ("y*x", 1), ("x*x", 2), ("x**3/y", 3), ("x/x**2", -1), ("x*y + 2*x", 1),
    ("x - y*x", 1), ("x + y", None), ("x + 1", None), ("exp(x)", None), ("exp(r)*x", 1),
    ("sqrt(x)", F(1, 2)), ("exp(ln(x))", 1), ("exp(2*ln(x/y) - r)", 2), ("exp(ln(x + y))", None),
    ("ln(y)", 0), ("ln(x)", None), ("1/x", -1),
    ("(x + y*x)**(-1/3)", F(-1, 3)), ("x**0", 0), ("-x", 1), ("x/0", 1), ("(x + y)**0", None)])
def test_changes_by_a_logarithm(text: str, wanted: Any) -> None:
    known = {"x": True, "y": True, "r": False}
    assert shown(text, known, symbol="x", logarithmic=True).change == wanted


@pytest.mark.parametrize(("text", "wanted"), [
    ("exp(r)", 1), ("y*exp(2*r - s)", 2), ("exp(r/2 + s)*exp(-3*r)", F(-5, 2)), ("r", None),
    ("exp(r*s)", None), ("exp(r**2)", None), ("exp((2 - 1/2)*r*3)", F(9, 2)), ("exp(s)", 0),
    ("exp(r)**2/y", 2), ("exp(-(r - s))", -1), ("exp(s/r)", None), ("exp(s*r*0)", None),
    ("exp(4**(1/2)*r)", 2), ("exp(2**(1/2)*r)", None), ("exp(exp(r))", None), ("exp(r/0)", None),
    ("exp(r)*exp(s) + 3*exp(r)", 1), ("exp(r**1)", None), ("exp(exp(s)*r)", None),
    ("exp(r*s/s)", None)])
def test_changes_by_the_symbol_itself(text: str, wanted: Any) -> None:
    known = {"y": True, "r": False, "s": False}
    assert shown(text, known, symbol="r").change == wanted


@pytest.mark.parametrize("seed", range(40))
def test_changes_against_sympy(seed: int) -> None:
    source = random.Random(seed)

    def product(depth: int) -> str:
        parts = [source.choice(["x", "y", "x**2", "2", "x**(-1/2)", "exp(r)", "(3*x)"])
                 for _ in range(source.randint(1, 3))]
        if depth:
            inner = product(0)
            parts.append(f"({inner} + {source.choice(['2', 'y'])}*{inner})**2")
        return source.choice("*/").join(parts)

    text = product(1)
    x = sympy.Symbol("x", positive=True)
    tree = sympy.sympify(text, locals={"x": x})
    wanted = sympy.simplify(sympy.diff(tree, x) * x / tree)
    known = {"x": True, "y": True, "r": False}
    found = shown(text, known, symbol="x", logarithmic=True).change
    assert found == F(int(wanted.p), int(wanted.q)), text


@pytest.mark.parametrize(("text", "wanted"), [
    ("0", 0), ("1/2", 1), ("-1", None), ("x", 1), ("r", None), ("exp(r)", 1), ("x - 1", None),
    ("2 - 1", 1), ("1 - 1", 0), ("0*x", 0), ("0*r", None), ("x + 0", 1), ("x**(-1/2)", 1),
    ("r**2", None), ("x/y", 1), ("x/0", None), ("0/x", 0), ("x*exp(r) + 2", 1), ("ln(x)", None),
    ("2**(1/2)", 1), ("0**2", 0), ("-1*-1", 1), ("sqrt(x + 1/3)", 1), ("1/0", None)])
def test_certain_signs(text: str, wanted: int | None) -> None:
    known = {"x": True, "y": True, "r": False}
    assert shown(text, known).sign == wanted


def complete(n: int) -> Json:
    names = [f"S{k}" for k in range(n)]
    return network(f"complete {n}", " ".join(names), [
        (f"t{i}_{j}", names[i], names[j], "x", "y") for i, j in
        itertools.combinations(range(n), 2)], "x y")


def compact_edge(net: Json) -> Json:
    """Return an edge of a complete graph: weights by symmetry, n**(r-1) r forests on n states."""
    names, steps = net["states"], [t["name"] for t in net["transitions"]]
    n, rows = len(names), []
    number = {(i, j): 2 * k for k, (i, j) in enumerate(itertools.combinations(range(n), 2))}
    number |= {(j, i): k + 1 for (i, j), k in number.items()}
    for size in range(1, n - 1):
        for between in itertools.permutations(range(2, n), size):
            walk = (1, *between, 0)
            rows.append({"steps": [number[pair] for pair in itertools.pairwise(walk)],
                         "weight": len(walk) * n ** (n - len(walk) - 1) if len(walk) < n else 1})
    return proof(net, ["barrier"], [{"kind": "edge", "transition": steps[0], "form": "compact",
                                     "cycles": rows}],
                 {"kind": "mean", "above": {s: s[1:] for s in names}, "below": None},
                 barrier(steps[0]), trees=False)


def test_all_cycles_of_a_complete_graph() -> None:
    record = compact_edge(complete(8))
    assert len(record["proofs"][0]["cycles"]) == 1956
    assert check_record(record).status == "valid"
    record["proofs"][0]["cycles"].pop(777)
    assert check_record(record).entry == "proofs[0].cycles"


def test_work_ends(monkeypatch: pytest.MonkeyPatch) -> None:
    for name, record in examples().items():
        if name.startswith(("complete", "support", "four in a ring-ab-cd")):
            verdict = check_record(record, 100)
            assert (verdict.status, verdict.entry) == ("incomplete", "work"), name
    expanded = examples()["complete-bd-barrier-expanded"]
    monkeypatch.setattr(trees, "MAX_MEMORY", 100_000)
    assert check_record(expanded).entry == "proofs"
    monkeypatch.setattr(trees, "MAX_DIRECTED", 63)
    verdict = check_record(expanded)
    assert (verdict.status, verdict.entry) == ("incomplete", "trees")
    monkeypatch.setattr(trees, "MAX_TREES", 15)
    assert check_record(expanded).expected == "at most 15"


def test_changes_that_are_too_different() -> None:
    net = network("steep", "A B", [("one", "A", "B", "x**65", "x"), ("two", "A", "B", "1", "2")],
                  "x")
    net["transitions"][0]["forward"] = "x**32*x**34"
    record = proof(net, ["directed-bundle"], [{"kind": "coefficients", "low": "0", "high": "1"}],
                   {"kind": "mean", "above": {"A": "1", "B": "0"}, "below": None}, symbol("x"),
                   trees=False)
    verdict = check_record(record)
    assert (verdict.status, verdict.entry) == ("incomplete", "network.transitions")


@pytest.mark.parametrize("text", ["(7**64)**60*" * 90 + "x", "(7**64/5**64)**9*" * 9000 + "x"])
def test_large_numbers_in_forms(text: str) -> None:
    record = examples()["local"]
    for key, value in (("network", {**record["network"], "transitions": [
            {**record["network"]["transitions"][0], "forward": text},
            *record["network"]["transitions"][1:]]}),
            ("target", {**record["target"], "above": {"A": text, "B": "0", "C": "0"}})):
        assert check_record({**record, key: value}).status == "incomplete"


def test_proofs_are_checked_without_the_package(tmp_path: Path) -> None:
    checker = Path(__file__).parent.parent / "symbolic_response" / "checker"
    files = []
    for name in ("ring-turn-barrier-expanded", "finite", "four in a ring-ab-cd", "several"):
        files.append(tmp_path / f"{name.replace(' ', '-')}.json")
        files[-1].write_text(json.dumps(examples()[name]), encoding="utf-8")
    done = subprocess.run([sys.executable, "-I", "-S", str(checker), *map(str, files)],
                          capture_output=True, text=True, check=False, cwd="/")
    assert (done.returncode, done.stderr, done.stdout.count("valid (")) == (0, "", 4)

