"""Exact points of a curve in one symbol against substitution into the closed form with SymPy."""

from __future__ import annotations

import time
from collections.abc import Callable
from fractions import Fraction

import sympy

from symbolic_response.control.at_points import limit_at
from symbolic_response.control.function import curve, function_of
from symbolic_response.control.steepness import forms
from symbolic_response.expressions.tree import number
from symbolic_response.network.quantities import BySymbol
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_form import closed_form
from tests.benchmarks.networks import cube
from tests.benchmarks.timing import Row, compare

PROBABILITY, COUNT, LOW, HIGH = "p[s1]", 400, Fraction(1, 1000), Fraction(1000)


def _given(analysis: Analysis) -> tuple[str, dict[str, Fraction]]:
    """Return the symbol that varies and the values of all others."""
    values = {entry.name: Fraction(2 * place + 3, place + 2)
              for place, entry in enumerate(analysis.network.symbols)}
    symbol = analysis.network.symbols[0].name
    del values[symbol]
    return symbol, values


def our_curve(analysis: Analysis) -> Callable[[], object]:
    """Return the curve from the network: the function is made anew at every run."""
    quantity = read_quantity(PROBABILITY, analysis.network)
    symbol, values = _given(analysis)
    return lambda: curve(function_of(analysis, quantity, symbol, values), LOW, HIGH, COUNT)


def sympy_curve(analysis: Analysis) -> Callable[[], object]:
    """Return the same points by substitution; the values of all others are put in once."""
    quantity = read_quantity(PROBABILITY, analysis.network)
    symbol, values = _given(analysis)
    form = closed_form(quantity, analysis).to_sympy()
    points = curve(function_of(analysis, quantity, symbol, values), LOW, HIGH, COUNT)
    x = sympy.Symbol(symbol, positive=True)

    def work() -> None:
        at = {sympy.Symbol(name, positive=True): sympy.Rational(value.numerator, value.denominator)
              for name, value in values.items()}
        along = form.subs(at)
        for point in points:
            value = along.subs(x, sympy.Rational(point.y.numerator, point.y.denominator))
            assert Fraction(int(value.p), int(value.q)) == point.value

    return work


def row() -> Row:
    """Compare 400 exact points of a probability of the cube along one rate."""
    analysis = Analysis(cube())
    return compare("400 exact points of a curve in one rate of the cube", our_curve(analysis),
                   "SymPy subs", sympy_curve(analysis), 50)


def steepness_figures() -> str:
    """Return the time of the steepness program of the cube: its forms, and one exact optimum."""
    network = cube()
    analysis = Analysis(network)
    by = BySymbol(network.symbols[0].name, True)
    values = {entry.name: number(Fraction(place + 2, place + 1))
              for place, entry in enumerate(network.symbols)}
    start = time.perf_counter()
    found = forms(analysis, by)
    between = time.perf_counter()
    limit_at(analysis, by, values)
    return (f"steepness program of the cube: {len(found)} forms in {between - start:.2f} s, exact"
            f" optimum at a point in {time.perf_counter() - between:.2f} s")
