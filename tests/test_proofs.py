"""Proofs for all rates: their data against brute force, and what must never be proved.

Oracles: enumeration of trees state by state (tests/proof_networks.py), networkx for paths, SymPy
for derivatives, exact linear algebra for the identities. They follow from the
all-minors theorem (Chaiken, SIAM J. Algebraic Discrete Methods 3, 319 (1982)).
"""

from __future__ import annotations

from collections import Counter
from fractions import Fraction
from itertools import combinations, product

import networkx as nx
import pytest
import sympy
from hypothesis import given, settings
from hypothesis import strategies as st
from proof_networks import Rate, analysis_of, rooted_trees, strong_graphs, undirected_trees

from symbolic_response.certificates.proofs.changes import logarithmic_change, shows_real, shows_sign
from symbolic_response.certificates.proofs.coefficients import coefficients_proof
from symbolic_response.certificates.proofs.edge import edge_proof, require_identities
from symbolic_response.certificates.proofs.rows import paths_proof
from symbolic_response.certificates.proofs.splitting import splitting_proof
from symbolic_response.certificates.proofs.transport import (
    mixed_cycles,
    runs_both_ways,
    transport_proof,
)
from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.reader import read_expression
from symbolic_response.network.quantities import BySymbol
from symbolic_response.topology import Graph
from symbolic_response.topology.tree_weights import tree_weights

SQUARE = Graph(4, ((0, 1), (1, 2), (2, 3), (3, 0), (0, 2)), (False,) * 5)
TWINS = Graph(2, ((0, 1), (1, 0)), (False, False))


def paths_by_networkx(graph: Graph, start: int, goal: int, without: int | None) -> Counter[object]:
    drawn = nx.MultiGraph()
    drawn.add_nodes_from(range(graph.size))
    for e, (a, b) in enumerate(graph.ends):
        if e != without:
            drawn.add_edge(a, b, key=e)
    if start == goal:
        return Counter()
    found: Counter[object] = Counter()
    for path in nx.all_simple_edge_paths(drawn, start, goal):
        here, steps = start, []
        for a, b, e in path:
            steps.append(2 * e + (graph.ends[e][0] != here))
            here = b if here == a else a
        found[tuple(steps)] += 1
    return found


def number_of(rate: Rate) -> int:
    return 2 * rate[0] + rate[1]


@settings(max_examples=60, deadline=None)
@given(strong_graphs(), st.data())
def test_rows_hold_every_path_and_every_tree(graph: Graph, data: st.DataObject) -> None:
    e = data.draw(st.integers(0, len(graph.ends) - 1))
    first, second = graph.ends[e]
    proof = edge_proof(analysis_of(graph), e)
    assert Counter(row.steps for row in proof.rows) == paths_by_networkx(graph, second, first, e)
    trees = [tree for tree in undirected_trees(graph) if e not in tree]
    for row in proof.rows:
        inside = {step // 2 for step in row.steps}
        assert row.weight == sum(inside <= set(tree) for tree in trees)
    assert sum(row.weight for row in proof.rows) == len(trees)
    whole = paths_proof(graph, first, second)
    assert Counter(row.steps for row in whole.rows) == paths_by_networkx(graph, first, second, None)
    assert sum(row.weight for row in whole.rows) == len(undirected_trees(graph))


@settings(max_examples=60, deadline=None)
@given(strong_graphs(), st.data())
def test_the_end_pair_identities_by_enumeration(graph: Graph, data: st.DataObject) -> None:
    """phi a_k = a_m b_k + a_n f_k at random integers, from trees listed state by state."""
    e = data.draw(st.integers(0, len(graph.ends) - 1))
    require_identities(analysis_of(graph), e)  # the same by expansion
    values = data.draw(st.lists(st.integers(1, 10**6), min_size=2 * len(graph.ends),
                                max_size=2 * len(graph.ends)))
    parts = []
    for root in range(graph.size):
        sums = {None: 0, False: 0, True: 0}
        for tree in rooted_trees(graph, root, e):
            weight, used = 1, None
            for rate in tree:
                if rate[0] == e:
                    used = rate[1]
                else:
                    weight *= values[number_of(rate)]
            sums[used] += weight
        parts.append((sums[None], sums[False], sums[True]))
    first, second = graph.ends[e]
    phi = parts[second][1]
    assert phi > 0 and parts[first][2] == phi
    for free, ahead, back in parts:
        assert phi * free == parts[first][0] * back + parts[second][0] * ahead


def test_wrong_trees_are_noticed(monkeypatch: pytest.MonkeyPatch) -> None:
    from symbolic_response.certificates.proofs import edge

    real = edge.rooted

    def without_the_last(*arguments: object, **named: object) -> object:
        forward, backward = real(*arguments, **named)  # type: ignore[arg-type]
        return forward[:-1], backward[:-1]

    monkeypatch.setattr(edge, "rooted", without_the_last)
    with pytest.raises(ArithmeticError):
        require_identities(analysis_of(SQUARE), 0)


@settings(max_examples=60, deadline=None)
@given(strong_graphs(max_size=5), st.data())
def test_sides_are_the_splittings(graph: Graph, data: st.DataObject) -> None:
    e = data.draw(st.integers(0, len(graph.ends) - 1))
    first, second = graph.ends[e]
    forests: Counter[int] = Counter()
    for tree in undirected_trees(graph):
        if e in tree:  # without e it is a forest of two trees that separates the ends
            label = list(range(graph.size))
            for other in tree:
                if other != e:
                    one, two = (label[end] for end in graph.ends[other])
                    label = [two if entry == one else entry for entry in label]
            forests[sum(1 << k for k in range(graph.size) if label[k] == label[second])] += 1
    proof = splitting_proof(analysis_of(graph), e)
    assert {side.mask: side.weight for side in proof.sides} == dict(forests)
    assert all(not side.mask >> first & 1 for side in proof.sides)


@settings(max_examples=80, deadline=None)
@given(strong_graphs(), st.data())
def test_tree_weights_by_enumeration(graph: Graph, data: st.DataObject) -> None:
    rates = [(e, back) for e, single in enumerate(graph.one_way)
             for back in ((False,) if single else (False, True))]
    chosen = data.draw(st.dictionaries(st.sampled_from(rates), st.integers(-3, 5), max_size=6))
    sums = [sum(chosen.get(rate, 0) for rate in tree)
            for root in range(graph.size) for tree in rooted_trees(graph, root)]
    assert tree_weights(graph, chosen) == (min(sums), max(sums))


def test_coefficients_in_fractions_and_their_limit() -> None:
    analysis = analysis_of(TWINS)
    half = {(0, False): Fraction(1, 2), (0, True): Fraction(-1, 2)}
    proof = coefficients_proof(analysis, half)
    assert (proof.low, proof.high) == (Fraction(-1, 2), Fraction(1, 2))
    with pytest.raises(SizeLimitError):
        coefficients_proof(analysis, {(0, False): Fraction(1000), (0, True): Fraction(1, 7)})


def bundles(graph: Graph) -> list[tuple[int, ...]]:
    """Return the sets of transitions of which trees use r or r + 1, by enumeration."""
    trees = undirected_trees(graph)
    sets = [chosen for size in (1, 2, 3) for chosen in combinations(range(len(graph.ends)), size)]
    return [chosen for chosen in sets
            if spread([len(set(chosen) & set(tree)) for tree in trees]) == 1]


def spread(numbers: list[int]) -> int:
    return max(numbers) - min(numbers)


@settings(max_examples=40, deadline=None)
@given(strong_graphs(), st.data())
def test_transport_makes_one_sum_the_other(graph: Graph, data: st.DataObject) -> None:
    analysis = analysis_of(graph)
    known = [bundle for bundle in bundles(graph)
             if mixed_cycles(analysis, bundle)
             and all(runs_both_ways(analysis, cycle) for cycle in mixed_cycles(analysis, bundle))]
    if not known:
        return
    bundle = data.draw(st.sampled_from(known))
    proof = transport_proof(analysis, bundle)
    least = min(len(set(bundle) & set(tree)) for tree in undirected_trees(graph))
    parts = []
    for root in range(graph.size):
        split: tuple[list[list[Rate]], list[list[Rate]]] = ([], [])
        for tree in rooted_trees(graph, root):
            split[sum(e in bundle for e, _ in tree) - least].append(tree)
        parts.append(split)

    def products(one: list[list[Rate]], other: list[list[Rate]]) -> Counter[tuple[int, ...]]:
        return Counter(tuple(sorted(map(number_of, [*a, *b]))) for a, b in product(one, other))

    assert [pair[:2] for pair in proof.pairs] == list(combinations(range(graph.size), 2))
    for i, j, moves in proof.pairs:
        above = products(parts[i][1], parts[j][0])
        below = products(parts[i][0], parts[j][1])
        along: Counter[tuple[int, ...]] = Counter()
        against: Counter[tuple[int, ...]] = Counter()
        for move in moves:
            cycle = proof.cycles[move.cycle]
            assert len({rate // 2 in bundle for rate in cycle}) == 2
            along[tuple(sorted([*cycle, *move.rest]))] += move.times
            against[tuple(sorted([*(rate ^ 1 for rate in cycle), *move.rest]))] += move.times
        assert along <= above and against <= below
        assert above - along == below - against


def test_too_many_products_are_refused() -> None:
    from symbolic_response.response.analysis import Analysis
    from tests.benchmarks.networks import cube

    with pytest.raises(SizeLimitError, match="products of trees"):
        transport_proof(Analysis(cube()), (0,))


CHANGES = [
    ("c", True, 1), ("k*c**2/m", True, 2), ("k*c + m*c", True, 1), ("k + m", True, 0),
    ("exp(k)*c", True, 1), ("sqrt(c)", True, Fraction(1, 2)), ("c*(k + c)", True, None),
    ("exp(c)", True, None), ("k + c", True, None), ("exp(2*F - k)", False, 2),
    ("k*exp(-F/2)", False, Fraction(-1, 2)), ("F", False, None), ("exp(k*F)", False, None),
    ("exp(F + k)*exp(F)", False, 2), ("exp(2*ln(c) - k)", True, 2), ("exp(ln(k*c**3))", True, 3),
    ("k*exp(-ln(c + k*c)/2)", True, Fraction(-1, 2)), ("exp(ln(c + k))", True, None),
    ("exp(F**2)", False, None),
]


@pytest.mark.parametrize(("text", "logarithmic", "expected"), CHANGES)
def test_changes_read_off_the_form(text: str, logarithmic: bool, expected: object) -> None:
    """Against SymPy's derivative of the logarithm."""
    name = "c" if logarithmic else "F"
    found = logarithmic_change(read_expression(text), BySymbol(name, logarithmic))
    assert found == expected
    symbols = {each: sympy.Symbol(each, positive=True) for each in "ckmF"}
    by_sympy = sympy.diff(sympy.log(sympy.sympify(text, locals=symbols)), symbols[name])
    by_sympy = sympy.simplify(by_sympy * (symbols[name] if logarithmic else 1))
    assert by_sympy.is_number == (expected is not None)
    if found is not None:
        assert by_sympy == sympy.Rational(found.numerator, found.denominator)


@pytest.mark.parametrize(("text", "shown"), [
    ("F", True), ("2*ln(3/2) - k", True), ("ln(k - m)", False), ("sqrt(k - m)", False),
    ("sqrt(k + m)", True), ("(k - m)**3", True), ("(k - m)**(-1)", False), ("exp(F)/k", True),
    ("exp(ln(k - m))", False), ("ln(exp(F) + 1)", True), ("1/F", False),
])
def test_what_is_real_by_its_form(text: str, shown: bool) -> None:
    assert shows_real(read_expression(text), frozenset("km")) is shown


@pytest.mark.parametrize(("texts", "shown"), [
    (["1", "0"], True), (["0", "0"], False), (["k", "-1"], False), (["k*m + 2", "exp(F)"], True),
    (["F", "1"], False), (["k - m", "1"], False), (["0", "F**2"], False), (["1/k", "0"], True),
])
def test_signs_read_off_the_form(texts: list[str], shown: bool) -> None:
    assert shows_sign(map(read_expression, texts), frozenset("km")) is shown
