"""Critical points and global maxima against SymPy, dense sampling and functions made for it."""

from __future__ import annotations

import random
from fractions import Fraction
from math import comb

import flint
import numpy as np
import pytest
import sympy

from symbolic_response.control.extrema import Maximum, critical_points, maximum
from symbolic_response.control.rational import RationalFunction, rational_function
from symbolic_response.errors import EvaluationError

X = sympy.Symbol("x", positive=True)


def rational(top: list[int], bottom: list[int], root: int = 1, kind: str = "power",
             ) -> RationalFunction:
    return rational_function("x", kind, root, flint.fmpz_poly(top), flint.fmpz_poly(bottom))


def adair(coefficients: list[int]) -> RationalFunction:
    """Return the mean occupied fraction of sites with a binding polynomial."""
    n = len(coefficients) - 1
    return rational([k * c for k, c in enumerate(coefficients)], [n * c for c in coefficients])


def holds(pair: tuple[str, str] | None, value: float) -> bool:
    assert pair is not None
    low, high = (Fraction(text) for text in pair)
    assert low <= high and high - low <= max(abs(low), abs(high)) * Fraction(1, 10**20)
    return abs(float(low) - value) <= 1e-9 * max(1.0, abs(value))


@pytest.mark.parametrize("seed", range(8))
def test_critical_points_are_those_of_sympy(seed: int) -> None:
    choose = random.Random(seed)
    f = rational([choose.randint(-9, 9) for _ in range(5)],
                 [choose.randint(1, 9) for _ in range(5)])
    written = sympy.sympify(f.text(), locals={"x": X})
    slope = sympy.Poly(sympy.numer(sympy.cancel(sympy.diff(written, X))), X)
    expected = sorted(root for root, _ in slope.intervals(eps=Fraction(1, 10**30))
                      if (root[0] + root[1]) > 0)
    found = critical_points(f)
    assert len(found) == len(expected)
    second = sympy.diff(written, X, 2)
    for place, (low, high) in zip(found, expected, strict=True):
        assert place.y is not None
        assert place.y[0] <= high and low <= place.y[1]
        assert place.y[1] - place.y[0] <= Fraction(1, 10**20) * place.y[0]
        bend = second.subs(X, sympy.Rational(low + high) / 2)
        assert place.kind == ("minimum" if bend > 0 else "maximum")
    rough = [r.real for r in np.roots([float(c) for c in slope.all_coeffs()])
             if abs(r.imag) < 1e-9 and r.real > 0]
    assert np.allclose(sorted(rough), [float(Fraction(p.x[0])) for p in found if p.x])


@pytest.mark.parametrize("seed", range(6))
@pytest.mark.parametrize("absolute", [False, True])
def test_no_sampled_value_is_larger(seed: int, absolute: bool) -> None:
    choose = random.Random(50 + seed)
    f = rational([choose.randint(-9, 9) for _ in range(6)],
                 [choose.randint(1, 9) for _ in range(6)], choose.choice((1, 2)))
    low, high = Fraction(1, 16), Fraction(81)
    best = maximum(f, low, high, absolute=absolute)
    grid = [low * Fraction(1296) ** 0 * (1 + Fraction(k, 1)) ** 2 for k in range(36)]
    values = [f.value(x) for x in grid] + [f.value(high)]
    top = max(abs(v) if absolute else v for v in values)
    assert Fraction(best.value[1]) >= top
    dense = np.geomspace(0.25, 9, 20001) if f.root == 2 else np.geomspace(1 / 16, 81, 20001)
    numeric = np.polyval([float(c) for c in f.numerator.coeffs()[::-1]], dense) / np.polyval(
        [float(c) for c in f.denominator.coeffs()[::-1]], dense)
    assert holds(best.value, float(Fraction(best.value[0])))
    assert np.isclose((np.abs(numeric) if absolute else numeric).max(),
                      float(Fraction(best.value[0])), rtol=1e-6)


@pytest.mark.parametrize("n", [2, 3, 4, 5])
def test_steepest_point_of_independent_and_cooperative_sites(n: int) -> None:
    independent = adair([comb(n, k) for k in range(n + 1)])
    best = maximum(independent.sensitivity())
    assert (best.exact_value, best.places[0].exact_y) == (Fraction(1, 4), 1)
    cooperative = adair([1] + [0] * (n - 1) + [1])
    steep = maximum(cooperative.sensitivity(), absolute=True)
    assert (steep.exact_value, steep.attained) == (Fraction(n, 4), True)


def symmetric() -> RationalFunction:
    """Return a function with f(1/x) = f(x), two highest places and a low one between."""
    return rational([0, 1, -3, 1], [1, 2, 7, 2, 1])


def test_ties_at_irrational_places_are_exact() -> None:
    f = symmetric()
    best = maximum(f)
    assert len(best.places) == 2 and best.exact_value is None
    low, high = (float(Fraction(p.x[0])) for p in best.places if p.x)
    assert low * high == pytest.approx(1) and low < 1
    assert best.places[0].value == best.places[1].value == best.value


def test_ties_of_opposite_sign_and_near_ties() -> None:
    odd = rational([-1, 0, 1], [1, 0, 1]) * symmetric()  # f(1/x) = -f(x)
    both = maximum(odd, absolute=True)
    assert len(both.places) == 2 and {p.value[0][0] == "-" for p in both.places} == {True, False}
    assert not both.value[0].startswith("-")
    assert len(maximum(odd).places) == 1
    tilted = symmetric() + rational([0, 1], [1, 1]) * Fraction(1, 10**60)
    assert len(maximum(tilted).places) == 1
    assert Fraction(maximum(tilted).places[0].x[0]) > 1  # type: ignore[index]


def test_a_tie_of_an_end_with_a_place_inside() -> None:
    f = rational([0, 1], [1, 0, 1])  # 1/2 at 1, 2/5 at 1/2 and 2
    ends = maximum(f - Fraction(1, 2), "1/2", 2, absolute=True)
    assert [p.kind for p in ends.places] == ["end", "end"]
    assert ends.exact_value == Fraction(1, 10)
    inside = maximum((f - Fraction(2, 5)) * (f - Fraction(1, 2)) * -1, "1/2", 2)
    assert all(p.kind == "maximum" for p in inside.places) and len(inside.places) == 2
    assert inside.exact_value is None or inside.exact_value == Fraction(1, 400)
    assert holds(inside.value, 1 / 400)


def test_open_ends_count_as_limits() -> None:
    f = rational([0, 1], [1, 1])
    top = maximum(f)
    assert (top.exact_value, top.attained, top.places[0].kind) == (1, False, "limit")
    assert maximum(f, 1, 3).exact_value == Fraction(3, 4) and maximum(f, 1, 3).attained
    assert maximum(-f).exact_value == 0 and not maximum(-f).attained
    with pytest.raises(EvaluationError, match="unbounded"):
        maximum(rational([0, 0, 1], [1, 1]))
    assert maximum(rational([0, 0, -1], [1, 1])).exact_value == 0
    with pytest.raises(EvaluationError, match="unbounded"):
        maximum(rational([0, 0, -1], [1, 1]), absolute=True)


def test_constants_have_no_critical_points() -> None:
    f = rational([-3], [4])
    assert critical_points(f) == ()
    expected = Maximum(("0.75000000000000000000000000",) * 2, Fraction(3, 4), (), True, True)
    assert maximum(f, absolute=True) == expected
    assert maximum(rational([0], [1])).value == ("0", "0")


def test_poles_are_refused_where_they_lie() -> None:
    f = rational([1], [-2, 0, 1])
    with pytest.raises(EvaluationError, match=r"a pole at x = 1\.41421"):
        maximum(f, 1, 2)
    assert maximum(f, 2, 3).exact_value == Fraction(1, 2)
    with pytest.raises(EvaluationError, match="pole"):
        critical_points(rational([1], [-2, 1]), 2, 3)
    with pytest.raises(EvaluationError, match="empty"):
        maximum(f, 3, 2)


def test_inflections_and_multiple_roots() -> None:
    f = rational([-1, 3, -3, 1], [1])  # (x - 1)**3
    (only,) = critical_points(f)
    assert (only.kind, only.exact_y, only.value) == ("inflection", 1, ("0", "0"))
    (double,) = critical_points(rational([4, 0, -4, 0, 1], [1]))  # (x**2 - 2)**2
    assert (double.kind, double.exact_value, double.exact_y) == ("minimum", 0, None)


def test_a_critical_point_on_an_end_is_an_end() -> None:
    f = rational([0, 1], [1, 1]).sensitivity()
    assert critical_points(f, 1, 5) == ()
    assert [p.kind for p in maximum(f, 1, 5).places] == ["end"]
    hump = rational([0, 1], [2, 0, 0, 0, 1], 2)  # y/(y^4 + 2): steepest at y^4 = 2/3
    assert len(critical_points(hump, "1/2", 1)) == 1
    shifted = rational([0, 1], [3, 0, 1], 2)  # highest at y = sqrt(3), x = 3
    assert critical_points(shifted, 3, 5) == () and critical_points(shifted, 1, 3) == ()
    assert [p.kind for p in maximum(shifted, 3, 5).places] == ["end"]
    assert holds(maximum(shifted, 3, 5).value, 1 / (2 * 3**0.5))


def test_real_symbols_in_exponents_and_outside() -> None:
    f = rational([0, 1], [1, 0, 2], 2, "exponential")  # y/(1 + 2y^2), y = exp(x/2): x = -ln 2
    (top,) = critical_points(f)
    assert top.kind == "maximum" and holds(top.x, -np.log(2.0))
    assert [p.kind for p in maximum(f, "-ln(2)", 3).places] == ["end"]
    assert [p.kind for p in maximum(f, 0, 3).places] == ["end"]
    assert [p.kind for p in maximum(f, "-5", "1/3").places] == ["maximum"]
    centred = rational([0, 1], [1, 0, 1], 1, "exponential")
    assert critical_points(centred)[0].x == ("0", "0")
    plain = rational([0, -3, 0, 1], [1], 1, "plain")
    assert [(p.kind, p.exact_y) for p in critical_points(plain)] == [("maximum", -1),
                                                                     ("minimum", 1)]
    assert maximum(plain, -3, 3).exact_value == 18
    with pytest.raises(EvaluationError, match="unbounded"):
        maximum(plain)
    with pytest.raises(EvaluationError, match="unbounded"):
        maximum(-plain)
    assert maximum(rational([0, 0, -1], [1], 1, "plain")).exact_value == 0
