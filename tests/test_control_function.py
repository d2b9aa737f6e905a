"""Exact functions of one symbol, against values from W p = 0, SymPy and published closed forms."""

from __future__ import annotations

import random
from fractions import Fraction
from itertools import product

import flint
import numpy as np
import pytest
import sympy

from symbolic_response.control.function import curve, function_of
from symbolic_response.control.line import solved
from symbolic_response.control.rational import RationalFunction, rational_function
from symbolic_response.errors import (
    AssignmentError,
    EvaluationError,
    QuantityError,
)
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import number
from symbolic_response.network import Barrier, Network, Rates, build_network
from symbolic_response.network.quantities import Change
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.values import Point
from tests.random_networks import Numbers

QUANTITIES = [
    "p[A]", "p[A, B]", "mean[Q]", "current[t0]", "traffic[t1]", "p[A]/p[B]", "current[t0]/p[C] - x",
    "d p[B] / d barrier[t0]", "d mean[Q] / d x", "d mean[Q] / d ln x", "d ln(p[A]/p[C]) / d ln y",
    "d current[t1] / d drive[t0]", "d (d p[A] / d energy[A]) / d ln x",
    "d (d mean[Q] / d x) / d ln x", "(p[A] - p[B])**2/mean[Q]", "forward[t0]*p[A]",
]


def random_network(seed: int) -> Network:
    """Return a network of three or four states with parallel and one-way transitions."""
    choose = random.Random(seed)
    names = "ABCD"[: choose.choice((3, 4))]
    pairs = [(names[i], names[(i + 1) % len(names)]) for i in range(len(names))]
    pairs += [(names[0], names[2]), (names[0], names[1])]

    def rate() -> str:
        factor = choose.choice(["x", "x**2", "1/x", "sqrt(x)", "x**(1/3)*y", "y", "1", "(2 + x*y)",
                                "x/(1 + x)", "sqrt(y)"])
        return f"{choose.randint(1, 9)}/{choose.randint(1, 9)}*{factor}"

    transitions = [Rates(a, b, rate(), None if place and choose.random() < 0.3 else rate(),
                         name=f"t{place}") for place, (a, b) in enumerate(pairs)]
    observable = {"A": "x", "B": "y + 1/2", names[-1]: "x*y + 3"}
    return build_network("random", states=list(names), transitions=transitions,
                         symbols={"x": "positive", "y": "positive"}, observables={"Q": observable})


@pytest.mark.parametrize("seed", range(12))
def test_values_are_those_of_the_linear_system(seed: int) -> None:
    network = random_network(seed)
    analysis = Analysis(network)
    for text in QUANTITIES:
        quantity = read_quantity(text, network)
        f = function_of(analysis, quantity, "x", {"y": "9/4"})
        for base in (Fraction(1, 3), Fraction(1), Fraction(7, 2)):
            x = base**6
            at = Point(network, {"x": number(x), "y": number(Fraction(9, 4))})
            assert f.value(x) == at.value(quantity), text


@pytest.mark.parametrize("seed", range(6))
def test_energy_form_with_a_real_symbol(seed: int) -> None:
    choose = random.Random(100 + seed)
    network = build_network(
        "energies", states={"A": "E", "B": "0", "C": "G"},
        transitions=[
            Barrier("A", "B", f"{choose.randint(-2, 2)}*E/3", "F", name="t0"),
            Barrier("B", "C", "G/2", f"{choose.randint(1, 3)}*F/2", name="t1"),
            Barrier("C", "A", "0", name="t2"), Barrier("A", "C", "E", "-F", name="t3")],
        observables={"Q": {"A": "2", "C": "exp(F)"}})
    analysis = Analysis(network)
    rest = {"E": "6*ln(3/2)", "G": "2*ln(2)"}
    for text in ("p[A]", "mean[Q]", "d p[B] / d F", "current[t1]", "d (d p[B] / d F) / d drive[t0]",
                 "d mean[Q] / d E", "d ln p[C] / d barrier[t3]"):
        quantity = read_quantity(text, network)
        f = function_of(analysis, quantity, "F", rest)
        assert f.kind == "exponential"
        for q in ("1/2", "5/3"):
            values = {**rest, "F": f"12*ln({q})"}
            at = Point(network, {k: read_expression(v) for k, v in values.items()})
            assert f.value(values["F"]) == at.value(quantity), text
        low, high = f.enclosure("1/7")
        near = Point(network, {**{k: read_expression(v) for k, v in rest.items()},
                               "F": number(Fraction(1, 7))})
        assert near.value(quantity) is None
        x = sympy.Symbol("F", real=True)
        exact = sympy.sympify(f.text(), locals={"F": x})
        approximate = exact.subs(x, sympy.Rational(1, 7)).evalf(40)
        assert sympy.Rational(low) <= sympy.Rational(str(approximate)) <= sympy.Rational(high)


def steady_by_sympy(network: Network, at: dict[str, object]) -> list[object]:
    size = len(network.states)
    matrix = sympy.zeros(size)
    for t in network.transitions:
        for rate, tail, head in ((t.forward, t.first, t.second), (t.backward, t.second, t.first)):
            if rate is not None:
                value = sympy.sympify(expression_text(rate), locals=at)
                matrix[head, tail] += value
                matrix[tail, tail] -= value
    (kernel,) = matrix.nullspace(simplify=True)
    return [sympy.cancel(entry / sum(kernel)) for entry in kernel]


@pytest.mark.parametrize("seed", [0, 3, 5])
def test_probability_and_derivatives_are_those_of_sympy(seed: int) -> None:
    network = random_network(seed)
    root = sympy.Symbol("r", positive=True)
    p = steady_by_sympy(network, {"x": root**6, "y": sympy.Rational(9, 4)})[1]
    f = function_of(Analysis(network), read_quantity("p[B]", network), "x", {"y": "9/4"})
    slope = root / 6 * sympy.diff(p, root)
    for g, expected in ((f, p), (f.sensitivity(), slope), (f.exponent(), slope / (p * (1 - p))),
                        (f.rescaled(3, Fraction(-1, 2)), 3 * p - sympy.Rational(1, 2))):
        written = sympy.sympify(g.text(), locals={"x": root**6})
        assert sympy.cancel(sympy.powdenest(written, force=True) - expected) == 0


def test_a_real_symbol_outside_exponents() -> None:
    network = build_network("plain", states="A B", transitions=[Rates("A", "B", "1 + z**2", "3")],
                            symbols={"z": "real"}, observables={"Q": {"A": "z"}})
    f = function_of(Analysis(network), read_quantity("mean[Q]", network), "z", {})
    assert (f.kind, f.text()) == ("plain", "3*z/(z**2 + 4)")
    assert f.value("-2") == Fraction(-3, 4)
    assert f.sensitivity().value(0) == Fraction(3, 4)
    assert f.leading_term("low") == f.leading_term("high") == (3, -1)
    assert [c.value for c in curve(f, -2, 2, 5, "linear")][::2] == [
        Fraction(-3, 4), 0, Fraction(3, 4)]


# -- binding sites -------------------------------------------------------------------------------


def independent_sites(n: int) -> Network:
    """Return n sites that bind and release on their own; Q the occupied fraction."""
    states = ["".join(bits) for bits in product("01", repeat=n)]
    transitions = [Rates(f"s{s}", f"s{s[:k]}1{s[k + 1:]}", f"x*k{k}", f"k{k}", name=f"t{s}_{k}")
                   for s in states for k in range(n) if s[k] == "0"]
    return build_network("sites", states=[f"s{s}" for s in states], transitions=transitions,
                         observables={"Q": {f"s{s}": Fraction(s.count("1"), n) for s in states}})


@pytest.mark.parametrize("n", [2, 3])
def test_independent_sites_follow_a_hyperbola(n: int) -> None:
    network = independent_sites(n)
    rest = {f"k{k}": Fraction(k + 2, 3) for k in range(n)}
    f = function_of(Analysis(network), read_quantity("mean[Q]", network), "x", rest)
    assert f.text() == "x/(x + 1)"
    assert f.sensitivity() == f * (1 - f)
    assert f.exponent().as_constant() == 1
    # the logarithmic sensitivity asked for as a response is the same function
    assert f.sensitivity() == function_of(
        Analysis(network), read_quantity("d mean[Q] / d ln x", network), "x", rest)


def cooperative_sites(n: int) -> Network:
    """Return n sites in one chain, the first ones bound weakly: x**n/w in the limit of large w."""
    steps = ["x/w"] * (n - 1) + [f"x*w**{n - 1}"]
    return build_network("chain", states=[f"s{k}" for k in range(n + 1)], transitions=[
        Rates(f"s{k}", f"s{k + 1}", step, "1") for k, step in enumerate(steps)])


@pytest.mark.parametrize("n", [2, 3, 4])
def test_exponent_of_a_chain_tends_to_its_length(n: int) -> None:
    network = cooperative_sites(n)
    gaps = []
    for w in (10, 1000, 10**6):
        f = function_of(Analysis(network), read_quantity(f"p[s{n}]", network), "x", {"w": w})
        gaps.append(n - f.exponent().value(1))
        assert f.exponent().value(1) < n
    assert gaps == sorted(gaps, reverse=True) and gaps[-1] < Fraction(1, 10**5)


# -- the object ----------------------------------------------------------------------------------


def rational(top: list[int], bottom: list[int], root: int = 1) -> RationalFunction:
    return rational_function("x", "power", root, flint.fmpz_poly(top), flint.fmpz_poly(bottom))


def test_lowest_terms_sign_and_smallest_root() -> None:
    f = rational([0, 0, -6, 0, -6], [0, 0, -4, 0, -8], 4)
    assert (f.root, f.text()) == (2, "3*(sqrt(x) + 1)/(2*(2*sqrt(x) + 1))")
    assert rational([6], [4]).as_constant() == Fraction(3, 2)
    assert f == rational([3, 3], [2, 4], 2) and hash(f) == hash(rational([3, 3], [2, 4], 2))


def test_arithmetic_over_different_roots() -> None:
    f, g = rational([1, 1], [2, 0, 1], 2), rational([0, 1], [1, 3], 3)
    for x in (Fraction(64), Fraction(1, 729)):
        a, b = f.value(x), g.value(x)
        for ours, value in ((f + g, a + b), (f - g, a - b), (f * g, a * b), (f / g, a / b),
                            (1 / f, 1 / a), (2 - f, 2 - a), (f**-2, a**-2), (-g, -b)):
            assert ours.value(x) == value
    with pytest.raises(EvaluationError, match="identically zero"):
        f / (g - g)


def test_limits_by_degree() -> None:
    f = rational([0, 2, 1], [3, 0, 0, 5], 2)
    assert f.leading_term("low") == (Fraction(2, 3), Fraction(1, 2))
    assert f.leading_term("high") == (Fraction(1, 5), Fraction(-1, 2))
    assert (f.limit("low"), (1 / f).limit("low"), rational([1, 2], [3, 1]).limit("high")) == (
        0, None, 2)


def test_elimination_solves_polynomial_systems() -> None:
    choose = random.Random(5)
    poly = flint.fmpz_poly
    matrix = [[poly([choose.randint(-3, 3) for _ in range(3)]) for _ in range(4)] for _ in range(4)]
    matrix[0][0] = poly(0)  # the first pivot is missing
    right = [[poly([choose.randint(-3, 3)])] for _ in range(4)]
    solution, scale = solved(matrix, right)
    for row, (value,) in zip(matrix, right, strict=True):
        total = sum((a * x[0] for a, x in zip(row, solution, strict=True)), poly(0))
        assert total == scale * value and scale.degree() > 0


def test_finite_changes_of_a_barrier() -> None:
    network = Numbers(3, ((0, 1, Fraction(2), Fraction(3)), (1, 2, Fraction(1), Fraction(5)),
                          (2, 0, Fraction(4), Fraction(1)))).network({1: "x"})
    quantity = Change(read_quantity("p[A]", network), 0, read_expression("ln(3)"))
    f = function_of(Analysis(network), quantity, "x", {})
    at = Point(network, {"x": number(Fraction(5, 3))})
    assert f.value("5/3") == at.value(quantity) != 0


def test_balls_hold_the_values() -> None:
    f = rational([0, 3, 1], [1, 2, 7])
    with flint.ctx.workprec(100):
        assert f.ball(flint.arb(flint.fmpq(1, 3))).contains(
            flint.arb(flint.fmpq(f.value("1/3").numerator, f.value("1/3").denominator)))


# -- curves --------------------------------------------------------------------------------------


def test_curve_on_a_geometric_grid() -> None:
    f = rational([0, 1], [1, 1])
    points = curve(f, "1/1000", "1000", 61)
    assert (points[0].y, points[-1].y) == (Fraction(1, 1000), 1000)
    assert all(p.value == p.y / (1 + p.y) and p.x == number(p.y) for p in points)
    grid = np.geomspace(1e-3, 1e3, 61)
    assert np.allclose([p.position() for p in points], grid, rtol=0.01)
    assert all(p.y.denominator.bit_length() < 30 for p in points[1:-1])


def test_curve_over_a_narrow_range_stays_in_order() -> None:
    low, high = Fraction(1), 1 + Fraction(1, 10**12)
    places = [p.y for p in curve(rational([0, 1], [1, 1]), low, high, 50)]
    assert places == sorted(set(places)) and places[0] == low and places[-1] == high


def test_curve_of_a_real_symbol_and_of_a_root() -> None:
    network = build_network("pair", states={"A": "E", "B": "0"},
                            transitions=[Barrier("A", "B", "0")])
    f = function_of(Analysis(network), read_quantity("p[A]", network), "E", {})
    points = curve(f, -5, "5", 11, "linear")
    assert np.allclose([p.position() for p in points], np.linspace(-5, 5, 11), atol=0.02)
    assert all(p.value == 1 / (1 + p.y) for p in points)
    exact = curve(f, "-2*ln(3)", "2*ln(3)", 3, "linear")
    assert [p.y for p in exact] == [Fraction(1, 9), 1, 9]
    roots = curve(rational([0, 1], [1, 1], 2), 4, 9, 6, "linear")
    assert (roots[0].y, roots[-1].y) == (2, 3)
    assert np.allclose([p.position() for p in roots], [4, 5, 6, 7, 8, 9], atol=0.02)


@pytest.mark.parametrize(("low", "high", "count", "spacing"), [
    (1, 1, 5, "log"), (2, 1, 5, "log"), (1, 2, 1, "log"), (1, 2, 5, "cubic"), (0, 2, 5, "log")])
def test_curves_that_cannot_be(low: int, high: int, count: int, spacing: str) -> None:
    with pytest.raises(EvaluationError):
        curve(rational([0, 1], [1, 1]), low, high, count, spacing)


# -- refusals ------------------------------------------------------------------------------------


def refusal(text: str, symbol: str, values: dict[str, str], network: Network) -> str:
    with pytest.raises((EvaluationError, AssignmentError, QuantityError)) as caught:
        function_of(Analysis(network), read_quantity(text, network), symbol, values)
    message = str(caught.value)
    assert "\n" not in message
    return message


def test_what_is_not_rational_is_refused_by_name() -> None:
    network = build_network(
        "mixed", states="A B",
        transitions=[Rates("A", "B", "x*sqrt(k)*exp(F/2)", "k*exp(-F/2)"),
                     Rates("B", "A", "exp(G)", "1")],
        symbols={"x": "positive", "k": "positive", "F": "real", "G": "real"})
    good = {"k": "4", "F": "2*ln(3)", "G": "0"}
    message = refusal("p[A]", "x", {**good, "k": "2"}, network)
    assert message.startswith("k = 2 makes") and "k=9/4" in message
    assert refusal("p[A]", "x", {**good, "F": "1"}, network).startswith("F = 1 makes")
    assert "F=2*ln(3/2)" in refusal("p[A]", "x", {**good, "F": "1"}, network)
    assert refusal("p[A]", "x", {**good, "G": "1/3"}, network).startswith("G = 1/3 makes")
    assert refusal("p[A]", "x", {"k": "4", "F": "0"}, network).startswith("G has no value")
    assert "leave its value out" in refusal("p[A]", "x", {**good, "x": "1"}, network)
    assert "there is no symbol" in refusal("p[A]", "z", good, network)
    assert "positive" in refusal("p[A]", "x", {**good, "k": "-4"}, network)
    assert "ln(...)" in refusal("ln(p[A]/p[B])", "x", good, network)
    assert "a root" in refusal("sqrt(p[A])", "x", good, network)


def test_a_symbol_inside_and_outside_exponents_is_refused() -> None:
    network = build_network(
        "both", states="A B", transitions=[Rates("A", "B", "exp(F)", "1 + F**2")],
        symbols={"F": "real"})
    assert "must occur in exponents" in refusal("p[A]", "F", {}, network)
    network = build_network("both", states="A B", transitions=[Rates("A", "B", "exp(c)", "c")])
    assert "must occur in powers" in refusal("p[A]", "c", {}, network)
    network = build_network("sum", states="A B", transitions=[Rates("A", "B", "sqrt(1 + c)", "c")])
    assert "must occur in powers" in refusal("p[A]", "c", {}, network)


def test_rates_that_change_sign_are_refused() -> None:
    network = build_network("sign", states="A B", transitions=[Rates("A", "B", "k - x", "1")])
    assert "is not positive at every x" in refusal("p[A]", "x", {"k": "1"}, network)
    fine = build_network("sign", states="A B", transitions=[Rates("A", "B", "x**2 - x + k", "1")])
    f = function_of(Analysis(fine), read_quantity("p[B]", fine), "x", {"k": "1"})
    assert f.value(2) == Fraction(3, 4)


def test_values_outside_the_domain_are_refused() -> None:
    f = rational([0, 1], [1, 1], 2)
    with pytest.raises(EvaluationError, match="positive symbol"):
        f.value(-1)
    with pytest.raises(EvaluationError, match="power 2 of a fraction"):
        f.value(2)
    low, high = f.enclosure(2)
    assert Fraction(low) < Fraction(high) and abs(float(low) - 2**0.5 / (1 + 2**0.5)) < 1e-12
