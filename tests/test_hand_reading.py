r"""Formulas in LaTeX and what they mean.

The meaning of each is given in the plain syntax of quantities, read by the project's other reader,
and compared by exact values modulo a prime; where numbers are involved, also with Fraction. What
the notation means is common practice in papers on kinetic networks, no source.
"""

from fractions import Fraction

import pytest
import sympy

from symbolic_response.errors import ExpressionError, FormulaError
from symbolic_response.expressions.tree import Number, Symbol
from symbolic_response.hand.latex.macros import expand, take_definitions
from symbolic_response.hand.latex.names import Names, names_of
from symbolic_response.hand.latex.reading import read_formula, read_formula_tokens
from symbolic_response.hand.latex.tokens import line_and_column, tokenize
from symbolic_response.network import read_network_text
from symbolic_response.network.build import build_network
from symbolic_response.network.quantities import DirectedRate, Probability
from tests.formula_values import MOTOR, plain_value, value

NAMES = names_of(MOTOR)

MEANINGS = r"""
a + b                                       | a + b
-a                                          | -a
+a - b                                      | a - b
- a^2                                       | -a**2
a b c                                       | a*b*c
abc                                         | a*b*c
2ab                                         | 2*a*b
2.5                                         | 5/2
0.125 a                                     | a/8
.5 a                                        | a/2
a/b                                         | a/b
a b/c                                       | a*b/c
F/2 + a                                     | F/2 + a
1/2                                         | 1/2
(a + b)/(a - b)                             | (a + b)/(a - b)
a/b^2                                       | a/b**2
a/(bc)                                      | a/(b*c)
a/\ln(b)                                    | a/ln(b)
a \cdot b/c                                 | a*b/c
\frac{a}{b}                                 | a/b
\tfrac12 a                                  | a/2
\dfrac{a+b}c                                | (a + b)/c
\frac ab                                    | a/b
\frac{a}{b} c                               | a*c/b
2 \frac{a}{b}                               | 2*a/b
a^2                                         | a**2
a^{10}                                      | a**10
a^{-1}                                      | 1/a
a^{1/2}                                     | sqrt(a)
a^{(1 + 2)/2}                               | a**(3/2)
a^{\frac{2}{3}}                             | a**(2/3)
a^\frac12                                   | a**(1/2)
(a+b)^2                                     | (a + b)**2
[a + b]^{-2}                                | (a + b)**-2
\{a + b\} c                                 | (a + b)*c
\left(\frac{a}{b}\right)^{2} c              | a**2/b**2*c
\bigl(a + \Bigl[b - c\Bigr]\bigr)           | a + b - c
\left[a\right]                              | a
k_{12} \left(k^{+}\right)^{2} b            | k_12*k**2*b
a (k_{on})^{-1} + c                         | a/k_on + c
a{}^2 b                                     | a**2*b
k{}_{12}{}^{2}                              | k_12**2
a + {}b                                     | a + b
a(b + c)                                    | a*(b + c)
k_{on}(a + b)                               | k_on*(a + b)
k^{+}(a - b/c)                              | k*(a - b/c)
a \cdot (b)                                 | a*b
2(a)                                        | 2*a
(a + b)(a - c)                              | (a + b)*(a - c)
(a)(b)c                                     | a*b*c
a \times b \, c \; k_{12} ~ b \quad c       | a*b*c*k_12*b*c
k_{on}c                                     | k_on*c
k_{\mathrm{on}} c                           | k_on*c
k_\text{on} c                               | k_on*c
k_{12}^2                                    | k_12**2
k^2_{12}                                    | k_12**2
k^{+} k_{12}                                | k*k_12
(k^{+})^2                                   | k**2
\mathrm{ATP} + a                            | ATP + a
\text{ATP}^2                                | ATP**2
ATP                                         | ATP
\mu a                                       | mu*a
B_{turn} + E_s - E_{t}                      | B_turn + E_s - E_t
\sqrt{a + b}                                | sqrt(a + b)
\sqrt a                                     | sqrt(a)
\sqrt[3]{a}                                 | a**(1/3)
\sqrt{a}^3                                  | a**(3/2)
\exp(-F/2)                                  | exp(-F/2)
\exp\left(-\frac{F}{2}\right)               | exp(-F/2)
e^{-F/2} c                                  | exp(-F/2)*c
\mathrm{e}^{\mu}                            | exp(mu)
e^F                                         | exp(F)
e^{\frac{a}{b}}(a + b)                      | exp(a/b)*(a + b)
\ln(a/b)                                    | ln(a/b)
\log(a)                                     | ln(a)
\ln a - \ln b                               | ln(a) - ln(b)
b \ln a + c                                 | b*ln(a) + c
\ln\frac{a}{b}                              | ln(a/b)
\ln\left[\frac{a}{b}\right] c               | ln(a/b)*c
(\ln a)^2                                   | ln(a)**2
\operatorname{ln}(a) b                      | ln(a)*b
\tanh(F/4)                                  | (exp(F/2) - 1)/(exp(F/2) + 1)
\tanh\left(\frac{F}{4}\right)/2             | tanh(F/4)/2
\sinh(F) \cosh(\mu)                         | (exp(F) - exp(-F))/2*(exp(mu) + exp(-mu))/2
\coth F                                     | (exp(2*F) + 1)/(exp(2*F) - 1)
|a - b|                                     | sqrt((a - b)**2)
\left|a - \left|b\right|\right|             | sqrt((a - sqrt(b**2))**2)
\lvert a \rvert c + \left|b\right|          | sqrt(a**2)*c + sqrt(b**2)
\bigl|b\bigr| a                             | sqrt(b**2)*a
|a|^2 b                                     | sqrt(a**2)**2*b
\frac{|a|}{|b|}                             | sqrt(a**2)/sqrt(b**2)
\sum_{i=1}^{3} a^i                          | a + a**2 + a**3
b \sum_{i=1}^{2} i a^{2i} c - b             | b*(a**2*c + 2*a**4*c) - b
\sum_{i=11}^{11} k_{i+1} a                  | k_12*a
\sum_{i=14}^{14} a^{i} k_{i-2}               | a**14*k_12
\prod_{i=1}^{3} (a + i)                     | (a + 1)*(a + 2)*(a + 3)
\sum_{i=0}^{1}\sum_{j=1}^{2} a^{i} b^{j}    | b + b**2 + a*b + a*b**2
\pi_A + \pi_{B}                             | p[A] + p[B]
p_A P_B                                     | p[A]*p[B]
\pi_{\mathrm{A}}^2                          | p[A]**2
\pi_{\{A,B\}}                               | p[A, B]
p_{\{B, C, A\}}                             | p[A, B, C]
\pi_{s_0}                                   | p[s_0]
\pi_{\mathrm{s\_0}}                         | p[s_0]
J_{bind}                                    | current[bind]
I_{\mathrm{bind}} - j_\text{slip}           | current[bind] - current[slip]
J_{set\_down}                               | current[set_down]
J_{CA}                                      | current[C_A]
J_{C\_A}                                    | current[C_A]
\tau_{bind}                                 | traffic[bind]
w^{+}_{bind} w_{slip}^-                     | forward[bind]*backward[slip]
w_{bind}^{+} \pi_A                          | forward[bind]*p[A]
W_{BA}                                      | forward[bind] + forward[slip]
W_{A,B}                                     | backward[bind] + backward[slip]
W_{C \leftarrow B}                          | forward[set_down]
W_{CC}                                      | -backward[set_down] - forward[C_A] - forward[out]
\langle \mathrm{load} \rangle               | mean[load]
\langle load \rangle^2                      | mean[load]**2
\left\langle \text{load} \right\rangle      | mean[load]
\sigma                                      | entropy_production
\frac{\partial \pi_A}{\partial c}           | d p[A] / d c
\frac{\partial \pi_A}{\partial \varepsilon_A} | d p[A] / d energy[A]
\partial_{B_{bind}} \pi_A                   | d p[A] / d barrier[bind]
\partial_{B_{\{bind,slip\}}} \pi_A          | d p[A] / d barrier[bind, slip]
\frac{d\ln J_{bind}}{d\ln c}                | d ln current[bind] / d ln c
\frac{\mathrm{d} J_{CA}}{\mathrm{d} \ln(c)} | d current[C_A] / d ln c
\frac{\partial \ln(\pi_A/\pi_B)}{\partial F} | d ln(p[A]/p[B]) / d F
\frac{\partial}{\partial c}(\pi_A J_{bind}) | d p[A]*current[bind] / d c
\frac{\partial \pi_t}{\partial B_{turn}}    | d p[t] / d barrier[turn]
\frac{\partial \pi_t}{\partial E_t}         | d p[t] / d energy[t]
\frac{\partial^2 \pi_A}{\partial c \, \partial a}  | d (d p[A] / d a) / d c
\frac{\partial^2 \pi_A}{\partial c^2}       | d (d p[A] / d c) / d c
\frac{\partial^2 \pi_A}{\partial(\ln c)^2}  | d (d p[A] / d ln c) / d ln c
a \partial_{c} \pi_A - b                    | a*(d p[A] / d c) - b
\frac{c}{\pi_A} \frac{\partial \pi_A}{\partial c} a | c/p[A]*(d p[A] / d c)*a
$a + b$                                     | a + b
\[ a + b . \]                               | a + b
a + b,                                      | a + b
a &{}+ b \notag\\ &{}+ c                    | a + b + c
\begin{aligned} a \\ + b \end{aligned}      | a + b
{a}b + {}c + {(a + b)}^2                    | a*b + c + (a + b)**2
a % rest\n + b                              | a + b
\newcommand{\on}{k_{\mathrm{on}}} \on c     | k_on*c
\def\rate#1{k_{#1}} \rate{12} a             | k_12*a
\newcommand{\half}[2][2]{\frac{#2}{#1}} \half{a} + \half[3]{b} | a/2 + b/3
"""


def cases() -> list[tuple[str, str]]:
    found = []
    for line in MEANINGS.strip().splitlines():
        latex, _, plain = (part.strip() for part in line.rpartition(" | "))
        found.append((latex.replace(r"\n", "\n") if "% rest" in latex else latex, plain))
    return found


@pytest.mark.parametrize(("latex", "plain"), cases())
def test_meaning(latex: str, plain: str) -> None:
    assert value(read_formula(latex, NAMES)) == plain_value(plain)


@pytest.mark.parametrize(("latex", "exact"), [
    ("2.5", Fraction(5, 2)), ("0.1", Fraction(1, 10)), (r"\frac12 + \frac{1}{3}", Fraction(5, 6)),
    ("2^{10}", Fraction(1024)), ("2/3 - 1", Fraction(-1, 3)), (r"3 \cdot 4^{-1}", Fraction(3, 4)),
    ("-2^2", Fraction(-4)), ("(-2)^2", Fraction(4)), ("|-3|", Fraction(3)),
    (r"\sum_{k=1}^{100} k", Fraction(5050)), (r"\prod_{k=1}^{5} k", Fraction(120)),
    (r"\sum_{k=1}^{4} \frac{1}{k}", Fraction(25, 12)), (r"\sum_{k=2}^{3} 2k^2", Fraction(26)),
    ("0.1(1 + 2)", Fraction(3, 10)), (r"\exp(0) + \ln(1)", Fraction(1)),
    ("[1 + 2](3)", Fraction(9)),
])
def test_numbers_are_exact(latex: str, exact: Fraction) -> None:
    """Oracle: arithmetic of Fraction by hand."""
    assert read_formula(latex, NAMES) == Number(exact)


def names_with(symbols: str, rates: str) -> Names:
    return names_of(read_network_text(
        f'title = "t"\n[symbols]\na = {{}}\n{symbols}\n[states.A]\n[states.B]\n[[transitions]]\n'
        f'name = "e"\nbetween = ["A", "B"]\nrates = {rates}\n'
    ))


@pytest.mark.parametrize("plain", [
    "a*k**2*b", "k_on*k**2/(a + k**3)", "k**(-2)*mu**3", "exp(F)*k**2*sqrt(b)",
])
def test_the_latex_of_sympy_is_read(plain: str) -> None:
    """Oracle: the text that SymPy printed, read by the other reader."""
    written = {sympy.Symbol(name): latex for name, latex in (
        ("k", "k^{+}"), ("k_on", "k_{on}"), ("mu", r"\mu"), ("F", "F"))}
    expression = sympy.sympify(plain, locals={str(symbol): symbol for symbol in written})
    latex = sympy.latex(expression, symbol_names=written)
    assert value(read_formula(latex, NAMES)) == plain_value(plain)


def test_letters_give_way_to_symbols() -> None:
    r"""Where p is a symbol, p_A is no probability; where \pi is one, p is the letter for it."""
    names = names_with("p_1 = {}", '["a*p_1", "1"]')
    with pytest.raises(FormulaError, match=r"unknown symbol p_\{A\}"):
        read_formula("p_A", names)
    assert read_formula(r"P_A", names) == Probability((0,))
    names = names_with(r"""q = {latex = '\pi_A'}""", '["a*q", "1"]')
    assert read_formula(r"\pi_A", names) == Symbol("q")
    assert read_formula("p_A", names) == Probability((0,))


def test_no_entropy_production_with_a_one_way_step() -> None:
    steps = [("A", "B", "a"), ("B", "A", "b", "c")]
    names = names_of(build_network("drop", states="A B", transitions=steps))
    for letter in (r"\sigma", r"\Sigma"):
        with pytest.raises(FormulaError, match="unknown"):
            read_formula(letter, names)
    assert read_formula(r"\sigma", names.with_definitions({r"\sigma": Symbol("a")})) == Symbol("a")


def test_e_is_a_symbol_where_the_file_has_one() -> None:
    names = names_with("e = {}", '["a*e", "1"]')
    assert value(read_formula("e^2 a", names)) == value(read_formula("a e e", names))
    with pytest.raises(FormulaError, match="no exact exponent"):
        read_formula("e^{a}", names)


def test_longest_name_counts_and_two_readings_are_refused() -> None:
    names = names_with(r"""b = {latex = '\Delta\mu'}
d_ = {latex = '\Delta'}
m = {latex = '\mu'}""", '["a*b*d_", "m"]')
    assert read_formula(r"\Delta\mu", names) == Symbol("b")
    assert read_formula(r"\mu\Delta", names) != Symbol("b")
    names = names_with(r"""b = {latex = 'a^{2}'}""", '["a*b", "1"]')
    with pytest.raises(FormulaError, match="can be read as"):
        read_formula("a^2", names)
    names = names_with(r"""b = {latex = 'x_{\mathrm{on}}'}
c = {latex = 'x_{\mathit{on}}'}""", '["a*b*c", "1"]')
    assert read_formula(r"x_{\mathrm{on}}", names) == Symbol("b")
    with pytest.raises(FormulaError, match="2 meanings"):
        read_formula("x_{on}", names)


def test_the_latex_of_a_symbol_that_tex_sets_otherwise_is_named() -> None:
    with pytest.raises(FormulaError, match=r"LaTeX of symbol 'b': line 1.*write _\{12\}"):
        names_with("b = {latex = 'x_12'}", '["a*b", "1"]')


def test_primes_in_braces() -> None:
    names = NAMES.with_definitions({"f'": Symbol("a"), "f''": Symbol("b")})
    for latex, name in (("f^{'}", "a"), ("f^{''}", "b"), (r"f^{\prime}", "a"), ("f'{}'", "b")):
        assert read_formula(latex, names) == Symbol(name)


def test_definitions_of_a_text() -> None:
    names = NAMES.with_definitions({r"\Sigma": read_formula("a + b", NAMES), "x_1": Symbol("c")})
    assert value(read_formula(r"\frac{a}{\Sigma} x_{1}^2", names)) == plain_value("a/(a+b)*c**2")
    assert read_formula(r"\Sigma", NAMES) != read_formula(r"\Sigma", names)
    with pytest.raises(ExpressionError, match="already"):
        NAMES.with_definitions({"k_{on}": Symbol("a")})


def test_tokens_keep_their_places_through_macros() -> None:
    text = "\\newcommand{\\on}[1]{k_{on} #1}\n a +\n  \\on{zz}"
    rest, macros = take_definitions(tokenize(text), text)
    tokens = expand(rest, macros, text)
    assert [t.text for t in tokens] == [*"a+k_{on}zz"]
    assert line_and_column(text, tokens[2].start) == (3, 3)
    assert text[tokens[2].start : tokens[2].end] == r"\on"
    assert text[tokens[-1].start] == "z"
    with pytest.raises(FormulaError, match="unknown symbol z") as caught:
        read_formula_tokens(tokens, NAMES, text)
    assert (caught.value.line, caught.value.column) == (3, 7)
    assert caught.value.pointed() == "  \\on{zz}\n      ^"


def test_rates_between_states_by_the_direction_of_the_indices() -> None:
    assert read_formula("W_{CB}", NAMES) == DirectedRate(1, False)
    assert read_formula("W_{BC}", NAMES) == DirectedRate(1, True)
