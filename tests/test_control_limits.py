"""Leading behaviour against SymPy limits, values at extreme points, and textbook limits."""

from __future__ import annotations

import random
import re
from fractions import Fraction

import mpmath
import pytest
import sympy

from symbolic_response.control.limits import Leading, leading
from symbolic_response.errors import EvaluationError, QuantityError
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.ring import all_symbols
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import number
from symbolic_response.network import Barrier, Network, Rates, build_network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.values import Point


def lead(network: Network, text: str, symbol: str, end: str) -> Leading:
    found = leading(Analysis(network), read_quantity(text, network), symbol, end)
    assert symbol not in found.coefficient.symbols()
    return found


def random_network(seed: int) -> Network:
    choose = random.Random(seed)
    names = "ABCD"[: choose.choice((3, 4))]
    pairs = [(names[i], names[(i + 1) % len(names)]) for i in range(len(names))]
    pairs += [(names[0], names[2]), (names[0], names[1])]

    def rate(place: int) -> str:
        factor = choose.choice(["x", "x**2", "1/x", "sqrt(x)", "1", "(a + x)", "x/(b + x)", "a*x"])
        return f"{choose.randint(1, 9)}*k{place}*{factor}"

    transitions = [Rates(s, t, rate(place), None if place and choose.random() < 0.3
                         else rate((place + 1) % len(pairs)), name=f"t{place}")
                   for place, (s, t) in enumerate(pairs)]
    observable = {"A": "x", "B": "a + b", names[-1]: "a*x + 3"}
    return build_network("random", states=list(names), transitions=transitions,
                         observables={"Q": observable, "R": {"A": "1", "C": "2"}})


QUANTITIES = ["p[A]", "p[B]/p[C]", "mean[Q]", "mean[R] - 1", "current[t0]", "p[A]*(1 - p[A])",
              "d p[B] / d ln x", "d ln(p[A]/p[B]) / d ln x", "d p[C] / d barrier[t1]", "1 - p[A]",
              "(p[A] - p[B])/p[C]", "sqrt(p[A]/p[C])", "d mean[Q] / d ln x"]


@pytest.mark.parametrize("end", ["0", "inf"])
@pytest.mark.parametrize("seed", range(8))
def test_quantities_approach_their_leading_terms(seed: int, end: str) -> None:
    network = random_network(seed)
    values = {entry.name: Fraction(2 * k + 3, k + 2) ** 2
              for k, entry in enumerate(network.symbols)}
    for text in QUANTITIES:
        found = lead(network, text, "x", end)
        base = Fraction(10) ** (60 if end == "inf" else -60)
        at = Point(network, {name: number(v) for name, v in {**values, "x": base**2}.items()})
        exact = at.expression(read_quantity(text, network))
        assert exact is not None and found.logarithm is None
        with mpmath.workdps(400):
            names = {k: mpmath.mpf(v.numerator) / v.denominator for k, v in values.items()}
            actual = evaluated(expression_text(exact), {})
            expected = evaluated(found.coefficient.text(), names)
            expected *= (mpmath.mpf(base.numerator) / base.denominator) ** (
                2 * mpmath.mpf(found.power.numerator) / found.power.denominator)
            if expected == 0:
                assert actual == 0
            else:
                assert abs(actual / expected - 1) < mpmath.mpf(10) ** -20, text


def evaluated(text: str, values: dict[str, object]) -> object:
    """Return a formula at numbers, by mpmath."""
    scope = {"exp": mpmath.exp, "ln": mpmath.log, "sqrt": mpmath.sqrt, "mpf": mpmath.mpf, **values}
    written = re.sub(r"(?<![A-Za-z0-9_])([0-9]+)", r"mpf('\1')", text)
    return eval(written, {"__builtins__": {}}, scope)


@pytest.mark.parametrize("seed", [1, 4])
@pytest.mark.parametrize("end", ["0", "inf"])
def test_limits_are_those_of_sympy(seed: int, end: str) -> None:
    network = random_network(seed)
    names = {s.name: sympy.Symbol(s.name, positive=True) for s in network.symbols}
    at = {name: sympy.Rational(2 * k + 3, k + 2) for k, name in enumerate(names)}
    del at["x"]
    size = len(network.states)
    matrix = sympy.zeros(size)
    for t in network.transitions:
        for rate, tail, head in ((t.forward, t.first, t.second), (t.backward, t.second, t.first)):
            if rate is not None:
                value = sympy.sympify(expression_text(rate), locals=names).subs(at)
                matrix[head, tail] += value
                matrix[tail, tail] -= value
    root = sympy.Symbol("r", positive=True)
    matrix = matrix.subs(names["x"], root**2)
    kernel = [sympy.cancel(matrix.minor(k, k) * (-1) ** (size - 1)) for k in range(size)]
    for k in range(size):
        p = sympy.cancel(kernel[k] / sum(kernel))
        found = lead(network, f"p[{network.states[k].name}]", "x", end)
        power = sympy.Rational(found.power.numerator, found.power.denominator)
        expected = sympy.limit(sympy.cancel(p / root**(2 * power)), root,
                               sympy.oo if end == "inf" else 0)
        ours = sympy.sympify(found.coefficient.text(), locals=names).subs(at)
        assert sympy.simplify(ours - expected) == 0


# -- textbook ------------------------------------------------------------------------------------


def enzyme() -> Network:
    """Return a one-substrate enzyme: binding, conversion, release; J is the release."""
    return build_network("enzyme", states="E ES EP", transitions=[
        Rates("E", "ES", "k1*S", "k2", name="bind"), Rates("ES", "EP", "k3", "k4", name="turn"),
        Rates("EP", "E", "k5", None, name="release")])


def test_saturation_of_an_enzyme() -> None:
    network = enzyme()
    top = lead(network, "current[release]", "S", "inf")
    assert top.power == 0 and top.limit() is not None
    assert same(expression_text(top.coefficient.expression), "k3*k5/(k3 + k4 + k5)")
    low = lead(network, "current[release]", "S", "0")
    assert low.power == 1
    assert same(low.coefficient.text(), "k1*k3*k5/(k2*k4 + k2*k5 + k3*k5)")
    short = lead(network, "k3*k5/(k3 + k4 + k5) - current[release]", "S", "inf")
    vmax, km = "(k3*k5/(k3 + k4 + k5))", "((k2*k4 + k2*k5 + k3*k5)/(k1*(k3 + k4 + k5)))"
    assert short.power == -1 and same(short.coefficient.text(), f"{vmax}*{km}")
    ratio = lead(network, "ln(p[ES]/p[E])", "S", "inf")
    assert ratio.power == 0 and ratio.logarithm is not None and ratio.logarithm.text() == "1"
    assert same(f"exp({ratio.coefficient.text()})", "k1*(k4 + k5)/(k2*k4 + k2*k5 + k3*k5)")
    assert ratio.limit() is None
    assert lead(network, "p[E]", "S", "inf").limit() == number(0)
    assert lead(network, "1/p[E]", "S", "inf").limit() is None


def same(ours: str, other: str) -> bool:
    names = {s: sympy.Symbol(s, positive=True) for s in
             all_symbols(read_expression(ours)) | all_symbols(read_expression(other))}
    return bool(sympy.simplify(sympy.sympify(ours, locals=names)
                               - sympy.sympify(other, locals=names)) == 0)


def test_leading_terms_that_cancel() -> None:
    network = build_network("line", states="A B C", transitions=[
        Rates("A", "B", "x*a", "b"), Rates("A", "C", "x*a", "c")])
    # p[B]/p[C] is c/b: the difference with c/b is identically zero
    none = lead(network, "p[B]/p[C] - c/b", "x", "inf")
    assert (none.coefficient.text(), none.power) == ("0", 0)
    rest = lead(network, "p[B] + p[C] - 1", "x", "inf")
    assert rest.power == -1 and same(rest.coefficient.text(), "-b*c/(a*(b + c))")
    logarithm = lead(network, "ln(p[B]/p[A]*b/(x*a + b))", "x", "inf")
    assert logarithm.power == -1 and same(logarithm.coefficient.text(), "-b/a")


def test_cooperative_sites_reach_their_number() -> None:
    for n in (2, 3):
        network = build_network("chain", states=[f"s{k}" for k in range(n + 1)], transitions=[
            Rates(f"s{k}", f"s{k + 1}", f"x*a{k}", f"b{k}") for k in range(n)])
        found = lead(network, f"p[s{n}]", "x", "0")
        assert found.power == n
        assert same(found.coefficient.text(),
                    "*".join(f"a{k}" for k in range(n)) + "/(" +
                    "*".join(f"b{k}" for k in range(n)) + ")")
        assert lead(network, f"d ln p[s{n}] / d ln x", "x", "0").coefficient.text() == str(n)
        assert lead(network, f"1 - p[s{n}]", "x", "inf").power == -1


# -- forces --------------------------------------------------------------------------------------


def driven() -> Network:
    return build_network("driven", states={"A": "E", "B": "G", "C": "0"}, transitions=[
        Barrier("A", "B", "U", "F", name="e"), Barrier("B", "C", "V", name="f"),
        Barrier("C", "A", "0", name="g")])


def current_at(force: object, rest: dict[str, object]) -> tuple[object, object]:
    """Return the current of e and p[A] by mpmath."""
    E, G, U, V = (rest[name] for name in "EGUV")
    exp, F = mpmath.exp, force
    rates = [(0, 1, exp(E - U + F / 2), exp(G - U - F / 2)), (1, 2, exp(G - V), exp(-V)),
             (2, 0, mpmath.mpf(1), exp(E))]
    W = mpmath.zeros(3)
    for i, j, ahead, back in rates:
        W[j, i] += ahead
        W[i, i] -= ahead
        W[i, j] += back
        W[j, j] -= back
    for k in range(3):
        W[2, k] = 1
    p = mpmath.lu_solve(W, mpmath.matrix([0, 0, 1]))
    return rates[0][2] * p[0] - rates[0][3] * p[1], p[0]


@pytest.mark.parametrize(("end", "force"), [("0", "1e-40"), ("inf", "300"), ("-inf", "-300")])
def test_currents_of_weak_and_strong_forces(end: str, force: str) -> None:
    network = driven()
    with mpmath.workdps(250):
        rest = {"E": mpmath.mpf("0.3"), "G": mpmath.mpf("-0.7"), "U": mpmath.mpf("0.2"),
                "V": mpmath.mpf("1.1")}
        F = mpmath.mpf(force)
        current, p = current_at(F, rest)
        tiny = mpmath.mpf("1e-8")
        step = mpmath.mpf("1e-50")
        slope = (current_at(F, {**rest, "E": rest["E"] + step})[0] - current) / step
        for text, actual in (("current[e]", current), ("p[A]", p), ("d current[e] / d E", slope),
                             ("current[e]**2/p[A]", current**2 / p)):
            found = lead(network, text, "F", end)
            assert found.exponential == (end != "0") and found.logarithm is None
            expected = evaluated(found.coefficient.text(), rest)
            power = mpmath.mpf(found.power.numerator) / found.power.denominator
            expected *= mpmath.exp(power * F) if found.exponential else F**power
            assert abs(actual / expected - 1) < tiny, text
    orders = {"0": 1, "inf": 0, "-inf": 0}
    assert lead(network, "current[e]", "F", end).power == orders[end]
    assert lead(network, "entropy_production", "F", "0").power == 2


def test_entropy_production_grows_with_the_force() -> None:
    network = driven()
    found = lead(network, "entropy_production", "F", "inf")
    assert found.power == 0 and found.logarithm is not None
    current = lead(network, "current[e]", "F", "inf")
    assert same(found.logarithm.text(), current.coefficient.text())
    both = lead(network, "ln(p[A]/p[B])", "F", "inf")
    assert both.logarithm is not None and both.logarithm.text() == "-1/2"
    weak = lead(network, "ln(p[A]/p[B]) - ln(p[A]/p[C])", "F", "0")
    assert weak.power == 0 and same(weak.coefficient.text(), "G")


def test_higher_orders_at_zero_force() -> None:
    network = driven()
    limit = lead(network, "current[e]", "F", "0")
    assert lead(network, "current[e]**3", "F", "0").power == 3
    assert limit.limit() == number(0)
    plain = build_network("plain", states="A B", transitions=[Rates("A", "B", "a + z**2", "b")],
                          symbols={"z": "real", "a": "positive", "b": "positive"})
    found = lead(plain, "p[A] - b/(a + b)", "z", "0")
    assert found.power == 2 and same(found.coefficient.text(), "-b/(a + b)**2")
    far = lead(plain, "p[A]", "z", "-inf")
    assert far.power == -2 and far.limit() == number(0) and same(far.coefficient.text(), "b")
    assert lead(plain, "p[A]*z**3", "z", "-inf").limit() is None


def test_what_has_no_leading_term_is_refused() -> None:
    network = enzyme()
    with pytest.raises(EvaluationError, match="cannot tend"):
        lead(network, "p[E]", "S", "-inf")
    with pytest.raises(EvaluationError, match="cannot tend"):
        lead(network, "p[E]", "S", "1")
    with pytest.raises(QuantityError, match="no symbol"):
        lead(network, "p[E]", "T", "0")
    with pytest.raises(EvaluationError, match="two logarithms"):
        lead(network, "ln(p[E])*ln(p[ES]/p[E])", "S", "inf")
    mixed = build_network("mixed", states="A B", transitions=[Rates("A", "B", "exp(c)", "c")])
    with pytest.raises(EvaluationError, match="positive and occurs in an exponent"):
        lead(mixed, "p[A]", "c", "0")
