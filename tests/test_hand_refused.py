r"""Formulas that are refused: where, why, and what to write instead; hostile texts.

Each row: the formula with ``@`` before the place of the error, then a part of the message. What
can be read in two ways was judged by how papers are commonly set; no source.
"""

import time

import pytest

from symbolic_response.errors import FormulaError, SizeLimitError
from symbolic_response.hand.latex.names import names_of
from symbolic_response.hand.latex.reading import read_formula
from symbolic_response.network import read_network_text
from tests.formula_values import MOTOR

NAMES = names_of(MOTOR)

REFUSED = r"""
\tanh F@/4                        ~ write \tanh(F)
\ln a@b                           ~ write \ln(a) or \ln(a b)
\ln a @\cdot b                    ~ write \ln(a)
\exp a @(b + c)                   ~ write \exp(a)
\tanh F @\ln a                    ~ write \tanh(F)
\ln @a^2                          ~ write \ln(a^{2})
\ln(a@)^2                         ~ write (\ln (a))^{2}
@\ln^2 a                          ~ write (\ln(x))^{2}
@\tanh^{-1}(F)                    ~ write \frac{1}{\tanh(x)}
@\log_{10}(a)                     ~ write logarithms as \frac{\ln x}{\ln b}
\ln(a)@(b + c)                    ~ \cdot (...)
\ln @\tanh(F)                     ~ write \ln(\tanh(x))
@\ln                              ~ write \ln(...)
@\ln -a                           ~ write \ln(...)
@\sin(F)                          ~ the functions are exp, ln
@ln(a)                            ~ write \ln
@tanh(F)                          ~ write \tanh
a/b@c                             ~ write \frac{a}{b}
a/b @\cdot c                      ~ write \frac{a}{b}
1/2 @a                            ~ write \frac{1}{2}
ab(c+a)/b @\overset{!}{=} 1/2      ~ unknown command \overset
a c/b @\footnotemark               ~ unknown command \footnotemark
\ln a @\footnotemark               ~ unknown command \footnotemark
b - a(b+c)/b @c                   ~ write \frac{a (b + c)}{b} before
ab/(b+ac)\,@c                     ~ write \frac{a b}{b + a c} before
a/(b+c)^2 @c                      ~ write \frac{a}{(b + c)^{2}} before
c(1+ab/b @c)                      ~ write \frac{a b}{b} before
\ln a @(b+c)                      ~ write \ln(a) or \ln(a (b + c))
\ln a @\left|b\right|             ~ write \ln(a)
@{a \over b + c}                  ~ write \frac{a}{b + c}
1 + @{\cal D}_1 c                 ~ write \mathcal{D}
@\cal D                           ~ write \mathcal{...}
@{\rm d} + a                      ~ write \mathrm{d}
@a'^{2}                           ~ unknown symbol
a{}^2{}@^3                        ~ two superscripts
a @{}^2                           ~ not visible
a/b@/c                            ~ write \frac{a}{b c}
a/b @(a + b)                      ~ write \frac{a}{b}
a/@\sum_{i=1}^{2} b^i             ~ in parentheses
@\frac{a}{b}^2                    ~ write \left(\frac{a}{b}\right)^{2}
a@_12                             ~ write _{12}
k@_12                             ~ write _{12}
k@_on c                           ~ write _{on}
2@^10                             ~ write ^{10}
@k12                              ~ write k_{12}
@a12                              ~ write 12 a or a \cdot 12
@(a + b)2                         ~ write 2 (a + b)
@a(b)                             ~ write a \cdot (b)
@k_{on}(c)                        ~ write k_{on} \cdot (c)
@a(-b)                            ~ write a \cdot (- b)
@a(k^{+})                         ~ write a \cdot (k^{+})
@a(2)^2                           ~ write a \cdot (2)^{2}
@a(b^2)^2                         ~ write a \cdot (b^{2})^{2}
@a[b c]                           ~ write a \cdot [b c]
@|a| + |b|                        ~ write \left|
@|a|b| + c|                       ~ write \left|
@|a                               ~ write \left|
\frac{|a + \frac{@|b|}{c}|}{a}    ~ write \left|
@{a+b}c                           ~ write (a + b)
a @\pm b                          ~ write each of them
a + @\cdots + b                   ~ write it all
a + @\ldots                       ~ write it all
1@,000                            ~ write thousands without one
1{@,}000                          ~ write thousands without one
1\,@000                           ~ write the number without a space
1 @000                            ~ write the number without a space
@2. + a                           ~ write decimals as in 2.5
2@\frac{1}{3}                     ~ write 2 \cdot \frac{1}{3} or 2 + \frac{1}{3}
a @= b                            ~ write the right side alone
a @* b                            ~ write \cdot
a \cdot @- b                      ~ put a signed term in parentheses
a + @- b                          ~ put a signed term in parentheses
a @+                              ~ write what it is applied to
@\cdot a                          ~ leave the operator out
@(a + b                           ~ write the missing ')'
a + b@)                           ~ leave it out
(a + b@]                          ~ write ')'
\left(a + b@)                     ~ write \left( ... \right)
@{a                               ~ write the missing }
a@}                               ~ leave it out
@\frac{a}                         ~ write it in braces
a@^                               ~ write it in braces
@^2                               ~ write the symbol that carries it
(@_a + b)                         ~ write the symbol that carries it
a \cdot@' b                       ~ write the symbol that carries it
a^2@^3                            ~ write (x^{a})^{b}
a_1@_2                            ~ write one, as in k_{1,2}
@k_{onn} + a                      ~ did you mean k_{on}?
a + @\pi_X                        ~ did you mean \pi_
@J_{binf}                         ~ did you mean J_{\mathrm{bind}}?
@k                                ~ did you mean k^{+}?
@a^{+}                            ~ unknown symbol a^{+}
@a^{b}                            ~ write e^{b \ln a}
@a^{(2)}                          ~ write a^{2} for the power
b + @a^{\left(2\right)} c           ~ unknown symbol a^{(2)}
@k_{on}^{(-1)}                    ~ write k_{on}^{-1} for the power
@a^{(n)}                          ~ an index or an order; known: a
(a + b@)^{(2)}                    ~ write x^{2} for the power
@2^{(3)}                          ~ write x^{2} for the power
@a^{100000}                       ~ write a product of powers
@e + 1                            ~ write \exp(1)
@\frac{1}{0}                      ~ division by zero
@\partial a                       ~ write \frac{\partial X}{\partial Y}
\frac{\partial \pi_A}{\partial @q} ~ nothing that a quantity can respond to
@\frac{\partial^2 \pi_A}{\partial c} ~ a derivative of order 2 by 1 variables
\frac{\partial \pi_A}{\partial @\ln F} ~ needs a positive symbol
\frac{\partial @\pi_A \pi_B}{\partial c} ~ (\pi_{A} \pi_{B})
\partial_{c} \pi_A @\cdot a       ~ \left(\partial_{c} \pi_{A}\right)
\frac{\partial}{\partial c} \pi_A @\pi_B ~ is not visible
@\sum_{i} a^i                     ~ write \sum_{k=1}^{3}
@\sum_{i=1}^{n} a^i               ~ write \sum_{k=1}^{3}
@\sum_{i=3}^{1} a^i               ~ begins at the smaller number
@\sum_{i=1}^{9999} a^i            ~ at most 1000
\sum_{a=1}^{2} @a b               ~ take another letter
@\prod_{i=1}^{2} a b              ~ put it in parentheses
@\int a                           ~ write the result
a @− b                            ~ write -
a @· b                            ~ write \cdot
a @\begin{cases} b \end{cases}    ~ write the formula itself
a @\\ b                           ~ begin it with +, - or \cdot
@\newcommand{\x}[a]{b} \x         ~ one digit
\newcommand{\x}[1]{a} b + @\x     ~ write them in braces
\def\a{\a} b + @\a                ~ write it out
"""


def rows() -> list[tuple[str, str]]:
    found = []
    for line in REFUSED.strip().splitlines():
        latex, _, message = line.rpartition(" ~ ")
        found.append((latex.rstrip(), message.strip()))
    return found


@pytest.mark.parametrize(("marked", "message"), rows())
def test_refused_at_its_place_with_what_to_write(marked: str, message: str) -> None:
    column = marked.index("@") + 1
    latex = marked.replace("@", "", 1)
    with pytest.raises(FormulaError) as caught:
        read_formula(latex, NAMES)
    error = caught.value
    assert message in str(error)
    assert (error.line, error.column) == (1, column)
    excerpt, caret = error.pointed().splitlines()
    assert excerpt == latex and caret == " " * (column - 1) + "^"


@pytest.mark.parametrize(("latex", "left_out"), [
    (" ".join("abc" * 9) + "/b c", "\\frac"), (r"\ln a |b|", " or "),
    (r"\ln a (" + "a + " * 20 + "b)", " or "),
])
def test_no_suggestion_where_none_can_be_made(latex: str, left_out: str) -> None:
    with pytest.raises(FormulaError) as caught:
        read_formula(latex, NAMES)
    assert left_out not in str(caught.value)


def test_places_in_several_lines() -> None:
    text = "\\frac{a}{\n  b + % note\n  q c}"
    with pytest.raises(FormulaError, match=r"unknown symbol q") as caught:
        read_formula(text, NAMES)
    assert (caught.value.line, caught.value.column) == (3, 3)
    assert caught.value.pointed() == "  q c}\n  ^"


def test_the_place_in_a_long_line_is_shown_in_part() -> None:
    text = "a + " * 100 + "q" + " + a" * 100
    with pytest.raises(FormulaError) as caught:
        read_formula(text, NAMES)
    excerpt, caret = caught.value.pointed().splitlines()
    assert len(excerpt) <= 72 and excerpt[len(caret) - 1] == "q" and caught.value.column == 401


def test_d_as_a_symbol_and_symbols_written_like_energies() -> None:
    names = names_of(read_network_text(
        'title = "t"\n[symbols.a]\n[symbols.q]\nlatex = "d"\n[symbols.E_A]\nsign = "real"\n'
        '[symbols.B]\nsign = "real"\n[states.A]\nenergy = "E_A"\n[states.B]\nenergy = "ln(a*q)"\n'
        '[[transitions]]\nname = "e"\nbetween = ["A", "B"]\nbarrier = "B"\n'
    ))
    with pytest.raises(FormulaError, match=r"write \\partial"):
        read_formula(r"\frac{d a}{d q}", names)
    with pytest.raises(FormulaError, match="plain syntax"):
        read_formula(r"\frac{\partial (\pi_A E_A)}{\partial E_A}", names)


HOSTILE = {
    "braces": "{" * 100_000 + "a" + "}" * 99_000, "open": "{" * 90_000, "closed": "}" * 90_000,
    "parentheses": "(" * 90_000, "fractions": r"\frac{a}{" * 20_000, "roots": r"\sqrt" * 90_000,
    "powers": "a^" * 45_000 + "a", "a megabyte": "+a" * 500_000, "two megabytes": "a" * 2_000_001,
    "digits": "1" * 90_000, "bars": "|a|" * 30_000, "functions": r"\ln(" * 20_000,
    "a long name": "k_{" + "x" * 90_000 + "}", "signs": "-" * 90_000,
    "zero": "a\x00b", "escape": "a + \x1b[31mb", "surrogate": "a + \ud800", "empty": "",
    "only a comment": "% a", "only space": " " * 500_000,
    "derivatives": r"\frac{\partial " * 30_000,
    "nested sums": r"\sum_{i=1}^{1000} \sum_{j=1}^{1000} a^{i} b^{j}",
    "macro bomb": "".join(rf"\def\{chr(97 + n)}{{\{chr(98 + n)}\{chr(98 + n)}}}" for n in range(25))
    + r"\def\z{a}\a",
    "a macro of its argument": r"\def\a#1{#1#1}" + r"\a{" * 40 + "a" + "}" * 40,
    "recursion": r"\newcommand{\a}{\a a}\a", "a number too long": r"(9999999999^{64})^{64}",
    "delimiters": "$" * 90_000, "partial": r"\partial_c" * 20_000 + " a",
    "response too deep": r"\partial_c (" * 8 + r"\pi_A" + ")" * 8,
}


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_texts_give_one_error_in_seconds(name: str) -> None:
    start = time.process_time()
    with pytest.raises((FormulaError, SizeLimitError)) as caught:
        read_formula(HOSTILE[name], NAMES)
    assert time.process_time() - start < 10
    assert len(str(caught.value)) < 500 and "\n" not in str(caught.value)


def test_a_long_formula_is_read_in_seconds() -> None:
    start = time.process_time()
    node = read_formula("+".join(["a b"] * 15_000), NAMES)
    assert len(node.terms) == 15_000  # type: ignore[attr-defined]
    assert time.process_time() - start < 10
