"""How each symbol takes exact values, so that all rates of a network are rational.

A positive symbol that occurs under a root of index r takes r-th powers of the grid numbers
2^k (1 + j/2^b); a real symbol that occurs in exponents only takes m ln(q), q a grid number and m
clearing the fractions in front of it; a real symbol that occurs outside exponents only takes plain
rationals. Grid numbers are numbered by k 2^b + j.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from fractions import Fraction
from math import lcm

import flint

from symbolic_response.errors import EvaluationError, SizeLimitError, UndecidedError
from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    function,
    multiply,
    number,
    symbols_of,
)
from symbolic_response.network.model import Network, SymbolEntry

BITS = 6
PLAIN_BITS = 4
MAX_OCTAVES = 4096
_PRECISIONS = (64, 256, 1024, 4096)


@dataclass(frozen=True, slots=True)
class Axis:
    """The values of one symbol; ``kind`` is ``power``, ``exponent`` or ``plain``.

    ``order``: the power that is taken of a grid number, or the m of m ln(q). ``first``, ``last``:
    numbers of the grid numbers within the range of the symbol, at 6 bits (``plain``: 0 and 1024,
    with steps of a 1024th of the range).
    """

    name: str
    kind: str
    order: int
    first: int
    last: int
    low: Fraction
    high: Fraction

    def value(self, place: int, bits: int = BITS) -> Expression:
        """Return the value with a number on the grid of ``bits`` bits."""
        if self.kind == "plain":
            step = (self.high - self.low) / (1 << (bits + PLAIN_BITS))
            return number(self.low + step * place)
        base = grid_number(place, bits)
        if self.kind == "power":
            return Number(base if self.order == 1 else base**self.order)
        return multiply([number(self.order), function("ln", Number(base))])

    def limits(self, bits: int) -> tuple[int, int]:
        """Return the first and last number on a finer grid."""
        return self.first << (bits - BITS), self.last << (bits - BITS)


def grid_number(place: int, bits: int = BITS) -> Fraction:
    """Return 2^k (1 + j/2^bits) for the number k 2^bits + j.

    >>> grid_number(-64), grid_number(32)
    (Fraction(1, 2), Fraction(3, 2))
    """
    octave, part = divmod(place, 1 << bits)
    top, shift = (1 << bits) + part, octave - bits
    return Fraction(top << shift) if shift >= 0 else Fraction(top, 1 << -shift)


@dataclass(slots=True)
class _Use:
    """Where a symbol occurs: root indices outside exponents, denominators inside."""

    roots: list[int] = field(default_factory=list)
    denominators: list[int] = field(default_factory=list)


def axes_for(network: Network, expressions: Iterable[Expression]) -> tuple[Axis, ...]:
    """Return how each symbol of a network is sampled, in file order.

    ``expressions``: everything that has to be rational, such as the rates. Raises UndecidedError
    where that cannot be had, EvaluationError for a range without a sampling point.
    """
    uses = {entry.name: _Use() for entry in network.symbols}
    for expression in expressions:
        _outside(expression, 1, uses, expression)
    return tuple(_axis(entry, uses[entry.name]) for entry in network.symbols)


def _outside(node: Expression, root: int, uses: dict[str, _Use], whole: Expression) -> None:
    """Note the symbols of a part that stands outside exponents, under a root of some index."""
    match node:
        case Symbol(name):
            uses[name].roots.append(root)
        case Power(base, exponent):
            _outside(base, root * exponent.denominator, uses, whole)
        case Product(factors):
            for factor in factors:
                _outside(factor, root, uses, whole)
        case Sum(terms):
            if root > 1 and symbols_of(node):
                raise _irrational(whole)
            for term in terms:
                _outside(term, root, uses, whole)
        case Function("exp", argument):
            _inside(argument, Fraction(1, root), uses, whole)
        case Function(_, argument) if symbols_of(argument):
            raise _irrational(whole)


def _inside(node: Expression, factor: Fraction, uses: dict[str, _Use], whole: Expression) -> None:
    """Note the symbols of an exponent; ``factor`` stands in front of the part."""
    match node:
        case Symbol(name):
            uses[name].denominators.append(factor.denominator)
        case Sum(terms):
            for term in terms:
                _inside(term, factor, uses, whole)
        case Product((Number(value), rest)):
            _inside(rest, factor * value, uses, whole)
        case Function("ln", argument):
            _outside(argument, factor.denominator, uses, whole)
        case _:
            raise _irrational(whole)


def _irrational(whole: Expression) -> UndecidedError:
    shown = expression_text(whole)
    shown = shown if len(shown) <= 60 else shown[:57] + "..."
    return UndecidedError(
        f"'{shown}' is not rational at exact points, so nothing is decided; points need powers,"
        " roots of products, and exponentials of real symbols with numbers in front"
    )


def _axis(entry: SymbolEntry, use: _Use) -> Axis:
    if use.denominators and (use.roots or entry.positive):
        why = ("is positive and occurs in an exponent" if entry.positive
               else "occurs inside and outside exponents")
        advice = 'sign = "real"' if entry.positive else "two symbols"
        raise UndecidedError(
            f"symbol {entry.name} {why}: at no exact point are all rates rational, so nothing is"
            f" decided; declare {advice} where the model allows it"
        )
    if use.denominators:
        return _grid_axis(entry, "exponent", lcm(*use.denominators), _compare_logarithm)
    if entry.positive:
        return _grid_axis(entry, "power", lcm(*use.roots), _compare_power)
    return Axis(entry.name, "plain", 1, 0, 1 << (BITS + PLAIN_BITS), entry.low, entry.high)


Compare = Callable[[Fraction, int, Fraction], int]
"""The sign of the value of a grid number, given the order, minus an end of the range."""


def _compare_power(base: Fraction, order: int, bound: Fraction) -> int:
    value = base**order
    return (value > bound) - (value < bound)


def _compare_logarithm(base: Fraction, order: int, bound: Fraction) -> int:
    if base == 1:
        return (bound < 0) - (bound > 0)
    for precision in _PRECISIONS:
        with flint.ctx.workprec(precision):
            logarithm = flint.arb(flint.fmpq(base.numerator, base.denominator)).log()
            gap = order * logarithm - flint.arb(flint.fmpq(bound.numerator, bound.denominator))
            if gap > 0 or gap < 0:
                return 1 if gap > 0 else -1
    raise UndecidedError("the end of a range cannot be told from a sampling point")


def _grid_axis(entry: SymbolEntry, kind: str, order: int, compare: Compare) -> Axis:
    octaves = _octaves(entry, kind, order)
    first = _first(lambda place: compare(grid_number(place), order, entry.low) >= 0, octaves)
    beyond = _first(lambda place: compare(grid_number(place), order, entry.high) > 0, octaves)
    if first >= beyond:
        form = "2^k (1 + j/64)" + (f" to the power {order}" if order > 1 else "")
        if kind == "exponent":
            form = f"{order} ln(2^k (1 + j/64))"
        raise EvaluationError(
            f"the range of {entry.name}, {fraction_text(entry.low)} to {fraction_text(entry.high)},"
            f" holds no sampling point {form}; widen it"
        )
    return Axis(entry.name, kind, order, first, beyond - 1, entry.low, entry.high)


def _octaves(entry: SymbolEntry, kind: str, order: int) -> int:
    """Return a number of octaves on either side of 1 that holds the range."""
    if kind == "exponent":
        octaves = 2 + int(max(abs(entry.low), abs(entry.high)) * Fraction(3, 2) / order)
    else:
        ends = (entry.low, entry.high)
        octaves = 2 + max(max(end.numerator.bit_length(), end.denominator.bit_length())
                          for end in ends) // order
    if octaves > MAX_OCTAVES:
        raise SizeLimitError(f"the range of {entry.name} is too wide for exact sampling; narrow it")
    return octaves


def _first(holds: Callable[[int], bool], octaves: int) -> int:
    """Return the first grid number at which a rising condition holds."""
    low, high = -octaves << BITS, octaves << BITS
    while low < high:
        middle = (low + high) // 2
        if holds(middle):
            high = middle
        else:
            low = middle + 1
    return low


def value_text(value: Expression) -> str:
    """Return a value as records write it: a fraction, or ``m*ln(q)``."""
    match value:
        case Product((Number(order), Function("ln", Number(base)))):
            return f"{fraction_text(order)}*ln({fraction_text(base)})"
        case Function("ln", Number(base)):
            return f"1*ln({fraction_text(base)})"
    return expression_text(value)
