"""Random expressions: what is read, normalised, differentiated or signed keeps its value.

Oracles: mpmath at 50 digits on the tree itself, and SymPy's own derivative; neither shares code
with the ball arithmetic and the polynomials that are tested.
"""

from fractions import Fraction

import flint
import mpmath
import pytest
import sympy
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from symbolic_response.errors import EvaluationError, SizeLimitError
from symbolic_response.expressions.derivative import by_symbol
from symbolic_response.expressions.enclosure import ball
from symbolic_response.expressions.normal_form import constant, normal_form
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.ring import Domain
from symbolic_response.expressions.signs import certain_sign
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    add,
    divide,
    function,
    multiply,
    negate,
    number,
    power,
)

POSITIVE = frozenset({"a", "b", "c"})
DOMAIN = Domain(("a", "b", "c", "x", "y"), POSITIVE)
SETTINGS = settings(
    max_examples=40,
    deadline=None,
    suppress_health_check=[HealthCheck.filter_too_much, HealthCheck.too_slow],
)

small = st.fractions(min_value=-4, max_value=4, max_denominator=6)
leaves = small.map(number) | st.sampled_from(DOMAIN.names).map(Symbol)
exponents = st.sampled_from([-2, -1, 2, 3, Fraction(1, 2), Fraction(-1, 2), Fraction(2, 3)])


def tidy(build: object, *parts: object) -> Expression:
    """Build a node, or give up on the example where it has no value."""
    try:
        return build(*parts)  # type: ignore[operator, no-any-return]
    except EvaluationError:
        assume(False)
        raise


def exponential(parts: list[tuple[int, str]]) -> Expression:
    return function("exp", add([multiply([number(Fraction(n, 2)), Symbol(s)]) for n, s in parts]))


halves = st.lists(
    st.tuples(st.integers(-3, 3), st.sampled_from(DOMAIN.names)), min_size=1, max_size=3
).map(exponential)
positives = st.sampled_from(["a", "b*c", "6*a/b", "a + b", "2/3", "a*exp(x)", "a**2 + 1"]).map(
    read_expression
)
logarithms = positives.map(lambda node: function("ln", node))
roots = st.tuples(positives, exponents).map(lambda pair: power(*pair))


def compound(inner: st.SearchStrategy[Expression]) -> st.SearchStrategy[Expression]:
    lists = st.lists(inner, min_size=2, max_size=3)
    return (
        lists.map(add)
        | lists.map(multiply)
        | inner.map(negate)
        | st.tuples(inner, inner).map(lambda pair: tidy(divide, *pair))
        | st.tuples(inner, exponents).map(lambda pair: tidy(power, *pair))
    )


trees = st.recursive(leaves | halves | logarithms | roots, compound, max_leaves=7)
positive_values = st.fractions(min_value=Fraction(1, 20), max_value=20, max_denominator=20)
real_values = st.fractions(min_value=-3, max_value=3, max_denominator=8)
points = st.fixed_dictionaries(
    {name: positive_values if name in POSITIVE else real_values for name in DOMAIN.names}
)


class NoValue(Exception):
    """The expression is not defined at the point."""


def evaluate(node: Expression, point: dict[str, Fraction]) -> mpmath.mpf:
    """Return the value by mpmath at the precision in force; NoValue outside the domain."""
    match node:
        case Number(value):
            return mpmath.mpf(value.numerator) / value.denominator
        case Symbol(name):
            return mpmath.mpf(point[name].numerator) / point[name].denominator
        case Sum(terms):
            return mpmath.fsum([evaluate(term, point) for term in terms])
        case Product(factors):
            return mpmath.fprod([evaluate(factor, point) for factor in factors])
        case Power(base, exponent):
            inner = evaluate(base, point)
            if (exponent.denominator != 1 and inner < 0) or abs(inner) < mpmath.mpf(10) ** -30:
                raise NoValue
            return mpmath.power(inner, mpmath.mpf(exponent.numerator) / exponent.denominator)
        case Function("exp", argument):
            return mpmath.exp(evaluate(argument, point))
        case Function("ln", argument):
            inner = evaluate(argument, point)
            if inner < mpmath.mpf(10) ** -30:
                raise NoValue
            return mpmath.log(inner)
    raise AssertionError(node)


def value_at(node: Expression, point: dict[str, Fraction]) -> mpmath.mpf:
    """Return the value at 50 digits, giving up on the example where there is none."""
    with mpmath.workdps(50):
        try:
            value = evaluate(node, point)
        except NoValue:
            assume(False)
        assume(abs(value) < 10**30)
        return value


def form_of(node: Expression):
    """Return the normal form, giving up on divisions by zero and on large expansions."""
    try:
        return normal_form(node, DOMAIN)
    except (EvaluationError, SizeLimitError):
        assume(False)
        raise


def as_balls(point: dict[str, Fraction]) -> dict[str, flint.arb]:
    return {name: flint.arb(flint.fmpq(v.numerator, v.denominator)) for name, v in point.items()}


def agrees(ball_: flint.arb, value: mpmath.mpf) -> bool:
    """Return whether a ball contains a value known to about 40 digits."""
    with mpmath.workdps(60):
        middle = mpmath.mpf(ball_.mid().str(60, radius=False))
        radius = mpmath.mpf(ball_.rad().str(20, radius=False)) * mpmath.mpf("1.001")
        return bool(abs(middle - value) <= radius + mpmath.mpf(10) ** -20 * (1 + abs(value)))


@SETTINGS
@given(trees)
def test_printed_text_reads_back(tree: Expression) -> None:
    """The text of what was read is a fixed point, and both are the same function."""
    text = expression_text(tree)
    again = read_expression(text)
    assert read_expression(expression_text(again)) == again
    difference = add([tree, negate(again)])
    assert form_of(difference).is_zero()


@SETTINGS
@given(trees, points)
def test_printed_text_has_the_same_value(tree: Expression, point: dict[str, Fraction]) -> None:
    """Oracle: mpmath on both trees."""
    value = value_at(tree, point)
    again = value_at(read_expression(expression_text(tree)), point)
    assert abs(again - value) <= 1e-25 * (1 + abs(value))


@SETTINGS
@given(trees, points)
def test_the_normal_form_keeps_the_value(tree: Expression, point: dict[str, Fraction]) -> None:
    """Oracle: mpmath on the original; balls of the original and of the normal form overlap it."""
    value = value_at(tree, point)
    plain = form_of(tree).expression()
    with flint.ctx.workprec(300):
        original, normal = ball(tree, as_balls(point)), ball(plain, as_balls(point))
        assume(original.is_finite() and normal.is_finite())
        assert original.overlaps(normal)
    assert agrees(original, value)
    assert agrees(normal, value)


@SETTINGS
@given(trees, points)
def test_zero_is_never_claimed_of_what_is_not(
    tree: Expression, point: dict[str, Fraction]
) -> None:
    """Oracle: mpmath. A constant of size 1e-9 beside an identity is seen as well."""
    value = value_at(tree, point)
    if form_of(tree).is_zero():
        assert abs(value) < 1e-25
    little = Fraction(1, 10**9)
    shifted = add([tree, negate(read_expression(expression_text(tree))), number(little)])
    assert form_of(shifted).as_fraction() == little


@SETTINGS
@given(trees, st.lists(points, min_size=1, max_size=6))
def test_a_certain_sign_is_never_contradicted(
    tree: Expression, several: list[dict[str, Fraction]]
) -> None:
    """Oracle: mpmath at random points, x and y at 0 among them."""
    try:
        sign = certain_sign(tree, POSITIVE)
    except EvaluationError:
        assume(False)
    assume(sign is not None)
    for point in [*several, *({**point, "x": Fraction(0), "y": Fraction(0)} for point in several)]:
        with mpmath.workdps(50):
            try:
                value = evaluate(tree, point)
            except NoValue:
                continue
        if sign == 0:
            assert abs(value) < 1e-25
        else:
            assert value * sign > 0


@pytest.mark.parametrize(
    ("text", "sign"),
    [
        ("a + exp(-x)", 1), ("-a*b - 1/3", -1), ("a - a", 0), ("x**2 + a", 1), ("sqrt(x) + a", 1),
        ("x**2", None), ("sqrt(x**2)", None), ("sqrt((x - y)**2)", None), ("a - b", None),
        ("sqrt(x**2/(a - b))", None), ("sqrt(y**2/a)", None),
        ("sqrt(sqrt(3 + 2*sqrt(2)) - 1 - sqrt(2))", None), ("sqrt(2) - 1", 1),
        ("ln(2) - ln(3)", -1), ("ln(a)", None), ("x", None), ("sqrt(a*b)/(a + b)", 1),
        ("(x**2)**(1/3) + (y**2)**(1/3)", None), ("exp(exp(x)) + x**4", 1), ("1/x**2", None),
    ],
)
def test_signs_known_by_hand(text: str, sign: int | None) -> None:
    """x and y are real, so that squares and roots of squares may vanish."""
    assert certain_sign(read_expression(text), POSITIVE) == sign


def to_sympy(node: Expression) -> sympy.Expr:
    match node:
        case Number(value):
            return sympy.Rational(value.numerator, value.denominator)
        case Symbol(name):
            return sympy.Symbol(name, real=True)
        case Sum(terms):
            return sympy.Add(*map(to_sympy, terms))
        case Product(factors):
            return sympy.Mul(*map(to_sympy, factors))
        case Power(base, exponent):
            root = sympy.Rational(exponent.numerator, exponent.denominator)
            return sympy.Pow(to_sympy(base), root)
        case Function("exp", argument):
            return sympy.exp(to_sympy(argument))
        case Function("ln", argument):
            return sympy.log(to_sympy(argument))
    raise AssertionError(node)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("ln(a**2 + b)", "2*a/(a**2 + b)"), ("sqrt(a)", "1/(2*sqrt(a))"), ("b", "0"),
        ("exp(-a*b/2)", "-b/2*exp(-a*b/2)"), ("1/(a + b)**3", "-3/(a + b)**4"),
        ("a*b*exp(a)*ln(a)", "b*exp(a)*(ln(a) + a*ln(a) + 1)"),
        ("(a*exp(x))**(2/3)", "2*(a*exp(x))**(2/3)/(3*a)"), ("a**2/b - a", "2*a/b - 1"),
    ],
)
def test_derivatives_from_the_textbook(text: str, expected: str) -> None:
    found = by_symbol(read_expression(text), "a")
    assert form_of(add([found, negate(read_expression(expected))])).is_zero()


@settings(SETTINGS, max_examples=25)
@given(trees, points, st.sampled_from(DOMAIN.names))
def test_derivatives_agree_with_sympy(
    tree: Expression, point: dict[str, Fraction], name: str
) -> None:
    """Oracle: sympy.diff, evaluated to 40 digits."""
    value_at(tree, point)
    derived = value_at(by_symbol(tree, name), point)
    symbol = sympy.Symbol(name, real=True)
    at = {sympy.Symbol(n, real=True): sympy.Rational(v.numerator, v.denominator)
          for n, v in point.items()}
    expected = sympy.diff(to_sympy(tree), symbol).evalf(40, subs=at)
    assume(expected.is_real and expected.is_finite)
    assert abs(mpmath.mpf(str(expected)) - derived) <= 1e-12 * (1 + abs(derived))


@given(st.fractions(max_denominator=10**6))
def test_rational_constants_are_recognised(value: Fraction) -> None:
    """A known constant wrapped in sums, quotients, exponentials and roots that cancel."""
    assert constant(value).as_fraction() == value
    shown = f"({value.numerator})/{value.denominator}"
    for text in (
        f"(a + b)*({shown})/(b + a)", f"exp(x/2)**2*({shown})/exp(x)",
        f"({shown} + sqrt(2))*(1 + a) - sqrt(2)*a - sqrt(8)/2 - ({shown})*a",
        f"ln(exp({shown}))", f"({shown})*sqrt(a*b)/(sqrt(a)*sqrt(b))",
    ):
        assert normal_form(read_expression(text), DOMAIN).as_fraction() == value
    for text in (f"{shown} + a", f"{shown} + sqrt(2)", "(a + 2*b)/(2*a + b)", "exp(x) + 1"):
        assert normal_form(read_expression(text), DOMAIN).as_fraction() is None
