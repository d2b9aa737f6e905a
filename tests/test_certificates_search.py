"""The search: how tight the bounds get, and how quickly false ones fall."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from typing import Any

import mpmath
import numpy as np
import pytest

from symbolic_response.bounds.claim import Claim, CycleMaximum, OneCycle, Term
from symbolic_response.bounds.curves import Tanh
from symbolic_response.bounds.evaluate import ClaimPoint
from symbolic_response.bounds.registry import claims_for
from symbolic_response.certificates.axes import value_text
from symbolic_response.certificates.construct import constructed
from symbolic_response.certificates.points import Refutation, certify_claims
from symbolic_response.certificates.sampling import Sampler
from symbolic_response.certificates.search import Found, search
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import ONE, Expression, divide, function
from symbolic_response.network import Barrier, Network, Rates, build_network
from symbolic_response.network.quantities import BarrierOf, Current, Response, Traffic
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.values import Point
from tests.benchmarks.networks import cube, square_with_chord


def searched(network: Network, text: str, name: str) -> Found:
    analysis = Analysis(network)
    (claim,) = claims_for(read_quantity(text, network), analysis, name)
    return search(claim, analysis, Sampler(analysis, "0"))


@pytest.mark.parametrize("make", [square_with_chord, cube])
@pytest.mark.parametrize("name", ["barrier", "end-pair"])
def test_barrier_bounds_are_reached(make: Any, name: str) -> None:
    network = make()
    for e in (0, len(network.transitions) - 1):
        t = network.transitions[e]
        x, y = network.states[t.first].name, network.states[t.second].name
        found = searched(network, f"d ln(p[{x}]/p[{y}]) / d barrier[{t.name}]", name)
        assert found.place is not None and found.place.ratio is not None and found.best is not None
        assert 0.999 <= found.place.ratio <= 1
        if name == "barrier":
            assert abs(float(found.place.ratio) - numeric_ratio(network, found.best, e)) < 1e-6


@pytest.mark.parametrize("make", [square_with_chord, cube])
def test_the_construction_alone_is_tight(make: Any) -> None:
    network = make()
    analysis = Analysis(network)
    for e in (0, 1):
        t = network.transitions[e]
        x, y = network.states[t.first].name, network.states[t.second].name
        quantity = read_quantity(f"d ln(p[{x}]/p[{y}]) / d barrier[{t.name}]", network)
        (claim,) = claims_for(quantity, analysis, "barrier")
        point = constructed(claim, analysis, Sampler(analysis, "0")).points[0]
        ratio = ClaimPoint(analysis, Point(network, point)).evaluate(claim).ratio()
        assert 1 - Fraction(1, 10**7) <= ratio <= 1
        assert abs(float(ratio) - numeric_ratio(network, point, e)) < 1e-9


@pytest.mark.parametrize("name", ["barrier", "splitting-barrier"])
def test_probabilities_come_near_their_bounds(name: str) -> None:
    found = searched(square_with_chord(), "d p[s1] / d barrier[e1_2]", name)
    assert found.place is not None and found.place.ratio is not None
    assert found.place.ratio >= Fraction(99, 100)


def test_energies_drives_and_shared_symbols() -> None:
    ring = build_network("ring", states={"A": "E_A", "B": "0", "C": "0"}, transitions=[
        Barrier("A", "B", "B_1", "F", name="e"), Barrier("B", "C", "B_2", "F/2", name="f"),
        Barrier("C", "A", "0", name="g")])
    found = searched(ring, "d ln(p[A]/p[B]) / d barrier[e]", "barrier")
    assert found.skipped is None and found.place is not None
    assert found.place.ratio is not None and found.place.ratio >= Fraction(999, 1000)
    shared = build_network("shared", states="A B C", transitions=[
        Rates("A", "B", "2*k*c", "k", name="e"), Rates("B", "C", "k", "u", name="f"),
        Rates("C", "A", "u", "k", name="g")])
    found = searched(shared, "d ln(p[A]/p[B]) / d barrier[f]", "barrier")
    assert found.skipped == "no symbols scale the two rates of the transition alone"
    assert found.place is not None and found.failing is None


def test_what_cannot_be_constructed_is_said() -> None:
    network = build_network("one-way", states="A B C", transitions=[
        Rates("A", "B", "c", "k", name="e"), Rates("B", "C", "u", name="f"),
        Rates("C", "A", "v", "w", name="g")])
    found = searched(network, "d ln(p[A]/p[B]) / d barrier[e]", "barrier")
    assert found.skipped is not None and "one-way" in found.skipped
    assert found.place is not None and found.place.ratio is not None
    assert found.place.ratio > Fraction(9, 10)
    bridge = build_network("bridge", states="A B", transitions=[("A", "B", "c", "k", "e")])
    found = searched(bridge, "d p[A] / d barrier[e]", "barrier")
    assert found.skipped == "the transition is a bridge"


def test_the_search_is_deterministic() -> None:
    one, two = (searched(square_with_chord(), "d p[s1] / d barrier[e1_2]", "barrier")
                for _ in range(2))
    assert one == two


# -- false bounds ---------------------------------------------------------------------------


def numeric(network: Network, values: dict[str, Expression]) -> tuple[Any, list[list[float]]]:
    """Return (generator, rates) from the texts of the values: every rate is a symbol here."""
    at = {name: float(Fraction(value_text(value))) for name, value in values.items()}
    rates = [[at[expression_text(rate)] for rate in (t.forward, t.backward) if rate is not None]
             for t in network.transitions]
    return generator(network, rates), rates


def generator(network: Network, rates: list[list[float]]) -> Any:
    matrix = np.zeros((len(network.states),) * 2)
    for t, (forward, backward) in zip(network.transitions, rates, strict=True):
        for tail, head, rate in ((t.first, t.second, forward), (t.second, t.first, backward)):
            matrix[head, tail] += rate
            matrix[tail, tail] -= rate
    return matrix


def steady(network: Network, rates: list[list[float]]) -> Any:
    """Return p at 60 digits, so that differences of neighbouring points mean something."""
    matrix = mpmath.matrix(generator(network, [[0.0, 0.0] for _ in rates]).tolist())
    for t, (forward, backward) in zip(network.transitions, rates, strict=True):
        for tail, head, rate in ((t.first, t.second, forward), (t.second, t.first, backward)):
            matrix[head, tail] += rate
            matrix[tail, tail] -= rate
    size = matrix.rows
    for column in range(size):
        matrix[size - 1, column] = 1
    return mpmath.lu_solve(matrix, mpmath.matrix([0] * (size - 1) + [1]))


def response(network: Network, values: dict[str, Expression], e: int, quantity: Any) -> float:
    """Return the response to a barrier by a central difference at 60 digits."""
    with mpmath.workdps(60):
        exact = {n: Fraction(value_text(v)) for n, v in values.items()}
        base = [[mpmath.mpf(exact[expression_text(r)].numerator)
                 / exact[expression_text(r)].denominator for r in (t.forward, t.backward)
                 if r is not None] for t in network.transitions]
        step, found = mpmath.mpf(10) ** -15, []
        for sign in (1, -1):
            rates = [[w * mpmath.exp(-sign * step) for w in pair] if i == e else pair
                     for i, pair in enumerate(base)]
            found.append(quantity(steady(network, rates), rates))
        return float((found[0] - found[1]) / (2 * step))


def numeric_ratio(network: Network, values: dict[str, Expression], e: int) -> float:
    """Return left/right of the barrier bound for the logarithm of the ratio of the ends."""
    t = network.transitions[e]
    left = abs(response(network, values, e, lambda p, _: mpmath.log(p[t.first] / p[t.second])))
    _, rates = numeric(network, values)
    analysis = Analysis(network)
    largest = max(
        abs(sum((1 if ahead else -1) * float(np.log(rates[i][0] / rates[i][1]))
                for i, ahead in zip(cycle.transitions, cycle.along, strict=True)))
        for cycle in analysis.cycles if e in cycle.transitions)
    return left / float(np.tanh(largest / 4))


def refuted(network: Network, claim: Claim, count: int = 8) -> Refutation:
    made = certify_claims(Analysis(network), claim.left, [claim], count=count, workers=1)
    assert made.refuted is not None and made.claims == ()
    assert set(made.refuted.values) == {entry.name for entry in network.symbols}
    return made.refuted


def barrier_claim(network: Network, text: str) -> Claim:
    (claim,) = claims_for(read_quantity(text, network), Analysis(network), "barrier")
    return claim


@pytest.mark.parametrize("count", [1, 200])
def test_a_fifth_instead_of_a_quarter(count: int) -> None:
    network = square_with_chord()
    base = barrier_claim(network, "d ln(p[s1]/p[s2]) / d barrier[e1_2]")
    found = refuted(network, replace(base, right=(Term(ONE, CycleMaximum(0), Tanh(5)),)), count)
    (term,) = found.place.right
    assert term.divisor == 5 and term.g is not None
    left = response(network, dict(found.values), 0, lambda p, _: mpmath.log(p[0] / p[1]))
    assert abs(abs(left) - float(found.place.left)) < 1e-9
    assert abs(left) > float(mpmath.tanh(mpmath.log(float(term.g)) / 5)) + 1e-3


def test_the_shortest_cycle_instead_of_the_largest_force() -> None:
    network = square_with_chord()
    analysis = Analysis(network)
    shortest = min((c for c in analysis.cycles if 0 in c.transitions), key=lambda c: len(c.states))
    base = barrier_claim(network, "d ln(p[s1]/p[s2]) / d barrier[e1_2]")
    found = refuted(network, replace(base, right=(Term(ONE, OneCycle(shortest)),)))
    _, rates = numeric(network, dict(found.values))
    force = sum((1 if ahead else -1) * float(np.log(rates[e][0] / rates[e][1]))
                for e, ahead in zip(shortest.transitions, shortest.along, strict=True))
    left = response(network, dict(found.values), 0, lambda p, _: mpmath.log(p[0] / p[1]))
    assert abs(left) > abs(float(np.tanh(force / 4))) * (1 + 1e-9)


def current(network: Network, e: int) -> Any:
    t = network.transitions[e]
    return lambda p, rates: rates[e][0] * p[t.first] - rates[e][1] * p[t.second]


def test_currents_may_respond_more_than_the_perturbed_one() -> None:
    network = square_with_chord()
    left = divide(Response(Current(0), BarrierOf(2)), Response(Current(2), BarrierOf(2)))
    found = refuted(network, Claim("currents", left, (Term(ONE),), {}, "", ""), 1)
    values = dict(found.values)
    ratio = response(network, values, 2, current(network, 0)) / response(
        network, values, 2, current(network, 2))
    assert abs(ratio) > 1
    assert abs(abs(ratio) / float(found.place.left) - 1) < 1e-6


def test_traffic_may_respond_more_than_one() -> None:
    network = square_with_chord()
    left = Response(function("ln", Traffic(0)), BarrierOf(0))
    found = refuted(network, Claim("traffic", left, (Term(ONE),), {}, "", ""), 1)
    t = network.transitions[0]
    slope = response(network, dict(found.values), 0, lambda p, rates: mpmath.log(
        rates[0][0] * p[t.first] + rates[0][1] * p[t.second]))
    assert abs(slope) > 1 and abs(abs(slope) - float(found.place.left)) < 1e-9


def test_true_claims_are_not_refuted() -> None:
    network = square_with_chord()
    left = divide(Response(Current(0), BarrierOf(0)), Current(0))
    claim = Claim("current", left, (Term(ONE),), {}, "", "")
    made = certify_claims(Analysis(network), left, [claim], count=20, workers=1)
    assert made.refuted is None and made.claims[0].worst.ratio is not None
    assert Fraction(99, 100) < made.claims[0].worst.ratio <= 1
