"""Conditions under which hand results hold: on them, and off them, against the oracle's values."""

from __future__ import annotations

import random
from collections.abc import Callable
from dataclasses import dataclass

import pytest
import sympy

from symbolic_response.errors import QuantityError
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.tree import number, substitute
from symbolic_response.hand.judging.conditions import force_conditions, forces_of, read_relations
from symbolic_response.hand.judging.solving import impose
from symbolic_response.hand.judging.verdict import judge
from symbolic_response.hand.judging.witness import SMALL_NUMBERS
from symbolic_response.network.build import Barrier, Rates, build_network
from symbolic_response.network.model import Network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from tests.hand_oracle import Oracle, point_of
from tests.test_hand_verdict import ENERGY, K4, LARGE, MIXED, RING, verdict

# Substrate and product bind at one site: E + S = ES = E + P, two parallel channels. K is the
# equilibrium constant of the conversion, here the value of an observable.
HALDANE = build_network("one complex", states="E ES", transitions=[
    Rates("E", "ES", "k1*S", "km1", "substrate"), Rates("ES", "E", "k2", "km2*P", "product")],
    observables={"constant": {"E": "K"}})
# Two loops that share the transition B - D.
THETA = build_network("two loops", states="A B C D", transitions=[
    Rates("A", "B", "a1", "b1"), Rates("B", "D", "a2", "b2"), Rates("D", "A", "a3", "b3"),
    Rates("B", "C", "a4", "b4"), Rates("C", "D", "a5", "b5")])
LOOP1, LOOP2 = "a1*a2*a3/(b1*b2*b3)", "a4*a5*b2/(b4*b5*a2)"

Point = dict[str, sympy.Expr]


def loops(at: Point, *, first: sympy.Expr, second: sympy.Expr) -> None:
    """Choose a1 and a4 so that the two loops have the given ratios of rates."""
    at["a1"] = first * at["b1"] * at["b2"] * at["b3"] / (at["a2"] * at["a3"])
    at["a4"] = second * at["b4"] * at["b5"] * at["a2"] / (at["a5"] * at["b2"])


def first_loop(at: Point) -> None:
    loops(at, first=sympy.Integer(1), second=sympy.Rational(5, 7))


def second_loop(at: Point) -> None:
    loops(at, first=sympy.Rational(5, 7), second=sympy.Integer(1))


def outer_loop(at: Point) -> None:
    loops(at, first=sympy.Integer(3), second=sympy.Rational(1, 3))


def equal_loops(at: Point) -> None:
    loops(at, first=sympy.Integer(3), second=sympy.Integer(3))


def no_loop(at: Point) -> None:
    loops(at, first=sympy.Integer(1), second=sympy.Integer(1))


def haldane(at: Point) -> None:
    at["K"] = at["k1"] * at["k2"] / (at["km1"] * at["km2"])


def ring_balance(at: Point) -> None:
    at["a3"] = at["b1"] * at["b2"] * at["b3"] / (at["a1"] * at["a2"])


def no_drive(at: Point) -> None:
    at["F"] = sympy.Integer(0)


@dataclass(frozen=True)
class Case:
    network: Network
    quantity: str
    formula: str
    given: tuple[str, ...]
    condition: tuple[str, ...]
    on: Callable[[Point], None]


CASES = [
    # Haldane, Enzymes (1930): K = V_f K_P/(V_r K_S); the reversible rate law and it from memory
    Case(HALDANE, "current[product]",
         "k1*k2*(S - P/K)/(km1 + k2 + k1*S + P*k1*k2/(km1*K))",
         ("K*km1*km2 = k1*k2",), ("given K*km1*km2 = k1*k2",), haldane),
    Case(HALDANE, "current[product]",
         "(k2*S/((km1 + k2)/k1) - km1*P/((km1 + k2)/km2))/(1 + k1*S/(km1 + k2) + km2*P/(km1 + k2))"
         "*K*km1*km2/(k1*k2)",
         ("K = (k2/((km1 + k2)/k1))/(km1/((km1 + k2)/km2))",), ("given K =",), haldane),
    # detailed balance of a ring: Wegscheider (1901), the Boltzmann weights from memory
    Case(RING, "p[B]", "(a1/b1)/(1 + a1/b1 + b3/a3)", (),
         ("cycle A -> B -> C -> A is zero", "a1*a2*a3 = b1*b2*b3"), ring_balance),
    Case(RING, "p[B]", "(a1/b1)/(1 + a1/b1 + b3/a3)", ("a1*a2/(b1*b2) = b3/a3",),
         ("given a1*a2/(b1*b2) = b3/a3",), ring_balance),
    Case(RING, "d current[one] / d drive[one]", "a1*p[A]*(1/(1 + a1*p[A]/(a2*p[B])"
         " + a1*p[A]/(a3*p[C])))", (), ("cycle A -> B -> C -> A is zero",), ring_balance),
    Case(ENERGY, "p[A]", "exp(-E_A)/(exp(-E_A) + exp(-E_B) + exp(-E_C))", (),
         ("A -[one]-> B -[two]-> A is zero", "F = 0"), no_drive),
    Case(ENERGY, "p[A]/p[B]", "exp(E_B - E_A - F)", ("F = 0",), ("given F = 0",), no_drive),
    Case(THETA, "p[A]", f"p[A]*{LOOP1}", (), ("cycle A -> B -> D -> A is zero",), first_loop),
    Case(THETA, "current[A_B]", f"current[A_B]*({LOOP2})**2", (),
         ("cycle B -> C -> D -> B is zero",), second_loop),
    Case(THETA, "p[C]", f"p[C]*{LOOP1}*{LOOP2}", (), ("cycle A -> B -> C -> D -> A is zero",),
         outer_loop),
    Case(THETA, "current[B_D]", f"current[B_D]*({LOOP1})/({LOOP2})", (),
         ("equals that of", "a1*a2**2*a3*b4*b5 = b1*b2**2*b3*a4*a5"), equal_loops),
    Case(THETA, "p[A]", "1/(1 + a1/b1 + b3/a3 + a1*a4/(b1*b4))", (),
         ("detailed balance",), no_loop),
    Case(THETA, "p[A]", f"p[A]*{LOOP1}*sqrt({LOOP2})",
         ("a4*a5*b2 = b4*b5*a2", "b1 = a1", "a1*a2*a3 = b1*b2*b3"),
         ("given a4*a5*b2 = b4*b5*a2 and a1*a2*a3 = b1*b2*b3",), no_loop),
]


def generic(network: Network, rng: random.Random) -> Point:
    def positive() -> sympy.Expr:
        return sympy.Rational(rng.randint(1, 9), rng.randint(1, 9))

    return {s.name: positive() if s.positive else 2 * sympy.log(positive())
            for s in network.symbols}


def gap(case: Case, at: Point) -> tuple[sympy.Expr, sympy.Expr]:
    """Return the difference of both sides at a point and the derived side."""
    oracle = Oracle(case.network, at)
    derived = oracle.value(read_quantity(case.quantity, case.network))
    by_hand = oracle.value(read_quantity(case.formula, case.network))
    return sympy.simplify(derived - by_hand), sympy.simplify(derived)


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.condition[0][:40])
def test_conditional_results(case: Case) -> None:
    found = verdict(case.network, case.quantity, case.formula, *case.given)
    assert found.kind == "conditional" and found.condition is not None
    for part in case.condition:
        assert part in found.condition
    if case.given:
        assert found.condition.startswith("given ")
    rng = random.Random(case.formula)
    seen = []
    for _ in range(4):
        at = generic(case.network, rng)
        assert gap(case, at)[0] != 0
        case.on(at)
        difference, derived = gap(case, at)
        assert difference == 0
        seen.append(derived)
    assert any(value != 0 for value in seen)
    assert found.witness is not None
    difference, _ = gap(case, point_of(found.witness))
    assert difference != 0


@pytest.mark.parametrize(("network", "quantity", "formula", "given"), [
    # both sides vanish under the condition, so any factor would pass
    (RING, "current[one]", "2*current[one]", ()),
    (RING, "current[one]", "current[one]*a1/b1", ()),
    (RING, "current[one]", "0", ()),
    (RING, "current[one]", "2*current[one]", ("a1*a2*a3 = b1*b2*b3",)),
    (RING, "entropy_production", "2*entropy_production", ()),
    (THETA, "current[A_B]", "3*current[A_B]", ()),
    (THETA, "current[A_B]", f"current[A_B]*{LOOP1}*a1", ()),
    (ENERGY, "current[two]", "-current[two]", ("F = 0",)),
    # no condition among those tried
    (RING, "p[A]", "1/3", ()),
    (RING, "p[A]", "p[B]", ("a1 = a2",)),
    (K4, "p[A]", "p[A]*2", ()),
    # a one-way step: the force of the only cycle through it is infinite
    (MIXED, "p[D]/p[B]", "x*z/(y*w)*2", ()),
    (MIXED, "p[A]", "r/(r + u + c*v)", ()),
    # exact agreement at detailed balance is not enough where the relation is only approximate
    (THETA, "p[A]", f"p[A]*(1 + ({LOOP1} - 1)**2)*a1/b1", ()),
])
def test_no_condition(
    network: Network, quantity: str, formula: str, given: tuple[str, ...]
) -> None:
    found = verdict(network, quantity, formula, *given)
    assert (found.kind, found.condition) == ("different", None)
    oracle = Oracle(network, point_of(found.witness or {}))
    sides = (oracle.value(read_quantity(text, network)) for text in (quantity, formula))
    assert sympy.simplify(next(sides) - next(sides)) != 0


def test_relations_that_the_network_implies_are_skipped() -> None:
    balanced = build_network("balanced", states="A B C", transitions=[
        ("A", "B", "x", "y"), ("B", "C", "y", "z"), ("C", "A", "z", "x")])
    assert list(force_conditions(forces_of(Analysis(balanced)), Analysis(balanced))) == []
    found = verdict(balanced, "p[A]", "y/(x + y + z)", "x*y*z = y*z*x")
    assert (found.kind, found.condition) == ("different", None)
    assert verdict(balanced, "p[A]", "y*z/(x*y + y*z + z*x)").kind in ("equal", "different")


def test_a_stated_relation_is_not_named_where_it_is_not_needed() -> None:
    assert verdict(RING, "p[A]/p[B]*p[B]", "p[A]", "a1 = b1").kind == "equal"
    found = verdict(RING, "p[B]", "(a1/b1)/(1 + a1/b1 + b3/a3)", "a1 = b2",
                    "a1*a2*a3 = b1*b2*b3")
    assert found.condition == "given a1*a2*a3 = b1*b2*b3"


@pytest.mark.parametrize(("given", "message"), [
    (["a1 + b1"], "one ="), (["a1 = a2 = a3"], "one ="), (["a1 ="], "ends where"),
    (["k9 = a1"], "unknown symbol 'k9'"), (["a1 == a2"], "one ="), ([""], "one ="),
    (["p[A] = a1"], "between symbols and rates"), (["a1 = -1"], "contradicts"),
    (["a1 + b1 = 0"], "contradicts"), (["exp(a1) = -a2"], "contradicts"),
    (["1 = 2"], "contradicts"), (["a1 = 0"], "contradicts"),
    (["a1 = a2", "a2 = 3*a1"], "contradicts"),
    (["(a1 - a2)*(a1 - 2*a2) = 0"], "cannot be solved"),
    (["a1**2 + a1*a2 = a2**2 + a1"], "cannot be solved"), (["1/(a1 - a1) = a2"], "given"),
    (["forward[one] = -backward[one]"], "contradicts"),
])
def test_relations_that_cannot_be_used(given: list[str], message: str) -> None:
    with pytest.raises(QuantityError) as error:
        verdict(RING, "p[A]", "p[A]", *given)
    assert message in str(error.value) and "\n" not in str(error.value)


def test_rates_may_stand_in_relations() -> None:
    found = verdict(RING, "p[A]", "p[A]*a1/b2", "forward[one] = backward[two]")
    assert found.condition == "given forward[one] = backward[two]"


@pytest.mark.parametrize("relation", [
    "a1*a2 = b1*b2", "a1**2 = b1*b2", "sqrt(a1) = b1/a2", "a1 = b1 + b2", "a1 - a2 = b1",
    "ln(a1/b1) = ln(a2)", "exp(ln(a1)/2) = 3", "a1*(b1 + b2) = a2 + a3", "a1/(a1 + b1) = 1/3",
    "1/a1 + 1/a2 = 2/b1"])
def test_solved_relations_hold_identically(relation: str) -> None:
    analysis = Analysis(RING)
    (found,) = read_relations([relation], analysis)
    solved = impose(found.difference, {}, analysis)
    assert solved is not None and len(solved) == 1
    left, right = (substitute(read_quantity(side, RING), dict(solved))
                   for side in relation.split("="))
    at = {name: sympy.Rational(3 * k + 40, 7) for k, name in
          enumerate(entry.name for entry in RING.symbols)}
    gap_there = _sympy(left, at) - _sympy(right, at)
    assert abs(sympy.N(gap_there, 50)) < sympy.Rational(1, 10**40)
    assert normal_form(substitute(found.difference, dict(solved)), analysis.domain).is_zero()


def _sympy(node: object, at: Point) -> sympy.Expr:
    from tests.hand_oracle import plain

    return plain(node, at)  # type: ignore[arg-type]


def test_real_symbols_in_relations() -> None:
    analysis = Analysis(ENERGY)
    for relation in ("F = 0", "E_A = E_B", "E_A - E_B = F/2", "exp(E_A) = exp(E_B)/3",
                     "exp(F) + exp(B_1) = 5*exp(B_2)"):
        (found,) = read_relations([relation], analysis)
        solved = impose(found.difference, {}, analysis)
        assert solved is not None
        assert normal_form(substitute(found.difference, dict(solved)), analysis.domain).is_zero()


def test_every_condition_of_a_network_holds_where_it_is_solved() -> None:
    """For K4 with seven cycles: products along and against are equal at solved points."""
    analysis = Analysis(K4)
    conditions = list(force_conditions(forces_of(analysis), analysis))
    texts = [condition.describe() for condition in conditions]
    assert sum(" is zero: " in text and text.startswith("the force") for text in texts) == 7
    assert len(set(texts)) == len(texts)
    at = {entry.name: sympy.Rational(2 + k, 1 + k % 5) for k, entry in enumerate(K4.symbols)}
    for condition, text in zip(conditions, texts, strict=True):
        changed = {name: _sympy(value, at) for name, value in condition.solved.items()}
        there = {**at, **changed}
        for equation in text.rsplit(": ", 1)[1].split(" and "):
            left, right = (_sympy(read_quantity(side, K4), there) for side in equation.split("="))
            assert left == right
            here = [_sympy(read_quantity(side, K4), at) for side in equation.split("=")]
            assert here[0] != here[1]


def test_a_condition_beyond_the_size_limit_is_named_in_the_reason() -> None:
    """Boltzmann weights along paths: right at detailed balance, and no closed form is possible."""
    network = LARGE
    ratios = ["1"]
    for k in range(1, 12):
        ratios.append(f"{ratios[-1]}*u{k - 1}_{k}/v{k - 1}_{k}")
    found = verdict(network, "p[s0]", f"1/({' + '.join(ratios)})")
    assert (found.kind, found.condition) == ("different", None)
    assert "detailed balance" in found.reason and "limit" in found.reason
    wrong = verdict(network, "p[s0]", f"2/({' + '.join(ratios)})")
    assert "limit" not in wrong.reason


def test_judging_the_same_twice_gives_the_same() -> None:
    analysis = Analysis(THETA)
    quantity = read_quantity("p[A]", THETA)
    hand = read_quantity(f"p[A]*{LOOP1}", THETA)
    assert judge(analysis, quantity, hand) == judge(analysis, quantity, hand)


def test_a_channel_in_energy_form_without_a_force() -> None:
    network = build_network("passive", states={"A": "E_A", "B": "E_B"}, transitions=[
        Barrier("A", "B", "B_1", name="one"), Barrier("A", "B", "B_2", name="two")])
    assert list(force_conditions(forces_of(Analysis(network)), Analysis(network))) == []
    assert verdict(network, "p[A]", "1/(1 + exp(E_A - E_B))").kind == "equal"
    assert verdict(network, "p[A]", "1/(1 + exp(E_B - E_A))").kind == "different"


def test_agreement_at_points_is_not_taken_for_a_proof() -> None:
    """A term that vanishes at every value that points give to b2, and not otherwise."""
    zero_at_points = "*".join(f"(b2 - {q})" for q in SMALL_NUMBERS)
    for hand, given in ((f"p[A]*{LOOP1} + {zero_at_points}", ()),
                        (f"p[A]*{LOOP1} + {zero_at_points}", ("a1*a2*a3 = b1*b2*b3",))):
        assert verdict(THETA, "p[A]", hand, *given).kind == "different"
    found = verdict(THETA, "p[A]", f"p[A] + {zero_at_points}")
    assert found.kind == "different" and found.witness is not None
    assert found.witness["b2"] not in [number(q) for q in SMALL_NUMBERS]


def test_relations_that_make_a_rate_or_an_earlier_symbol_negative() -> None:
    network = build_network("difference", states="A B", transitions=[("A", "B", "a - b", "a + b")])
    for net, given in ((network, ["a = b"]), (RING, ["a1 = a2 - b1", "b1 = 2*a2"])):
        with pytest.raises(QuantityError, match="contradicts"):
            verdict(net, "p[A]", "p[A]", *given)
