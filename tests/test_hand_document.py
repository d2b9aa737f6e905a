r"""Hand results in LaTeX files: every display is accounted for, and read as it is meant.

What a formula means is said in the plain syntax of network files, which shares no code with the
reading of LaTeX; values at points are computed here. That every display is accounted for is
checked against a count made here, line by line. The texts and networks are invented.
"""

from __future__ import annotations

import random
import re
import time
from collections.abc import Callable
from fractions import Fraction
from pathlib import Path

import pytest

from symbolic_response.errors import InputError
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
)
from symbolic_response.hand.latex.names import Names, names_of
from symbolic_response.hand.latex.tokens import tokenize
from symbolic_response.hand.papers.document import Reading, read_equations, read_equations_file
from symbolic_response.hand.papers.statements import split_statements
from symbolic_response.network.model import Network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.network.toml_reader import read_network_text

PUMP = r"""
title = "A pump with a lid"
[symbols]
k_on = {about = "opening, for each unit of c"}
k_off = {about = "closing"}
c = {about = "concentration over its reference"}
a = {about = "turning"}
b = {about = "turning back"}
g = {about = "release"}
h = {about = "release undone"}
[states.A]
[states.B]
[states.C]
[[transitions]]
name = "bind"
between = ["A", "B"]
rates = ["k_on*c", "k_off"]
[[transitions]]
name = "flip"
between = ["B", "C"]
rates = ["a", "b"]
[[transitions]]
name = "reset"
between = ["C", "A"]
rates = ["g", "h"]
[observables.open]
B = 1
C = "1/2"
"""


@pytest.fixture(scope="module")
def pump() -> Network:
    return read_network_text(PUMP)


@pytest.fixture(scope="module")
def names(pump: Network) -> Names:
    return names_of(pump)


def value(node: Expression, salt: int) -> Fraction:
    """The value of an expression at a point: each symbol and atom a number of its own."""
    match node:
        case Number(exact):
            return exact
        case Sum(terms):
            return sum((value(term, salt) for term in terms), Fraction(0))
        case Product(factors):
            result = Fraction(1)
            for factor in factors:
                result *= value(factor, salt)
            return result
        case Power(base, exponent) if exponent.denominator == 1:
            return value(base, salt) ** int(exponent)
        case Function(name, argument):
            return opaque(f"{name} {value(argument, salt)}", salt)
        case Symbol(name):
            return opaque(name, salt)
    return opaque(repr(node), salt)


def opaque(text: str, salt: int) -> Fraction:
    number = sum((place + 1 + salt) * ord(letter) for place, letter in enumerate(text))
    return Fraction(number % 997 + 1, number % 89 + 2)


Check = Callable[[Expression, str], bool]


@pytest.fixture(scope="module")
def same(pump: Network) -> Check:
    """Whether an expression means what a text in plain syntax says."""

    def check(expression: Expression, plain: str) -> bool:
        meant = read_quantity(plain, pump)
        return all(value(expression, salt) == value(meant, salt) for salt in (3, 8, 20))

    return check


def pairs(found: Reading) -> list[tuple[str, str]]:
    return [(equation.quantity_latex, equation.latex) for equation in found.equations]


def reasons(found: Reading) -> list[tuple[int, str]]:
    return [(passed.line, passed.reason) for passed in found.passed_over]


# -- ends of displays -----------------------------------------------------------------------------

ENDS = [
    ("$$", "$$"), (r"\[", r"\]"),
    *((rf"\begin{{{name}{star}}}" + ("{2}" if "alignat" in name else ""), rf"\end{{{name}{star}}}")
      for name in ("equation", "align", "gather", "multline", "flalign", "alignat", "eqnarray")
      for star in ("", "*")),
    (r"\begin{displaymath}", r"\end{displaymath}"),
    (r"\begin{equation}\begin{split}", r"\end{split}\end{equation}"),
    (r"\begin{equation}\begin{aligned}[t]", r"\end{aligned}\label{x}\end{equation}"),
    (r"\begin{equation}\begin{gathered}", r"\end{gathered},\end{equation}"),
    (r"\[\left\{\begin{aligned}", r"\end{aligned}\right.\]"),
    (r"\be", r"\ee"),
]


@pytest.mark.parametrize(("opening", "closing"), ENDS)
def test_each_display_is_read(names: Names, same: Check, opening: str, closing: str) -> None:
    text = "\\newcommand{\\be}{\\begin{equation}}\n\\def\\ee{\\end{equation}}\nText\n"
    found = read_equations(f"{text}{opening}\n\\pi_A = \\frac{{k_{{off}}}}{{c}} .\n{closing} so on",
                           names)
    assert found.passed_over == ()
    (equation,) = found.equations
    assert equation.line == 5
    assert (equation.quantity_latex, equation.latex) == (r"\pi_A", r"\frac{k_{off}}{c}")
    assert same(equation.quantity, "p[A]")
    assert same(equation.expression, "k_off/c")


@pytest.mark.parametrize("environment", ["dmath", "dmath*", "IEEEeqnarray", "numcases"])
def test_environments_passed_over(names: Names, environment: str) -> None:
    found = read_equations(f"\n\\begin{{{environment}}}\\pi_A = c\\end{{{environment}}}", names)
    assert found.equations == ()
    ((line, reason),) = reasons(found)
    assert line == 2
    assert environment in reason


@pytest.mark.parametrize("text", [
    r"% \[ \pi_A = c \]",
    "\\begin{verbatim}\n\\[ \\pi_A = c \\]\n\\end{verbatim}",
    "\\begin{lstlisting}[language=TeX]\n$$ \\pi_A = c $$\n\\end{lstlisting}",
    "\\begin{comment}\n$$ \\pi_A = c $$\n\\end{comment}",
    "\\iffalse\n$$ \\pi_A = c $$ \\ifx\\a\\b x\\fi \\fi",
    "\\iftrue text\\else $$ \\pi_A = c $$\\fi",
    r"\verb|$$ \pi_A = c $$|",
    r"\url{https://example.org/a%20b}",
    "\\end{document} $$ \\pi_A = c $$",
    r"costs 3\$\$ or 4\$",
    r"$\pi_A$$\pi_B = c$",
    r"\newcommand{\say}{\[ \pi_A = c \]}",
    r"\newenvironment{myeq}{\begin{equation}}{\end{equation}}",
])
def test_no_display_where_tex_sets_none(names: Names, text: str) -> None:
    shown = read_equations(text, names)
    assert shown.equations == shown.definitions == ()
    assert shown.passed_over == ()


@pytest.mark.parametrize("before", [
    "5\\% of\n", "\\iffalse x \\else y \\fi\n", "\\newif\\ifdraft\n", "\\iff\n", "a \\\\[2pt]\n",
    "\\begin{verbatim} \\[ \\end{verbatim}\n", "\\verb|$|\n", "% $\n", "$x$\n", "\\(x\\)\n",
])
def test_what_hides_nothing(names: Names, before: str) -> None:
    found = read_equations(f"{before}$$ \\pi_A = c $$", names)
    assert pairs(found) == [(r"\pi_A", "c")]
    assert found.equations[0].line == 2


@pytest.mark.parametrize("text", [
    r"\iffalse $$ \pi_A = a $$ \else $$ \pi_A = c $$ \fi", r"\iftrue $$ \pi_A = c $$ \else a \fi",
    r"\iffalse \ifx a \else b \fi \fi $$ \pi_A = c $$",
])
def test_branches_of_conditionals(names: Names, text: str) -> None:
    assert pairs(read_equations(text, names)) == [(r"\pi_A", "c")]


def test_inputs_are_listed(names: Names) -> None:
    found = read_equations("\\input{rates}\n\\include{app/b}\n$$ \\pi_A = c $$", names)
    assert [(line, reason.split(" is ")[0]) for line, reason in reasons(found)] == [
        (1, r"\input{rates}"), (2, r"\include{app/b}")]
    assert len(found.equations) == 1


# -- rows, chains, punctuation ---------------------------------------------------------------------

ROWS = [
    ("align", r"\pi_A &= a \\ &\quad{}+ b \\ &\qquad - c g", [("p[A]", "a + b - c*g")]),
    ("align", "\\pi_A &= a \\\\[2pt]\n\\pi_B &= b \\\\*\n\\pi_C &= c",
     [("p[A]", "a"), ("p[B]", "b"), ("p[C]", "c")]),
    ("align", r"\pi_A &= \frac{a}{b} \nonumber\\ &= \frac{a c}{b c} \\ &\equiv g",
     [("p[A]", "a/b"), ("p[A]", "a*c/(b*c)"), ("p[A]", "g")]),
    ("align", r"\pi_A &= a + {} \\ & b, & \pi_B &= h", [("p[A]", "a + b"), ("p[B]", "h")]),
    ("align*", r"\pi_A &= a & \pi_B &= b \\ &+ g & &- h",
     [("p[A]", "a + g"), ("p[B]", "b - h")]),
    ("alignat*}{2", r"\pi_A &= a &\quad \pi_B &= b", [("p[A]", "a"), ("p[B]", "b")]),
    ("eqnarray", r"\pi_A & = & a \\ & & + b \nonumber \\ \pi_B & = & c",
     [("p[A]", "a + b"), ("p[B]", "c")]),
    ("multline", r"\pi_A = a + b \\ + c \\ - g h", [("p[A]", "a + b + c - g*h")]),
    ("gather", r"\pi_A = a + b \\ + c \\ -J_{bind} = g",
     [("p[A]", "a + b + c"), ("-current[bind]", "g")]),
    ("gather", r"\pi_A = a \left( b + \right. \\ \left. c \right)", [("p[A]", "a*(b + c)")]),
    ("equation", r"\pi_A = a, \qquad \pi_B = b \quad\text{and}\quad \pi_C := c;",
     [("p[A]", "a"), ("p[B]", "b"), ("p[C]", "c")]),
    ("equation", r"\pi_A = \pi_B = a", [("p[A]", "p[B]"), ("p[A]", "a")]),
    ("equation", r"\pi_A = \begin{aligned}[t] & a \\ &+ b \end{aligned}", [("p[A]", "a + b")]),
    ("equation", r"\pi_A = a \approx g", [("p[A]", "a")]),
    ("equation", r"\pi_A = a\,.\tag{1*}", [("p[A]", "a")]),
    ("equation", r"\pi_A = \frac12\text{.}", [("p[A]", "1/2")]),
    ("align", r"\pi_A &= a \\ \intertext{and then} \pi_B &= b \\", [("p[A]", "a"), ("p[B]", "b")]),
    ("align", "\\pi_A &= a % first\n\\\\ % second = 3 \\\\\n &+ b", [("p[A]", "a + b")]),
    ("equation", r"\ln\frac{\pi_A}{\pi_B} = a", [("ln(p[A]/p[B])", "a")]),
    ("equation", r"\pi_A = a\ \ \mathrm{and}\ \ \pi_B = b", [("p[A]", "a"), ("p[B]", "b")]),
    ("equation", r"\pi_A = a\;\;\pi_B = b", [("p[A]", "a"), ("p[B]", "b")]),
    ("equation", r"\pi_A = a\hspace{1cm}\pi_B = b", [("p[A]", "a"), ("p[B]", "b")]),
    ("equation", r"\boxed{\pi_A = a}.", [("p[A]", "a")]),
    ("displaymath", r"\pi_A = a \eqno(3)", [("p[A]", "a")]),
    ("align", r"\pi_A &= a \tag{$*$} \\[1ex] & \pi_B = b", [("p[A]", "a"), ("p[B]", "b")]),
    ("equation", r"\pi_A + \pi_B + \pi_C = 1", [("p[A] + p[B] + p[C]", "1")]),
]


@pytest.mark.parametrize(("environment", "rows", "meant"), ROWS)
def test_rows(
    names: Names, same: Check, environment: str, rows: str, meant: list[tuple[str, str]]
) -> None:
    name = environment.partition("}")[0]
    found = read_equations(rf"\begin{{{environment}}}{rows}\end{{{name}}}", names)
    assert len(found.equations) == len(meant), found
    for equation, (quantity, formula) in zip(found.equations, meant, strict=True):
        assert same(equation.quantity, quantity), equation
        assert same(equation.expression, formula), equation


@pytest.fixture(scope="module")
def signed() -> Network:
    r"""A two-state network whose rates are written with signs as scripts."""
    return read_network_text(PUMP.replace(
        'a = {about = "turning"}', "a = {latex = 'a_-'}").replace(
        'b = {about = "turning back"}', "b = {latex = 'b^{-}'}").replace(
        'g = {about = "release"}', "g = {latex = 'f_+'}").replace(
        'h = {about = "release undone"}', "h = {latex = 'g^*'}"))


@pytest.mark.parametrize(("latex", "plain"), [
    ("a_-", "a"), ("a_{-}", "a"), ("b^-", "b"), ("b^{-}", "b"), ("f_+", "g"), ("g^*", "h"),
    (r"c a_-\,", "c*a"), ("c b^- {}", "c*b"),
])
@pytest.mark.parametrize("between", [
    r"\\", r"\nonumber\\", r"\notag \label{x}\\[2pt]", r"\qquad",
])
def test_a_sign_in_a_script_is_no_operator(
    signed: Network, latex: str, plain: str, between: str
) -> None:
    text = rf"\begin{{gather}} \pi_A = {latex} {between} \pi_B = c \end{{gather}}"
    found = read_equations(text, names_of(signed))
    meant = [read_quantity(plain, signed), read_quantity("c", signed)]
    assert [e.quantity for e in found.equations] == [
        read_quantity("p[A]", signed), read_quantity("p[B]", signed)]
    for equation, formula in zip(found.equations, meant, strict=True):
        assert all(value(equation.expression, salt) == value(formula, salt) for salt in (3, 8))
    text = rf"\begin{{gather}} Z = {latex} {between} Y = c \\ \pi_A = Z/Y \end{{gather}}"
    found = read_equations(text, names_of(signed))
    assert [definition.latex for definition in found.definitions] == ["Z", "Y"]


@pytest.mark.parametrize("row", [r"b^- - \\ c", r"b^{-} - {} \\ & c", r"a_{}- \\ & c"])
def test_a_sign_behind_a_script_is_an_operator(signed: Network, row: str) -> None:
    found = read_equations(rf"\begin{{align}} \pi_A &= {row} \end{{align}}", names_of(signed))
    assert len(found.equations) + len(found.passed_over) == 1
    assert all(passed.reason.startswith("line 1") for passed in found.passed_over)


@pytest.mark.parametrize(("text", "parts"), [
    (r"\left< x \right> = \left.y\right|_{c=0}", 2), (r"f(a = b) = [c < d] > e", 3),
    (r"\sum_{k=1}^{3} a = \{b = c\}", 2), (r"a := b \equiv c \approx d", 4),
])
def test_relations_in_brackets_separate_nothing(text: str, parts: int) -> None:
    (statement,) = split_statements(tokenize(text), None, text)
    assert len(statement.parts) == parts


def test_lines_and_labels(names: Names) -> None:
    text = "\n".join([
        "% a comment", r"\begin{align}", r"  \pi_A &= a", r"  \label{eq:a}\\",
        r"  &= b \label{eq:again} \\", r"  \pi_B", r"  &= c,", r"  \label{eq:b}", r"\end{align}",
        "", r"\begin{equation}\label{eq:c}", r"  \pi_C = g", r"\end{equation}",
    ])
    found = read_equations(text, names)
    assert [(e.line, e.label, e.latex) for e in found.equations] == [
        (3, "eq:a", "a"), (5, "eq:a", "b"), (6, "eq:b", "c"), (12, "eq:c", "g")]
    assert read_equations(text.replace("\n", "\r\n"), names) == found


# -- macros ---------------------------------------------------------------------------------------

@pytest.mark.parametrize("text", [
    r"\newcommand{\koff}{k_{off}}\[ \pi_A = \koff/c \]",
    r"\renewcommand*\koff{k_{off}}\[ \pi_A = \koff/c \]",
    r"\providecommand{\rate}[1]{k_{#1}}\[ \pi_A = \rate{off}/c \]",
    r"\newcommand{\rate}[2][off]{\frac{k_{#1}}{#2}}\[ \pi_A = \rate{c} \]",
    r"\def\over#1#2{\frac{k_{#2}}{#1}}\[ \pi_A = \over{c}{off} \]",
    r"\newcommand{\P}[1]{\pi_{#1}}\[ \P{A} = k_{off}/c \]",
    r"\newcommand{\is}{&=}\begin{align}\pi_A \is k_{off}/c\end{align}",
    r"\newcommand{\x}{a}\renewcommand{\x}{c}\[ \pi_A = k_{off}/\x \]\renewcommand{\x}{b}",
    r"\newenvironment{ours}{\begin{equation}}{\end{equation}}\begin{ours}\pi_A = k_{off}/c"
    r"\end{ours}",
])
def test_macros(names: Names, same: Check, text: str) -> None:
    found = read_equations(text, names)
    assert found.passed_over == ()
    (equation,) = found.equations
    assert same(equation.quantity, "p[A]")
    assert same(equation.expression, "k_off/c")


def test_a_macro_is_shown_as_it_is_written(names: Names) -> None:
    found = read_equations(
        "\\newcommand{\\w}[1]{k_{#1}}\n\n\\[ \\pi_A = \\w{on} + \\frac{\\w{off}}{c} \\]", names)
    assert pairs(found) == [(r"\pi_A", r"\w{on} + \frac{\w{off}}{c}")]


# -- definitions -----------------------------------------------------------------------------------

DEFINED = [
    r"\[ Z = k_{off} + k_{on} c \] \[ \pi_A = k_{off}/Z \]",
    r"\[ \pi_A = k_{off}/Z, \qquad Z = k_{off} + k_{on} c \]",
    r"\[ \pi_A = \frac{k_{off}}{Z}, \] where $Z = k_{off} + k_{on} c$.",
    r"Let us define \(\mathcal{N}_{\mathrm{s}} \equiv k_{off} + k_{on} c\), so that \[\pi_A ="
    r" \frac{k_{off}}{\mathcal{N}_\mathrm{s}}\]",
    r"\[ \pi_A = \frac{x_1}{x_1 + x_2} \] with $x_1 = k_{off}$ and $x_2 = k_{on} c$.",
    r"\[ \Delta = \tilde{x} + k_{off} \] \[ \tilde{x} := k_{on} c \] \[ \pi_A = k_{off}/\Delta \]",
    r"\[ Z = k_{off} + k_{on} c \] \[ Z = k_{off} + k_{on} c \] \[ \pi_A = k_{off}/Z \]",
    r"\begin{align} \pi_A &= 1 - K' / (1 + K'), \\ \text{where } K' &= k_{on} c / k_{off}"
    r" \end{align}",
    r"\[ \pi_A = k_{off}/c^{\left(0\right)}, \quad c^{(0)} = k_{off} + k_{on} c \]",
    r"\[ c^{\left(0\right)} = k_{off} + k_{on} c \] \[ \pi_A = k_{off}/c^{(0)} \]",
    r"\[ \pi_A = k_{off}/f', \quad f^{'} = k_{off} + k_{on} c \]",
    r"\[ Z = k_{off} + k_{on} c = k_{off} (1 + k_{on} c/k_{off}) \] \[ \pi_A = k_{off}/Z \]",
]


@pytest.mark.parametrize("text", DEFINED)
def test_definitions(names: Names, same: Check, text: str) -> None:
    found = read_equations(text, names)
    assert found.definitions
    (equation,) = found.equations
    assert same(equation.quantity, "p[A]")
    assert same(equation.expression, "k_off/(k_off + k_on*c)")


def test_what_definitions_are(names: Names, same: Check) -> None:
    found = read_equations("\n$$ N_A = a b, $$\n$$ x_1 \\equiv N_A^2 $$\nwith $D' = x_1 + c$.",
                           names)
    assert [(d.latex, d.line) for d in found.definitions] == [("N_A", 2), ("x_1", 3), ("D'", 4)]
    for definition, plain in zip(found.definitions, ["a*b", "(a*b)**2", "(a*b)**2 + c"],
                                 strict=True):
        assert same(definition.expression, plain)


@pytest.mark.parametrize("text", [
    "A formula $Z = a + b$ stands here", "where it ends. Then $Z = a$", "with\n\n$Z = a$",
    "where \\[ \\pi_A = c \\] and $Z = a$", "where $c = a$ and $Z$ and $k_{on} = 2$",
])
def test_no_definition_within_a_line(names: Names, text: str) -> None:
    assert read_equations(text, names).definitions == ()


def test_a_definition_that_nothing_uses_is_listed(names: Names) -> None:
    text = ("$$ r_A = k_{off}/c $$\n$$ Z = a + b $$\n$$ Y = Z^2 $$ with $X = a$,\n"
            "$$ \\pi_A = \\frac{a}{\\unknown + {Y}} $$\n$$ V = c $$\n$$ W_1 = c $$\n"
            "$$ \\pi_B \\approx e^{-V} \\text{ for all } a $$\n$$ \\pi_C = (W_1 $$")
    found = read_equations(text, names)
    assert [d.latex for d in found.definitions] == ["r_A", "Z", "Y", "X", "V", "W_1"]
    listed = [(line, reason) for line, reason in reasons(found) if "nothing uses" in reason]
    assert listed == [(1, "read as a definition, which nothing uses")]
    assert r"r_A = k_{off}/c" in {passed.excerpt for passed in found.passed_over}
    for alone in (r"\[ Z = a = Z \]", r"\[ Z = a \] \[ Z = a \]", r"so \[ Z = a + b \]"):
        assert "nothing uses" in str(reasons(read_equations(alone, names)))
    cases = r"\[ Z = a \] \[ \pi_A = \begin{cases} Z & a > b \\ b & a < b \end{cases} \]"
    assert "nothing uses" not in str(reasons(read_equations(cases, names)))


def test_an_ambiguous_name_counts_nowhere(names: Names) -> None:
    found = read_equations("$$ Z = a + b $$\n$$ \\pi_A = a/Z $$\n$$ Y = c/Z $$\n"
                           "$$ \\pi_B = a/b $$\n$$ Z = a - b $$", names)
    assert pairs(found) == [(r"\pi_B", "a/b")]
    assert found.definitions == ()
    listed = dict(reasons(found))
    said = "Z has two different definitions (lines 1 and 5); give each a name of its own"
    assert listed[1] == listed[5] == said
    assert listed[2] == f"line 2, column 14: {said}"
    assert listed[3] == f"line 3, column 10: {said}"
    found = read_equations("$$ c^{(1)} = a $$\n$$ c^{(1)} = b $$ $$ \\Delta c = a $$\n"
                           "$$ c^{(1)} = g $$\n$$ \\pi_A = c^{(1)} $$\n$$ \\pi_B = c^2 $$", names)
    assert "c^{(1)} has 3 different definitions (lines 1, 2 and 3)" in dict(reasons(found))[4]
    assert pairs(found) == [(r"\pi_B", "c^2")]


def test_a_name_waits_for_all_its_formulas(names: Names) -> None:
    found = read_equations("$$ Z = a $$ $$ Z = x $$ $$ x = y $$ $$ y = b $$\n"
                           "$$ \\pi_A = Z $$", names)
    assert [definition.latex for definition in found.definitions] == ["x", "y"]
    assert found.equations == ()


def test_another_formula_that_cannot_be_read_is_listed(names: Names) -> None:
    found = read_equations("$$ Z = \\sum_i N_i $$\n$$ Z = a + b $$\n$$ \\pi_A = a/Z $$", names)
    assert [(d.latex, d.line) for d in found.definitions] == [("Z", 2)]
    assert [line for line, _ in reasons(found)] == [1]
    assert len(found.equations) == 1


def test_definitions_that_grow(names: Names) -> None:
    grown = "".join(f"$$ x_{{{n + 1}}} = x_{{{n}}} a + x_{{{n}}} b $$\n" for n in range(40))
    found = read_equations(f"$$ x_{{0}} = c $$\n{grown}", names)
    assert 5 < len(found.definitions) < 20
    assert len(found.definitions) + len(found.passed_over) == 41
    assert "definitions put in" in found.passed_over[0].reason


def test_definitions_in_a_circle(names: Names) -> None:
    found = read_equations("$$ x = y + 1 $$ $$ y = x + 1 $$ $$ z = z + 1 $$", names)
    assert found.definitions == found.equations == ()
    assert len(found.passed_over) == 3


# -- passed over -----------------------------------------------------------------------------------

PASSED = [
    (r"\pi_A \approx c", r"\approx is no equality"),
    (r"\pi_A \le c = g", r"\le is no equality"),
    (r"\pi_A < 1", "< is no equality"),
    (r"\pi_A \propto c", r"\propto is no equality"),
    (r"\pi_A \simeq c", r"\simeq is no equality"),
    (r"\pi_A", "no equals sign"),
    (r"k_{on} = c", "symbol of the network"),
    (r"k_{on} c = a", "no quantity"),
    (r"\frac{d \pi_A}{dt} = a", "by time"),
    (r"\frac{\mathrm{d}p_A}{\mathrm{d}t} = a", "by time"),
    (r"\dot p_A = a", "by time"),
    (r"\partial_t \pi_A = a", "by time"),
    (r"= a", "nothing stands left"),
    (r"\pi_A = ", "nothing stands"),
    (r"\pi_A = \begin{cases} a & c > 1 \\ b & c < 1 \end{cases}", "cases"),
    (r"\pi_A = \begin{pmatrix} a & b \end{pmatrix}", "pmatrix"),
    (r"\pi_A k_{off} = \pi_B a", "both sides"),
    (r"\pi_A = a \quad \text{if } c = 1", '"if"'),
    (r"\pi_A = a \quad (c > 1)", "(c>1)"),
    (r"\pi_A = a \qquad \text{for all } c", "for all"),
    (r"\pi_A = a \hspace{1em} (c > 1)", "(c>1)"),
    (r"\pi_k = \frac{a}{b}, \quad k = A, B", "B beside"),
    (r"\pi_A(c) = a", "line 1, column 3: "),
    (r"\pi_A \stackrel{!}{=} a", "no equals sign"),
    (r"\pi_A = a \quad (c > 1)", "outside of the display"),
    (r"\pi_X = a", "line 1, column "),
    (r"", "no formula"),
    (r"\label{x}", "no formula"),
]


@pytest.mark.parametrize("rows", [
    r"\pi_A &= a && \text{if } c = 1", r"\pi_A &= a \\ & \text{if $c = 1$}",
    r"\pi_A &= a \\ & \text{for } c = 1", r"\pi_A &= a & &\text{(two states)}",
])
def test_words_about_an_equation_keep_it_from_being_read(names: Names, rows: str) -> None:
    found = read_equations(rf"\begin{{align}}{rows}\end{{align}}", names)
    assert found.equations == ()
    assert "the words" in found.passed_over[0].reason


@pytest.mark.parametrize(("inside", "reason"), PASSED)
def test_passed_over(names: Names, inside: str, reason: str) -> None:
    found = read_equations(rf"\[{inside} \]", names)
    assert found.equations == found.definitions == ()
    assert found.passed_over
    assert all(passed.line == 1 for passed in found.passed_over)
    assert any(reason in passed.reason for passed in found.passed_over), found
    assert all("\n" not in passed.reason for passed in found.passed_over)


@pytest.mark.parametrize(("text", "unread"), [
    (r"$$ \pi_X = a $$", True), (r"$$ P_C^{ss} = a $$", True), (r"$$ J_{far} = a $$", True),
    (r"$$ p_A^{(0)} = a $$", True), (r"$$ \pi_X k_{on} = a $$", True),
    (r"$$ p^{\infty}_{A} \,= a $$", True), (r"$$ \pi_A = \unknown $$", True),
    ("$$ \\pi_A = a\n\n$$ \\pi_B = b $$", True), (r"\[ \pi_A = {a \]", True),
    (r"\[ \pi_A = a} \]", True), (r"a \end{align}", True), (r"\begin{align} \pi_A &= a", True),
    (r"\begin{dmath} \pi_A = a \end{dmath}", True), (r"\iffalse $$ \pi_A = a $$", True),
    (r"\newcommand{\say}{\[ \pi_A = a \]} \say", True),
    (r"\newcommand{\x}{\x} \[ \pi_A = \x \]", True), (r"\[ \pi_A = a \\ \begin \]", True),
    (r"$$ \pi_A \approx c $$", False), (r"$$ \pi_A $$", False), (r"$$ k_{on} = c $$", False),
    (r"$$ \frac{dp_X}{dt} = c $$", False), (r"$$ \mathbf{W} p = 0 $$", False), ("$$ $$", False),
    (r"$$ X_3 y = 4 $$", False), (r"\input{more}", False), ("$x\n\n", False),
    (r"$$ \pi_A(t) = a $$", False), (r"$$ X = a $$", False),
])
def test_what_could_have_been_a_result(names: Names, text: str, unread: bool) -> None:
    passed = read_equations(text, names).passed_over
    assert [each.unread for each in passed] == [unread]


def test_an_equality_of_quantities(names: Names, same: Check) -> None:
    found = read_equations(r"\[ J_{bind} = \pi_A k_{on} c - \pi_B k_{off} = J_{flip} \]", names)
    assert all(same(equation.quantity, "current[bind]") for equation in found.equations)
    first, second = found.equations
    assert same(first.expression, "p[A]*k_on*c - p[B]*k_off")
    assert same(second.expression, "current[flip]")


def test_the_place_of_what_cannot_be_read(names: Names) -> None:
    text = "Text\n\\begin{align}\n  \\pi_A &= a \\\\\n  &= b + \\unknown c\n\\end{align}\n"
    ((line, reason),) = reasons(read_equations(text, names))
    column = text.splitlines()[3].index(r"\unknown") + 1
    assert line == 4
    assert reason.startswith(f"line 4, column {column}: ")
    single = r"so $$ \pi_A = \unknown $$"
    ((_, reason),) = reasons(read_equations(single, names))
    assert reason.startswith(f"line 1, column {single.index('unknown')}: ")


def test_a_chain_goes_on_after_what_cannot_be_read(names: Names) -> None:
    found = read_equations(r"\[ \pi_A = \sum_k q_k = a/b \]", names)
    assert pairs(found) == [(r"\pi_A", "a/b")]
    assert len(found.passed_over) == 1


# -- whole texts ---------------------------------------------------------------------------------

ARTICLE = r"""\documentclass[aps,pre,twocolumn]{revtex4-2}
\usepackage{amsmath}
\newcommand{\kon}{k_{\mathrm{on}}}
\newcommand{\koff}{k_{\mathrm{off}}}
\newcommand{\pd}[2]{\frac{\partial #1}{\partial #2}}
\DeclareMathOperator{\Tr}{Tr}
\begin{document}
\title{A pump with a lid}
\begin{abstract} We solve it; a fraction of 5\% of it. % \[ \pi_A = 0 \]
\end{abstract}
\section{Steady state}
The populations obey
\begin{equation}
  \frac{\mathrm{d}p_A}{\mathrm{d}t} = \koff p_B - \kon c\, p_A + g\, p_C - h\, p_A.
  \label{eq:master}
\end{equation}
Counting trees gives
\begin{align}
  N_A &= \koff b + \koff g + a g , \label{eq:NA} \\
  N_B &= \kon c\,(b + g) + h b , \nonumber \\
  N_C &= \kon c\, a + h (a + \koff) , \label{eq:NC}
\end{align}
so that
\begin{equation}
  \pi_A = \frac{N_A}{D}, \qquad \pi_B = \frac{N_B}{D}
  \quad\text{and}\quad \pi_C = \frac{N_C}{D}, \label{eq:p}
\end{equation}
where $D = N_A + N_B + N_C$ and $c \in [0, 1]$ stays free.
\section{Current}
The current through every edge is
\begin{align}
  J_{\mathrm{bind}} &= \kon c\, \pi_A - \koff \pi_B \\
  &= \frac{\kon c\, a g - \koff b h}{D} \label{eq:J} \\
  &\approx \frac{\kon c\, a g}{D} .
\end{align}
It vanishes for
$$ \kon c\, a g = \koff b h . $$
\section{Response}
\begin{multline}
  \pd{\ln \pi_A}{c} = - \frac{\kon}{D} \bigl( b + g \\
  + a \bigr) . \label{eq:response}
\end{multline}
\begin{verbatim}
\[ \pi_A = 1 \]
\end{verbatim}
\end{document}
\[ \pi_A = 2 \]
"""

FRAGMENT = r"""% appendix, to be \input
\appendix
\section{Bounds and all that}
We write \(\sigma_0 = a b\) as before. With $K = \frac{k_{on}c}{k_{off}}$,
\[
\begin{split}
  p_A &= \left[ 1 + K
      + \frac{a}{b} K \right]^{-1} \\
  p_B &= K p_A
\end{split}
\]
\begin{eqnarray}
  p_C & = & \frac{a}{b}\, K \left( 1 + K \right. \nonumber \\
      &   & \left. {}+ \frac{a}{b}\, K \right)^{-1}
\end{eqnarray}
\begin{gather*}
  p_A + p_B + p_C = 1 , \\
  0 \le p_A \le 1 , \\
  \langle \mathrm{open} \rangle = p_B + \tfrac12 p_C
\end{gather*}
\iffalse
\begin{equation} p_A = 0 \end{equation}
\fi
\begin{equation*}
  p_A = \begin{cases} 1 & c = 0 \\ 0 & c \to \infty \end{cases}
\end{equation*}
\begin{equation}
  p_B \simeq K
\end{equation}
\input{more}
"""

NOTES = r"""\def\be{\begin{equation}}
\def\ee{\end{equation}}
\def\lr#1{\left( #1 \right)}
\def\S{a + b + c}
Notes of a rainy day.

\be \pi_A \equiv \lr{1 + \S}^{-1} \ee
\be\label{two} \pi_B = { b \over a } \ee
\be \pi_C = 1 - \pi_A - \pi_B \ee
\begin{alignat}{2}
 k_{on} &= 3, &\qquad \pi_A &= \frac{1}{1 + \S} \quad \text{if } c = 1, \\
 \pi_B &= a^2, & \pi_C &= b^2
\end{alignat}
$$ \pi_A = \int_0^1 x\,dx $$
$$ \frac{\pi_A}{\pi_B} = \frac{\pi_B}{\pi_C} $$
"""

STYLES = [
    (ARTICLE, 6, {"eq:NA", "eq:NC", "eq:p", "eq:J", "eq:response"}, [
        ("p[A]", "(k_off*b + k_off*g + a*g)/TREES", 25),
        ("p[B]", "(k_on*c*(b + g) + h*b)/TREES", 25),
        ("p[C]", "(k_on*c*a + h*(a + k_off))/TREES", 26),
        ("current[bind]", "k_on*c*p[A] - k_off*p[B]", 32),
        ("current[bind]", "(k_on*c*a*g - k_off*b*h)/TREES", 33),
        ("d ln p[A] / d c", "-k_on/TREES*(b + g + a)", 40),
    ]),
    (FRAGMENT, 5, set(), [
        ("p[A]", "1/(1 + LEFT + a/b*LEFT)", 7), ("p[B]", "LEFT*p[A]", 9),
        ("p[C]", "a/b*LEFT/(1 + LEFT + a/b*LEFT)", 13), ("p[A] + p[B] + p[C]", "1", 17),
        ("mean[open]", "p[B] + 1/2*p[C]", 19),
    ]),
    (NOTES, 6, {"two"}, [
        ("p[A]", "1/(1 + a + b + c)", 7), ("p[C]", "1 - p[A] - p[B]", 9), ("p[B]", "a**2", 12),
        ("p[C]", "b**2", 12),
    ]),
]
TREES = "(k_off*b + k_off*g + a*g + k_on*c*(b + g) + h*b + k_on*c*a + h*(a + k_off))"
LEFT = "(k_on*c/k_off)"


@pytest.mark.parametrize(("text", "displays", "labels", "meant"), STYLES,
                         ids=["article", "fragment", "notes"])
def test_whole_texts(
    names: Names, same: Check, text: str, displays: int, labels: set[str],
    meant: list[tuple[str, str, int]],
) -> None:
    found = read_equations(text, names)
    assert [equation.line for equation in found.equations] == [line for _, _, line in meant]
    for equation, (quantity, plain, _) in zip(found.equations, meant, strict=True):
        formula = plain.replace("TREES", TREES).replace("LEFT", LEFT)
        assert same(equation.quantity, quantity), equation
        assert same(equation.expression, formula), equation
    assert {e.label for e in found.equations if e.label} <= labels
    check_accounted(text, found, displays)


def check_accounted(text: str, found: Reading, displays: int) -> None:
    """Each display, found here line by line, holds a line of something that was read or listed."""
    spans = display_lines(text)
    assert len(spans) == displays
    lines = {e.line for e in found.equations} | {d.line for d in found.definitions}
    lines |= {passed.line for passed in found.passed_over}
    for span in spans:
        assert lines & set(span), (span, found)


def display_lines(text: str) -> list[range]:
    """The lines of each display of a tidy text, counted from 1."""
    known = "(?:equation|align|gather|multline|eqnarray)"
    opening = re.compile(rf"\\be(?![a-z])|\\\[|^\$\$|\\begin\{{{known}")
    closing = re.compile(rf"\\ee|\\\]|\$\$$|\\end\{{{known}")
    spans: list[range] = []
    begun = None
    hidden = False
    for line, shown in enumerate(text.splitlines(), 1):
        shown = shown.partition("%")[0].strip()
        if shown.startswith((r"\begin{verbatim}", r"\iffalse", r"\end{document}")):
            hidden = True
        elif shown.startswith((r"\end{verbatim}", r"\fi")):
            hidden = False
        elif not hidden and not shown.startswith(r"\def"):
            if opening.search(shown):
                begun = line
            if begun is not None and closing.search(shown):
                spans.append(range(begun, line + 1))
                begun = None
    return spans


NO_DISPLAY = [
    "Words, 5\\% of them.", "% $$ \\pi_A = c $$", "with $x$ and \\(y\\)", "a\\\\[2pt] b",
    "\\iffalse\n$$ a $$\n\\fi", "\\begin{verbatim}\n\\[ a\n\\end{verbatim}", "\\section{A $c$}",
    "\\begin{itemize}\\item\n\\end{itemize}", "\\verb|\\[| and \\verb+$$+",
    "\\newcommand{\\x}{\\[}", "\\unknown{$a$}",
]


@pytest.mark.parametrize("seed", range(12))
def test_every_display_of_a_shuffled_text_is_accounted_for(names: Names, seed: int) -> None:
    draw = random.Random(seed)
    displays = [f"\\[{inside} \\]" for inside, _ in PASSED]
    displays += [f"\\begin{{{environment}}}\n{rows}\n\\end{{{environment.partition('}')[0]}}}"
                 for environment, rows, _ in ROWS]
    displays += [text for text, _ in UNCLOSED[:5]]
    lines: list[str] = []
    spans: list[range] = []
    for _ in range(40):
        chosen = draw.choice(draw.choice([displays, NO_DISPLAY]))
        if chosen in displays:
            spans.append(range(len(lines) + 1, len(lines) + 2 + chosen.count("\n")))
        lines += [*chosen.split("\n"), *draw.choice([[""], ["", "and"], [""]])]
        lines += [""]
    found = read_equations("\n".join(lines), names)
    said = {e.line for e in found.equations} | {d.line for d in found.definitions}
    said |= {passed.line for passed in found.passed_over}
    assert all(said & set(span) for span in spans)
    assert all(any(line in span for span in spans) for line in said)


# -- hostile input --------------------------------------------------------------------------------

UNCLOSED = [
    (r"\[ \pi_A = c", 1), ("text\n\\begin{align} \\pi_A &= c", 2), ("$$ \\pi_A = c\n\n so $x$", 1),
    (r"\begin{equation} a \begin{align} \pi_A &= c \end{align}", 1), (r"\[ \pi_A = c $$", 1),
    ("\n\n$x", 3), ("\\begin{comment}", 1), ("\\begin{verbatim} $$", 1), (r"\iffalse $$a$$", 1),
    (r"a \]", 1), (r"\end{align}", 1), (r"\[ \pi_A = {c \]", 1), (r"\[ \pi_A = c} \]", 1),
    (r"\newcommand{\x}{a", 1), (r"\newcommand", 0), (r"\[ \begin{aligned} a \]", 1),
    (r"\[ \end{aligned} \]", 1), (r"\[ \pi_A = \frac{a} \]", 1), (r"\[ \left( \]", 1),
    (r"\newcommand{\x}{\x}\[ \pi_A = \x \]", 1), (r"\def\x{\y\y}\def\y{\x\x}\[ \pi_A = \x \]", 1),
    (r"\newcommand{\x}[2]{#1}\[ \pi_A = \x \]", 1), (r"\def\x#1.{#1}", 1), (r"\[ \label \]", 1),
    (r"\[ \pi_A = 1/0 \]", 1), (r"\[ \pi_A = 2^{9999999} \]", 1), ("\\[ \x00 = \x01 \\]", 1),
    (r"\[ \begin \]", 1), (r"\[ \text \]", 1), (r"\[ \pi_A = \text{ \]", 1), (r"\[ = = = \]", 1),
]


@pytest.mark.parametrize(("text", "line"), UNCLOSED)
def test_what_is_broken_gives_one_clear_line(names: Names, text: str, line: int) -> None:
    found = read_equations(text, names)
    assert all("\n" not in passed.reason + passed.excerpt for passed in found.passed_over)
    assert all(passed.reason for passed in found.passed_over)
    assert line == 0 or line in {passed.line for passed in found.passed_over}


def test_reading_goes_on_after_what_is_not_closed(names: Names) -> None:
    found = read_equations("\\[ \\pi_A = a\n\n\\[ \\pi_B = b \\]\n\\begin{align} \\pi_C &= c\n"
                           "$$ \\pi_C = g $$ $ x\n\n $$ \\pi_A = h $$", names)
    assert [e.line for e in found.equations] == [3, 5, 7]
    assert [line for line, _ in reasons(found)] == [1, 4, 5]


HUGE = {
    "braces": lambda: "$$ \\pi_A = " + "{" * 100_000 + "c" + "}" * 100_000 + " $$",
    "braces in one display": lambda: "$$ \\pi_A = " + "{" * 20_000 + "c" + "}" * 20_000 + " $$",
    "open braces": lambda: "{" * 100_000 + "$$ \\pi_A = c $$",
    "environments": lambda: "$$" + r"\begin{aligned}" * 3_000 + "$$",
    "text": lambda: "All the same. Where $x$ stands. " * 30_000,
    "displays": lambda: "$$ \\pi_A = c $$\n" * 6_000,
    "dollars": lambda: "$" * 60_000,
    "openings": lambda: r"\begin{align}" * 15_000,
    "doubling": lambda: "".join(
        rf"\newcommand{{\x{chr(98 + n)}}}{{\x{chr(97 + n)}\x{chr(97 + n)}}}" for n in range(25)
    ) + r"\newcommand{\xa}{c}" + r"$$ \pi_A = \xz $$" * 300,
    "arguments": lambda: r"\newcommand{\x}[1]{#1 #1}" + (
        "$$ \\pi_A = " + r"\x{" * 30 + "c" + "}" * 30 + " $$\n") * 100,
    "definitions": lambda: "".join(
        f"$$ x_{{{n}}} = x_{{{n - 1}}} x_{{{n - 1}}} + x_{{{n - 1}}} $$ " for n in range(1, 200)
    ) + "$$ x_0 = a + b $$ $$ \\pi_A = x_{199} $$",
    "rows": lambda: r"\begin{align} \pi_A &= a" + r"\\ &+ b" * 800 + r"\end{align}",
    "wide spaces": lambda: r"$$ \pi_A = a" + r"\quad b" * 6_000 + "$$",
    "conditionals": lambda: r"\iffalse " * 100_000,
}


@pytest.mark.parametrize("kind", HUGE)
def test_long_input_takes_bounded_time(names: Names, kind: str) -> None:
    begun = time.monotonic()
    read_equations(HUGE[kind](), names)
    assert time.monotonic() - begun < 20


def test_files(names: Names, tmp_path: Path) -> None:
    path = tmp_path / "result.tex"
    path.write_bytes("\ufeffÜber $$\\pi_A = c$$".encode())
    assert pairs(read_equations_file(path, names)) == [(r"\pi_A", "c")]
    path.write_bytes(b"$$\\pi_A = c$$\n% caf\xe9")
    with pytest.raises(InputError, match=r"result.tex:2: the byte 0xe9 is not UTF-8"):
        read_equations_file(path, names)
    path.write_bytes(b"a" * 2_000_001)
    with pytest.raises(InputError, match="2000000 bytes"):
        read_equations_file(path, names)
    for wrong in (tmp_path, tmp_path / "none.tex", "a\x00b"):
        with pytest.raises(InputError) as raised:
            read_equations_file(wrong, names)
        assert "\n" not in str(raised.value)
