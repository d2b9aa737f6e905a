"""Responses of a current to its own barrier and drive, against trees and W p = 0 on fractions."""

import random
from fractions import Fraction

import pytest
from random_networks import Numbers, random_numbers

from symbolic_response.bounds.enclose import enclose
from symbolic_response.bounds.evaluate import ClaimPoint
from symbolic_response.bounds.registry import claims_for
from symbolic_response.bounds.report import bound
from symbolic_response.bounds.sides import right_text
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.reader import read_expression
from symbolic_response.network import Barrier, Network, Rates, build_network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.values import Point


def sides(numbers: Numbers, e: int, kind: str) -> tuple[Fraction, Fraction, Fraction]:
    """Return |d J_e/d theta|, |J_e| or tau_e/2, and the share of trees that do not use e."""
    moves = [(Fraction(0), Fraction(0))] * len(numbers.transitions)
    moves[e] = ((Fraction(-1), Fraction(-1)) if kind == "barrier"
                else (Fraction(1, 2), Fraction(-1, 2)))
    p, dp = numbers.change(moves)
    a, b, w, v = numbers.transitions[e]
    x, y = moves[e]
    slope = w * (dp[a] + x * p[a]) - v * (dp[b] + y * p[b])
    current, traffic = w * p[a] - v * p[b], w * p[a] + v * p[b]
    trees = numbers.trees()
    free = sum((t for _, rates, t in trees if not rates & {2 * e, 2 * e + 1}), Fraction(0))
    share = free / sum(t for _, _, t in trees)
    return abs(slope), abs(current) if kind == "barrier" else traffic / 2, share


@pytest.mark.parametrize("seed", range(4))
def test_both_sides_on_random_networks(seed: int) -> None:
    """Range: Aslyamov & Esposito, Phys. Rev. Lett. 132, 037101 (2024); exact: derived here."""
    rng = random.Random(f"currents {seed}")
    tightest = Fraction(0)
    for _ in range(30):
        numbers = random_numbers(rng)
        network = numbers.network()
        analysis = Analysis(network)
        place = ClaimPoint(analysis, Point(network, {}))
        e = rng.randrange(len(numbers.transitions))
        for kind in ("barrier", "drive"):
            quantity = read_quantity(f"d current[t{e}] / d {kind}[t{e}]", network)
            exact, within = claims_for(quantity, analysis)
            left, size, share = sides(numbers, e, kind)
            assert (exact.name, within.name) == ("current-exact", "current-range")
            found = place.evaluate(exact)
            assert (found.left, found.right_value(), found.holds) == (left, size * share, True)
            found = place.evaluate(within)
            assert (found.left, found.right_value(), found.holds) == (left, size, True)
            tightest = max(tightest, left / size if size else Fraction(0))
    assert Fraction(1, 2) < tightest <= 1


RING = build_network("ring", states="A B C", transitions=[
    Rates("A", "B", "a", "b", name="e"), Rates("B", "C", "c", "d1", name="f"),
    Rates("C", "A", "g", name="h")])


def test_texts_and_sources() -> None:
    exact, within = claims_for(read_quantity("d current[h] / d drive[h]", RING), Analysis(RING))
    assert right_text(within, Analysis(RING)) == "traffic[h]/2"
    assert within.source == "Aslyamov & Esposito, Phys. Rev. Lett. 132, 037101 (2024)"
    assert exact.source == "derived here; see DEVELOPERS.md" and exact.equality
    assert right_text(exact, Analysis(RING)) == (
        "traffic[h]*(a*c + a*d1 + b*d1)/(2*(a*c + a*d1 + a*g + b*d1 + b*g + c*g))")


def test_a_bridge_carries_no_current() -> None:
    tree = build_network("tree", states="A B", transitions=[Rates("A", "B", "a", "b", name="e")])
    for kind in ("barrier", "drive"):
        exact, _ = claims_for(
            read_quantity(f"d current[e] / d {kind}[e]", tree), Analysis(tree))
        assert right_text(exact, Analysis(tree)) == "0"


def test_another_transition_is_refused() -> None:
    """abs(d J_a/d J_e) <= 1 is false: nothing is claimed about other transitions' barriers."""
    for by in ("barrier[f]", "drive[f]", "energy[A]", "ln a"):
        with pytest.raises(QuantityError, match="the same transition"):
            claims_for(read_quantity(f"d current[e] / d {by}", RING), Analysis(RING))


def energy_form() -> Network:
    return build_network("energy form", states={"A": "E", "B": "0", "C": "0"}, transitions=[
        Barrier("A", "B", "0", "F", name="e"), Barrier("B", "C", "1", name="f"),
        Barrier("C", "A", "0", "F/3", name="g")])


@pytest.mark.parametrize("kind", ["barrier", "drive"])
def test_a_point_with_irrational_rates(kind: str) -> None:
    """The identity is proved there by closed forms, the range by enclosures."""
    network = energy_form()
    report = bound(network, f"d current[e] / d {kind}[e]", {"E": "1/2", "F": 2})
    assert [row.evaluated.holds for row in report.rows if row.evaluated] == [True, True]
    exact, within = claims_for(
        read_quantity(f"d current[e] / d {kind}[e]", network), Analysis(network))
    at = {"E": read_expression("1/2"), "F": read_expression("2")}
    found = enclose(exact, Analysis(network), at)
    assert found.left is not None and found.right is not None
    assert Fraction(found.left[0]) <= Fraction(found.right[1])
    assert abs(Fraction(found.left[0]) / Fraction(found.right[0]) - 1) < Fraction(1, 10**19)
    assert enclose(within, Analysis(network), at).holds is True
