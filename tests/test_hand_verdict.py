"""Verdicts on hand results: textbook formulas, rewritings, witnesses; the oracle is hand_oracle."""

from __future__ import annotations

import random
from itertools import combinations

import pytest
import sympy

from symbolic_response.errors import EvaluationError, QuantityError
from symbolic_response.expressions.tree import Expression, Symbol, divide, multiply, number
from symbolic_response.hand.judging.verdict import Verdict, judge
from symbolic_response.network.build import Barrier, Rates, build_network
from symbolic_response.network.model import Network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from tests.hand_oracle import Oracle, point_of
from tests.hand_rewriting import correct_formulas, rewritten, slipped

SITE = build_network("site", states="empty full",
                     transitions=[Rates("empty", "full", "k_on*c", "k_off", "bind")],
                     observables={"bound": {"full": 1}})
RING = build_network("ring", states="A B C", transitions=[
    ("A", "B", "a1", "b1", "one"), ("B", "C", "a2", "b2", "two"), ("C", "A", "a3", "b3", "three")])
ENZYME = build_network("conversion", states="E ES EP", transitions=[
    ("E", "ES", "k1*S", "km1", "take"), ("ES", "EP", "k2", "km2", "turn"),
    ("EP", "E", "k3", "km3*P", "give")])
ENERGY = build_network(
    "two channels", states={"A": "E_A", "B": "E_B", "C": "E_C"}, transitions=[
        Barrier("A", "B", "B_1", "F", name="one"), Barrier("A", "B", "B_2", name="two"),
        Barrier("B", "C", "B_3", name="three"), Barrier("C", "A", "B_4", name="four")])
MIXED = build_network("sums and one way", states="A B C D", transitions=[
    Rates("A", "B", "u + c*v", "r", "ab"), Rates("A", "B", "s", "t", "ab2"),
    Rates("B", "C", "x", None, "bc"), Rates("C", "A", "y", None, "ca"),
    Rates("C", "D", "z", "w", "cd")], observables={"Q": {"A": "1/2", "C": "c"}})
K4 = build_network("complete", states="A B C D", transitions=[
    Rates(a, b, f"w{a}{b}", f"w{b}{a}") for a, b in combinations("ABCD", 2)])
LARGE = build_network("circle with chords", states=[f"s{i}" for i in range(12)], transitions=[
    Rates(f"s{i}", f"s{j}", f"u{i}_{j}", f"v{i}_{j}") for i, j in combinations(range(12), 2)
    if j - i in (1, 2, 5, 11)])


def verdict(network: Network, quantity: str, hand: str | Expression, *given: str) -> Verdict:
    tree = read_quantity(hand, network) if isinstance(hand, str) else hand
    return judge(Analysis(network), read_quantity(quantity, network), tree, given)


def check_witness(found: Verdict, network: Network, quantity: Expression,
                  hand: Expression) -> None:
    """Compare a witness with the oracle: both values there, and that they differ."""
    assert found.witness is not None and found.hand_value and found.derived_value
    assert list(found.witness) == [entry.name for entry in network.symbols]
    at = point_of(found.witness)
    for entry in network.symbols:
        assert not entry.positive or at[entry.name] > 0
    oracle = Oracle(network, at)
    sides = [(found.hand_value, oracle.value(hand)), (found.derived_value, oracle.value(quantity))]
    for value, expected in sides:
        if value.exact is not None:
            assert sympy.simplify(expected - sympy.Rational(*value.exact.as_integer_ratio())) == 0
        else:
            assert value.enclosure is not None
            low, high = (sympy.Rational(end) for end in value.enclosure)
            assert low <= expected.evalf(60) <= high
    gap = sides[0][1] - sides[1][1]
    assert abs(gap.evalf(40)) > sympy.Rational(1, 10**15)


# -- textbook formulas ---------------------------------------------------------------------------

# Langmuir, J. Am. Chem. Soc. 40, 1361 (1918): the occupied fraction of sites, from memory.
OCCUPANCY = ["k_on*c/(k_on*c + k_off)", "c/(c + k_off/k_on)", "1/(1 + k_off/(k_on*c))",
             "1 - 1/(1 + c*k_on/k_off)", "(k_on*c/k_off)/(1 + k_on*c/k_off)",
             "1/2*(1 + (k_on*c - k_off)/(k_on*c + k_off))",
             "exp(ln(k_on*c/k_off))/(1 + exp(ln(k_on*c/k_off)))",
             "sqrt(k_on*c)/(sqrt(k_on*c) + k_off/sqrt(k_on*c))",
             "1 - p[empty]", "mean[bound]", "forward[bind]/(forward[bind] + backward[bind])",
             "traffic[bind]/(2*backward[bind])"]


@pytest.mark.parametrize("formula", OCCUPANCY)
def test_occupancy_of_a_site(formula: str) -> None:
    assert verdict(SITE, "p[full]", formula).kind == "equal"


# Hill, J. Theor. Biol. 10, 442 (1966), and Free Energy Transduction in Biology (1977): the sum
# over the three directional diagrams of a state, from memory.
DIAGRAMS = {"A": "b1*b2 + b1*a3 + a2*a3", "B": "a1*b2 + a1*a3 + b2*b3",
            "C": "a1*a2 + b1*b3 + a2*b3"}
TOTAL = " + ".join(DIAGRAMS.values())


@pytest.mark.parametrize("state", "ABC")
def test_ring_by_the_diagram_method(state: str) -> None:
    others = " + ".join(text for name, text in DIAGRAMS.items() if name != state)
    top = DIAGRAMS[state]
    for formula in (f"({top})/({TOTAL})", f"1 - ({others})/({TOTAL})",
                    f"1/(1 + ({others})/({top}))",
                    f"(({top})/a1/b2)/(({TOTAL})/(a1*b2))"):
        assert verdict(RING, f"p[{state}]", formula).kind == "equal"
        assert verdict(RING, f"p[{state}]", f"{formula} + a1/(1 + {TOTAL})").kind == "different"


# King and Altman, J. Phys. Chem. 60, 1375 (1956): reversible conversion by way of two complexes,
# E + S = ES = EP = E + P; the net flux from memory.
BELOW = ("km1*km2 + km1*k3 + k2*k3 + k1*S*(km2 + k3 + k2) + km3*P*(k2 + km1 + km2)")
FLUX = [f"(k1*k2*k3*S - km1*km2*km3*P)/({BELOW})",
        f"k1*k2*k3*(S - km1*km2*km3/(k1*k2*k3)*P)/({BELOW})",
        f"k1*k2*k3*S/({BELOW}) - km1*km2*km3*P/({BELOW})",
        "(k2*k3/(km2 + k3 + k2)*S*(1 - km1*km2*km3*P/(k1*k2*k3*S)))"
        "/(S + (km1*km2 + km1*k3 + k2*k3)/(k1*(km2 + k3 + k2))"
        " + km3*P*(k2 + km1 + km2)/(k1*(km2 + k3 + k2)))"]


@pytest.mark.parametrize("formula", FLUX)
def test_flux_of_a_reversible_conversion(formula: str) -> None:
    for step in ("take", "turn", "give"):
        assert verdict(ENZYME, f"current[{step}]", formula).kind == "equal"
    wrong = verdict(ENZYME, "current[turn]", f"2*({formula})")
    assert (wrong.kind, wrong.condition) == ("different", None)


@pytest.mark.parametrize(("network", "quantity", "formula"), [
    (ENERGY, "d p[A] / d F", "d p[A] / d drive[one]"),
    (ENERGY, "entropy_production", "F*(current[one])"),
    (ENERGY, "ln(p[A]/p[B])", "E_B - E_A + ln((exp(-B_1 - F/2) + exp(-B_2)"
     " + exp(-B_3 - B_4)/(exp(-B_3) + exp(-B_4)))/(exp(-B_1 + F/2) + exp(-B_2)"
     " + exp(-B_3 - B_4)/(exp(-B_3) + exp(-B_4))))"),
    (MIXED, "mean[Q]", "p[A]/2 + c*p[C]"),
    (MIXED, "p[D]/p[C]", "z/w"),
    (MIXED, "current[bc]", "x*p[B]"),
    (MIXED, "current[ab] + current[ab2]", "y*p[C]"),
    (MIXED, "d p[C] / d ln c", "c*(d p[C] / d c)"),
    (K4, "d p[A] / d energy[A]", "-p[A]*(1 - p[A])"),
    (K4, "d (d p[A] / d energy[A]) / d energy[A]", "p[A]*(1 - p[A])*(1 - 2*p[A])"),
])
def test_general_relations_hold(network: Network, quantity: str, formula: str) -> None:
    assert verdict(network, quantity, formula).kind == "equal"


# -- random rewritings and slips -----------------------------------------------------------------


@pytest.mark.parametrize(("network", "count"), [
    (SITE, 200), (RING, 330), (ENZYME, 200), (ENERGY, 80), (MIXED, 150), (K4, 40)],
    ids=lambda value: getattr(value, "title", ""))
def test_rewritings_are_never_called_different(network: Network, count: int) -> None:
    rng, analysis = random.Random(f"rewritten {network.title}"), Analysis(network)
    formulas = correct_formulas(network)
    factors = [Symbol(entry.name) for entry in network.symbols if entry.positive]
    factors = factors or [t.forward for t in network.transitions]
    for _ in range(count):
        correct = rng.choice(formulas)
        form = rewritten(correct, factors, rng)
        assert judge(analysis, correct.quantity, form).kind == "equal", form


@pytest.mark.parametrize("network", [SITE, RING, ENZYME, ENERGY, MIXED], ids=lambda n: n.title)
def test_witnesses_of_slips_are_right(network: Network) -> None:
    rng, analysis = random.Random(f"slipped {network.title}"), Analysis(network)
    formulas = correct_formulas(network)
    kinds = []
    for _ in range(25):
        correct = rng.choice(formulas)
        form = slipped(correct, rng)
        found = judge(analysis, correct.quantity, form)
        kinds.append(found.kind)
        assert found.kind != "undecided"
        if found.kind == "equal":  # a slip that changes nothing, such as a sum of one term
            at = {s.name: sympy.Rational(3 + k, 2) if s.positive else 2 * k * sympy.log(2)
                  for k, s in enumerate(network.symbols)}
            oracle = Oracle(network, at)
            assert sympy.simplify(oracle.value(form) - oracle.value(correct.quantity)) == 0
        else:
            check_witness(found, network, correct.quantity, form)
    assert kinds.count("different") > 10


@pytest.mark.parametrize(("network", "quantity", "formula"), [
    (RING, "d p[A] / d barrier[two]", "d p[A] / d barrier[one]"),
    (RING, "d p[A] / d drive[two]", "-current[two]*p[A]"),
    (RING, "entropy_production", "current[one]*ln(a1*a2*a3/(b1*b2))"),
    (RING, "ln(p[A]/p[B])", "ln(b1/a1)"),
    (RING, "p[A]", "sqrt(b1)/(sqrt(b1) + sqrt(a1))"),
    (ENERGY, "current[one]", "exp(-B_1)*(p[A] - p[B])"),
    (ENERGY, "traffic[two]", "F"),
    (MIXED, "mean[Q]", "p[A]/2"),
    (MIXED, "d p[A] / d energy[C]", "d p[A] / d energy[D]"),
])
def test_witnesses_of_other_quantities(network: Network, quantity: str, formula: str) -> None:
    found = verdict(network, quantity, formula)
    assert found.kind in ("different", "conditional")
    check_witness(found, network, read_quantity(quantity, network),
                  read_quantity(formula, network))


def test_witness_prefers_small_numbers_and_rational_values() -> None:
    found = verdict(RING, "p[A]", "a1/(a1 + b1)")
    assert found.witness is not None
    assert {str(value.value) for value in found.witness.values()} == {"1"}
    assert found.hand_value is not None and str(found.hand_value) == "1/2"
    both = verdict(RING, "p[A]*exp(a1)", "p[B]*exp(a1)")
    assert both.derived_value is not None and both.derived_value.enclosure is not None


def test_symbols_inside_and_outside_exponents() -> None:
    network = build_network("warm", states="A B", transitions=[("A", "B", "k*exp(-E/T)", "k*T")],
                            symbols={"k": "positive", "T": "positive", "E": "real"})
    right = "exp(-E/T)/(exp(-E/T) + T)"
    assert verdict(network, "p[B]", right).kind == "equal"
    wrong = verdict(network, "p[B]", "exp(-E)/(exp(-E) + T)")
    assert wrong.kind == "different"
    check_witness(wrong, network, read_quantity("p[B]", network),
                  read_quantity("exp(-E)/(exp(-E) + T)", network))


def test_rates_that_are_not_always_positive() -> None:
    network = build_network("difference", states="A B", transitions=[("A", "B", "a - b", "a + b")])
    assert verdict(network, "p[B]", "(a - b)/(2*a)").kind == "equal"
    wrong = verdict(network, "p[B]", "(a + b)/(2*a)")
    check_witness(wrong, network, read_quantity("p[B]", network),
                  read_quantity("(a + b)/(2*a)", network))


# -- large networks, no values, no decision ------------------------------------------------------


def test_a_wrong_result_for_a_large_network_is_different_at_once() -> None:
    for quantity, formula in (("p[s0]", "u0_1/(u0_1 + v0_1)"),
                              ("current[s0_s1]", "2*current[s0_s1]")):
        found = verdict(LARGE, quantity, formula)
        assert (found.kind, found.condition) == ("different", None)
        check_witness(found, LARGE, read_quantity(quantity, LARGE), read_quantity(formula, LARGE))


def test_agreement_beyond_the_size_limit_is_undecided() -> None:
    rest = ", ".join(f"s{i}" for i in range(1, 12))
    found = verdict(LARGE, "p[s0]", f"1 - p[{rest}]")
    assert found.kind == "undecided" and "limit" in found.reason and found.witness is None


def test_what_the_normal_form_does_not_settle_is_undecided() -> None:
    # nested roots: sqrt(1 + c + 2 sqrt(c)) = 1 + sqrt(c)
    found = verdict(SITE, "p[full]*(1 + sqrt(c))", "p[full]*sqrt(1 + c + 2*sqrt(c))")
    assert found.kind in ("equal", "undecided")
    assert found.kind == "equal" or "normal form" in found.reason


@pytest.mark.parametrize("formula", ["1/(a1 - a1)", "ln(-a1)", "sqrt(-a1 - b1)", "1/(p[A] - p[A])",
                                     "a1/(a1/b1 - 1/(b1/a1))", "1/(1 - p[A, B, C])"])
def test_a_hand_result_without_a_value_is_refused(formula: str) -> None:
    with pytest.raises(EvaluationError) as error:
        verdict(RING, "p[A]", formula)
    assert "\n" not in str(error.value) and "hand result" in str(error.value)


def test_a_quantity_that_does_not_exist_is_refused() -> None:
    with pytest.raises((QuantityError, EvaluationError)) as error:
        verdict(MIXED, "entropy_production", "0")
    assert "\n" not in str(error.value)


def test_a_network_without_symbols() -> None:
    network = build_network("numbers", states="A B", transitions=[("A", "B", "2", "1/3")])
    assert verdict(network, "p[A]", "1/7").kind == "equal"
    found = verdict(network, "p[A]", "1/6")
    assert (found.kind, found.witness, str(found.derived_value)) == ("different", {}, "1/7")


def test_a_factor_is_found_in_whatever_form() -> None:
    for correct in correct_formulas(RING):
        form = multiply([number(2), divide(multiply([*correct.above[:1]]), number(1))])
        assert judge(Analysis(RING), correct.quantity, form).kind == "different"
