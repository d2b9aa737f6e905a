r"""What the printers write reads back exactly, and mutated formulas are never read wrongly.

Compared by exact values modulo a prime (:mod:`tests.formula_values`), which neither the printers
nor the reader know; mutants that are accepted are read a second time there, by other code.
"""

import dataclasses
import random
from collections.abc import Callable
from fractions import Fraction

import mpmath
import pytest

from symbolic_response.errors import EvaluationError, FormulaError, SymbolicResponseError
from symbolic_response.expressions.latex import expression_latex
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.ring import plain
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
from symbolic_response.hand.latex.names import names_of
from symbolic_response.hand.latex.reading import read_formula
from symbolic_response.network import read_network_text
from symbolic_response.network.model import Network
from symbolic_response.network.notation_section import symbol_names
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_form import closed_form
from symbolic_response.response.notation import notation_of
from symbolic_response.response.quantity_latex import quantity_in
from tests.formula_values import MOTOR, second_value, value

NAMES = names_of(MOTOR)
LATEX = symbol_names(MOTOR)
EXPONENTS = (2, 3, -1, -2, "1/2", "-1/2", "2/3", "-5/3", 10)


def drawn(source: random.Random, depth: int) -> Expression:
    """Return a random expression in the symbols of the network."""
    if depth == 0 or source.random() < 0.15:
        if source.random() < 0.3:
            return number(read_fraction(source))
        return Symbol(source.choice(list(LATEX)))
    kind = source.randrange(7)
    parts = [drawn(source, depth - 1) for _ in range(source.randint(2, 3))]
    try:
        if kind < 2:
            return add([negate(part) if source.random() < 0.4 else part for part in parts])
        if kind < 4:
            return multiply(parts)
        if kind == 4:
            return divide(parts[0], parts[1])
        if kind == 5:
            return power(parts[0], read_exponent(source))
        return function(source.choice(("exp", "ln")), parts[0])
    except EvaluationError:
        return parts[0]


def read_fraction(source: random.Random) -> Fraction:
    return Fraction(source.randint(-12, 12), source.choice((1, 1, 2, 3, 10)))


def read_exponent(source: random.Random) -> Fraction:
    return Fraction(source.choice(EXPONENTS))


def test_random_expressions_read_back() -> None:
    source = random.Random(7)
    counted = 0
    while counted < 2000:
        node = drawn(source, source.randint(1, 4))
        latex = expression_latex(node, LATEX)
        try:
            expected = value(node)
        except ZeroDivisionError:
            continue
        assert value(read_formula(latex, NAMES)) == expected, latex
        counted += 1


def test_exponentials_beside_a_symbol_e_read_back() -> None:
    """Printed as e^2, the square of the symbol and the exponential of 2 would be one text."""
    network = read_network_text(
        'title = "t"\n[symbols.e]\n[symbols.a]\n[states.A]\n[states.B]\n[[transitions]]\n'
        'between = ["A", "B"]\nrates = ["a*e", "1"]\n'
    )
    for text in ("exp(2)", "e**2", "exp(-a/2)*e**3 + exp(e)**2", "a*exp(a)*(a + e)"):
        latex = expression_latex(read_expression(text), symbol_names(network))
        assert value(read_formula(latex, names_of(network))) == value(read_expression(text)), latex


QUANTITIES = [
    "p[A]", "p[A, C]", "ln(p[A]/p[B])", "current[bind]/p[A]", "mean[load]", "entropy_production",
    "traffic[set_down]", "forward[bind] - backward[set_down]", "current[C_A]**2", "1 - p[s_0]",
    "d p[A] / d energy[B]", "d ln p[A] / d ln c", "d p[A, B] / d barrier[bind, slip]",
    "d current[bind]/p[A] / d drive[C_A]", "d (d p[A] / d barrier[slip]) / d energy[B]",
    "d (d mean[load] / d barrier[slip]) / d barrier[slip]", "d ln(p[A]/p[B]) / d F",
    "d (d p[A] / d ln c) / d ln c", "2*(d p[A] / d c) - p[B]", "p[A]*(d p[A] / d ln k)*(a + b)",
    "d p[t] / d energy[t]", "d current[turn] / d barrier[turn]", "d exp(p[A]) / d a",
    "d ln current[bind] / d energy[s_0]", "ln(current[bind])",
]


@pytest.mark.parametrize("text", QUANTITIES)
def test_left_sides_read_back(text: str) -> None:
    quantity = read_quantity(text, MOTOR)
    latex = quantity_in(notation_of(MOTOR), quantity)
    assert value(read_formula(latex, NAMES)) == value(quantity), latex


@pytest.mark.parametrize("section", [
    'indices = "to-from"', 'indices = "from-to"', "beta = true", 'letters = {probability = "p"}',
    'states = {A = "0", B = "1"}', 'transitions = {bind = "+"}', 'observables = {load = "n"}',
])
def test_left_sides_in_other_notations_read_back(section: str) -> None:
    network = noted(section)
    names, notation = names_of(network), notation_of(network)
    for text in QUANTITIES:
        quantity = read_quantity(text, network)
        latex = quantity_in(notation, quantity)
        assert value(read_formula(latex, names)) == value(quantity), latex


def noted(section: str) -> Network:
    table = read_network_text(
        'title = "t"\n[symbols.a]\n[states.A]\n[states.B]\n[[transitions]]\nbetween = ["A", "B"]\n'
        f'rates = ["a", "1"]\n[observables.load]\nB = 1\n[notation]\n{section}\n'
    ).notation
    return dataclasses.replace(MOTOR, notation=table)


@pytest.mark.parametrize("text", ["p[A]", "current[bind]", "d ln p[B] / d ln c",
                                  "d p[C] / d barrier[slip]", "ln(p[A]/p[B])"])
def test_closed_forms_read_back(text: str) -> None:
    form = closed_form(read_quantity(text, MOTOR), Analysis(MOTOR))
    back = read_formula(form.latex(), NAMES)
    assert floating(back) == floating(plain(form.expression))


def floating(node: Expression) -> str:
    """Return 14 digits of an expression at positive numbers: print gathers exponentials, which
    functions without rules do not see through."""
    with mpmath.workdps(60):
        def at(part: Expression) -> mpmath.mpf:
            match part:
                case Number(exact):
                    return mpmath.mpf(exact.numerator) / exact.denominator
                case Symbol(_):
                    return 1 + mpmath.mpf(value(part) % 1000) / 700
                case Sum(terms):
                    return mpmath.fsum(map(at, terms))
                case Product(factors):
                    return mpmath.fprod(map(at, factors))
                case Power(base, exponent):
                    return at(base) ** (mpmath.mpf(exponent.numerator) / exponent.denominator)
                case Function("exp", argument):
                    return mpmath.exp(at(argument))
                case Function(_, argument):
                    return mpmath.log(at(argument))
            raise AssertionError(part)

        return str(mpmath.nstr(at(node), 14))


BASES = [
    r"\frac{k_{on} c}{k_{on} c + b e^{\mu}}", r"k_{12}^2 (a + b) - 2.5 c", r"\tanh(F/4) \pi_A",
    r"\frac{1}{2} \ln\left(\frac{a}{b}\right)", r"a b/c - \sqrt{a + b}", r"e^{-F/2} (a - b)^{-1}",
    r"\pi_{A} J_{bind} - w^{+}_{bind} p_B", r"|a - b| \cdot 2^{1/3}", r"(k^{+})^3 + k_{12} k_{on}",
    r"\frac{a + b}{c} \cdot \frac{c}{a}", r"\mathrm{ATP} \cdot [a + b]", r"\ln \pi_A - \ln \pi_B",
    r"W_{BA} \pi_A - W_{AB} \pi_B", r"12 a^{10} b", r"\sigma/(a + 1)",
    r"\langle \mathrm{load} \rangle a", r"\cosh(\mu) \sinh(F) + \coth(a)", r"\sqrt[3]{a b} c^{-2}",
    r"\tfrac12 a - \dfrac{3}{4} b", r"-\bigl(a - (b + c)\bigr) a", r"a \, b \; c + 1/3",
    r"\exp(-B_{turn} + E_s) \times 3", r"\frac{\frac{a}{b}}{\frac{c}{a}}", r"0.25 a/b + \ln 2",
]
ALPHABET = "abcekFApJ0123456789+-/^_{}()[]|.,\\ '=*lntx"


def mutants(count: int) -> list[tuple[str, str]]:
    source = random.Random(11)
    found = []
    while len(found) < count:
        base = source.choice(BASES)
        place, kind = source.randrange(len(base) + 1), source.randrange(3)
        letter = source.choice(ALPHABET)
        mutant = (base[:place] + letter + base[place:] if kind == 0
                  else base[:place] + base[place + 1 :] if kind == 1
                  else base[:place] + letter + base[place + 1 :])
        found.append((base, mutant))
    return found


@pytest.mark.parametrize("base", BASES)
def test_both_readers_agree_on_what_is_right(base: str) -> None:
    assert value(read_formula(base, NAMES)) == second_value(base)


def or_none(read: Callable[..., int], what: object) -> int | None:
    """Return a value, or None for a division by zero."""
    try:
        return read(what)
    except ZeroDivisionError:
        return None


def test_mutants_are_refused_or_mean_what_they_say() -> None:
    refused = 0
    for base, mutant in mutants(4000):
        try:
            node = read_formula(mutant, NAMES)
        except FormulaError as error:
            assert error.line >= 1 and error.column >= 1 and error.message, (base, mutant)
            refused += 1
            continue
        except SymbolicResponseError as error:
            raise AssertionError((base, mutant)) from error
        assert or_none(value, node) == or_none(second_value, mutant), (base, mutant)
    assert 1500 < refused < 3800
