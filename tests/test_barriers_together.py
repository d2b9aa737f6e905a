"""Responses to several barriers raised together: read, derived, evaluated, written."""

import random
from fractions import Fraction
from itertools import combinations

import flint
import mpmath
import pytest
from random_networks import random_numbers

from symbolic_response.appendix.document import appendix_text
from symbolic_response.bounds.balls import BallPoint
from symbolic_response.bounds.sides import quantity_text
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.reader import read_expression
from symbolic_response.network import Barrier, Rates, build_network
from symbolic_response.network.quantities import BarrierOf, BarriersOf
from symbolic_response.network.quantity_reader import read_perturbation, read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.deriving import derive

SQUARE = build_network("square", states="A B C D", transitions=[
    Rates("A", "B", "k1*c", "k2", name="e"), Rates("B", "C", "k3", "k4", name="f"),
    Rates("C", "D", "k5", name="g"), Rates("D", "A", "k6", "k7", name="h"),
    Rates("A", "C", "c", "k1", name="i")], observables={"q": {"B": "c", "D": 2}})


def test_reading() -> None:
    assert read_perturbation("barrier[g, e]", SQUARE) == BarriersOf((0, 2))
    assert read_perturbation("barrier[e]", SQUARE) == BarrierOf(0)
    text = "(d p[A] / d barrier[e, g])"
    assert quantity_text(read_quantity("d p[A] / d barrier[g,e]", SQUARE), SQUARE) == text
    for bad, message in [("barrier[e, e]", "a transition is named twice"),
                         ("drive[e, f]", "one name; barriers are raised together by"),
                         ("energy[A, B]", "energy.* takes one name"),
                         ("barrier[e, A]", "'A' is a state; barrier takes a transition"),
                         ("barrier[e, nowhere]", "no transition")]:
        with pytest.raises(QuantityError, match=message):
            read_quantity(f"d p[A] / d {bad}", SQUARE)


@pytest.mark.parametrize("quantity", [
    "p[B]", "mean[q]", "ln(p[A]/p[D])", "current[f]", "traffic[e]/p[C]", "forward[g]*p[A, B]",
    "(d p[B] / d energy[C])"])
@pytest.mark.parametrize("chosen", ["e, f", "e, g, i", "e, f, g, h, i"])
def test_closed_forms_are_the_sum_of_the_single_responses(quantity: str, chosen: str) -> None:
    """The rates of e are e^-B_e times the rest: derivatives in all B_e add up."""
    single = " - ".join(f"(d {quantity} / d barrier[{e}])" for e in chosen.split(", "))
    difference = f"(d {quantity} / d barrier[{chosen}]) - {single}"
    assert derive(SQUARE, difference).expression == "0"


@pytest.mark.parametrize("seed", range(3))
def test_values_on_random_networks(seed: int) -> None:
    """Against W p' = -W' p on fractions, and against a difference quotient at 60 digits."""
    rng = random.Random(f"together {seed}")
    for _ in range(20):
        numbers = random_numbers(rng)
        network, count = numbers.network(), len(numbers.transitions)
        if count < 2:
            continue
        chosen = sorted(rng.sample(range(count), rng.randint(2, count)))
        moves = [(Fraction(-(e in chosen)),) * 2 for e in range(count)]
        _, dp = numbers.change(moves)
        by = f"barrier[{', '.join(f't{e}' for e in chosen)}]"
        found = derive(network, f"d p[A] / d {by}").value
        assert found is not None and found.exact == dp[0]
        step = Fraction(1, 10**12)
        after, before = (
            numbers.steady([(1 - s, 1 - s) if e in chosen else (Fraction(1),) * 2
                            for e in range(count)])[0] for s in (step, -step))
        with mpmath.workdps(60):
            quotient = (mpmath.mpf(after.numerator) / after.denominator
                        - mpmath.mpf(before.numerator) / before.denominator) / (2e-12)
            assert abs(quotient - float(dp[0])) < 1e-9


def test_enclosures() -> None:
    """At irrational rates, second order included, against the sums of single responses."""
    network = build_network("energy form", states={"A": "E", "B": "0", "C": "0"}, transitions=[
        Barrier("A", "B", "0", "F", name="e"), Barrier("B", "C", "1", name="f"),
        Barrier("C", "A", "0", "F/3", name="g")])
    at = {"E": read_expression("1/2"), "F": read_expression("2")}
    with flint.ctx.workprec(200):
        place = BallPoint(Analysis(network), at)

        def value(text: str) -> flint.arb:
            return place.value(read_quantity(text, network))

        for quantity in ("p[B]", "current[f]", "ln(p[A]/p[C])"):
            both = value(f"d {quantity} / d barrier[e, g]")
            single = sum(value(f"d {quantity} / d barrier[{e}]") for e in "eg")
            assert both.overlaps(single) and abs(both) > 1e-6 and both.rad() < 1e-40
            twice = value(f"d (d {quantity} / d barrier[e, g]) / d barrier[e, g]")
            parts = sum(value(f"d (d {quantity} / d barrier[{a}]) / d barrier[{b}]")
                        for a in "eg" for b in "eg")
            assert twice.overlaps(parts) and abs(twice) > 1e-6 and twice.rad() < 1e-40


def test_latex_and_the_appendix() -> None:
    derived = derive(SQUARE, "d p[A] / d barrier[f, i]", at={"c": 1})
    assert derived.value is None
    text = appendix_text(SQUARE, quantities=["d p[A] / d barrier[f, i]"])
    assert r"B_{\{\mathrm{f},\mathrm{i}\}}" in text
    assert "Responses to several barriers raised together" in text
    assert "raising several barriers together" in text


def test_a_set_and_its_complement_add_up_to_nothing() -> None:
    """All barriers together scale time."""
    ends = [t.name for t in SQUARE.transitions]
    for pair in combinations(ends, 2):
        rest = [e for e in ends if e not in pair]
        parts = [f"(d p[B] / d barrier[{', '.join(chosen)}])" for chosen in (pair, rest)]
        assert derive(SQUARE, " + ".join(parts)).expression == "0"
