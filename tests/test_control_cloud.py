"""Clouds: every point exact and below the envelope, against a computation of its own."""

import csv
import io
import math
from fractions import Fraction

import pytest

from symbolic_response.bounds.decide import Weighted, holds
from symbolic_response.certificates.sampling import Sampler
from symbolic_response.control import cloud as module
from symbolic_response.control.cloud import Cloud, cloud, cloud_csv
from symbolic_response.errors import (
    AssignmentError,
    EvaluationError,
    QuantityError,
    RefutedError,
)
from symbolic_response.network import Rates, build_network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.values import Point
from tests.benchmarks.networks import square_with_chord

F = Fraction
SQUARE = Analysis(square_with_chord())
LN = "d ln(p[s1]/p[s3]) / d barrier[e1_3]"
SET = "d p[s1, s2] / d barrier[e1_2]"
CYCLES = [("s1", "s2", "s3"), ("s1", "s3", "s4"), ("s1", "s2", "s3", "s4")]


@pytest.fixture(scope="module")
def clouds() -> dict[str, Cloud]:
    return {text: cloud(SQUARE, text, 60, workers=1) for text in (LN, SET)}


def rates_at(index: int) -> dict[tuple[str, str], Fraction]:
    """Return the rate from one state to another, by their names, at a sample point."""
    point = Point(SQUARE.network, Sampler(SQUARE, "0").point(index))
    states = [state.name for state in SQUARE.network.states]
    found = {}
    for e, t in enumerate(SQUARE.network.transitions):
        found[states[t.first], states[t.second]] = point.rate(e, False)
        found[states[t.second], states[t.first]] = point.rate(e, True)
    return found


def largest_ratio(rates: dict[tuple[str, str], Fraction], e: set[str]) -> Fraction:
    """Return exp of the largest force over the cycles through a transition, by hand."""
    largest = F(1)
    for cycle in CYCLES:
        steps = list(zip(cycle, (*cycle[1:], cycle[0]), strict=True))
        if e in [set(step) for step in steps]:
            ratio = F(1)
            for a, b in steps:
                ratio *= rates[a, b] / rates[b, a]
            largest = max(largest, ratio, 1 / ratio)
    return largest


@pytest.mark.parametrize(("text", "e"), [(LN, {"s1", "s3"}), (SET, {"s1", "s2"})])
def test_points_are_exact(clouds: dict[str, Cloud], text: str, e: set[str]) -> None:
    found = clouds[text]
    assert found.count == 60 and [p.made for p in found.points[:60]] == [False] * 60
    for index, point in enumerate(found.points[:60]):
        place = Point(SQUARE.network, Sampler(SQUARE, "0").point(index))
        response = place.value(read_quantity(text, SQUARE.network))
        p = place.value(read_quantity("p[s1, s2]", SQUARE.network))
        assert response is not None and p is not None
        assert point.value == abs(response) / (1 if text == LN else p * (1 - p))
        assert point.g == largest_ratio(rates_at(index), e)


@pytest.mark.parametrize("text", [LN, SET])
def test_points_are_below_the_envelope(clouds: dict[str, Cloud], text: str) -> None:
    for point in clouds[text].points:
        assert 1 <= point.end_pair <= point.g
        assert holds(point.value, [Weighted(F(1), point.g)])
        assert holds(point.value, [Weighted(F(1), point.end_pair)])


def test_points_are_made_near_the_envelope(clouds: dict[str, Cloud]) -> None:
    made = [point for point in clouds[LN].points if point.made]
    assert clouds[LN].skipped is None
    assert {point.g for point in made} == {F(4) ** k for k in range(1, 9)}
    for point in made:
        root = F(2) ** (point.g.numerator.bit_length() // 2)  # sqrt of a power of 4
        assert root**2 == point.g
        assert point.value > F(999, 1000) * (root - 1) / (root + 1)


def test_forces_for_drawing(clouds: dict[str, Cloud]) -> None:
    for point in clouds[LN].points:
        assert point.force == pytest.approx(math.log(point.g), rel=1e-9, abs=1e-15)
        assert point.end_pair_force == pytest.approx(math.log(point.end_pair), abs=1e-12)


def test_the_number_of_workers_changes_nothing() -> None:
    done: list[tuple[int, int]] = []
    alone = cloud(SQUARE, LN, 260, "seed", 1, lambda *step: done.append(step))
    both = cloud(SQUARE, LN, 260, "seed", 2)
    assert alone == both
    assert done == [(125, 260), (250, 260), (260, 260)]
    assert cloud(SQUARE, LN, 3, "other", 1).points[:3] != alone.points[:3]
    assert cloud(SQUARE, LN, 3, "seed", 1).points[:3] == alone.points[:3]


def test_what_the_cloud_says(clouds: dict[str, Cloud]) -> None:
    found = clouds[SET]
    assert found.value_text == (
        "abs(d p[s1, s2] / d barrier[e1_2])/(p[s1, s2]*(1 - p[s1, s2]))")
    assert found.value_latex.startswith(r"\left|\partial \pi_{\{1,2\}} \, / \, \partial B_{")
    assert found.value_latex.endswith(r"\left[\pi_{\{1,2\}} (1 - \pi_{\{1,2\}})\right]")
    assert (found.transition, found.seed) == ("e1_2", "0")
    assert clouds[LN].value_latex.endswith(r"\right|")


def test_the_table_is_exact(clouds: dict[str, Cloud]) -> None:
    found = clouds[SET]
    head, *rows = csv.reader(io.StringIO(cloud_csv(found)))
    assert head[0] == "exp(force_max[e1_2])" and head[2] == found.value_text
    assert [(F(row[0]), F(row[2]), F(row[4]), row[6]) for row in rows] == [
        (p.g, p.value, p.end_pair, "constructed" if p.made else "sampled") for p in found.points]
    for row, point in zip(rows, found.points, strict=True):
        assert float(row[1]) == pytest.approx(point.force)
        assert float(row[3]) == pytest.approx(float(point.value))


def network(*backward: str | None) -> Analysis:
    names = ["A", "B", "C"]
    rates = [Rates(a, b, f"k_{a}", *([back] if back else []), name=f"{a}{b}")
             for a, b, back in zip(names, [*names[1:], names[0]], backward, strict=True)]
    tail = Rates("A", "T", "u", "v", name="tail")
    values = {"a": {"B": "h"}, "one": dict.fromkeys([*names, "T"], 1), "b": {"A": -1, "T": 2}}
    used = ["k_A", "k_B", "k_C", "u", "v", *(name for name in backward if name)]
    symbols = {"h": {"sign": "real", "range": ["1", "2"]}, **{name: {} for name in used}}
    return Analysis(build_network("ring", states="A B C T", transitions=[*rates, tail],
                                  observables=values, symbols=symbols))


def test_observables_and_ratios() -> None:
    ring = network("l_A", "l_B", "l_C")
    shown = {text: cloud(ring, f"d {text} / d barrier[AB]", 20, workers=1) for text in (
        "mean[b]", "mean[a]", "(p[A]/p[B])", "(p[A] + 2*p[B])")}
    for found in shown.values():
        assert all(holds(point.value, [Weighted(F(1), point.g)]) for point in found.points)
    assert r"\langle b \rangle + 1" in shown["mean[b]"].value_latex
    assert r"\max(" in shown["mean[a]"].value_latex
    assert r"\partial \left(" in shown["(p[A] + 2*p[B])"].value_latex


@pytest.mark.parametrize(("analysis", "text", "message"), [
    (network("l_A", None, "l_C"), "d p[A] / d barrier[AB]",
     "^a one-way transition in a cycle through AB makes its largest force infinite"),
    (network("l_A", "l_B", "l_C"), "d p[A] / d barrier[tail]", "^tail is a bridge"),
    (network("l_A", "l_B", "l_C"), "d mean[one] / d barrier[AB]", "^a constant observable"),
    (network("l_A", "l_B", "l_C"), "d p[A] / d drive[AB]", "'barrier' does not apply"),
    (SQUARE, "p[s1]", "does not apply"),
])
def test_what_has_no_cloud_is_refused(analysis: Analysis, text: str, message: str) -> None:
    with pytest.raises(QuantityError, match=message) as caught:
        cloud(analysis, text, 5, workers=1)
    assert "\n" not in str(caught.value)


def test_a_one_way_transition_elsewhere_is_no_obstacle() -> None:
    ring = Analysis(build_network("two rings", states="A B C D", transitions=[
        Rates("A", "B", "a1", "a2", name="AB"), Rates("B", "A", "b1", "b2", name="BA"),
        Rates("B", "C", "c1", name="BC"), Rates("C", "D", "d1", name="CD"),
        Rates("D", "B", "e1", name="DB")]))
    found = cloud(ring, "d ln(p[A]/p[B]) / d barrier[AB]", 20, workers=1)
    assert len(found.points) == 20 and found.skipped is not None
    assert all(holds(point.value, [Weighted(F(1), point.g)]) for point in found.points)


def test_counts_and_seeds_that_cannot_be() -> None:
    with pytest.raises(QuantityError, match="one point or more"):
        cloud(SQUARE, LN, 0)
    with pytest.raises(AssignmentError, match="UTF-8"):
        cloud(SQUARE, LN, 5, "\ud800")


def test_a_point_above_the_envelope_is_an_error(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(module, "holds", lambda left, right: holds(4 * left, right))
    with pytest.raises(RefutedError, match=r"^barrier is refuted at W_1_2 = .*exp\(F\) is"):
        cloud(SQUARE, LN, 40, workers=1)


def test_a_range_without_points_is_refused() -> None:
    broken = Analysis(build_network("pair", states="A B", transitions=[
        Rates("A", "B", "x - 5", "y", name="one"), Rates("A", "B", "z", "y", name="two")],
        symbols={"x": {"range": ["1", "2"]}, "y": {}, "z": {}}))
    with pytest.raises(EvaluationError, match="200 draws"):
        cloud(broken, "d p[A] / d barrier[one]", 5, workers=1)
