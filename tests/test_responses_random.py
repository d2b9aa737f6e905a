"""Closed forms against the linear system, on random networks.

The closed forms come from spanning trees and forests. They are compared with ``Point``, which
differentiates W p = 0 in exact fractions and knows no trees, and, so that nothing is shared, with
SymPy: its null space of the generator, its derivatives, its substitution.
"""

from fractions import Fraction

import pytest
import sympy
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from symbolic_response.algebra.specialise import specialise
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.ring import Domain
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import Expression, substitute
from symbolic_response.network.build import Rates, build_network
from symbolic_response.network.model import Network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_form import closed_form
from symbolic_response.response.values import Point

NONE = Domain((), frozenset())
RATES = ("k*c", "c", "u", "k*u", "2*k", "u*c**2", "k/(1+c)", "k + u*c", "u/3", "k*exp(F)",
         "u*exp(-F/2)", "c*exp(F/2 + 2*F)")
VALUES = {"k": "3/2", "c": "5/7", "u": "2", "F": "2*ln(3/2)"}
ALWAYS = {"keep": "k*c*u*exp(F)"}  # an observable that uses every symbol


@st.composite
def networks(draw: st.DrawFn) -> Network:
    """A strongly connected multigraph with 2 to 4 states, some steps one-way."""
    size = draw(st.integers(2, 4))
    states = "ABCD"[:size]
    links = [(k, (k + 1) % size) for k in range(size)]
    pairs = st.tuples(st.integers(0, size - 1), st.integers(0, size - 1))
    links += [(i, j) for i, j in draw(st.lists(pairs, max_size=3)) if i != j]
    rate = st.sampled_from(RATES)
    transitions = []
    for place, (i, j) in enumerate(links):
        one_way = place < size and size > 2 and draw(st.integers(0, 3)) == 0
        back = None if one_way else draw(rate)
        transitions.append(Rates(states[i], states[j], draw(rate), back, name=f"t{place}"))
    return build_network(
        "random", states=" ".join(states), transitions=transitions,
        symbols={"k": "positive", "c": "positive", "u": "positive", "F": "real"},
        observables={"q": {"A": 1, "B": "1/2"}, "moving": {"A": "c**2*k*u*exp(F)", "B": "-1"}},
    )


ATOMS = ("p[A]", "p[A, B]", "mean[q]", "mean[moving]", "current[t0]", "traffic[t1]",
         "forward[t0]", "p[A]/p[B]", "ln(p[A]/p[B])", "current[t1]/p[A]", "c*p[B]**2",
         "1/(1 + current[t0]**2)", "backward[t1]")
PERTURBATIONS = ("energy[A]", "energy[B]", "barrier[t0]", "barrier[t1]", "drive[t0]", "c", "ln c",
                 "u", "F", "k")


@st.composite
def responses(draw: st.DrawFn) -> str:
    quantity = draw(st.sampled_from(ATOMS))
    for _ in range(draw(st.integers(0, 2))):
        quantity = f"(d {quantity} / d {draw(st.sampled_from(PERTURBATIONS))})"
    return quantity[1:-1] if quantity.startswith("(d") else quantity


def values() -> dict[str, Expression]:
    return {name: read_expression(text) for name, text in VALUES.items()}


@settings(max_examples=120, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(networks(), responses())
def test_closed_forms_against_the_linear_system(network: Network, text: str) -> None:
    quantity = read_quantity(text, network)
    form = closed_form(quantity, Analysis(network))
    exact = Point(network, values()).value(quantity)
    placed = specialise(form.form, values(), NONE)
    found = normal_form(placed.expression(), NONE)
    if exact is None:
        assert text.startswith("ln") and found.as_fraction() is None
    else:
        assert found.as_fraction() == exact
    # what is printed reads back as the same value
    printed = substitute(read_expression(form.text()), values())
    again = normal_form(printed, NONE)
    assert again.as_fraction() == found.as_fraction()
    assert expression_text(again.expression()) == expression_text(found.expression())


def sympy_rate(text: str, symbols: dict[str, sympy.Symbol]) -> sympy.Expr:
    return sympy.sympify(text, locals=symbols)


def sympy_answer(network: Network, weights: list[sympy.Expr], name: str) -> Fraction:
    """Return the derivative of sum weights p by a symbol at VALUES, from SymPy alone."""
    symbols = {s: sympy.Symbol(s, positive=s != "F") for s in VALUES}
    size = len(network.states)
    matrix = sympy.zeros(size, size)
    for t in network.transitions:
        for rate, i, j in ((t.forward, t.first, t.second), (t.backward, t.second, t.first)):
            if rate is not None:
                value = sympy_rate(expression_text(rate), symbols)
                matrix[j, i] += value
                matrix[i, i] -= value
    system = matrix.copy()
    system[size - 1, :] = sympy.ones(1, size)
    at = {symbols[s]: sympy_rate(v.replace("ln", "log"), symbols) for s, v in VALUES.items()}
    right = sympy.zeros(size, 1)
    right[size - 1] = 1
    numeric = system.subs(at).applyfunc(sympy.simplify)
    p = numeric.LUsolve(right)
    slope = system.diff(symbols[name]).subs(at).applyfunc(sympy.simplify)
    dp = numeric.LUsolve(-slope * p)
    result = sympy.simplify(sum(w * x for w, x in zip(weights, dp, strict=True)))
    assert result.is_Rational
    return Fraction(int(result.p), int(result.q))


@settings(max_examples=15, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(networks(), st.sampled_from(["c", "u", "k", "F"]))
def test_responses_against_sympy(network: Network, name: str) -> None:
    weights = [sympy.Integer(1), sympy.Rational(1, 2), *([sympy.Integer(0)] * 2)]
    expected = sympy_answer(network, weights[: len(network.states)], name)
    quantity = read_quantity(f"d mean[q] / d {name}", network)
    assert Point(network, values()).value(quantity) == expected
    placed = specialise(closed_form(quantity, Analysis(network)).form, values(), NONE)
    assert normal_form(placed.expression(), NONE).as_fraction() == expected


def test_entropy_production_feels_a_drive() -> None:
    """One cycle of force F_c: sigma = J F_c, so d sigma/d drive = F_c dJ/d drive + J (item 4)."""
    ring = build_network("ring", states="A B C", transitions=[
        Rates("A", "B", "k", "c", name="a"), Rates("B", "C", "u", "k", name="b"),
        Rates("C", "A", "c", "u", name="e")])
    drive, force = "drive[b]", "ln(forward[a]*forward[b]*forward[e]/" \
        "(backward[a]*backward[b]*backward[e]))"
    for quantity, other in ((f"d entropy_production / d {drive}",
                             f"(d current[a] / d {drive})*{force} + current[a]"),
                            ("d entropy_production / d barrier[b]",
                             f"(d current[a] / d barrier[b])*{force}")):
        given = {name: read_expression(text) for name, text in
                 {"k": "3", "c": "5/7", "u": "2"}.items()}
        analysis = Analysis(ring)
        found = [normal_form(specialise(closed_form(read_quantity(text, ring), analysis).form,
                                        given, NONE).expression(), NONE)
                 for text in (quantity, other)]
        assert expression_text(found[0].expression()) == expression_text(found[1].expression())


@pytest.mark.parametrize("order", [1, 2, 3])
def test_nested_responses_do_not_depend_on_the_order_of_elementary_ones(order: int) -> None:
    network = build_network("pair of channels", states="A B", transitions=[
        Rates("A", "B", 4, 1, name="one"), Rates("B", "A", 4, 1, name="two")])
    steps = ["barrier[one]", "energy[A]", "drive[two]"][:order]
    results = set()
    for turn in range(order):
        text = "p[A]"
        for step in steps[turn:] + steps[:turn]:
            text = f"(d {text} / d {step})"
        results.add(Point(network, {}).value(read_quantity(text, network)))
    assert len(results) == 1
