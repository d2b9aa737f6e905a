"""How long an expression is when printed: characters and literals.

The measure of length counts a symbol by its own width (6 for ``W_{21}``), 1 for each ``+``, ``-``
and bar of a fraction, 2 for a pair of parentheses, 2 for ``^2``, the digits of numbers, and
nothing for spaces and products: ``W_{12}(W_{13}+W_{23})`` has 21 characters and 3 literals.
"""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

from symbolic_response.expressions.layout import without_sign
from symbolic_response.expressions.ring import Generator, Polynomial, expression_of
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    walk,
)

Width = Callable[[str], int]
"""The number of characters of a symbol."""

GENERATOR_WIDTH = 6
SHORT_WIDTH = 3
_WIDTHS = {"#total": 1, "#tree": SHORT_WIDTH, "#current": SHORT_WIDTH, "#factor": SHORT_WIDTH,
           "#exit": SHORT_WIDTH, "#shifts": SHORT_WIDTH}


def default_width(name: str) -> int:
    """Return 6 for a rate, a forest difference and an effective rate, 3 for ``N_1``, 1 for D.

    >>> [default_width(name) for name in ("W_21", "#tree[0]", "#total[]", "#forest[0, 1]")]
    [6, 3, 1, 6]
    """
    return _WIDTHS.get(name.split("[")[0], GENERATOR_WIDTH)


def floored(width: Width) -> Width:
    """Return widths of at least 3, with which ``a b + a c`` is longer than ``a (b + c)``."""
    return lambda name: max(SHORT_WIDTH, width(name))


def generator_width(generator: Generator, width: Width) -> int:
    """Return the width of a generator: 3 more for a function."""
    names = [part.name for part in walk(generator.base) if isinstance(part, Symbol)]
    own = sum(width(name) for name in names) or 1
    return own if generator.kind in ("symbol", "rate") else own + SHORT_WIDTH


def exponent_width(exponent: Fraction | int) -> int:
    """Return the characters of an exponent with its ``^``, 0 for 1."""
    text = str(exponent)
    return 0 if exponent == 1 else 1 + len(text) + 2 * (len(text) > 1)


def literals(node: Expression) -> int:
    """Return the number of symbols to write down.

    >>> from symbolic_response.expressions.reader import read_expression
    >>> literals(read_expression("a*(b + c**2) + b"))
    4
    """
    return sum(1 for part in walk(node) if isinstance(part, Symbol))


def characters(node: Expression, width: Width = default_width) -> int:
    """Return the number of characters when printed, counted as this module says.

    >>> from symbolic_response.expressions.reader import read_expression
    >>> characters(read_expression("a*(b + c**2) - 2*b"), lambda name: 1)
    11
    """
    match node:
        case Sum(terms):
            minus = all(without_sign(term)[0] for term in terms)
            inner = [characters(without_sign(term)[1], width) for term in terms]
            return sum(inner) + len(terms) - 1 + minus
        case Product(factors):
            return _product(factors, width)
        case Power(base, exponent):
            if exponent < 0:
                return _product((node,), width)
            return _factor(base, width) + exponent_width(exponent)
        case Function(name, argument):
            return (1 if name == "exp" else 2) + 2 + characters(argument, width)
        case Symbol(name):
            return width(name)
        case Number(value):
            return len(str(value))
        case Polynomial(ring, poly):
            return characters(expression_of(ring, poly), width)
    raise TypeError(f"not a plain expression: {type(node).__name__}")


def _product(factors: tuple[Expression, ...], width: Width) -> int:
    above = [f for f in factors if not (isinstance(f, Power) and f.exponent < 0)]
    below = [f for f in factors if isinstance(f, Power) and f.exponent < 0]
    minus = bool(above) and isinstance(above[0], Number) and above[0].value == -1
    if minus:
        above = above[1:]
    total = int(minus) + (0 if above else 1)
    lone = len(above) == 1 and isinstance(above[0], Sum) and bool(below)
    total += sum(characters(f, width) if lone else _factor(f, width) for f in above)
    for factor in below:
        total += _factor(factor.base, width) + exponent_width(-factor.exponent)
    return total + bool(below)


def _factor(node: Expression, width: Width) -> int:
    return characters(node, width) + 2 * isinstance(node, Sum)
