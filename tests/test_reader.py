"""Reading expressions, against Python's own arithmetic on fractions."""

from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from symbolic_response.errors import ExpressionError
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.tree import Number, Symbol, add, function, power

numbers = st.integers(0, 20).map(str) | st.sampled_from(["0.1", "2.50", "1e-3", ".5", "3."])


def compound(inner: st.SearchStrategy[str]) -> st.SearchStrategy[str]:
    binary = st.tuples(inner, st.sampled_from([" + ", "-", "*", "/"]), inner).map("".join)
    power_ = st.tuples(inner, st.integers(-3, 3)).map(lambda t: f"({t[0]})**{t[1]}")
    return binary | inner.map(lambda t: f"({t})") | inner.map(lambda t: f"-{t}") | power_


@settings(max_examples=300)
@given(st.recursive(numbers, compound, max_leaves=12))
def test_arithmetic_agrees_with_python(text: str) -> None:
    """Oracle: Python's parser and operators over exact decimals, which this reader never uses."""
    import re

    python = re.sub(r"(?<![\w.])((?:\d+\.?\d*|\.\d+)(?:e-?\d+)?)", r"Fraction('\1')", text)
    python = re.sub(r"\*\*(-?)Fraction\('(\d+)'\)", r"**\1\2", python)
    try:
        expected = eval(python, {"Fraction": Fraction})
    except ZeroDivisionError:
        with pytest.raises(ExpressionError, match="division by zero"):
            read_expression(text)
        return
    assert read_expression(text) == Number(expected)


@pytest.mark.parametrize(
    ("text", "value"),
    [("-2**2", -4), ("2**-1", Fraction(1, 2)), ("2**3**2", 512), ("2**-3**2", Fraction(1, 512)),
     ("8/4/2", 1), ("8-4-2", 2), ("2*-3", -6), ("--3", 3), ("6/2*3", 9), ("0.1", Fraction(1, 10))],
)
def test_precedence(text: str, value: Fraction) -> None:
    assert read_expression(text) == Number(Fraction(value))


def test_words_that_mean_something_in_python_are_names() -> None:
    read = read_expression("lambda + None + I")
    assert read == add([Symbol("lambda"), Symbol("None"), Symbol("I")])
    assert read_expression("sqrt(exp(c))") == power(function("exp", Symbol("c")), Fraction(1, 2))


REFUSED = {
    "": "ends where a value",
    "c +": "ends where a value",
    "(c": "never closed",
    "c)": "without an opening",
    "2c": "runs into",
    "c d": "operator such as",
    "c^2": r"write \*\*",
    "c**x": "exact number",
    "9**9**9": "larger than 64",
    "c**65": "larger than 64",
    "c**(1/65)": "larger than 64",
    "1/0": "division by zero",
    "1/(2-2)": "division by zero",
    "log(c)": "write ln",
    "foo(c)": "not a function",
    "__import__('os')": "does not belong",
    "c.real": "does not belong",
    "c[0]": "operator such as",
    "lambda: 1": "does not belong",
    "1e99999": "digits",
    "1" * 1001: "digits",
    "(" * 100_000 + "c" + ")" * 100_000: "nested more than",
    "-" * 100_000 + "c": "nested more than",
    "c+" * 400_000 + "c": "characters long",
    "((10**64)**64)**64": "longer than",
    "²": "does not belong",
    "c\u00a0+ d\u2212e": "does not belong",
    "a,b": "cannot follow",
    "*c": "value is expected",
    "()": "value is expected",
}


@pytest.mark.parametrize("text", REFUSED, ids=lambda text: text[:20])
def test_refusals(text: str) -> None:
    with pytest.raises(ExpressionError, match=REFUSED[text]):
        read_expression(text)


def test_a_long_sum_is_one_node_and_read_in_linear_time() -> None:
    text = "+".join(f"x{i}" for i in range(60_000))
    tree = read_expression(text)
    assert len(tree.terms) == 60_000  # type: ignore[attr-defined]
