"""Decimal enclosures, against mpmath at 150 digits and against exact fractions."""

from fractions import Fraction

import mpmath
import pytest
from hypothesis import given
from hypothesis import strategies as st

from symbolic_response.errors import EvaluationError, UndecidedError
from symbolic_response.expressions.enclosure import decimal_enclosure, sign_of_constant
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.tree import ZERO, Expression, Number, function, negate

TABLE = {
    "exp(1)": lambda m: m.e,
    "ln(2)": lambda m: m.log(2),
    "sqrt(2)": lambda m: m.sqrt(2),
    "-ln(3/2)**3": lambda m: -m.log(m.mpf(3) / 2) ** 3,
    "exp(-1/2) - 1": lambda m: m.exp(-m.mpf(1) / 2) - 1,
    "exp(1/10**30) - 1": lambda m: m.expm1(m.mpf(10) ** -30),
    "ln(1 + 1/10**60)": lambda m: m.log1p(m.mpf(10) ** -60),
    "exp(200*ln(10)/3)": lambda m: m.power(10, m.mpf(200) / 3),
    "exp(1000)": lambda m: m.exp(1000),
    "-exp(-1000)": lambda m: -m.exp(-1000),
    "exp(10**20)": lambda m: m.exp(m.mpf(10) ** 20),
    "exp(-10**50)": lambda m: m.exp(-m.mpf(10) ** 50),
    "1/(exp(10**6) - 1)": lambda m: 1 / (m.exp(10**6) - 1),
    "sqrt(10**40 + 1) - 10**20": lambda m: 1 / (m.sqrt(m.mpf(10) ** 40 + 1) + m.mpf(10) ** 20),
    "2**(1/3)*3**(-5/7)": lambda m: m.cbrt(2) * m.power(3, -m.mpf(5) / 7),
    "exp(exp(3)) - exp(exp(3) - 1/10**25)":
        lambda m: -m.exp(m.exp(3)) * m.expm1(-m.mpf(10) ** -25),
    "1/3": lambda m: m.mpf(1) / 3,
    "-10**30": lambda m: -m.mpf(10) ** 30,
    "7/10**12": lambda m: m.mpf(7) / 10**12,
    "99999999999999999999999999/10**5": lambda m: m.mpf(10**26 - 1) / 10**5,
}


@pytest.mark.parametrize("text", TABLE)
def test_constants(text: str) -> None:
    """Oracle: mpmath at 150 digits, written with other functions than the text."""
    low, high = decimal_enclosure(read_expression(text))
    with mpmath.workdps(150):
        bottom, top, value = mpmath.mpf(low), mpmath.mpf(high), TABLE[text](mpmath.mp)
        slack = abs(value) * mpmath.mpf(10) ** -50
        assert bottom - slack <= value <= top + slack
        assert top - bottom <= mpmath.mpf(10) ** -20 * min(abs(bottom), abs(top))


@given(st.fractions(), st.integers(-60, 60))
def test_rational_numbers_are_enclosed_exactly(value: Fraction, shift: int) -> None:
    """Oracle: exact comparison of fractions."""
    value *= Fraction(10) ** shift
    if value == 0:
        with pytest.raises(UndecidedError):
            decimal_enclosure(Number(value))
        return
    low, high = map(Fraction, decimal_enclosure(Number(value)))
    assert low <= value <= high
    assert high - low <= abs(value) * Fraction(1, 10**20)
    assert sign_of_constant(Number(value)) == (1 if value > 0 else -1)


@pytest.mark.parametrize("distance", [Fraction(s, 10**60) for s in (-1, 1)])
@pytest.mark.parametrize("whole", range(2, 14))
def test_ends_are_rounded_outwards(whole: int, distance: Fraction) -> None:
    """Built from the answer: a value nearer to a short decimal than the first precision sees."""
    value = whole + distance
    node = function("exp", function("ln", Number(value)))
    low, high = decimal_enclosure(node)
    assert Fraction(low) <= value <= Fraction(high)
    low, high = decimal_enclosure(negate(node))
    assert Fraction(low) <= -value <= Fraction(high)


@pytest.mark.parametrize(
    "text",
    ["sqrt(2)*sqrt(3) - sqrt(6)", "ln(6) - ln(2) - ln(3)", "exp(ln(7)) - 7", "0",
     "1/(exp(ln(7)) - 7)", "ln(exp(ln(7)) - 7)"],
)
def test_what_cannot_be_told_from_zero_is_undecided(text: str) -> None:
    with pytest.raises(UndecidedError) as caught:
        decimal_enclosure(read_expression(text))
    assert "\n" not in str(caught.value)
    with pytest.raises(UndecidedError):
        sign_of_constant(read_expression(text))


@pytest.mark.parametrize(
    ("node", "message"),
    [
        (read_expression("ln(-1)"), "logarithm"),
        (read_expression("2 + exp(ln(ln(1/2)))"), "logarithm"),
        (function("ln", ZERO), "logarithm"),
        (read_expression("sqrt(1 - sqrt(2))"), "root of a negative"),
        (read_expression("(ln(1/2))**(2/3)"), "root of a negative"),
        (read_expression("exp(" * 6 + "9" + ")" * 6), "too large"),
        (read_expression("exp(-" + "exp(" * 6 + "9" + ")" * 7), "too large"),
    ],
)
def test_what_has_no_value_is_an_error(node: Expression, message: str) -> None:
    with pytest.raises(EvaluationError, match=message) as caught:
        decimal_enclosure(node)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("text", "low", "high"),
    [
        ("2", "2.0000000000000000000000000", "2.0000000000000000000000000"),
        ("-1/4", "-0.2500000000000000000000000", "-0.2500000000000000000000000"),
        ("10**25", "10000000000000000000000000", "10000000000000000000000000"),
    ],
)
def test_how_enclosures_look(text: str, low: str, high: str) -> None:
    """Exact where the number is, in as many digits."""
    found = decimal_enclosure(read_expression(text))
    assert tuple(map(Fraction, found)) == (Fraction(low), Fraction(high))
    assert all("e" not in end for end in found)
