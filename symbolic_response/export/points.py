"""The exact point at which exported results are checked, and their values there.

The values come from W p = 0 (:class:`symbolic_response.response.values.Point`), not from the
formulas that are exported; only where that gives no value, as for rates that are irrational at
every simple point, from the closed form.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.errors import (
    EvaluationError,
    SizeLimitError,
    SymbolicResponseError,
    UndecidedError,
)
from symbolic_response.export.asked import Asked
from symbolic_response.expressions.enclosure import decimal_enclosure
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Power,
    function,
    multiply,
    number,
    symbols_of,
)
from symbolic_response.expressions.tree import walk as walk_tree
from symbolic_response.network.checks import expressions_of
from symbolic_response.network.model import Network, SymbolEntry
from symbolic_response.network.quantities import walk_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.deriving import Value, derive_quantity
from symbolic_response.response.values import Point

MAX_TRIES = 24
MAX_POINTS = 6
MAX_TREES = 2_000  # beyond, a value that the linear system does not give stays unknown
_CHOICES = tuple(Fraction(text) for text in (
    "2", "3", "1/2", "5", "3/2", "1/3", "4", "2/3", "5/2", "7", "3/4", "1/4", "4/3", "6", "5/3"))

Values = Mapping[str, Expression]


@dataclass(frozen=True, slots=True)
class At:
    """A point and the exact value of a quantity there."""

    point: Values
    value: Value


def check_points(network: Network, asked: Sequence[Asked]) -> tuple[Values, ...]:
    """Return up to six points, values of all symbols at which the rates are positive; or none.

    Small fractions, inside the ranges of the file where these hold some; squares where roots are
    taken, and ``2*ln(fraction)`` for symbols in exponents, so that the rates are rational.
    """
    in_exponents, roots = _uses(network, asked)
    found: list[Values] = []
    for attempt in range(MAX_TRIES):
        values = {
            entry.name: _value(entry, place, attempt, entry.name in in_exponents, roots)
            for place, entry in enumerate(network.symbols)
        }
        try:
            Point(network, values)
        except (EvaluationError, SizeLimitError, UndecidedError):
            continue
        found.append(values)
        if len(found) == MAX_POINTS or not values:
            break
    return tuple(found)


def _uses(network: Network, asked: Sequence[Asked]) -> tuple[frozenset[str], bool]:
    found, roots = set[str](), False
    pieces = [part for expression, _, _ in expressions_of(network)
              for part in walk_tree(expression)]
    for one in asked:
        pieces += walk_quantity(one.quantity)
    for piece in pieces:
        if isinstance(piece, Function) and piece.name == "exp":
            found |= symbols_of(piece.argument)
        roots = roots or (isinstance(piece, Power) and piece.exponent.denominator > 1)
    for state in network.states:
        found |= symbols_of(state.energy) if state.energy is not None else frozenset()
    for transition in network.transitions:
        for expression in (transition.barrier, transition.drive):
            found |= symbols_of(expression) if expression is not None else frozenset()
    return frozenset(found), roots


def _value(
    entry: SymbolEntry, place: int, attempt: int, in_exponents: bool, roots: bool
) -> Expression:
    for step in range(len(_CHOICES)):
        chosen = _CHOICES[(place + 4 * attempt + step) % len(_CHOICES)]
        if in_exponents:
            base = chosen if chosen > 1 or not entry.positive else 1 / chosen
            return multiply([number(2), function("ln", number(base))])
        value = chosen**2 if roots else chosen
        if entry.low <= value <= entry.high:
            return number(value)
    return number((entry.low + entry.high) / 2)


def value_at(analysis: Analysis, asked: Asked, points: Sequence[Values]) -> At | None:
    """Return the exact value of a quantity at the first of the points where it has one."""
    for values in points:
        try:
            found = _value_at(analysis, asked, values)
        except SymbolicResponseError:
            continue
        if found is not None:
            return At(values, found)
    return None


def _value_at(analysis: Analysis, asked: Asked, values: Values) -> Value | None:
    if sum(analysis.tree_counts) <= MAX_TREES:
        return derive_quantity(analysis, asked.quantity, asked.text, values).value
    point = Point(analysis.network, values)
    exact = point.value(asked.quantity)
    if exact is not None:
        return Value(exact, number(exact))
    constant = point.expression(asked.quantity)
    return None if constant is None else Value(None, constant, decimal_enclosure(constant))
