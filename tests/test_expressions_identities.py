"""The zero test on identities built from a known answer, and on near misses.

Oracles: the identities are written down from textbook rules or made by SymPy's rearrangements,
which the normal form never sees; near misses are told apart by mpmath.
"""

import random
import re
from fractions import Fraction

import mpmath
import pytest
import sympy
from hypothesis import given, settings
from hypothesis import strategies as st

from symbolic_response.errors import EvaluationError, InputError, UndecidedError
from symbolic_response.expressions.enclosure import decimal_enclosure, sign_of_constant
from symbolic_response.expressions.normal_form import normal_form, same_function
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.ring import Domain
from symbolic_response.expressions.tree import number, power

DOMAIN = Domain(("a", "b", "c", "x", "y"), frozenset("abc"))
EQUAL = [
    # rational arithmetic
    ("(a + b)*(a - b)", "a**2 - b**2"),
    ("1/((x + 1)*(x + 2))", "1/(x + 1) - 1/(x + 2)"),
    ("(x**7 - 1)/(x - 1)", "1 + x + x**2 + x**3 + x**4 + x**5 + x**6"),
    ("1/(1 + 1/(1 + 1/a))", "(a + 1)/(2*a + 1)"),
    # exponentials split over sums, halves, and common denominators
    ("exp(x + y/2 - 1)", "exp(x)*exp(y)**(1/2)/exp(1)"),
    ("(exp(x) - exp(-x))*(exp(x) + exp(-x))", "exp(2*x) - exp(-2*x)"),
    ("exp((a*c + b)/(c*(a + 1)))", "exp(a/(a + 1))*exp(b/(c*(a + 1)))"),
    ("exp((x + y)**2)", "exp(x**2)*exp(2*x*y)*exp(y**2)"),
    ("(exp(x/2) + exp(x/3))**2", "exp(x) + 2*exp(5*x/6) + exp(2*x/3)"),
    # logarithms
    ("ln(6*a**2/b)", "ln(2) + ln(3) + 2*ln(a) - ln(b)"),
    ("ln(a**2 + 2*a*b + b**2)", "2*ln(a + b)"),
    ("ln(exp(x)*a)", "x + ln(a)"),
    ("ln(10**50)", "50*ln(10)"),
    ("ln(sqrt(a*exp(x)))", "x/2 + ln(a)/2"),
    ("exp(3*ln(a + b)/2)", "(a + b)**(3/2)"),
    ("exp(ln(a)/3 - ln(b))", "a**(1/3)/b"),
    ("exp(-2*ln(x - y))", "1/(x - y)**2"),
    # roots
    ("sqrt(2)*sqrt(3)", "sqrt(6)"),
    ("sqrt(8)", "2*sqrt(2)"),
    ("1/(1 + sqrt(2))", "sqrt(2) - 1"),
    ("(2 + 3*sqrt(5))/(1 - sqrt(5))", "-(17 + 5*sqrt(5))/4"),
    ("4**(1/4)", "sqrt(2)"),
    ("(9/4)**(-3/2)", "8/27"),
    ("1/sqrt(a + b)", "sqrt(a + b)/(a + b)"),
    ("sqrt(a/b)", "sqrt(a)/sqrt(b)"),
    ("sqrt(a + b)**-3*(a + b)", "1/sqrt(a + b)"),
    ("sqrt(exp(x)/4)*sqrt(exp(x)*9)", "3*exp(x)/2"),
    ("sqrt(a*(a + b))*sqrt((a + b)/a)", "a + b"),
    ("(a**3)**(1/3)", "a"),
    ("sqrt(a + b)*a/sqrt(b + a)", "a"),
    ("sqrt(x**2)*sqrt(x**2)", "x**2"),
    ("sqrt(x - y)**3/(x - y)", "sqrt(x - y)"),
    ("(x - y)**(1/3)*(x - y)**(2/3)", "x - y"),
    ("(1 + sqrt(2) + sqrt(3))*(1 + sqrt(2) - sqrt(3))", "2*sqrt(2)"),
    ("2**(1/3)*4**(1/3)", "2"),
    ("sqrt(a + sqrt(b))**2*sqrt(a + sqrt(b))**2", "a**2 + 2*a*sqrt(b) + b"),
]


def form(text: str):
    return normal_form(read_expression(text), DOMAIN)


@pytest.mark.parametrize(("left", "right"), EQUAL)
def test_identities(left: str, right: str) -> None:
    """An identity is recognised, and stops being one when a millionth of a symbol is added."""
    assert same_function(read_expression(left), read_expression(right), DOMAIN)
    assert not form(f"({left}) - ({right}) + b/10**6").is_zero()
    with pytest.raises(EvaluationError, match="identically zero"):
        form(f"1/(({left}) - ({right}))")


@pytest.mark.parametrize(
    ("left", "right"),
    [
        ("sqrt(x**2)", "x"), ("sqrt(x**2)", "-x"), ("(x**4)**(1/4)", "x"), ("ln(x**2)", "ln(x)"),
        ("exp(ln(x**2)/2)", "x"), ("sqrt(a**2 + b**2)", "a + b"), ("sqrt(2) + sqrt(3)", "sqrt(5)"),
        ("sqrt((x - y)**2)", "x - y"), ("ln(a + b)", "ln(a) + ln(b)"),
        ("exp(a*b)", "exp(a)*exp(b)"),
        ("exp(x)**(1/2)", "exp(sqrt(a))"), ("(x**6)**(1/2)", "x**3"),
        ("sqrt(3 + 2*sqrt(2))", "1 + sqrt(3)"), ("exp(exp(x))**2", "exp(exp(2*x))"),
        ("(exp(10**50) - 1)/(exp(1) - 1)", "exp(10**50)"), ("exp(10**12*x) - 1", "exp(x) - 1"),
    ],
)
def test_what_is_not_an_identity(left: str, right: str) -> None:
    assert not same_function(read_expression(left), read_expression(right), DOMAIN)


def test_a_nested_root_may_stay_undecided_but_gets_no_sign() -> None:
    """sqrt(3 + 2 sqrt(2)) = 1 + sqrt(2): if the normal form is not zero, nothing else claims so."""
    text = "sqrt(3 + 2*sqrt(2)) - 1 - sqrt(2)"
    if not form(text).is_zero():
        with pytest.raises(UndecidedError):
            sign_of_constant(read_expression(text))
        with pytest.raises(UndecidedError):
            decimal_enclosure(read_expression(text))


def test_a_root_of_a_negative_number_is_not_folded_away() -> None:
    with pytest.raises(EvaluationError, match="root of a negative number"):
        power(number(-8), Fraction(2, 3))
    with pytest.raises(InputError, match="root of a negative number"):
        read_expression("sqrt(-2)**2")
    assert read_expression("sqrt(0)") == number(0)


@pytest.mark.parametrize("text", ["sqrt(-2)", "(-8)**(1/3)", "(-8)**(2/3)", "(2 - 5)**(-1/2)",
                                  "a - sqrt(exp(ln(2)) - 7)", "(sqrt(8)/sqrt(2) - 3)**(2/3)"])
def test_a_root_of_a_negative_number_is_refused(text: str) -> None:
    """No complex numbers and no real cube roots of negative ones, wherever it is noticed."""
    with pytest.raises(InputError, match="root of a negative number"):
        form(text)


@pytest.mark.parametrize(
    "text",
    ["1/(a - a*exp(0))", "1/((a + b)**2 - a**2 - 2*a*b - b**2)", "x/(sqrt(2)*sqrt(3) - sqrt(6))",
     "(ln(6) - ln(2) - ln(3))**-2", "(exp(x)*exp(-x) - 1)**(-1/2)"],
)
def test_division_by_zero_is_refused(text: str) -> None:
    with pytest.raises(EvaluationError, match="identically zero"):
        form(text)


def from_sympy(expression: sympy.Expr) -> str:
    """Return SymPy's own text in the syntax of the reader."""
    return re.sub(r"\bE\b", "exp(1)", str(expression).replace("log(", "ln("))


A, B, X = (*sympy.symbols("a b", positive=True), sympy.Symbol("x", real=True))
atoms = st.sampled_from(
    [A, B, X, sympy.exp(X), sympy.exp(-X / 2), sympy.sqrt(A), sympy.log(B), sympy.Integer(2),
     sympy.Rational(-3, 5), A + B, 1 + sympy.exp(X), sympy.sqrt(2)]
)
pieces = st.lists(atoms, min_size=1, max_size=3).map(lambda parts: sympy.Mul(*parts))
fractions = st.tuples(
    st.lists(pieces, min_size=1, max_size=3), st.sampled_from([1, A, A + X**2, B])
)


@settings(max_examples=40, deadline=None)
@given(st.lists(fractions, min_size=1, max_size=3), st.integers(0, 2**32))
def test_rearrangements_by_sympy(parts: list, seed: int) -> None:
    """Oracle: sympy.expand, together and expand_log keep the function; the value by mpmath."""
    whole = sympy.Mul(*(sympy.Add(*top) / below for top, below in parts))
    changed = random.Random(seed).choice(
        [sympy.expand, sympy.together, sympy.factor_terms, lambda e: sympy.expand(e, log=True)]
    )(whole)
    left, right = read_expression(from_sympy(whole)), read_expression(from_sympy(changed))
    assert same_function(left, right, DOMAIN)
    value = whole.evalf(30, subs={A: Fraction(5, 7), B: Fraction(11, 3), X: Fraction(-2, 9)})
    if abs(mpmath.mpf(str(value))) > 1e-15:
        assert not normal_form(left, DOMAIN).is_zero()


@settings(max_examples=40, deadline=None)
@given(st.lists(st.integers(-3, 3), min_size=1, max_size=4),
       st.lists(st.integers(-3, 3), min_size=1, max_size=4))
def test_products_of_sums_in_exponentials(left: list[int], right: list[int]) -> None:
    """Built from the answer: coefficients of exp(k x/2) multiply by convolution."""
    def text(coefficients: list[int]) -> str:
        return "+".join(f"({value})*exp({k}*x/2)" for k, value in enumerate(coefficients))

    product = [0] * (len(left) + len(right) - 1)
    for i, p in enumerate(left):
        for j, q in enumerate(right):
            product[i + j] += p * q
    assert form(f"({text(left)})*({text(right)}) - ({text(product)})").is_zero()
    product[len(product) // 2] += 1
    assert not form(f"({text(left)})*({text(right)}) - ({text(product)})").is_zero()
