"""Response curves as data: the curves they are compared with against closed forms, the table."""

import csv
import io
import math
from dataclasses import replace
from decimal import Decimal
from fractions import Fraction

import pytest
from curve_examples import GRID, below_hill, constant, curve, hill

from symbolic_response.control.curve_data import (
    CurveData,
    CurvePoint,
    balanced,
    curve_csv,
    decimal_text,
    logarithm,
    positions,
    saturating,
)
from symbolic_response.errors import EvaluationError, QuantityError
from symbolic_response.expressions.reader import read_expression

F = Fraction


@pytest.mark.parametrize("n", [1, 3, -2])
@pytest.mark.parametrize("half", [F(1), F(7, 5), F(1, 3)])
def test_a_hill_curve_is_its_own_saturating_curve(n: int, half: Fraction) -> None:
    data = hill(n, half)
    found = saturating(data)
    assert found.crossings == 1
    assert found.anchor == pytest.approx((float(half), 0.5))
    assert found.values == pytest.approx([float(point.q) for point in data.points], abs=1e-12)


def test_the_saturating_curve_is_the_integral_of_the_steepness() -> None:
    grid = tuple(F(2) ** F(-8) * F(257, 256) ** k for k in range(3000))
    data = replace(below_hill(), points=curve(
        lambda x: x**2 / (1 + x + x**2), lambda x: F(1), lambda x: 2 + x / (1 + x),
        tuple(F(round(float(x) * 10**9), 10**9) for x in grid)).points)
    golden = (1 + math.sqrt(5)) / 2  # where x^2 = 1 + x
    wanted = []
    for point in data.points:
        x = float(point.x)
        odds = (x / golden) ** 2 * (1 + x) / (1 + golden)
        wanted.append(odds / (1 + odds))
    assert saturating(data).values == pytest.approx(wanted, abs=1e-5)
    assert saturating(data).anchor == pytest.approx((golden, 0.5), rel=1e-5)


def test_without_driving() -> None:
    data = hill(2, F(3, 2))
    wanted = [float(point.x / (F(3, 2) + point.x)) for point in data.points]
    assert balanced(data, F(1)).values == pytest.approx(wanted, abs=1e-12)
    assert balanced(data, [F(1)] * len(data.points)).values == balanced(data, F(1)).values
    with pytest.raises(QuantityError, match="3 values of H"):
        balanced(data, [F(1)] * 3)


def test_a_curve_that_never_crosses_one_half() -> None:
    data = curve(lambda x: 1 / (1 + x) / 3, lambda x: -x / (1 + x) ** 2 / 3, lambda x: F(1))
    found = saturating(data)
    assert found.crossings == 0
    assert found.anchor == pytest.approx((float(GRID[0]), float(data.points[0].q)))
    assert found.values[0] == pytest.approx(float(data.points[0].q))
    assert all(a > b for a, b in zip(found.values, found.values[1:], strict=False))
    for q in (F(0), F(1)):
        assert set(saturating(constant(q)).values) == {float(q)}


def test_the_first_crossing_of_several_counts() -> None:
    qs = [F(1, 4), F(3, 4), F(1, 4), F(1, 2)]
    points = tuple(CurvePoint(F(k), q, F(0), F(1)) for k, q in enumerate(qs, 1))
    data = CurveData("c", "c", "p[A]", "p", False, points)
    found = saturating(data)
    assert found.crossings == 3
    assert found.anchor == (1.5, 0.5)


@pytest.mark.parametrize(("qs", "x"), [((F(0), F(3, 4)), 5 / 3), ((F(1, 3), F(1)), 1.25)])
def test_a_crossing_next_to_an_end_value(qs: tuple[Fraction, Fraction], x: float) -> None:
    points = tuple(CurvePoint(F(k), q, F(1), F(1)) for k, q in enumerate(qs, 1))
    assert saturating(CurveData("c", "c", "p", "p", False, points)).anchor == (
        pytest.approx(x), 0.5)


def test_real_parameters() -> None:
    xs = [read_expression(text) for text in ("-2*ln(2)", "0", "2*ln(3/2)", "3")]
    points = tuple(CurvePoint(x, F(1, k), F(-1, 9), F(1)) for k, x in enumerate(xs, 2))
    data = CurveData("E", "E", "p[A]", "p", False, points)
    assert positions(data) == pytest.approx([-2 * math.log(2), 0, 2 * math.log(1.5), 3])
    rows = list(csv.reader(io.StringIO(curve_csv(data))))
    assert [row[0] for row in rows[1:]] == ["-2*ln(2)", "0", "2*ln(3/2)", "3"]
    assert [row[1] for row in rows[1:]] == ["-1.38629436112", "0", "0.810930216216", "3"]
    twice = (points[0], points[0])
    with pytest.raises(EvaluationError, match="do not increase"):
        CurveData("E", "E", "p[A]", "p", False, twice)


@pytest.mark.parametrize(("change", "message"), [
    ({"points": hill(1).points[:1]}, "two points"),
    ({"points": tuple(reversed(hill(1).points))}, "do not increase"),
    ({"points": (CurvePoint(F(1), F(3, 2), F(0), F(1)),) * 2}, "is 3/2 at c = 1, not from 0 to 1"),
    ({"points": (CurvePoint(F(0), F(1), F(0), F(1)),) * 2}, "c = 0 has no logarithm"),
])
def test_what_is_no_curve_is_refused(change: dict[str, object], message: str) -> None:
    with pytest.raises((EvaluationError, QuantityError), match=message):
        replace(hill(1), **change)  # type: ignore[arg-type]


def test_the_table_is_exact() -> None:
    data = below_hill(rescaled=(F(1, 2), F(5)))
    head, *rows = csv.reader(io.StringIO(curve_csv(data)))
    assert head[::2] == ["c", "(mean[open] - (1/2))/(9/2)", "(d mean[open] / d ln c)/(9/2)",
                         "bound H*q*(1 - q)", "H", "covariance bound"]
    assert head[1::2] == [f"{name} (decimal)" for name in head[::2]]
    assert len(rows) == len(data.points)
    for row, point in zip(rows, data.points, strict=True):
        wanted = [point.x, point.q, point.sensitivity, point.steepness * point.q * (1 - point.q),
                  point.steepness, point.covariance]
        assert [F(entry) if entry else None for entry in row[::2]] == wanted
        for exact, decimal in zip(wanted, row[1::2], strict=True):
            assert (exact is None) == (decimal == "")
            if exact:
                assert abs(F(Decimal(decimal)) / exact - 1) < F(1, 10**11)
    assert curve_csv(hill(1)).startswith("c,c (decimal),")


def test_decimals_of_any_size() -> None:
    assert decimal_text(F(10**400)) == "1E+400"
    assert decimal_text(F(1, 10**400)) == "1E-400"
    assert decimal_text(F(-1, 3)) == "-0.333333333333"
    assert decimal_text(F(0)) == "0"
    assert logarithm(F(10**400)) == pytest.approx(400 * math.log(10))
    assert logarithm(1 + F(1, 10**20)) == pytest.approx(1e-20)
