"""Limits on the steepness: for all forces, at points, read backwards.

Oracle for responses: W p' = -W' p on fractions, no trees.
"""

import math
import random
from fractions import Fraction
from itertools import pairwise

import pytest
from random_networks import Numbers, random_numbers, rate, ring

from symbolic_response.control.at_points import Limit, Place
from symbolic_response.control.changes import change_of
from symbolic_response.control.covariances import observable_limits
from symbolic_response.control.decomposition import LinearForm, linear_form
from symbolic_response.control.family import classes_of, family_of
from symbolic_response.control.program import optimum
from symbolic_response.control.steepness import (
    FORCE,
    NO_DRIVING,
    NO_FORCE,
    Reading,
    breakpoints,
    forms,
    limit_at,
    read_backwards,
)
from symbolic_response.errors import EvaluationError, QuantityError
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.tree import ONE, Number, number
from symbolic_response.network import Network, Rates, build_network
from symbolic_response.network.quantities import BySymbol
from symbolic_response.response.analysis import Analysis

F = Fraction
LN_C = BySymbol("c", True)
Moves = list[tuple[Fraction, Fraction]]


def with_powers(numbers: Numbers, moves: Moves) -> Network:
    """Return a network whose rates are numbers times powers of c, the rates at c = 1."""
    names = "ABCDEFGH"[: numbers.size]
    return build_network("powers", states=list(names), symbols={"c": {}}, transitions=[
        Rates(names[a], names[b], f"{w}*c**({x})", f"{v}*c**({y})" if v else None, name=f"t{e}")
        for e, ((a, b, w, v), (x, y)) in enumerate(zip(numbers.transitions, moves, strict=True))])


def at_equal(found: tuple[LinearForm, ...], t: Fraction) -> Fraction:
    """Return the minimum of forms where all t are equal."""
    pairs = [form.numbers() for form in found]
    return min(pair[0] + t * sum(pair[1].values(), F(0)) for pair in pairs if pair is not None)


def steered_ring() -> Analysis:
    """A ring of four; c multiplies both rates out of state 1 and the rates 2 -> 3 and 4 -> 3."""
    return Analysis(build_network("ring", states=["s1", "s2", "s3", "s4"], symbols={"c": {}},
                                  transitions=[
        Rates("s1", "s2", "c", "2", name="a"), Rates("s2", "s3", "3*c", "1", name="b"),
        Rates("s3", "s4", "1", "5*c", name="d"), Rates("s4", "s1", "7", "c", name="e")]))


# -- forms -----------------------------------------------------------------------------------------


def test_forms_of_a_ring() -> None:
    analysis = steered_ring()
    network = analysis.network

    def texts(**options: bool) -> set[str]:
        return {form.text(network) for form in forms(analysis, LN_C,
                                                     family_of(analysis, **options))}

    assert texts(single=True, directed=False) == {"2 + t[a] + t[e]"}
    assert texts(single=True) == {"2 + t[a] + t[e]", "3"}
    (text,) = texts()
    assert text in ("2 + t[a, e]", "2 + t[b, d]")


def test_two_triangles_that_share_a_state() -> None:
    network = build_network("bow", states=list("ABCDE"), symbols={"c": {}}, transitions=[
        Rates("A", "B", "c", "2*c"), Rates("B", "C", "3*c", "c"), Rates("C", "A", "c", "c"),
        Rates("A", "D", "1", "2"), Rates("D", "E", "5", "1"), Rates("E", "A", "1", "1")])
    analysis = Analysis(network)
    (form,) = forms(analysis, LN_C)
    assert form.text(network) == "0" and form.decomposition.count == 1
    assert limit_at(analysis, LN_C, {"c": number(3)}).high == 0
    assert read_backwards([form], F(1, 100)) == Reading(NO_DRIVING)


@pytest.mark.parametrize("seed", range(6))
def test_forms_are_least_where_all_t_are_equal(seed: int) -> None:
    """Exactly, between breakpoints too; at other t they are no smaller than the least limit."""
    rng = random.Random(f"forms {seed}")
    numbers = ring(rng, 4) if seed == 0 else random_numbers(rng)
    moves = [(F(rng.randint(-2, 2)), F(rng.randint(-2, 2))) for _ in numbers.transitions]
    analysis = Analysis(with_powers(numbers, moves))
    family, change = family_of(analysis), change_of(analysis, LN_C).numbers
    found = forms(analysis, LN_C)
    for k in range(17):
        t = F(k, 16)
        assert at_equal(found, t) == optimum(family, change, [t] * len(family.bundles)).value
    classes = classes_of(family, analysis)
    for _ in range(6):
        values = [F(rng.randint(0, 64), 64) for _ in classes]
        t = [values[c] for c in classes]
        places = dict(zip(family.bundles, t, strict=True))
        limit = min(pair[0] + sum((places[part] * slope for part, slope in pair[1].items()), F(0))
                    for pair in (form.numbers() for form in found) if pair is not None)
        assert limit >= optimum(family, change, t).value


def test_breakpoints_are_exact() -> None:
    analysis = steered_ring()
    family = family_of(analysis, single=True)
    change = change_of(analysis, LN_C).numbers
    assert F(1, 2) in breakpoints(family, change)
    bends = [F(0), *breakpoints(family, change), F(1)]
    for low, high in pairwise(bends):
        values = [optimum(family, change, [t] * len(family.bundles)).value
                  for t in (low, (low + high) / 2, high)]
        assert values[0] + values[2] == 2 * values[1]


def test_bundles_with_the_same_cycles_share_t() -> None:
    analysis = steered_ring()
    assert set(classes_of(family_of(analysis), analysis)) == {0}
    chord = Analysis(build_network("chord", states=list("ABCD"), transitions=[
        Rates(a, b, "1", "2") for a, b in ("AB", "BC", "CD", "DA", "AC")]))
    family = family_of(chord)
    numbers = dict(zip(family.bundles, classes_of(family, chord), strict=True))
    assert numbers[(0,)] == numbers[(1,)] != numbers[(2,)] == numbers[(3,)]
    assert numbers[(0, 1)] == numbers[(0,)] and numbers[(4,)] not in (numbers[(0,)], numbers[(2,)])


def test_forms_of_a_change_that_is_not_a_number() -> None:
    network = build_network("leak", states=["A", "B", "C"], symbols={"c": {}}, transitions=[
        Rates("A", "B", "2 + c", "c", name="one"), Rates("B", "C", "1", "3", name="two"),
        Rates("C", "A", "c", "2 + c", name="three")])
    analysis = Analysis(network)
    found = forms(analysis, LN_C)
    assert all(form.numbers() is None for form in found)
    place = Place(analysis, {"c": read_expression("2/3")})
    least = limit_at(analysis, LN_C, place)
    assert all(place.form(form)[1] >= least.low for form in found)
    with pytest.raises(QuantityError, match="depends on symbols"):
        read_backwards(found, F(1))


# -- read backwards --------------------------------------------------------------------------------


def test_a_measured_steepness_read_backwards() -> None:
    analysis = steered_ring()
    found = forms(analysis, LN_C)  # 2 + t
    assert read_backwards(found, F(2)) == Reading(NO_FORCE)
    assert read_backwards(found, F(3001, 1000)) == Reading(NO_DRIVING)
    assert read_backwards(found, F(3)) == Reading(FORCE, F(1), None)
    reading = read_backwards(found, F(13, 5))
    assert (reading.verdict, reading.t) == (FORCE, F(3, 5)) and reading.force is not None
    low, high = map(float, reading.force)
    assert low == pytest.approx(math.log(16)) == pytest.approx(high)
    single = forms(analysis, LN_C, family_of(analysis, single=True))  # min(2 + 2 t, 3)
    assert read_backwards(single, F(5, 2)).t == F(1, 4)
    assert read_backwards(single, F(3)).t == F(1, 2)
    assert read_backwards(single, F(4)).verdict == NO_DRIVING


@pytest.mark.parametrize("seed", range(4))
def test_reading_backwards_inverts_the_limit(seed: int) -> None:
    rng = random.Random(f"backwards {seed}")
    numbers = ring(rng, 4)
    moves = [(F(rng.randint(-2, 2)), F(rng.randint(-2, 2))) for _ in numbers.transitions]
    found = forms(Analysis(with_powers(numbers, moves)), LN_C)
    for k in range(1, 40):
        h = F(k, 7)
        reading = read_backwards(found, h)
        if reading.t is None:
            assert (reading.verdict == NO_FORCE) == (h <= at_equal(found, F(0)))
            assert (reading.verdict == NO_DRIVING) == (h > at_equal(found, F(1)))
        else:
            assert at_equal(found, reading.t) == h
            assert at_equal(found, reading.t - F(1, 10**9)) < h


# -- at points -------------------------------------------------------------------------------------


def holds(numbers: Numbers, moves: Moves, limit: Limit, place: Place,
          rng: random.Random) -> float:
    """Check both limits for random observables; return the largest response over the limit."""
    p, dp = numbers.change(moves)
    rises = [change / value for change, value in zip(dp, p, strict=True)]
    spread = max(rises) - min(rises)
    assert spread <= limit.high and limit.low <= limit.high < limit.low + F(1, 10**15)
    for _ in range(3):
        values = [F(rng.randint(0, 8), 8) for _ in p]
        mean = sum((x * q for x, q in zip(p, values, strict=True)), F(0))
        response = abs(sum((x * q for x, q in zip(dp, values, strict=True)), F(0)))
        assert response <= limit.high * mean * (1 - mean)
        both = observable_limits(place, limit, values)
        assert response <= both.covariance <= both.range <= limit.high * mean * (1 - mean)
    return float(spread / limit.high) if limit.high else 0.0


@pytest.mark.parametrize("seed", range(10))
def test_never_above_on_random_networks(seed: int) -> None:
    rng = random.Random(f"points {seed}")
    largest = 0.0
    for _ in range(12):
        numbers = ring(rng, rng.randint(2, 4)) if rng.random() < 0.3 else random_numbers(rng)
        weights = (-1, 0, 0, 1, 1, 2)
        moves = [(F(rng.choice(weights)), F(rng.choice(weights))) for _ in numbers.transitions]
        moves[0] = (F(1), moves[0][1])
        analysis = Analysis(with_powers(numbers, moves))
        place = Place(analysis, {"c": ONE})
        limit = limit_at(analysis, LN_C, place)
        largest = max(largest, holds(numbers, moves, limit, place, rng))
    assert 0.3 < largest <= 1


FIXED = {
    "ring": ([(0, 1), (1, 2), (2, 3), (3, 0)],
             [(1, 0), (1, 0), (0, 1), (0, 1)]),
    "chord": ([(0, 1), (1, 2), (2, 3), (3, 0), (0, 2)],
              [(1, 1), (1, 1), (0, 1), (0, 0), (1, -1)]),
    "ladder": ([(0, 1), (1, 2), (3, 4), (4, 5), (0, 3), (1, 4), (2, 5)],
               [(1, 0), (1, 0), (1, 0), (1, 0), (0, 0), (0, 0), (1, 1)]),
}


@pytest.mark.parametrize("name", FIXED)
def test_never_above_on_fixed_networks(name: str) -> None:
    rng = random.Random(f"fixed {name}")
    ends, powers = FIXED[name]
    moves = [(F(x), F(y)) for x, y in powers]
    largest = 0.0
    for count in range(60):
        octaves = 1 + count % 8
        numbers = Numbers(1 + max(map(max, ends)), tuple(
            (a, b, rate(rng, octaves), rate(rng, octaves)) for a, b in ends))
        analysis = Analysis(with_powers(numbers, moves))
        place = Place(analysis, {"c": ONE})
        limit = limit_at(analysis, LN_C, place)
        largest = max(largest, holds(numbers, moves, limit, place, rng))
    assert 0.5 < largest <= 1


def test_a_limit_that_is_reached() -> None:
    """Two transitions between two states, 4, 1 and 1, 4: the response is tanh(ln(16)/4) = 3/5."""
    network = build_network("pair", states=["A", "B"], symbols={"c": {}}, transitions=[
        Rates("A", "B", "4*c", "c", name="one"), Rates("A", "B", "1", "4", name="two")])
    limit = limit_at(Analysis(network), LN_C, {"c": ONE})
    assert limit.low == limit.high == F(3, 5) and limit.error == 0
    assert limit.t == (((0,), (F(3, 5), F(3, 5))),)


def test_a_one_way_step_has_an_infinite_force() -> None:
    network = build_network("wheel", states=["A", "B", "C"], symbols={"c": {}}, transitions=[
        Rates("A", "B", "c"), Rates("B", "C", "2"), Rates("C", "A", "3")])
    limit = limit_at(Analysis(network), LN_C, {"c": ONE})
    assert limit.low == limit.high == 1 and all(pair == (1, 1) for _, pair in limit.t)


def test_irrational_forces_and_changes() -> None:
    """Enclosed by balls; the same as by floats."""
    network = build_network("warm", states=["A", "B"], symbols={"c": {}, "F": {"sign": "real"}},
                            transitions=[Rates("A", "B", "(1 + c)*exp(F)", "1 + c", name="one"),
                                         Rates("A", "B", "1", "2", name="two")])
    analysis = Analysis(network)
    values = {"c": read_expression("sqrt(2)"), "F": read_expression("1")}
    limit = limit_at(analysis, LN_C, values)
    share = math.sqrt(2) / (1 + math.sqrt(2))
    assert float(limit.high) == pytest.approx(share * math.tanh((1 + math.log(2)) / 4))
    assert 0 < limit.high - limit.low < F(1, 10**15) and limit.error > 0
    (form,) = forms(analysis, LN_C)
    low, high = Place(analysis, values).form(form)
    assert low < limit.high and limit.low < high and high - low < F(1, 10**15)
    slope = limit_at(analysis, BySymbol("F"), values)
    assert float(slope.high) == pytest.approx(1) and slope.error == 0


def test_the_pieces_of_a_limit_give_it() -> None:
    analysis = steered_ring()
    place = Place(analysis, {"c": read_expression("7/5")})
    limit = limit_at(analysis, LN_C, place)
    assert place.form(linear_form(limit.decomposition, analysis))[1] == limit.high
    assert limit.family.complete
    assert all(isinstance(piece.amount, Number) for piece in limit.decomposition.bundles)


def test_forms_limit_at_a_point() -> None:
    """One cycle: all t are equal, and the minimum of the forms is the least limit."""
    analysis = steered_ring()
    found = forms(analysis, LN_C)
    place = Place(analysis, {"c": read_expression("9/5")})
    limit = limit_at(analysis, LN_C, place)
    assert place.least(found) == (limit.low, limit.high)


def test_a_point_without_positive_rates() -> None:
    network = build_network("minus", states=["A", "B"], symbols={"c": {}}, transitions=[
        Rates("A", "B", "2 - c", "1", name="one"), Rates("A", "B", "c", "1", name="two")])
    with pytest.raises(EvaluationError, match="not positive"):
        limit_at(Analysis(network), LN_C, {"c": number(3)})
