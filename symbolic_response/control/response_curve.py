"""The response curve of an observable in one parameter, with its limits at every point."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from fractions import Fraction
from math import lcm

from symbolic_response.control.asked import (
    Asked,
    asked_of,
    extremes,
    observable_values,
    rescaled,
)
from symbolic_response.control.at_points import Limit, Place
from symbolic_response.control.changes import change_of
from symbolic_response.control.covariances import observable_limits
from symbolic_response.control.curve_data import CurveData, CurvePoint
from symbolic_response.control.decomposition import LinearForm, assembled
from symbolic_response.control.family import Family, family_of
from symbolic_response.control.function import curve, function_of
from symbolic_response.control.line import Line
from symbolic_response.control.program import optimum
from symbolic_response.control.rational import Poly, RationalFunction, rational_function
from symbolic_response.control.steepness import forms
from symbolic_response.errors import EvaluationError
from symbolic_response.expressions.tree import ONE, Expression, Sum
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis, as_analysis
from symbolic_response.response.closed_form import symbol_names
from symbolic_response.response.deriving import Given
from symbolic_response.response.notation import notation_of
from symbolic_response.response.quantity_latex import quantity_in

COUNT = 200
Step = Callable[[int, int], None]


def response_curve(
    subject: Network | Analysis,
    observable: str,
    parameter: str,
    at: Mapping[str, Given] | None = None,
    *,
    low: Given,
    high: Given,
    count: int = COUNT,
    progress: Step | None = None,
) -> CurveData:
    """Return ``count`` exact points of an observable between two values of a parameter.

    At each of them the sensitivity, H and the finer limit by covariances, all exact or rounded
    upwards. ``at``: all other symbols. Points lie even in ln x where x is positive. Raises
    QuantityError, AssignmentError, EvaluationError (irrational values), SizeLimitError.
    """
    analysis = as_analysis(subject)
    asked = asked_of(analysis, observable, parameter, at)
    missing = asked.missing(analysis)
    if missing:
        raise EvaluationError(f"a curve needs every other symbol; {missing[0]} has no value: give"
                              f" it one with --at {missing[0]}=VALUE")
    ends = extremes(asked)
    assert ends is not None  # every symbol has a value
    line = Line(analysis.network, asked.symbol, asked.values)
    function = line.function(rescaled(asked, ends)[0])
    slope = function.sensitivity()
    spacing = "log" if asked.by.logarithmic else "linear"
    limits = _Limits(analysis, asked, ends)
    points = []
    for done, place in enumerate(curve(_variable(line), low, high, count, spacing)):
        x = place.x
        limit, finer = limits.at({**asked.values, asked.symbol: x})
        points.append(CurvePoint(x, function.value(x), slope.value(x), limit, finer))
        if progress is not None:
            progress(done + 1, count)
    entry = next(e for e in analysis.network.symbols if e.name == asked.symbol)
    return CurveData(
        asked.symbol, symbol_names(analysis.network)[asked.symbol], asked.term,
        _latex(analysis, asked), asked.by.logarithmic, tuple(points), entry.about, "",
        None if ends == (Fraction(0), Fraction(1)) else ends, limits.without_forces,
    )


def _variable(line: Line) -> RationalFunction:
    """Return the variable of which all rates are rational functions, so that each point is exact.

    The observable alone may be a function of a power of it.
    """
    rates = [rate for t in line.network.transitions for rate in (t.forward, t.backward)
             if rate is not None]
    root = lcm(*(line.converted(rate).root for rate in rates))
    return rational_function(line.symbol, line.kind, root, Poly([0, 1]), Poly([1]))


def _latex(analysis: Analysis, asked: Asked) -> str:
    """Return the observable in LaTeX, as a term of a difference or quotient."""
    shown = quantity_in(notation_of(analysis.network), asked.quantity)
    return rf"\left({shown}\right)" if isinstance(asked.quantity, Sum) else shown


class _Limits:
    """The limits at many points: the best of the forms, or the program where they depend on x."""

    def __init__(
        self, analysis: Analysis, asked: Asked, ends: tuple[Fraction, Fraction]
    ) -> None:
        self.analysis, self.asked = analysis, asked
        low, high = ends
        self.observable = [(value - low) / (high - low) for value in observable_values(asked)]
        self.family: Family = family_of(analysis)
        self.forms = forms(analysis, asked.by, self.family)
        self.fixed = all(form.numbers() is not None for form in self.forms)
        self.change = change_of(analysis, asked.by)
        self.factors = [function_of(analysis, expression, asked.symbol, asked.values)
                        for expression, _ in self.change.parts]
        self._without: list[Fraction] = []

    @property
    def without_forces(self) -> Fraction | tuple[Fraction, ...]:
        """H at zero force: one number, or that of each point so far."""
        if not self.fixed:
            return tuple(self._without)
        return min(_constant(form) for form in self.forms)

    def at(self, values: dict[str, Expression]) -> tuple[Fraction, Fraction]:
        """Return H and the finer limit on the sensitivity at a point."""
        place = Place(self.analysis, values)
        limit = self._best(place) if self.fixed else self._least(place)
        return limit.high, observable_limits(place, limit, self.observable).covariance

    def _best(self, place: Place) -> Limit:
        bounds = [place.form(form) for form in self.forms]
        best = min(range(len(bounds)), key=lambda k: bounds[k][1])
        t = tuple((part, place.tanh(part)) for part, _ in self.forms[best].slopes)
        return Limit(bounds[best][0], bounds[best][1], t, self.forms[best].decomposition, (),
                     self.family, Fraction(0))

    def _least(self, place: Place) -> Limit:
        """Return the least limit of the family, its lower end left open."""
        vector = list(self.change.numbers)
        for factor, (_, direction) in zip(self.factors, self.change.parts, strict=True):
            value = factor.value(place.values[self.asked.symbol])
            vector = [x + value * u for x, u in zip(vector, direction, strict=True)]
        bundles = self.family.bundles
        t = [place.tanh(part) for part in bundles]
        found = optimum(self.family, tuple(vector), [high for _, high in t])
        without = optimum(self.family, tuple(vector), [Fraction(0)] * len(t))
        self._without.append(without.value)
        pieces = assembled(self.analysis, self.family, [(ONE, found.amounts)])
        return Limit(Fraction(0), found.value, tuple(zip(bundles, t, strict=True)), pieces,
                     found.dual, self.family, Fraction(0))


def _constant(form: LinearForm) -> Fraction:
    parts = form.numbers()
    assert parts is not None
    return parts[0]
