"""Compact forms: exact on every small graph, for random polynomials, and deterministic."""

from __future__ import annotations

import os
import subprocess
import sys
from fractions import Fraction

import networkx as nx
import pytest
from compact_oracle import connected_graphs, multiplied_out, sparse, tree_sum
from hypothesis import given, settings
from hypothesis import strategies as st

from symbolic_response.algebra.compact.build import InternalError, require_equal
from symbolic_response.algebra.compact.expansion import generator_leaves
from symbolic_response.algebra.compact.factor import MAX_TERMS, factored, prepared
from symbolic_response.algebra.compact.kernels import Search
from symbolic_response.algebra.compact.measure import characters, default_width, literals
from symbolic_response.algebra.compact.nested import size_of
from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.latex import expression_latex
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.ring import (
    Domain,
    Generator,
    Poly,
    Polynomial,
    Ring,
    expression_of,
)
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import Number, Symbol, add, negate
from symbolic_response.network import Network
from symbolic_response.response.analysis import Analysis
from tests.benchmarks.networks import complete, ladder, network_of, square_with_chord

GRAPHS = list(connected_graphs(5))
NAMES = "abcde"


def three(_: str) -> int:
    return 3


RING = Ring([Generator("symbol", i, n, Symbol(n), True) for i, n in enumerate(NAMES)], [1] * 5)


def test_atlas_is_complete() -> None:
    counts = [sum(len(graph) == n for graph in GRAPHS) for n in range(2, 6)]
    assert counts == [1, 2, 6, 21]  # OEIS A001349


@pytest.mark.parametrize("graph", GRAPHS, ids=lambda g: g.name)
def test_every_tree_sum_of_every_small_graph(graph: nx.Graph) -> None:
    network = network_of(graph, "small")
    analysis = Analysis(network)
    for root in range(len(graph)):
        form = factored(analysis.tree_sum(root), analysis.rates.ring)
        assert multiplied_out(form) == tree_sum(analysis.graph, network, root)


terms = st.dictionaries(
    st.tuples(*[st.integers(0, 3)] * 5), st.integers(-6, 6).filter(bool), min_size=1, max_size=14
)


@given(terms)
@settings(max_examples=120, deadline=None)
def test_random_polynomials(table: dict[tuple[int, ...], int]) -> None:
    poly = RING.context.from_dict(table)
    form = factored(poly, RING, len)
    assert multiplied_out(form) == sparse(poly, RING)
    assert characters(form, three) <= characters(expression_of(RING, poly), three)


sums = st.lists(
    st.dictionaries(st.tuples(*[st.integers(0, 1)] * 5), st.integers(-3, 3).filter(bool),
                    min_size=2, max_size=3),
    min_size=2, max_size=3,
)


@given(sums)
@settings(max_examples=60, deadline=None)
def test_products_of_sums_stay_short(tables: list[dict[tuple[int, ...], int]]) -> None:
    poly, size = RING.constant(1), 0
    for table in tables:
        piece = RING.context.from_dict(table)
        poly = poly * piece
        size += characters(expression_of(RING, piece), three) + 2
    form = factored(poly, RING, len)
    assert multiplied_out(form) == sparse(poly, RING)
    assert characters(form, three) <= size


def test_edges_of_the_range() -> None:
    assert factored(RING.constant(0), RING) == Number(Fraction(0))
    assert factored(RING.constant(-7), RING) == Number(Fraction(-7))
    empty = Ring((), ())
    assert factored(empty.constant(3), empty) == Number(Fraction(3))
    a, b, *_ = RING.context.gens()
    assert factored(a, RING) == Symbol("a")
    assert characters(factored((a + b) ** 3, RING), len) == len("(a+b)^3")
    assert characters(factored(-a - b, RING), len) == len("-a-b")
    assert factored(b - a, RING) == add([Symbol("b"), negate(Symbol("a"))])


def test_sums_that_are_too_long_are_refused() -> None:
    a, b, c, d, _ = RING.context.gens()
    with pytest.raises(SizeLimitError, match=f"up to {MAX_TERMS}"):
        factored((a + b + c + d + 1) ** 20, RING)
    with pytest.raises(SizeLimitError, match="a power of 2000"):
        factored(a**2000 + b, RING)


def test_long_sums_do_not_nest_the_search_too_deep() -> None:
    places = range(120)
    ring = Ring([Generator("symbol", i, f"x{i}", Symbol(f"x{i}"), True) for i in places], [1] * 120)
    gens = ring.context.gens()
    poly = ring.constant(0)
    for i in places:
        for j in (7, 11, 13, 29, 31):
            poly = poly + gens[i] * gens[(i * i + j) % 120] * gens[(3 * i + j * j) % 120]
    assert multiplied_out(factored(poly, ring)) == sparse(poly, ring)


@pytest.mark.parametrize("text", [
    "k*exp(F/2) + k*exp(-F/2) + c*exp(F/2)",
    "sqrt(c)*k + sqrt(c)*exp(E)*k**2 + c*k",
    "exp(F/2 + E)*k + exp(F/2)*c + 2*exp(F)*c*k",
    "k*ln(c) - 3*k**2*ln(c)**2 + c*sqrt(k + c)",
])
def test_functions_and_roots(text: str) -> None:
    domain = Domain(("k", "c", "E", "F"), frozenset("kc"))
    value = normal_form(read_expression(text), domain)
    for poly in (value.numerator, value.denominator):
        form = factored(poly, value.ring, len)
        difference = add([form, negate(Polynomial(value.ring, poly))])
        assert normal_form(difference, domain).is_zero()


def test_whole_powers_of_roots_stay_leaves() -> None:
    """A root to a whole power would print as the sum under it; it must not dissolve in the sum."""
    k, c = Symbol("k"), Symbol("c")
    root = Generator("root", 0, "k+c", add([k, c]), True)
    ring = Ring([Generator("symbol", 0, "k", k, True), root], [1, 2])
    gen, sqrt = ring.context.gens()
    form = factored(sqrt**2 * gen + sqrt**3 + gen, ring, len)
    expected = read_expression("(k + c)*k + (k + c)*sqrt(k + c) + k")
    difference = add([read_expression(expression_text(form)), negate(expected)])
    assert normal_form(difference, Domain(("k", "c"), frozenset("kc"))).is_zero()
    assert characters(form, len) < 20


def test_a_wrong_form_is_never_returned() -> None:
    a, b, *_ = RING.context.gens()
    with pytest.raises(InternalError):
        require_equal(Symbol("a"), a + b, generator_leaves(RING), RING, "a sum")


# -- how long ----------------------------------------------------------------------------------


def sums_of(network: Network) -> list[tuple[Poly, Ring]]:
    analysis = Analysis(network)
    polys = [analysis.tree_sum(k) for k in range(analysis.graph.size)]
    polys += [analysis.current_numerator(e) for e in range(len(network.transitions))]
    polys += [analysis.forest_difference(0, e) for e in range(len(network.transitions))]
    return [(poly, analysis.rates.ring) for poly in polys]


@pytest.mark.parametrize("network", [square_with_chord(), complete(4), ladder(3)],
                         ids=lambda n: n.title)
def test_characters_are_those_printed(network: Network) -> None:
    """The length counted in the search, the one of the tree and that of the LaTeX agree."""
    for poly, ring in sums_of(network):
        names = {g.key: f"W_{{{place % 10}{place // 10}}}"
                 for place, g in enumerate(ring.generators)}
        form = factored(poly, ring)
        printed = expression_latex(form, names).replace(r"\cdot", "").replace(" ", "")
        assert characters(form) == len(printed)
        assert literals(form) == printed.count("W")
        packing, sizes = prepared([poly], ring, default_width)
        if poly.factor()[1][1:]:
            continue
        assert size_of(Search(packing, sizes).terms(packing.pack(poly))) == len(printed)


SCRIPT = """
from tests.benchmarks.networks import complete
from tests.benchmarks.compact_table import sums_of
from symbolic_response.algebra.compact.network import compact_network
print(compact_network(sums_of(complete(4))).definitions)
"""


def test_the_same_text_in_every_process() -> None:
    texts = set()
    for seed in ("1", "2"):
        done = subprocess.run([sys.executable, "-c", SCRIPT], capture_output=True, text=True,
                              check=True, env={**os.environ, "PYTHONHASHSEED": seed})
        texts.add(done.stdout)
    assert len(texts) == 1
