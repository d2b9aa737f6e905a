"""Networks from Python, substitution, and round trips through NetworkX and SymPy."""

from __future__ import annotations

import subprocess
import sys
from dataclasses import replace
from fractions import Fraction

import networkx
import pytest
import sympy
from hypothesis import given, settings
from hypothesis import strategies as st

from symbolic_response.errors import AssignmentError, ExpressionError, NetworkError
from symbolic_response.expressions.names import default_latex, nearest, same_latex
from symbolic_response.expressions.reader import read_expression as read
from symbolic_response.expressions.sympy_exchange import expression_from_sympy, expression_to_sympy
from symbolic_response.expressions.tree import Symbol
from symbolic_response.network import (
    Barrier,
    Network,
    Rates,
    build_network,
    from_generator_matrix,
    from_networkx,
    generator_matrix,
    read_network_text,
    to_networkx,
    with_substitution,
)

TEXT = r"""
title = "Motor"
about = "all of it"
[symbols.c]
about = "fuel"
latex = 'c_{0}'
range = ["1/100", 100]
[symbols.k]
[symbols.E]
sign = "real"
[symbols.B]
sign = "real"
[symbols.F]
sign = "real"
[symbols.spare]
[states.A]
energy = "E"
latex = 'A_{0}'
[states.B]
energy = "E/2 - 1"
[states.C]
[[transitions]]
name = "bind"
between = ["B", "A"]
rates = ["k*c/(1 + c)**2", "sqrt(k)"]
[[transitions]]
between = ["A", "B"]
barrier = "B"
drive = "F - ln(c)"
[[transitions]]
name = "jump"
between = ["B", "A"]
barrier = 0
[[transitions]]
between = ["A", "C"]
rates = [1]
[[transitions]]
name = "back"
between = ["C", "A"]
rates = ["3*k"]
[observables.size]
B = "c"
C = -1
[[hand]]
plain = "spare*c"
[appendix]
author = "k"
"""


def motor() -> Network:
    return read_network_text(TEXT)


def test_python_equals_file() -> None:
    assert motor() == build_network(
        "Motor",
        about="all of it",
        states={"A": {"energy": "E", "latex": "A_{0}"}, "B": "E/2 - 1", "C": None},
        transitions=[
            Rates("B", "A", "k*c/(1 + c)**2", sympy.sqrt(sympy.Symbol("k")), name="bind"),
            Barrier("A", "B", Symbol("B"), "F - ln(c)"),
            Barrier("B", "A", 0, name="jump"),
            ("A", "C", Fraction(2, 2)),
            ("C", "A", "3*k", None, "back"),
        ],
        symbols={
            "c": {"about": "fuel", "latex": "c_{0}", "range": [Fraction(1, 100), 100]},
            "k": "positive", "E": "real", "B": "real", "F": "real", "spare": {},
        },
        observables={"size": {"B": Symbol("c"), "C": -1}},
        sections={"hand": [{"plain": "spare*c"}], "appendix": {"author": "k"}},
    )
    assert build_network(
        "Motor", about="all of it", states={"A": "E", "B": "E/2 - 1", "C": None},
        transitions=[
            ("B", "A", "k*c/(1 + c)**2", "sqrt(k)", "bind"), Barrier("A", "B", "B", "F"),
            ("A", "C", 1), ("C", "A", 1, None, "back"),
        ],
        symbols=[replace(entry, latex=None) for entry in motor().symbols[:5]],
    ).symbols[0].low == Fraction(1, 100)


def test_symbols_left_out() -> None:
    network = build_network("pair", states={"A": "E", "B": "2*E"}, transitions=[
        Rates("A", "B", "k*exp(mu)", "q"), Barrier("A", "B", "G", "F + mu", name="other")])
    assert [entry.name for entry in network.symbols] == ["E", "k", "mu", "q", "G", "F"]
    assert network.positive_symbols == {"k", "q"}


@pytest.mark.parametrize(("changes", "message"), [
    ({"states": "A A B"}, "^state 'A' is given twice"),
    ({"states": [1, 2]}, "^state name 1: write"),
    ({"transitions": [("A", "B")]}, r"^the transition an array cannot be read; write \(first"),
    ({"transitions": ["AB"]}, "^the transition 'AB' cannot be read"),
    ({"transitions": [("A", "B", 0.5, 1)]}, "forward rate is a binary floating-point number"),
    ({"transitions": [("A", "B", True, 1)]}, "forward rate is true; write an exact number"),
    ({"transitions": [("A", "B", object(), 1)]}, "forward rate is a Python object; write"),
    ({"transitions": [("A", "B", sympy.Float(0.5), 1)]}, "a SymPy Float cannot be used; write an"),
    ({"transitions": [("A", "B", "c", "p")]}, "symbol 'p': this word is reserved"),
    ({"transitions": [("A", "B", Symbol("x y"), 1)]}, "symbol name 'x y': write"),
    ({"transitions": []}, "takes part in no transition"),
    ({"symbols": {"c": "positve"}}, "symbol 'c': sign is 'positve'"),
    ({"symbols": {"k": "positive"}}, "'c' is not declared; add"),
    ({"symbols": {"c": {"latex": 3}}}, "latex is not a line of text"),
    ({"observables": {"n": {"X": 1}}}, "observable 'n' has no state 'X'; known: A, B"),
    ({"sections": {"hends": []}}, "no key 'hends'; did you mean 'hand'"),
])
def test_faulty_in_python(changes: dict[str, object], message: str) -> None:
    given_: dict[str, object] = {"states": "A B", "transitions": [("A", "B", "c", 1)]}
    with pytest.raises(NetworkError, match=message):
        build_network("pair", **{**given_, **changes})  # type: ignore[arg-type]


def test_substitution() -> None:
    changed = with_substitution(motor(), {"c": read("2*k"), "F": read("0"), "E": read("B + F")})
    assert [entry.name for entry in changed.symbols] == ["k", "B", "F", "spare"]
    assert changed.transitions[0].forward == read("k*(2*k)/(1 + 2*k)**2")
    assert changed.transitions[1].drive == read("-ln(2*k)")
    assert changed.transitions[1].forward == read("exp(B + F - B + (-ln(2*k))/2)")
    assert changed.states[1].energy == read("(B + F)/2 - 1")
    assert changed.observables[0].values[1] == read("2*k")
    swapped = with_substitution(motor(), {"c": Symbol("k"), "k": Symbol("c")})
    assert swapped.transitions[0].forward == read("c*k/(1 + k)**2")
    assert with_substitution(motor(), {}) == motor()


@pytest.mark.parametrize(("name", "value", "error", "message"), [
    ("x", "1", AssignmentError, "the network has no symbol 'x'"),
    ("spar", "1", AssignmentError, "no symbol 'spar'; did you mean 'spare'"),
    ("c", "k*q", AssignmentError, "no symbol 'q'"),
    ("c", "-k", AssignmentError, "'c' is positive, the expression for it is negative"),
    ("c", "0", AssignmentError, "'c' is positive, the expression for it is zero"),
    ("c", "1/(k - k)", AssignmentError, "expression for 'c': division by"),
    ("E", "1/F", None, ""),
    ("F", "ln(c)", None, ""),
])
def test_substitution_checks(
    name: str, value: str, error: type[Exception] | None, message: str
) -> None:
    if error is None:
        with_substitution(motor(), {name: read(value)})
        return
    with pytest.raises(error, match=message):
        with_substitution(motor(), {name: read(value)})


def test_substitution_that_breaks_a_rate() -> None:
    network = build_network("pair", states="A B", transitions=[("A", "B", "a - b", "1/(a - 2*b)")])
    with pytest.raises(NetworkError, match=r"^after the substitution, .* forward rate is zero"):
        with_substitution(network, {"a": read("b")})
    with pytest.raises(NetworkError, match=r"^after the substitution, .*zero"):
        with_substitution(network, {"a": read("2*b")})


def test_networkx_round_trip() -> None:
    graph = to_networkx(motor())
    assert graph.nodes["A"] == {"energy": "E", "latex": "A_{0}"}
    assert graph.edges["B", "A", "bind"] == {
        "rate": "k*c/(c + 1)**2", "direction": "forward", "place": 0}
    assert graph.edges["A", "B", "bind"]["direction"] == "backward"
    assert graph.edges["A", "B", "A_B"]["drive"] == "F - ln(c)"
    assert ("C", "A", "A_C") not in graph.edges
    assert from_networkx(graph) == motor()
    assert from_networkx(networkx.node_link_graph(
        networkx.node_link_data(graph, edges="edges"), edges="edges")) == motor()


def test_plain_networkx_graphs() -> None:
    graph = networkx.DiGraph()
    graph.add_edge("A", "B", rate="k")
    graph.add_edge("B", "A", rate=2)
    graph.add_edge("A", "C", rate=sympy.Symbol("q") ** 2)
    graph.add_edge("C", "B", rate="k")
    network = from_networkx(graph, "plain")
    assert [entry.name for entry in network.transitions] == ["A_B", "A_C", "C_B"]
    assert network.transitions[0].backward == read("2")
    assert network.transitions[1].forward == read("q**2")
    assert network == from_networkx(networkx.MultiDiGraph(graph), "plain")
    graph.add_edge("C", "A")
    with pytest.raises(NetworkError, match="the edge from 'C' to 'A' has no rate"):
        from_networkx(graph)
    with pytest.raises(NetworkError, match="the graph is undirected"):
        from_networkx(graph.to_undirected())


def test_generator() -> None:
    matrix = generator_matrix(motor())
    c, k = sympy.symbols("c k", positive=True)
    energy, barrier, drive = sympy.symbols("E B F", real=True)
    assert all(sympy.expand(sum(matrix[:, column])) == 0 for column in range(3))
    assert matrix[2, 0] == 1 and matrix[1, 2] == 0 and matrix[0, 2] == 3 * k
    first = sympy.exp(energy - barrier + (drive - sympy.log(c)) / 2)
    assert sympy.simplify(matrix[1, 0] - first - sympy.sqrt(k) - sympy.exp(energy)) == 0


def test_generator_round_trip() -> None:
    network = build_network(
        "ring", states="A B C",
        transitions=[("A", "B", "k1*c", "k2"), ("C", "A", "exp(-F)", 2), ("B", "C", "1/3")],
        symbols={"k1": "positive", "c": "positive", "k2": "positive", "F": "real"},
    )
    matrix = generator_matrix(network)
    back = from_generator_matrix(matrix, ["A", "B", "C"], "ring")
    assert generator_matrix(back) == matrix
    assert [(entry.first, entry.second, entry.backward is None) for entry in back.transitions] == [
        (0, 1, False), (0, 2, False), (1, 2, True)]
    assert back.positive_symbols == network.positive_symbols
    assert from_generator_matrix(matrix).states[0].name == "S1"


@pytest.mark.parametrize(("entries", "names", "message"), [
    ([[-1, 2]], None, "1 rows and 2 columns"),
    ([[-1, 2], [1, -1]], None, "column 2 of the matrix does not sum to zero"),
    ([[-1, 2], [1, -2]], ["A"], "1 names for 2 states"),
    ([[-1, 2], [1, -2]], ["A", "A"], "'A' is given twice"),
    ([[-1, sympy.sin(1)], [1, -sympy.sin(1)]], None, "a SymPy sin cannot be used"),
    ([[-1, 0], [1, 0]], None, "state 'S1' cannot be reached|absorbing"),
    ([[-sympy.Symbol("k", real=True), sympy.Symbol("k", positive=True)],
      [sympy.Symbol("k", real=True), -sympy.Symbol("k", positive=True)]], None,
     "two symbols are called 'k'"),
])
def test_faulty_generators(entries: list[list[object]], names: object, message: str) -> None:
    with pytest.raises(NetworkError, match=message):
        from_generator_matrix(entries, names)  # type: ignore[arg-type]


_LEAVES = st.sampled_from(["a", "F", "2", "1/3", "-5"]).map(read)
_TREES = st.recursive(_LEAVES.map(lambda node: f"({_text(node)})"), lambda inner: st.one_of(
    st.tuples(inner, st.sampled_from("+-*"), inner).map(lambda parts: f"({''.join(parts)})"),
    inner.map(lambda part: f"exp({part})"),
    inner.map(lambda part: f"(1 + exp({part}))**(-2)"),
    inner.map(lambda part: f"sqrt(2 + exp({part}))"),
    inner.map(lambda part: f"ln(3 + exp({part}))"),
), max_leaves=6)


def _text(node: object) -> str:
    from symbolic_response.expressions.text import expression_text

    return expression_text(node)  # type: ignore[arg-type]


def test_a_symbolic_power_of_sympy_is_an_exponential() -> None:
    """SymPy writes exp(exp(2)*log(x)) as a power, so that form has to be taken."""
    x, n = sympy.Symbol("x", positive=True), sympy.Symbol("n", real=True)
    assert _text(expression_from_sympy(x**n)) == "exp(n*ln(x))"
    there = expression_to_sympy(read("exp(n*ln(x))"), frozenset("x"))
    assert there.subs({x: 3, n: 2}) == 9


@settings(max_examples=60, deadline=None)
@given(_TREES)
def test_expression_round_trips(text: str) -> None:
    node = read(text)
    assert _text(read(_text(node))) == _text(node)
    there = expression_to_sympy(node, frozenset("a"))
    back = expression_to_sympy(expression_from_sympy(there), frozenset("a"))
    assert back == there


@pytest.mark.parametrize(("expression", "message"), [
    (sympy.Float(1.5), "Float cannot be used; write an exact Rational"),
    (sympy.pi, "a SymPy Pi cannot be used"),
    (sympy.zoo, "cannot be used"),
    (sympy.nan, "cannot be used"),
    (sympy.oo, "cannot be used"),
    (sympy.I, "cannot be used"),
    (sympy.Symbol("x") ** sympy.Float(0.3), "exponent that is not exact"),
    (sympy.Symbol("x") ** 65, "exponent larger than 64"),
    (sympy.Symbol("k on"), "'k on' is not a name"),
    (sympy.Function("f")(sympy.Symbol("x")), "cannot be used"),
])
def test_sympy_expressions_refused(expression: object, message: str) -> None:
    with pytest.raises(ExpressionError, match=message):
        expression_from_sympy(expression)


def test_euler_number() -> None:
    assert expression_from_sympy(sympy.E**2 + sympy.E) in (read("exp(1) + exp(2)"),
                                                           read("exp(2) + exp(1)"))


@pytest.mark.parametrize(("name", "latex"), [
    ("c", "c"), ("k_on", "k_{on}"), ("k1", "k_1"), ("k12", "k_{12}"), ("mu_x", r"\mu_{x}"),
    ("Delta", r"\Delta"), ("k_mu", r"k_{\mu}"), ("mu1", r"\mu_1"), ("k_", "k"),
    ("rate2_a_b", r"\mathrm{rate}_{2,a,b}"), ("Alpha", r"\mathrm{Alpha}"),
])
def test_default_latex(name: str, latex: str) -> None:
    assert default_latex(name) == latex


def test_names() -> None:
    assert same_latex("k_{1}") == same_latex(default_latex("k1")) != same_latex("k_{12}")
    assert nearest("Bind", ["bond", "bind"]) == "; did you mean 'bind'?"
    assert nearest("x" * 101, ["x" * 101]) == ""
    with pytest.raises(NetworkError, match="'k1' and 'k_1' look the same in LaTeX"):
        build_network("pair", states="A B", transitions=[("A", "B", "k1", "k_1")])


def test_nothing_heavy_is_imported() -> None:
    code = (
        "import sys, symbolic_response.network as n\n"
        "heavy = {'sympy', 'networkx', 'numpy', 'flint'}\n"
        "sys.exit(str(heavy & set(sys.modules)) if heavy & set(sys.modules) else 0)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
