"""The doctests of an exported module: exact values that its functions must give."""

from __future__ import annotations

import textwrap
from collections.abc import Mapping, Sequence
from fractions import Fraction

from symbolic_response.export.points import At, Values
from symbolic_response.expressions.enclosure import decimal_enclosure
from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.expressions.tree import Expression, Function, Number, Product
from symbolic_response.response.deriving import Value

TOLERANCE, FLOOR = 1e-9, 1e-13
MAX_DIGITS = 300  # a longer exact value is compared as a decimal


def quantity_tests(
    name: str, arguments: Mapping[str, str], at: At | None, rational: bool
) -> list[str]:
    """Return the lines of a doctest of one function; ``arguments``: their names by symbol.

    ``rational``: the function gives fractions for fractions.
    """
    if at is None:
        return ["Not tested: no exact value is known at a simple point."]
    call = call_at(name, arguments, at.point)
    if rational and is_exact(at.point, at.value):
        return [*_prompt(call), repr(at.value.exact)]
    return [*_prompt(_near(call, at.value)), "True"]


def dict_tests(
    name: str,
    arguments: Mapping[str, str],
    point: Values | None,
    entries: Sequence[tuple[str, At | None]],
    rational: bool,
) -> list[str]:
    """Return the lines of a doctest of a function that returns a dict, entry by entry."""
    if point is None:
        return ["Not tested: no simple point with positive rates was found."]
    lines = _prompt(f"found = {call_at(name, arguments, point)}")
    for key, at in entries:
        if at is None:
            continue
        if rational and is_exact(point, at.value):
            lines += [f">>> found{key}", repr(at.value.exact)]
        else:
            lines += [*_prompt(_near(f"found{key}", at.value)), "True"]
    return lines


def call_at(name: str, arguments: Mapping[str, str], point: Values) -> str:
    """Return the call of a function at a point."""
    values = [f"{arguments[symbol]}={_number(value)}" for symbol, value in point.items()]
    return f"{name}({', '.join(values)})"


def literal(text: str) -> str:
    """Return a text as a Python literal in double quotes."""
    return '"' + text.replace("\\", "\\\\").replace('"', '\\"') + '"'


def is_exact(point: Values, value: Value) -> bool:
    """Return whether a value at a point of fractions is a fraction that can be printed."""
    return value.exact is not None and len(fraction_text(value.exact)) < MAX_DIGITS and all(
        isinstance(given, Number) for given in point.values())


def _number(value: Expression) -> str:
    match value:
        case Number(exact):
            plain = exact.denominator == 1
            return str(exact) if plain else f"Fraction({exact.numerator}, {exact.denominator})"
        case Product((Number(factor), Function("ln", Number(base)))):
            return f"{factor}*math.log({fraction_text(base)})"
    raise TypeError(expression_text(value))


def _near(shown: str, value: Value) -> str:
    """Return the test that a float is a value to nine digits."""
    decimal = "0"
    if value.exact != 0:
        decimal = (value.enclosure or decimal_enclosure(value.expression))[0]
    margin = max(float(abs(Fraction(decimal))) * TOLERANCE, FLOOR)
    return f"abs({shown} - {_signed(decimal)}) < {margin:.0e}"


def _signed(decimal: str) -> str:
    shortened = repr(float(decimal))
    return f"({shortened})" if shortened.startswith("-") else shortened


def _prompt(text: str) -> list[str]:
    """Return a statement as doctest input, broken inside its outermost parentheses only."""
    joined = text.replace(") < ", ")<")
    first, *rest = textwrap.wrap(joined, 84, break_long_words=False, break_on_hyphens=False)
    lines = [f">>> {first}", *(f"...     {line}" for line in rest)]
    return [*lines[:-1], lines[-1].replace(")<", ") < ")]
