"""The main job against published numbers and formulas, each with its source."""

import re
from fractions import Fraction
from itertools import product

import networkx as nx
import pytest
import sympy

from symbolic_response.algebra.minors import tree_sums_by_minors
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.ring import Domain
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import Expression
from symbolic_response.network import Barrier, Network, Rates, build_network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.deriving import derive
from symbolic_response.response.values import Point


def value(network: Network, text: str, **at: int | str) -> Fraction:
    result = derive(network, text, at=at).value
    assert result is not None and result.exact is not None
    return result.exact


def test_three_states_with_numbers() -> None:
    """W_21 = 2, W_12 = 1, W_32 = 3, W_23 = 1, W_13 = 5, W_31 = 1 (worked by hand, design notes)."""
    ring = build_network("three states", states="s1 s2 s3", transitions=[
        Rates("s1", "s2", 2, 1, name="a"), Rates("s2", "s3", 3, 1, name="b"),
        Rates("s3", "s1", 5, 1, name="c")])
    assert [value(ring, f"p[s{k}]") for k in (1, 2, 3)] == [
        Fraction(21, 44), Fraction(13, 44), Fraction(10, 44)]
    assert {value(ring, f"current[{e}]") for e in "abc"} == {Fraction(29, 44)}


def conversion() -> Network:
    return build_network("reversible conversion", states="E ES EP", transitions=[
        Rates("E", "ES", "k1*S", "m1", name="bind"), Rates("ES", "EP", "k2", "m2", name="turn"),
        Rates("EP", "E", "k3", "m3*P", name="release")])


def test_three_step_reversible_conversion() -> None:
    """Rate law of the three-step reversible mechanism, as in textbooks of enzyme kinetics (Cleland
    1963; Segel, Enzyme Kinetics, 1975; here as recalled in the design notes, from memory)."""
    form = derive(conversion(), "current[turn]").expression
    symbols = {n: sympy.Symbol(n) for n in ("k1", "k2", "k3", "m1", "m2", "m3", "S", "P")}
    k1, k2, k3, m1, m2, m3, s, p = symbols.values()
    law = (k1 * k2 * k3 * s - m1 * m2 * m3 * p) / (
        m1 * m2 + m1 * k3 + k2 * k3 + k1 * s * (k2 + m2 + k3) + m3 * p * (m1 + k2 + m2))
    assert sympy.simplify(sympy.sympify(form, locals=symbols) - law) == 0


def test_haldane_relation() -> None:
    """The net current vanishes at P/S = k1 k2 k3/(m1 m2 m3) (Haldane 1930)."""
    at = {"P": "k1*k2*k3*S/(m1*m2*m3)"}
    assert derive(conversion(), "current[turn]", put=at).expression == "0"


def test_two_parallel_transitions_saturate_the_barrier_bound() -> None:
    """Rates 4, 1 and 1, 4 give 3/5 = tanh(ln 16 / 4): Owen, Gingrich & Horowitz, Phys. Rev. X 10,
    011066 (2020), the instance worked out in the design notes."""
    pair = build_network("pair", states="A B", transitions=[
        Rates("A", "B", 4, 1, name="one"), Rates("A", "B", 1, 4, name="two")])
    assert abs(value(pair, "d ln(p[A]/p[B]) / d barrier[one]")) == Fraction(3, 5)
    x = Fraction(3, 5)  # x = tanh(F/4) exactly where ((1 + x)/(1 - x))^2 = e^F
    assert ((1 + x) / (1 - x)) ** 2 == 16


def test_mean_time_to_a_state_from_two_tree_forests() -> None:
    """Chaiken 1982; here: mean first passage by forests against the linear system."""
    ring = build_network("ring", states="A B C", transitions=[
        Rates("A", "B", 2, 3, name="a"), Rates("B", "C", 5, 1, name="b"),
        Rates("C", "A", 1, 4, name="c")])
    analysis = Analysis(ring)
    difference = analysis.forest_difference(0, 1)  # Phi_{A,b} / N_A = T(A from B) - T(A from C)
    w = sympy.Matrix([[-(3 + 5), 5], [1, -(1 + 1)]])  # backward equations on B, C
    times = w.LUsolve(sympy.Matrix([-1, -1]))
    rates = [2, 3, 5, 1, 1, 4]
    ratio = Fraction(int(difference(*rates)), int(analysis.tree_sum(0)(*rates)))
    assert ratio == Fraction(str(times[0] - times[1]))


def atlas() -> list[nx.Graph]:
    """All connected graphs with 2 to 5 states (Read & Wilson, An Atlas of Graphs, 1998)."""
    return [g for g in nx.graph_atlas_g() if 2 <= len(g) <= 5 and nx.is_connected(g)]


def test_number_of_connected_graphs() -> None:
    """1, 2, 6, 21 connected graphs on 2..5 nodes (OEIS A001349)."""
    assert len(atlas()) == 1 + 2 + 6 + 21


def network_of(graph: nx.Graph) -> Network:
    return build_network("atlas", states=[f"s{k}" for k in graph], transitions=[
        Rates(f"s{i}", f"s{j}", f"u{i}{j}", f"v{i}{j}", name=f"e{i}{j}") for i, j in graph.edges()])


@pytest.mark.parametrize("place", range(30))
def test_closed_forms_for_all_small_graphs(place: int) -> None:
    """Trees against minors, and every p and one response of each kind against W p = 0."""
    graph = atlas()[place]
    network = network_of(graph)
    analysis = Analysis(network)
    assert tree_sums_by_minors(analysis.rates) == [
        analysis.tree_sum(k) for k in range(len(network.states))]
    (i, j), *_ = graph.edges()
    texts = [f"p[s{k}]" for k in graph]
    texts += [f"d p[s{i}] / d barrier[e{i}{j}]", f"d p[s{j}] / d drive[e{i}{j}]",
              f"d p[s{i}] / d energy[s{j}]", f"d p[s{j}] / d u{i}{j}", f"current[e{i}{j}]"]
    numbers = {s.name: read_expression(f"{2 + 3 * n % 7}/{1 + n % 4}")
               for n, s in enumerate(network.symbols)}
    point = Point(network, numbers)
    for text in texts:
        expected = point.value(read_quantity(text, network))
        form = derive(analysis, text).expression
        placed = read_expression(_put(form, numbers))
        found = normal_form(placed, Domain((), frozenset())).as_fraction()
        assert found == expected


def _put(text: str, numbers: dict[str, Expression]) -> str:
    """Write numbers into a printed expression: text alone, no substitution of the package."""

    def shown(match: re.Match[str]) -> str:
        found = numbers.get(match.group())
        return match.group() if found is None else f"({expression_text(found)})"

    return re.sub(r"[A-Za-z]\w*", shown, text)


SMALL = [
    [Rates("A", "B", 4, 1, name="one"), Rates("A", "B", 1, 4, name="two")],
    [Rates("A", "B", 2, 1, name="one"), Rates("B", "C", 3, 1, name="two"),
     Rates("C", "A", 5, name="three")],
    [Rates("A", "B", 2, 1, name="one"), Rates("B", "C", 3, 1, name="two"),
     Rates("C", "A", 5, 2, name="three"), Rates("A", "C", 1, 7, name="four")],
]


@pytest.mark.parametrize("transitions", SMALL)
def test_sum_rules(transitions: list[Rates]) -> None:
    """Uniform rescaling of time: the barrier responses of p add up to 0, of J to -J; and
    2 J dp/dF = -tau dp/dB (items 9 of the design notes; common practice, no source)."""
    states = sorted({t.first for t in transitions} | {t.second for t in transitions})
    network = build_network("sums", states=states, transitions=transitions)
    names = [t.name for t in transitions]
    for state in states:
        assert sum(value(network, f"d p[{state}] / d barrier[{e}]") for e in names) == 0
        for e in names:
            j, tau = value(network, f"current[{e}]"), value(network, f"traffic[{e}]")
            by_drive = value(network, f"d p[{state}] / d drive[{e}]")
            by_barrier = value(network, f"d p[{state}] / d barrier[{e}]")
            assert 2 * j * by_drive == -tau * by_barrier
    for e, f in product(names, names):
        total = sum(value(network, f"d current[{e}] / d barrier[{g}]") for g in names)
        assert total == -value(network, f"current[{e}]")
        # currents respond to an energy in proportion (item 10), hence ratios of currents do not
        slope = value(network, f"d (current[{e}]/current[{f}]) / d energy[A]")
        assert slope == 0


def test_detailed_balance_has_no_barrier_response() -> None:
    """At detailed balance pi depends on energies alone (Boltzmann; common practice, no source)."""
    states = {"A": "E_A", "B": "E_B", "C": "E_C"}
    network = build_network("balance", states=states, transitions=[
        Barrier("A", "B", "B_1", name="one"), Barrier("B", "C", "B_2", name="two"),
        Barrier("C", "A", "B_3", name="three"), Barrier("A", "B", "B_4", name="four")])
    for e in ("one", "two", "three", "four"):
        assert derive(network, f"d p[A] / d barrier[{e}]").expression == "0"
        assert derive(network, f"current[{e}]").expression == "0"
    assert derive(network, "entropy_production").expression == "0"
    assert derive(network, "ln(p[A]/p[B])").expression == "-E_A + E_B"


def test_a_bridge_has_no_barrier_response() -> None:
    """A bridge carries no current (Owen, Gingrich & Horowitz 2020: F_max = 0)."""
    network = build_network("bridge", states="A B C", transitions=[
        Rates("A", "B", "a", "b", name="bridge"), Rates("B", "C", "c", "d1", name="one"),
        Rates("C", "B", "e", "f", name="two")])
    assert derive(network, "d p[C] / d barrier[bridge]").expression == "0"
    assert derive(network, "d p[C] / d barrier[one]").expression != "0"
