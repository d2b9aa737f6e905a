"""Sample points: exact, in range, rational positive rates, forces over all strata."""

from __future__ import annotations

import hashlib
from collections.abc import Iterator
from fractions import Fraction

import mpmath
import networkx as nx
import pytest
import sympy

from symbolic_response.certificates.axes import grid_number, value_text
from symbolic_response.certificates.sampling import Sampler
from symbolic_response.errors import EvaluationError, SizeLimitError, UndecidedError
from symbolic_response.expressions.text import expression_text
from symbolic_response.network import Barrier, Network, Rates, build_network
from symbolic_response.response.analysis import Analysis
from tests.benchmarks.networks import cube, square_with_chord

COUNT = 200


def energy_ring() -> Network:
    return build_network("energy ring", states={"A": "E_A", "B": "E_B", "C": "0"}, transitions=[
        Barrier("A", "B", "B_1", "F", name="e"), Barrier("B", "C", "B_2", "F/2 + G", name="f"),
        Barrier("C", "A", "0", name="g")])


def rooted() -> Network:
    return build_network("roots", states="A B C", transitions=[
        Rates("A", "B", "sqrt(c)*k", "k", name="e"), Rates("B", "C", "u + k", "c**(2/3)", name="f"),
        Rates("C", "A", "u", "x + 6", name="g")],
        symbols={"c": "positive", "k": "positive", "u": "positive", "x": "real"})


def exact(text: str) -> sympy.Expr:
    return sympy.sympify(text.replace("ln", "log"), rational=True)


def rates_at(network: Network, values: dict[str, str]) -> list[list[sympy.Rational]]:
    at = {sympy.Symbol(name): exact(text) for name, text in values.items()}
    names = {name: sympy.Symbol(name) for name in values}
    found = []
    for t in network.transitions:
        pair = []
        for rate in (t.forward, t.backward):
            assert rate is not None
            expression = sympy.sympify(expression_text(rate), locals=names, rational=True)
            pair.append(sympy.simplify(sympy.expand(expression.subs(at))))
        found.append(pair)
    return found


def forces(network: Network, rates: list[list[sympy.Rational]]) -> Iterator[float]:
    graph = nx.Graph()
    for e, t in enumerate(network.transitions):
        graph.add_edge(t.first, t.second, e=e)
    for cycle in nx.simple_cycles(graph):
        ratio = sympy.Integer(1)
        for a, b in zip(cycle, cycle[1:] + cycle[:1], strict=True):
            e = graph.edges[a, b]["e"]
            forward, backward = rates[e]
            ratio *= forward / backward if network.transitions[e].first == a else backward / forward
        yield abs(float(mpmath.log(mpmath.mpf(ratio.p) / ratio.q)))


@pytest.mark.parametrize("make", [square_with_chord, cube, energy_ring, rooted])
def test_rates_are_rational_and_positive(make: object) -> None:
    network = make()  # type: ignore[operator]
    sampler = Sampler(Analysis(network), "rates")
    for index in range(12):
        values = {n: value_text(v) for n, v in sampler.point(index).items()}
        for pair in rates_at(network, values):
            assert all(rate.is_Rational and rate > 0 for rate in pair)


@pytest.mark.parametrize("make", [square_with_chord, energy_ring, rooted])
def test_points_are_in_range(make: object) -> None:
    network = make()  # type: ignore[operator]
    sampler = Sampler(Analysis(network), "ranges")
    with mpmath.workdps(40):
        for index in range(COUNT):
            for name, value in sampler.point(index).items():
                entry = network.symbol(name)
                text = value_text(value)
                at = exact(text).evalf(40)
                assert entry.low <= Fraction(str(at)) <= entry.high
                assert not entry.positive or at > 0


def test_forces_spread_over_the_strata() -> None:
    network = square_with_chord()
    sampler = Sampler(Analysis(network), "forces")
    largest = []
    for index in range(COUNT):
        values = {n: value_text(v) for n, v in sampler.point(index).items()}
        rates = [[exact(values[expression_text(r)]) for r in (t.forward, t.backward)]
                 for t in network.transitions]
        largest.append(max(forces(network, rates)))
    near = [f for f in largest if f < 0.1]
    moderate = [f for f in largest if 0.1 <= f <= 5]
    large = [f for f in largest if f > 5]
    assert min(len(near), len(moderate), len(large)) >= COUNT // 8
    assert all(f < 0.3 for f in largest[1::4])


def test_energies_reach_all_strata() -> None:
    network = energy_ring()
    sampler = Sampler(Analysis(network), "forces")
    largest = [max(forces(network, rates_at(
        network, {n: value_text(v) for n, v in sampler.point(i).items()}))) for i in range(24)]
    assert any(f < 0.1 for f in largest[1::4])
    assert any(0.1 < f < 5 for f in largest[2::4])
    assert any(f > 5 for f in largest[3::4])


def test_the_first_draw_is_the_documented_rule() -> None:
    """Stratum 0: SHA-256 of "INDEX ATTEMPT WHAT SEED", modulo the grid numbers in the range."""
    network = square_with_chord()
    values = Sampler(Analysis(network), "a b").point(4)
    grid = [k for k in range(-64 * 12, 64 * 12)
            if Fraction(1, 1000) <= Fraction(2) ** (k // 64) * (1 + Fraction(k % 64, 64)) <= 1000]
    for name, value in values.items():
        digest = hashlib.sha256(f"4 0 {name} a b".encode()).hexdigest()
        place = grid[int(digest, 16) % len(grid)]
        number = Fraction(2) ** (place // 64) * (1 + Fraction(place % 64, 64))
        assert value_text(value) == str(number)
        assert grid_number(place) == number


def test_points_depend_on_seed_and_index_alone() -> None:
    network = cube()
    one, two = Sampler(Analysis(network), "s"), Sampler(Analysis(network), "s")
    other = Sampler(Analysis(network), "t")
    backwards = [two.point(index) for index in reversed(range(8))]
    points = [one.point(index) for index in range(8)]
    assert points == backwards[::-1]
    assert all(point != other.point(index) for index, point in enumerate(points))


def pair(forward: str, backward: str = "1", **symbols: object) -> Sampler:
    network = build_network("pair", states="A B", symbols=symbols or None,  # type: ignore[arg-type]
                            transitions=[Rates("A", "B", forward, backward, name="e")])
    return Sampler(Analysis(network), "0")


def table(sign: str, low: str, high: str) -> dict[str, object]:
    return {"sign": sign, "range": [low, high]}


def test_a_symbol_inside_and_outside_exponents_is_undecided() -> None:
    with pytest.raises(UndecidedError, match="F occurs inside and outside exponents"):
        pair("exp(F)*(F**2 + 1)", F="real")
    with pytest.raises(UndecidedError, match="U is positive and occurs in an exponent"):
        pair("exp(-U)", U="positive")
    with pytest.raises(UndecidedError, match="not rational"):
        pair("exp(F*k)", F="real", k="positive")
    with pytest.raises(UndecidedError, match="not rational"):
        pair("exp(1)*k")
    with pytest.raises(UndecidedError, match="not rational"):
        pair("sqrt(k + 1)")


def test_a_range_without_sampling_points() -> None:
    with pytest.raises(EvaluationError, match=r"range of k, 261/512 to .* holds no sampling point"):
        pair("k", k=table("positive", "261/512", "263/512"))
    with pytest.raises(EvaluationError, match="range of F"):
        pair("exp(F/2)", F=table("real", "1/1000", "1/500"))
    with pytest.raises(SizeLimitError, match="too wide"):
        pair("exp(F)", F=table("real", "-1e9", "1e9"))


def test_one_sampling_point_is_enough() -> None:
    sampler = pair("k", k=table("positive", "1/2", "65/128"))
    found = {value_text(sampler.point(index)["k"]) for index in range(30)}
    assert found == {"1/2", "65/128"}


def test_rates_that_are_seldom_or_never_positive() -> None:
    sampler = pair("k1 - k2")
    for index in range(20):
        values = {n: Fraction(value_text(v)) for n, v in sampler.point(index).items()}
        assert values["k1"] > values["k2"]
    never = pair("k1 - k2", k1=table("positive", "1", "2"), k2=table("positive", "3", "4"))
    with pytest.raises(EvaluationError, match=r"200 draws .* 'k1 - k2'"):
        never.point(0)


def test_plain_real_symbols_take_both_signs() -> None:
    sampler = pair("x + 6", x="real")
    found = [Fraction(value_text(sampler.point(index)["x"])) for index in range(40)]
    assert min(found) < 0 < max(found) and all(-5 <= x <= 5 for x in found)
