"""Printed expressions: exact strings, rules that all LaTeX keeps, long polynomials."""

import re
import time

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from symbolic_response.errors import SymbolicResponseError
from symbolic_response.expressions.latex import expression_latex
from symbolic_response.expressions.normal_form import normal_form, same_function
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.ring import Domain, Polynomial
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import Expression, Product, Sum, Symbol, symbols_of

NAMES = {"a": "a", "b": "b", "c": "c", "x": "x", "k": "k^{+}", "mu": r"\mu", "k_on": "k_{on}"}
DOMAIN = Domain(tuple(NAMES), frozenset(NAMES) - {"x"})

EXACT = [
    ("mu*a", r"\mu a"),
    ("2*a", "2 a"),
    ("a*2**(1/3)", r"a \cdot 2^{1/3}"),
    ("a*(b + c)", "a (b + c)"),
    ("2*(b + c)", "2 (b + c)"),
    ("(a + b)*(b + c)", "(a + b) (b + c)"),
    ("(a**2 + b)**2", "(a^2 + b)^2"),
    ("k**2*sqrt(k)", r"(k^{+})^2 \sqrt{k^{+}}"),
    ("k_on**10", "k_{on}^{10}"),
    ("a/(b*c)", r"\frac{a}{b c}"),
    ("-(a + b)/c", r"-\frac{a + b}{c}"),
    ("a - (b - c)", "a - (b - c)"),
    ("a - 3*b/2", r"a - \frac{3 b}{2}"),
    ("-1/2", r"-\frac{1}{2}"),
    ("(1/2)**(1/3)", r"(\frac{1}{2})^{1/3}"),
    ("exp((a + b)/2)", "e^{(a + b)/2}"),
    ("exp(-(a + b)/2 + c/3)", "e^{-(a + b)/2 + c/3}"),
    ("exp(a/2 + b)", "e^{a/2 + b}"),
    ("exp(-1/2)", "e^{-1/2}"),
    ("exp(a)**2", "(e^{a})^2"),
    ("ln(a)**2", r"(\ln(a))^2"),
    ("ln(a)*(b + c)", r"\ln(a) \cdot (b + c)"),
    ("sqrt(x**2)", r"\sqrt{x^2}"),
    ("(x**2)**(1/3)", "(x^2)^{1/3}"),
    ("1/sqrt(a)", r"\frac{1}{\sqrt{a}}"),
    ("0", "0"),
]


@pytest.mark.parametrize(("text", "latex"), EXACT)
def test_exact_latex(text: str, latex: str) -> None:
    assert expression_latex(read_expression(text), NAMES) == latex


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("a/(b/c)", "a*c/b"), ("1/(2*a)", "1/(2*a)"), ("(a*b)**(-2)", "1/(a**2*b**2)"),
        ("a - (b - c)", "a - (b - c)"), ("-(a+b)", "-(a + b)"), ("(a**2)**(1/3)", "(a**2)**(1/3)"),
        ("sqrt(sqrt(a))", "sqrt(sqrt(a))"), ("0.125*a", "a/8"), ("(-1/3)**3", "-1/27"),
        ("exp((a+b)/2)", "exp((a + b)/2)"), ("a**-0.5", "1/sqrt(a)"), ("a*(-2)", "-2*a"),
        ("(a**64)**2", "((a**2)**64)"), ("(a**64)**64", "((a**64)**64)"),
        ("(a**13)**5", "(a**64*a)"),
        ("1/(a**50)**3", "1/((a**2)**64*a**22)"),
    ],
)
def test_exact_text(text: str, shown: str) -> None:
    node = read_expression(text)
    assert expression_text(node) == shown
    assert same_function(read_expression(shown), node, DOMAIN)


@pytest.mark.parametrize(
    "text", ["a**(1/64)*a**(1/63)", "sqrt((a + b)**(1/64))", "(a**64)**40*(a**63)**5/exp(x/1000)",
             "exp(10**50*x) + exp(10**50*ln(c)/7)"]
)
def test_powers_beyond_the_readers_limit_read_back(text: str) -> None:
    """What the normal form makes of roots and powers stays within the syntax of the file."""
    value = normal_form(read_expression(text), DOMAIN)
    for poly in (value.numerator, value.denominator):
        leaf = Polynomial(value.ring, poly)
        assert same_function(read_expression(expression_text(leaf)), leaf, DOMAIN)


def leaf_of(text: str) -> Polynomial:
    value = normal_form(read_expression(text), DOMAIN)
    assert value.denominator.is_one()
    return Polynomial(value.ring, value.numerator)


def test_polynomial_leaves() -> None:
    """Roots of squares stay roots; a negative term inside a sum shows one sign."""
    leaf = leaf_of("sqrt(x**2) - 2*a*exp(x/2)")
    assert set(expression_text(leaf).replace(" - ", " + -").split(" + ")) == {
        "sqrt(x**2)", "-2*a*exp(x/2)"
    }
    assert r"\sqrt{x^2}" in expression_latex(leaf, NAMES)
    nested = Sum((Symbol("c"), leaf_of("-2*a")))
    assert expression_latex(nested, NAMES) == "c - 2 a"
    assert expression_text(nested) == "c - 2*a"
    assert expression_text(Product((Symbol("c"), leaf_of("-2*a")))) == "c*(-2*a)"
    assert expression_text(leaf_of("a - a")) == "0"
    assert expression_latex(leaf_of("a - a"), NAMES) == "0"


atoms = st.sampled_from(
    ["a", "b", "k", "mu", "k_on", "x", "2", "3/2", "-1", "a + b", "-x + mu", "exp(-x/2)",
     "exp((a + b)/2)", "ln(a + 1)", "sqrt(mu)", "3**(1/3)", "0.25"]
)


def compound(inner: st.SearchStrategy[str]) -> st.SearchStrategy[str]:
    binary = st.tuples(inner, st.sampled_from("+-*/"), inner)
    powers = st.tuples(inner, st.sampled_from(["2", "-1", "(1/2)", "(2/3)", "-12"]))
    return binary.map(lambda t: f"({t[0]}){t[1]}({t[2]})") | powers.map(
        lambda t: f"({t[0]})**{t[1]}"
    )


def tree_of(text: str) -> Expression | None:
    try:
        return read_expression(text)
    except SymbolicResponseError:
        return None


sources = st.recursive(atoms, compound, max_leaves=8).map(tree_of).filter(lambda t: t is not None)


def inside(latex: str) -> int:
    depth = 0
    for character in re.sub(r"\\[A-Za-z]+|\\.", "", latex):
        depth += {"{": 1, "}": -1}.get(character, 0)
        assert depth >= 0
    return depth


def between(text: str, opening: int) -> str:
    """Return what stands outside inner brackets between a parenthesis and its partner."""
    kept, depth = "", 0
    for character in text[opening:]:
        depth += {"(": 1, "{": 1, ")": -1, "}": -1}.get(character, 0)
        if depth == 0:
            return kept
        kept += character if depth == 1 else ""
    raise AssertionError(text)


@settings(max_examples=60, deadline=None, suppress_health_check=list(HealthCheck))
@given(sources)
def test_rules_of_latex(tree: Expression) -> None:
    r"""Balanced; no ``+-``; control words end before a letter; dots where they are needed."""
    latex = expression_latex(tree, NAMES)
    assert inside(latex) == 0
    assert latex.count("(") == latex.count(")")
    assert not re.search(r"[-+]\s*[-+]", latex)
    known = {"frac", "sqrt", "ln", "mu", "cdot", "left", "right"}
    assert set(re.findall(r"\\([A-Za-z]+)", latex)) <= known
    assert not re.search(r"[0-9] [0-9]", latex)  # a number before a number is dotted
    plain = latex.replace(r"\cdot ", r"\cdot@")
    assert not re.search(r"[A-Za-z}] [0-9]", plain)  # ... and so is one after a symbol
    for call in re.finditer(r"(?<![A-Za-z\\])(?:[abcx]|\\mu) \(", latex):
        assert re.search(r" [-+] ", between(latex, call.end() - 1))  # a sum: no call by accident
    assert "^{2}" not in latex
    assert not re.search(r"\^(?:\{[^{}]*\}|[0-9])\s*\^", latex)  # no double superscript
    assert not re.search(r"(?<!n)\(\([^()]*\)\)\^", latex)  # no second pair of parentheses
    assert symbols_of(tree) <= set(NAMES)


def test_a_hundred_thousand_terms_print_in_seconds() -> None:
    """Time grows with the number of terms, not faster."""
    names = tuple(f"k{i}" for i in range(18))
    domain = Domain(names, frozenset(names))
    value = normal_form(
        read_expression(f"({'+'.join(names)})**6"), domain
    )
    leaf = Polynomial(value.ring, value.numerator)
    assert len(leaf.poly) > 100_000
    start = time.process_time()
    text = expression_text(leaf)
    latex = expression_latex(leaf, {name: f"k_{{{name[1:]}}}" for name in names})
    assert time.process_time() - start < 8
    assert text.count(" + ") == latex.count(" + ") == len(leaf.poly) - 1
