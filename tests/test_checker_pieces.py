"""Parts of the checker by themselves: decisions, values, graphs, linear algebra."""

from __future__ import annotations

import copy
import itertools
import json
import random
import subprocess
import sys
from fractions import Fraction
from pathlib import Path

import networkx
import pytest
import sympy

sys.path.insert(0, str(Path(__file__).parent))

from checker_examples import examples
from checker_records import Oracle

from symbolic_response.checker import (
    bounds,
    check_file,
    check_record,
    checking,
    exit_status,
    expressions,
    network,
    record,
)
from symbolic_response.checker.expressions import read, run
from symbolic_response.checker.network import Graph, determinant, solve
from symbolic_response.checker.point import Solved
from symbolic_response.checker.reading import Rejected, Verdict, Work, shown
from symbolic_response.checker.statement import statement

F = Fraction


def work() -> Work:
    return Work(10**9)


def test_both_conditions_of_the_squared_comparison() -> None:
    assert (1 + 2) ** 2 <= 9 * (1 - 2) ** 2  # the second alone would let 2 <= tanh(ln(9)/4) pass
    assert not bounds.squared(F(2), F(1), F(9))
    assert bounds.decide(F(2), [(F(1), F(9))]) is False
    assert bounds.decide(F(2), [(F(1), F(8))]) is False
    assert bounds.decide(F(1, 2), [(F(1), F(9))]) is True  # equality: tanh(ln(9)/4) = 1/2
    assert bounds.decide(F(1, 2) + F(1, 10**30), [(F(1), F(9))]) is False


@pytest.mark.parametrize("seed", range(200))
def test_decisions_against_numbers(seed: int) -> None:
    source = random.Random(seed)
    terms = [(F(source.randint(0, 9), source.randint(1, 9)),
              source.choice([None, F(1), F(4), F(source.randint(5, 90), source.randint(1, 5))]))
             for _ in range(source.randint(1, 4))]
    total = sympy.N(sum(sympy.Rational(f.numerator, f.denominator) * (
        1 if g is None else sympy.tanh(sympy.log(sympy.Rational(g.numerator, g.denominator)) / 4))
        for f, g in terms), 60)
    near = F(str(total)).limit_denominator(10**source.randint(1, 12))
    for left in (near, near + F(1, 10**13), F(source.randint(0, 300), 20)):
        value = sympy.N(sympy.Rational(left.numerator, left.denominator) - total, 50)
        if abs(value) > 1e-40:
            assert bounds.decide(left, terms) is bool(value < 0)
        low, high = bounds.sum_bounds(terms, 128)
        assert low <= high and high - low < F(1, 2**100)


def test_a_tie_of_several_roots_is_left_undecided() -> None:
    # tanh(ln(2)/4) + tanh(ln(8)/4) is irrational; no fraction equals it, but one may be too near
    low, high = bounds.sum_bounds([(F(1), F(2)), (F(1), F(8))], 5000)
    assert bounds.decide((low + high) / 2, [(F(1), F(2)), (F(1), F(8))]) is None
    assert bounds.decide(low - F(1, 2**4000), [(F(1), F(2)), (F(1), F(8))]) is True


def test_terms_with_one_force_are_taken_together() -> None:
    root = F(1, 7)  # equal irrational terms: decided by squares, never by bounds
    assert bounds.decide(root, [(F(1), F(2)), (F(1), F(2))]) is True
    assert bounds.decide(F(1), [(F(1), F(2)), (F(1), F(2))]) is False


def test_ratio_without_a_right_side() -> None:
    assert bounds.ratio(F(0), [(F(0), None)]) == 0
    assert bounds.ratio(F(1), [(F(0), None)]) is None
    assert bounds.ratio(F(1), [(F(1), F(1))]) is None
    assert bounds.ratio(F(1), [(F(1), 1 + F(1, 2**300))]) > 2**300  # above 1: never 0


@pytest.mark.parametrize(("text", "value"), [
    ("1 + 2*3", 7), ("-2**2", -4), ("2**-2", F(1, 4)), ("2**3**2", 512), ("8/4/2", 1),
    ("2 - 3 - 4", -5), ("2*-3", -6), ("-2*3 + 1", -5), ("2**-1*4", 2), ("+ - +3", -3),
    ("(1 + 2)*(3)", 9), ("1.5e1", 15), (".5", F(1, 2)), ("2.", 2), ("1e-2", F(1, 100)),
    ("sqrt(16/9)", F(4, 3)), ("27**(1/3)", 3), ("(32/243)**(2/5)", F(4, 9)), ("0**0", 1),
    ("exp(ln(2)/2 + ln(8)/2)", 4), ("exp(3*ln(2) - ln(4))", 2), ("exp(0)", 1), ("sqrt(0)", 0),
    ("exp(ln(1/3)*2)", F(1, 9)), ("ln(5) - ln(5)", 0), ("ln(5)*0 + 2", 2), ("exp(ln(1))", 1),
    ("ln(2)**1 - ln(2)", 0), ("(ln(3) + ln(3))/2 - ln(3)", 0), ("1/exp(ln(4))", F(1, 4)),
    ("exp(ln(4)/3)*exp(0)", None), ("2**64", 2**64), ("(-2)**3", -8), ("0*ln(3)", 0)])
def test_values(text: str, value: object) -> None:
    expression = read(text, "here", {})
    if value is None:
        with pytest.raises(Exception, match="root"):
            expression.at({}, work())
    else:
        assert expression.at({}, work()) == (value, 0)


@pytest.mark.parametrize("text", [
    "x**3/(y + x)", "sqrt(x)*y - x", "exp(2*ln(x) - ln(y))", "x**(3/2)", "1/x - -x", "x*x*x",
    "exp(ln(x*y)*2)", "(x + y)**0*x", "exp(z)*x", "exp(z/2)**4/y", "exp(ln(x)*2 - z)"])
def test_derivatives_against_sympy(text: str) -> None:
    names = {"x": sympy.Rational(4, 9), "y": sympy.Integer(5), "z": sympy.log(9)}
    symbols = {name: sympy.Symbol(name, positive=True) for name in names}
    tree = sympy.sympify(text, locals={**symbols, "ln": sympy.log})
    for name in names:
        point = {"x": (F(4, 9), F(name == "x")), "y": (F(5), F(name == "y")),
                 "z": ({F(9): F(1)}, F(name == "z"))}
        value, slope = read(text, "here", names).at(point, work())
        at = {symbols[key]: number for key, number in names.items()}
        assert sympy.simplify(tree.subs(at)) == sympy.Rational(value.numerator, value.denominator)
        wanted = sympy.simplify(sympy.diff(tree, symbols[name]).subs(at))
        assert wanted == sympy.Rational(slope.numerator, slope.denominator)


def test_derivative_of_what_has_no_exact_one() -> None:
    point = {"x": (F(2), F(1)), "z": ({F(3): F(1)}, F(0))}
    value, slope = run(read("exp(x*z)", "here", point).program, point, work())
    assert (value, slope) == (9, {F(3): F(9)})
    assert run(read("x*z", "here", point).program, point, work())[1] == {F(3): F(1)}


GRAPHS = {
    "parallel": (2, [(0, 1), (0, 1), (0, 1)]), "ring": (5, [(i, (i + 1) % 5) for i in range(5)]),
    "k4": (4, list(itertools.combinations(range(4), 2))),
    "k5": (5, list(itertools.combinations(range(5), 2))), "tree": (4, [(0, 1), (1, 2), (1, 3)]),
    "doubled": (4, [(0, 1), (1, 2), (2, 3), (3, 0), (0, 2), (0, 2), (1, 2)]),
    "cube": (8, [(i, i | b) for i in range(8) for b in (1, 2, 4) if not i & b]),
    "petersen": (10, [tuple(sorted(e)) for e in networkx.petersen_graph().edges]),
}


@pytest.mark.parametrize("name", GRAPHS)
def test_cycles_and_splittings_against_brute_force(name: str) -> None:
    states, ends = GRAPHS[name]
    graph = Graph(states, ends, [False] * len(ends), work())
    plain = networkx.Graph(ends)
    multi = networkx.MultiDiGraph()
    for i, (a, b) in enumerate(ends):
        multi.add_edge(a, b, key=2 * i)
        multi.add_edge(b, a, key=2 * i + 1)
    for e, (m, n) in enumerate(ends):
        rest = multi.copy()
        rest.remove_edge(m, n, 2 * e)
        rest.remove_edge(n, m, 2 * e + 1)
        walks = {(2 * e, *(step[2] for step in walk))
                 for walk in networkx.all_simple_edge_paths(rest, n, m)}
        assert set(graph.cycles(e)) == walks and len(graph.cycles(e)) == len(walks)
        sets = set()
        for inside in range(1, 2**states - 1):
            here = [k for k in range(states) if inside >> k & 1]
            there = [k for k in range(states) if not inside >> k & 1]
            if m in here and n in there and all(
                    networkx.is_connected(plain.subgraph(part)) for part in (here, there)):
                sets.add(inside)
        found = graph.splittings(e)
        assert set(found) == sets and len(found) == len(sets)
        assert graph.splittings(e) is found and graph.cycles(e) is graph.cycles(e)


def test_published_numbers_of_cycles() -> None:
    k7 = list(itertools.combinations(range(7), 2))
    graph = Graph(7, k7, [False] * len(k7), work())
    lengths = [len(cycle) for e in range(len(k7)) for cycle in graph.cycles(e)]
    assert sum(F(1, length) for length in lengths) == 1172  # each once for each of its edges


def test_a_large_grid_is_not_searched_in_vain(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(network, "MAX_LISTED", 10_000)
    ends = [(i, i + 1) for i in range(31)] + [(i, i + 8) for i in range(24)]
    graph = Graph(32, ends, [False] * len(ends), work())
    with pytest.raises(Rejected) as caught:
        graph.splittings(0)
    assert caught.value.verdict.status == "incomplete"


@pytest.mark.parametrize("seed", range(30))
def test_linear_algebra_against_sympy(seed: int) -> None:
    source = random.Random(seed)
    size = source.randint(1, 6)
    matrix = [[F(source.choice([0, 0, 1, -2, 5]), source.randint(1, 4)) for _ in range(size)]
              for _ in range(size)]
    exact = sympy.Matrix(size, size, [sympy.Rational(x.numerator, x.denominator)
                                      for row in matrix for x in row])
    wanted = exact.det()
    assert determinant(matrix, work()) == F(int(wanted.p), int(wanted.q))
    if wanted:
        right = [F(source.randint(-5, 5)) for _ in range(size)]
        found = solve(matrix, right, work())
        for row, b in zip(matrix, right, strict=True):
            assert sum(x * y for x, y in zip(row, found, strict=True)) == b
    assert determinant([], work()) == 1


def test_steady_state_and_response_against_finite_differences() -> None:
    record = examples()["square-splitting"]
    net = copy.deepcopy(record["network"])
    here = Oracle(net, record["points"][0], record["perturbation"])
    step = F(1, 10**6)
    probabilities = []
    for sign in (1, -1):
        for rate in ("forward", "backward"):
            text = record["network"]["transitions"][4][rate]
            net["transitions"][4][rate] = f"({text})*{1 - sign * step}"
        probabilities.append(Oracle(net, record["points"][0], None).p)
    for k, slope in enumerate(here.dp):
        assert abs((probabilities[0][k] - probabilities[1][k]) / (2 * step) - slope) < F(1, 10**9)


def test_known_value_of_two_parallel_transitions() -> None:
    claim = examples()["pair"]["claims"][0]["worst"]
    assert claim["left"] == "3/5" and claim["ratio"] == "1"
    assert claim["right"] == [{"factor": "1", "g": "16"}]


@pytest.mark.parametrize(("forced", "status"), [(F(4), "it does not"), (F(1), "it does not")])
def test_a_claim_that_fails(monkeypatch: pytest.MonkeyPatch, forced: F, status: str) -> None:
    monkeypatch.setattr(bounds, "_largest_force", lambda graph, cycles, at: forced)
    verdict = check_record(examples()["pair"])
    assert (verdict.status, verdict.entry) == ("invalid", "claims[0].holds")
    assert verdict.got.startswith(status)


def test_a_claim_that_is_not_decided(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(checking, "decide", lambda left, terms: None)
    verdict = check_record(examples()["pair"])
    assert (verdict.status, verdict.entry) == ("invalid", "claims[0].holds")
    assert verdict.got.startswith("undecided")


def test_an_equality_that_is_an_inequality_fails(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(checking, "right_side", lambda *_: [(F(9), None)])
    verdict = check_record(examples()["ring-energy"])
    assert verdict.entry == "claims[0].holds" and " = 9" in verdict.got


def test_a_rate_that_is_no_text_and_ties_of_constant_observables() -> None:
    record = copy.deepcopy(examples()["ring-barrier"])
    for side in ("above", "below"):  # constant: Y = 0 and nothing responds
        record["target"][side] = {"A": "2", "B": "2", "C": "2"}
    for claim in record["claims"]:
        claim["worst"] = {"point": 0, "left": "0", "ratio": "0", "right": [
            {**claim["worst"]["right"][0], "factor": "0", "g": claim["worst"]["right"][0]["g"]}]}
    verdict = check_record(record)
    assert verdict.status == "invalid" and verdict.entry.endswith("right[0].g")
    record["network"]["transitions"][0]["forward"] = 1
    assert check_record(record).status == "malformed"


def test_cycles_of_equal_force_and_cycles_that_cannot_be_run() -> None:
    def force(ends: list[tuple[int, int]], one_way: list[bool], rates: list[F]) -> F | None:
        graph = Graph(1 + max(map(max, ends)), ends, one_way, work())
        return bounds._largest_force(graph, graph.cycles(0), Solved("", {}, rates, []))

    double = [(0, 1), (0, 1), (0, 1)]
    two = F(2)
    assert force(double, [False] * 3, [two, F(1), F(1), two, F(1), F(1)]) == 4
    assert force(double, [False] * 3, [two, F(1), F(1), F(1), F(1), two]) == 4
    ring = [(0, 1), (1, 2), (0, 2)]  # one-way steps against each other: no cycle can be run
    assert force(ring, [False, True, True], [two, F(1), F(1), F(0), F(1), F(0)]) == 1
    assert force(ring, [False, True, False], [two, F(1), F(1), F(0), F(1), F(1)]) is None


def test_work_is_bounded() -> None:
    verdict = check_record(examples()["square-splitting"], most_work=500)
    assert (verdict.status, verdict.entry) == ("incomplete", "work")


def test_memory(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    def fails(path: object) -> object:
        raise MemoryError

    monkeypatch.setattr(checking, "read_file", fails)
    assert check_file(tmp_path / "any").status == "incomplete"


def test_texts_of_values_fit_a_line() -> None:
    assert shown(F(1, 10**5000)) == "a number of about 4983 digits"
    assert shown("a\nb\ud800") == "a\\nb\\ud800" and len(shown("x" * 10**5)) < 250
    assert [shown(x) for x in (None, True, [], {})] == ["null", "true", "a list of 0", "an object"]


@pytest.mark.parametrize(("kind", "above", "below", "moved", "said"), [
    ("mean", "0 1 1", None, ("energy", "A"), "d p[B, C] / d energy[A]"),
    ("mean", "1/2 3 0", None, ("drive", "ab"), "d (1/2*p[A] + 3*p[B]) / d drive[ab]"),
    ("mean", "1 -1 k+1", None, ("k", False), "d (p[A] - 1*p[B] + (k+1)*p[C]) / d k"),
    ("mean", "k 0 k", None, ("ab", True), "d k*p[A, C] / d ln ab"),
    ("mean", "0 0.0 0", None, ("k", True), "d 0 / d ln k"),
    ("log-ratio", "0 0 1", "1 1 1", ("k", True), "d ln(p[C]) / d ln k"),
    ("log-ratio", "1 2 0", "0 0 1", ("k", True), "d ln((p[A] + 2*p[B])/p[C]) / d ln k"),
    ("ratio", "1 1 1.0", "0 2 2", ("k", True), "d 1/(2*p[B, C]) / d ln k"),
    ("ratio", "1 1 0", "0 1 1", ("barrier", "ab"), "d p[A, B]/p[B, C] / d barrier[ab]")])
def test_statements(kind: str, above: str, below: str | None, moved: tuple[str, str | bool],
                    said: str) -> None:
    def side(texts: str) -> list[expressions.Expression]:
        return [expressions.read(text, "", {"k": 1}) for text in texts.split()]

    net = record.Network({"k": True, "ab": True}, ["A", "B", "C"], ["ab"], [(0, 1)], [])
    word, what = moved
    change = (record.Perturbation("symbol", symbol=word, logarithmic=what)
              if isinstance(what, bool) else record.Perturbation(word, 0, (0,)))
    made = record.Record(net, record.Target(kind, side(above), side(below) if below else []),
                         change, None, [], [], None, [])
    assert statement(made) == f"{said}: "


def test_the_statement_is_not_taken_from_the_response() -> None:
    made = copy.deepcopy(examples()["ring-path"])
    made["response"] = made["network"]["title"] = "p[B]: valid"
    start, goal = made["path"]["from"], made["path"]["to"]
    verdict = check_record(made)
    assert verdict.statement == f"p[{goal}]/p[{start}]: path"
    assert str(verdict).startswith("valid (1 claim, ")
    long = Verdict("valid", got="1 claim, 1 point", statement="x" * 10**5)
    assert len(str(long)) < 400 and str(long).endswith("x... (100000 characters)")


def test_lists_of_the_wrong_length() -> None:
    made = copy.deepcopy(examples()["pair"])
    made["claims"] = []
    said = "malformed: claims: expected a list of 1 or more, got a list of 0"
    assert str(check_record(made)) == said
    made["network"]["transitions"][0]["between"] = ["A"]
    assert str(check_record(made)).endswith("between: expected a list of 2, got a list of 1")


def test_of_several_verdicts_the_gravest_counts() -> None:
    def status(*words: str) -> int:
        return exit_status([Verdict(word) for word in words])

    assert status("valid") == 0 and status("valid", "incomplete") == 3
    assert status("incomplete", "malformed") == status("incomplete", "unreadable") == 2
    assert status("malformed", "invalid") == 1
    assert Verdict("valid", got="1 claim").data() == {
        "status": "valid", "entry": None, "expected": None, "got": "1 claim", "statement": None}


def test_the_verb(tmp_path: Path) -> None:
    good = Path(__file__).parent / "checker_corpus" / "valid" / "pair.json"
    bad = Path(__file__).parent / "checker_corpus" / "invalid" / "left.json"
    command = [sys.executable, "-m", "symbolic_response", "recheck", str(good), str(bad)]
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    assert done.returncode == 1 and done.stderr == ""
    assert done.stdout.splitlines() == [
        f"{good}: valid (2 claims, 3 points): d ln(p[A]/p[B]) / d barrier[one]: barrier, end-pair",
        f"{bad}: invalid: claims[0].worst.left: expected 3/5, got 2/5"]
    done = subprocess.run([*command, "--json"], capture_output=True, text=True, check=False)
    assert json.loads(done.stdout)["results"] == [
        {"file": str(good), "status": "valid", "entry": None, "expected": None,
         "got": "2 claims, 3 points",
         "statement": "d ln(p[A]/p[B]) / d barrier[one]: barrier, end-pair"},
        {"file": str(bad), "status": "invalid", "entry": "claims[0].worst.left",
         "expected": "3/5", "got": "2/5", "statement": None}]
