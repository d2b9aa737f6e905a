"""All sums of a network together, and state elimination: exact, and as short as promised."""

from __future__ import annotations

import random
from collections.abc import Mapping
from dataclasses import replace
from fractions import Fraction

import networkx as nx
import pytest
from compact_oracle import (
    Powers,
    Sparse,
    connected_graphs,
    multiplied_out,
    plus,
    rate,
    sparse,
    times,
    tree_sum,
    value_at,
)
from hypothesis import given, settings
from proof_networks import network_on, strong_graphs

from symbolic_response.algebra.compact.build import InternalError
from symbolic_response.algebra.compact.factor import factored
from symbolic_response.algebra.compact.measure import characters, literals
from symbolic_response.algebra.compact.network import NetworkSums, compact_network
from symbolic_response.algebra.compact.states import eliminated
from symbolic_response.algebra.compact.together import CompactSums, Target, compact_together
from symbolic_response.expressions.ring import expression_of
from symbolic_response.expressions.tree import Symbol, symbols_of
from symbolic_response.network import Network
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import Graph
from tests.benchmarks.compact_table import LISTED, sums_of, table
from tests.benchmarks.networks import complete, cube, ladder, network_of, square_with_chord


def in_order(sums: CompactSums, rates: set[str]) -> None:
    """Every symbol of a form is a rate or a name defined before; no name is defined twice."""
    known = set(rates)
    for d in sums.definitions:
        assert symbols_of(d.form) <= known
        assert d.key not in known
        known.add(d.key)


def expansions(sums: CompactSums) -> dict[str, Sparse]:
    known: dict[str, Sparse] = {}
    for d in sums.definitions:
        known[d.key] = multiplied_out(d.form, known)
    return known


def check_all_sums(graph: Graph, network: Network, known: Mapping[str, Sparse]) -> None:
    """Trees by brute force; D, C_e and Phi_{k,e} by the equations that determine them.

    W Phi = D (d_m - d_n) with Phi summing to 0 (mathematics: d p from W p = 0, multiplied by D).
    """
    trees = [tree_sum(graph, network, k) for k in range(graph.size)]
    total: Sparse = {}
    for k, tree in enumerate(trees):
        assert known[f"#tree[{k}]"] == tree
        total = plus(total, tree)
    assert known["#total[]"] == total
    for e, (m, n) in enumerate(graph.ends):
        flow: Sparse = {}
        for tail, scale in ((m, 1), (n, -1)):
            if name := rate(graph, network, tail, e):
                flow = plus(flow, times({((name, 1),): Fraction(1)}, trees[tail]), scale)
        assert known[f"#current[{e}]"] == flow
        phi = [known[f"#forest[{k}, {e}]"] for k in range(graph.size)]
        balance: list[Sparse] = [{} for _ in range(graph.size)]
        whole: Sparse = {}
        for f, ends in enumerate(graph.ends):
            for tail in ends:
                if name := rate(graph, network, tail, f):
                    moved = times({((name, 1),): Fraction(1)}, phi[tail])
                    head = sum(ends) - tail
                    balance[head] = plus(balance[head], moved)
                    balance[tail] = plus(balance[tail], moved, -1)
        for k in range(graph.size):
            whole = plus(whole, phi[k])
            assert balance[k] == plus({}, total, (k == m) - (k == n))
        assert whole == {}


def rate_names(sums: NetworkSums) -> set[str]:
    return {g.key for g in sums.ring.generators}


@pytest.mark.parametrize("graph", list(connected_graphs(4)), ids=lambda g: g.name)
@pytest.mark.parametrize("relations", [True, False])
def test_all_sums_of_every_small_graph(graph: nx.Graph, relations: bool) -> None:
    network = network_of(graph, "small")
    given_sums = sums_of(network)
    sums = compact_network(given_sums, relations=relations)
    in_order(sums, rate_names(given_sums))
    check_all_sums(given_sums.graph, network, expansions(sums))


@given(strong_graphs())
@settings(max_examples=12, deadline=None)
def test_parallel_and_one_way_transitions(graph: Graph) -> None:
    network = network_on(graph)
    given_sums = sums_of(network)
    sums = compact_network(given_sums)
    in_order(sums, rate_names(given_sums))
    check_all_sums(graph, network, expansions(sums))
    check_elimination(graph, network, eliminated(graph, given_sums.ring, given_sums.rates), 3)
    forests = [(k, e) for k in range(graph.size) for e in range(len(graph.ends))]
    shifted = eliminated(graph, given_sums.ring, given_sums.rates, forests=forests)
    in_order(shifted, rate_names(given_sums))
    assert sorted(d.place for d in shifted.definitions if d.kind == "forest") == forests
    check_elimination(graph, network, shifted, 2)


def check_elimination(graph: Graph, network: Network, sums: CompactSums, points: int) -> None:
    """Evaluate the definitions one by one and compare with trees or with W N = 0."""
    draw = random.Random(7)
    names = [name for e, ends in enumerate(graph.ends) for tail in ends
             if (name := rate(graph, network, tail, e))]
    for _ in range(points):
        point = {name: Fraction(draw.randrange(1, 50), draw.randrange(1, 9)) for name in names}
        values = dict(point)
        for d in sums.definitions:
            assert symbols_of(d.form) <= set(values)
            values[d.key] = value_at(d.form, values)
        found = [values[f"#tree[{k}]"] for k in range(graph.size)]
        for k in range(graph.size):
            inflow, outflow = Fraction(0), Fraction(0)
            for e, ends in enumerate(graph.ends):
                for tail in ends:
                    if k in ends and (name := rate(graph, network, tail, e)):
                        flow = point[name] * found[tail]
                        inflow, outflow = (inflow, outflow + flow) if tail == k else (
                            inflow + flow, outflow)
            assert inflow == outflow
        check_shifts(graph, network, values)
        tree = tree_sum(graph, network, 0)
        assert found[0] == sum(
            c * value_of_product(powers, point) for powers, c in tree.items())


def check_shifts(graph: Graph, network: Network, values: Mapping[str, Fraction]) -> None:
    """W Phi = D (d_m - d_n) and the Phi add up to 0, for the transitions that have them."""
    for e, (m, n) in enumerate(graph.ends):
        if f"#forest[0, {e}]" not in values:
            continue
        phi = [values[f"#forest[{k}, {e}]"] for k in range(graph.size)]
        assert sum(phi) == 0
        balance = [Fraction(0)] * graph.size
        for f, ends in enumerate(graph.ends):
            for tail in ends:
                if name := rate(graph, network, tail, f):
                    balance[sum(ends) - tail] += values[name] * phi[tail]
                    balance[tail] -= values[name] * phi[tail]
        whole = values["#total[]"]
        assert balance == [whole * ((k == m) - (k == n)) for k in range(graph.size)]


def value_of_product(powers: Powers, point: Mapping[str, Fraction]) -> Fraction:
    result = Fraction(1)
    for name, exponent in powers:
        result *= point[name] ** exponent
    return result


@pytest.mark.parametrize("graph", list(connected_graphs(5)), ids=lambda g: g.name)
def test_elimination_on_every_small_graph(graph: nx.Graph) -> None:
    network = network_of(graph, "small")
    given_sums = sums_of(network, forests=False)
    forests = [(k, e) for k in range(len(graph)) for e in range(graph.number_of_edges())]
    for wanted in ([], forests):
        sums = eliminated(given_sums.graph, given_sums.ring, given_sums.rates, forests=wanted)
        in_order(sums, rate_names(given_sums))
        check_elimination(given_sums.graph, network, sums, 2)


def test_forest_differences_of_one_way_rings_and_chains() -> None:
    """States with one way out pass their source on whole, and sources cancel."""
    ring = Graph(4, ((0, 1), (1, 2), (2, 3), (3, 0)), (True, True, False, True))
    chain = Graph(4, ((1, 0), (1, 2), (3, 2)), (False,) * 3)
    for graph in (ring, chain):
        network = network_on(graph)
        given_sums = sums_of(network)
        sums = eliminated(graph, given_sums.ring, given_sums.rates,
                          forests=list(given_sums.forests))
        in_order(sums, rate_names(given_sums))
        check_elimination(graph, network, sums, 2)


def test_single_forest_differences_by_elimination() -> None:
    """Only some pairs are asked for: the others are not defined, and the forms do not need them."""
    given_sums = sums_of(ladder(3), forests=False)
    whole = Analysis(ladder(3))
    numbers = [7 + 3 * place * place for place in range(len(given_sums.ring.generators))]
    for wanted in ([(1, 0)], [(0, 3), (2, 3), (2, 5)], [(4, e) for e in range(7)]):
        sums = eliminated(given_sums.graph, given_sums.ring, given_sums.rates, forests=wanted)
        assert sorted(d.place for d in sums.definitions if d.kind == "forest") == wanted
        values = {g.key: Fraction(v)
                  for g, v in zip(given_sums.ring.generators, numbers, strict=True)}
        for d in sums.definitions:
            values[d.key] = value_at(d.form, values)
        for k, e in wanted:  # two-tree forests, enumerated
            assert values[f"#forest[{k}, {e}]"] == int(whole.forest_difference(k, e)(*numbers))


def test_elimination_multiplied_out() -> None:
    given_sums = sums_of(complete(4), forests=False)
    sums = eliminated(given_sums.graph, given_sums.ring, given_sums.rates, trees=given_sums.trees)
    assert sums.proof == "expansion"
    wrong = [*given_sums.trees[1:], given_sums.trees[0]]
    with pytest.raises(InternalError):
        eliminated(given_sums.graph, given_sums.ring, given_sums.rates, trees=wrong)


@pytest.mark.parametrize("network", [cube(), network_of(nx.petersen_graph(), "Petersen")],
                         ids=lambda n: n.title)
def test_elimination_of_large_networks(network: Network) -> None:
    analysis = Analysis(network)
    rates = [(analysis.rates.generator(e), analysis.rates.generator(e, True))
             for e in range(len(network.transitions))]
    sums = eliminated(analysis.graph, analysis.rates.ring, rates)
    draw = random.Random(3)
    names = [g.key for g in analysis.rates.ring.generators]
    values = {name: Fraction(draw.randrange(1, 50)) for name in names}
    numbers = [int(values[name]) for name in names]
    for d in sums.definitions:
        values[d.key] = value_at(d.form, values)
    for k in range(analysis.graph.size):  # the trees, enumerated
        assert values[f"#tree[{k}]"] == int(analysis.tree_sum(k)(*numbers))


def test_one_state_and_states_without_return() -> None:
    ring = sums_of(complete(2), forests=False).ring
    lonely = eliminated(Graph(1, (), ()), ring, ())
    assert [d.key for d in lonely.definitions] == ["#tree[0]"]
    a, b = ring.context.gens()
    found = eliminated(Graph(3, ((0, 1), (1, 2), (0, 2)), (True, True, True)), ring,
                       ((a, None), (b, None), (a, None)), trees=[0 * a, 0 * a, 2 * a * b])
    assert found.proof == "expansion"
    with pytest.raises(ValueError, match="not connected"):
        eliminated(Graph(3, ((0, 1), (0, 2)), (True, True)), ring, ((a, None), (b, None)))


def test_rates_that_share_symbols_and_factors() -> None:
    """Rates k c, k and 2 k + c in a triangle: relations hold for any rates."""
    analysis = Analysis(complete(3))
    ring = analysis.rates.ring
    c, k, *_ = ring.context.gens()
    values = [k * c, k, 2 * k + c, c, c * c, k]
    swap = [poly.compose(*values, ctx=ring.context) for poly in ring.context.gens()]

    def image(poly: object) -> object:
        return poly.compose(*values, ctx=ring.context)  # type: ignore[attr-defined]

    plain = sums_of(complete(3))
    changed = NetworkSums(
        plain.graph, ring, [(swap[2 * e], swap[2 * e + 1]) for e in range(3)],
        [image(p) for p in plain.trees], image(plain.total),
        {e: image(p) for e, p in plain.currents.items()},
        {key: image(p) for key, p in plain.forests.items()},
    )
    known = expansions(compact_network(changed))
    for k_, poly in enumerate(changed.trees):
        assert known[f"#tree[{k_}]"] == sparse(poly, ring)
    for (state, e), poly in changed.forests.items():
        assert known[f"#forest[{state}, {e}]"] == sparse(poly, ring)
    check = eliminated(changed.graph, ring, changed.rates, trees=changed.trees)
    assert check.proof == "expansion"


def test_a_false_relation_is_noticed() -> None:
    given_sums = sums_of(complete(3), forests=False)
    targets = [Target("#tree[0]", given_sums.trees[0]),
               Target("#tree[1]", given_sums.trees[1], (Symbol("#tree[0]"),))]
    with pytest.raises(InternalError):
        compact_together(given_sums.ring, targets)


# -- lengths: /work/shared/design/typesetting.md, section Compact formulas ---------------------


@pytest.mark.parametrize(("network", "expected"), [
    (square_with_chord(), (151, 24)), (complete(4), (303, 48)), (ladder(3), (464, 75)),
    (cube(), (16511, 2688))], ids=["square", "K4", "ladder", "cube"])
def test_how_the_table_counts(network: Network, expected: tuple[int, int]) -> None:
    analysis = Analysis(network)
    written = expression_of(analysis.rates.ring, analysis.tree_sum(0))
    assert (characters(written), literals(written)) == expected


@pytest.mark.parametrize(("network", "limits"), [
    (square_with_chord(), (79, 11)), (complete(4), (144, 20)), (ladder(3), (170, 25)),
    (cube(), (1980, 282))], ids=["square", "K4", "ladder", "cube"])
def test_one_tree_sum_is_as_short_as_published(
    network: Network, limits: tuple[int, int]
) -> None:
    analysis = Analysis(network)
    form = factored(analysis.tree_sum(0), analysis.rates.ring)
    assert characters(form) <= limits[0]
    assert literals(form) <= limits[1]


def test_the_cube_by_elimination() -> None:
    given_sums = sums_of(cube(), forests=False)
    one = eliminated(given_sums.graph, given_sums.ring, given_sums.rates, root=0)
    assert one.characters() <= 1277
    assert [d.key for d in one.definitions if d.kind == "tree"] == ["#tree[0]"]
    whole = compact_network(replace(given_sums, total=None, currents={}))
    assert whole.proof == "elimination"
    assert sum(d.kind == "tree" for d in whole.definitions) == 8
    assert whole.characters() <= 1277  # all eight in less room than one took before
    forests = {(k, e): given_sums.trees[0] for k in range(8) for e in range(12)}  # the keys count
    everything = compact_network(replace(given_sums, forests=forests))
    assert sum(d.kind == "forest" for d in everything.definitions) == 96
    assert everything.characters() <= 6000


@pytest.mark.parametrize(("network", "limit"), [
    (square_with_chord(), 2192), (complete(4), 4188), (ladder(3), 10939)],
    ids=["square", "K4", "ladder"])
def test_the_whole_appendix(network: Network, limit: int) -> None:
    given_sums = sums_of(network)
    polys = [*given_sums.trees, *given_sums.currents.values(), *given_sums.forests.values()]
    apart = sum(characters(factored(poly, given_sums.ring)) for poly in polys)
    together = compact_network(given_sums)
    assert apart <= limit
    assert together.characters(left_sides=True) < apart


def test_the_benchmark_prints_the_table() -> None:
    text = table(LISTED[:1])
    assert "square with chord" in text
    assert "2192" in text
