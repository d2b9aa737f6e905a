"""Exact points with small numbers, and the values of a derived and a hand result there.

A point gives every symbol a small number q > 0 to start from: a positive symbol is q (or a power
of q where roots of it occur), a real symbol in exponents m ln(q), another real symbol q - 1; q = 1
is the plainest value, 1 or 0. Values come from W p = 0 at the point, without closed forms.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from fractions import Fraction
from itertools import combinations, islice
from math import lcm

from symbolic_response.errors import (
    AssignmentError,
    EvaluationError,
    QuantityError,
    SizeLimitError,
    UndecidedError,
)
from symbolic_response.expressions.enclosure import sign_of_constant
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    add,
    function,
    multiply,
    negate,
    number,
    power,
    symbols_of,
    walk,
)
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import Change, Response
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.deriving import Value, derive_quantity
from symbolic_response.response.direct import direct_value
from symbolic_response.response.values import NO_SYMBOLS, Point, rational_constant

NO_VALUE = (EvaluationError, SizeLimitError, UndecidedError, OverflowError)
SINGLES = (2, 3, Fraction(1, 2))
MAX_SINGLES, MAX_PAIRS, MAX_MIXED = 150, 60, 40
MAX_IRRATIONAL = 8
SMALL_NUMBERS = tuple(Fraction(*pair) for pair in (
    (2, 1), (3, 1), (1, 2), (5, 1), (1, 3), (3, 2), (4, 1), (2, 3), (7, 1), (1, 5), (5, 2)))

Values = Mapping[str, Expression]


@dataclass(frozen=True, slots=True)
class Axis:
    """How a symbol takes values; ``kind`` is ``power``, ``logarithm`` or ``plain``.

    ``order``: the power of q that is taken, or the m of m ln(q).
    """

    name: str
    kind: str
    order: int
    positive: bool

    def value(self, q: Fraction, root: int = 1) -> Expression:
        """Return the value that belongs to q > 0; ``root``: raise q to this power first."""
        if self.kind == "plain":
            return number(q - 1)
        if self.kind == "power":
            return number(q ** (self.order * root))
        base = (1 + q if self.positive else q) ** root
        return multiply([number(self.order), function("ln", number(base))])


@dataclass(frozen=True, slots=True)
class Places:
    """Where symbols occur in some expressions.

    ``roots``: by symbol, the least common index of the roots it stands under outside exponents (1
    without a root); ``inside``: by symbol, the least common denominator in exponents; ``coupled``:
    symbols that multiply another one in an exponent, and are not the one that takes logarithms.
    """

    positive: frozenset[str]
    roots: dict[str, int]
    inside: dict[str, int]
    coupled: set[str]


def axes_of(network: Network, expressions: Iterable[Expression]) -> tuple[Axis, ...]:
    """Return how every symbol of a network takes values, in file order.

    ``expressions``: what is to be rational where that can be, beside the rates. Atoms are leaves.
    """
    places = Places(network.positive_symbols, {}, {}, set())
    rates = (r for t in network.transitions for r in (t.forward, t.backward) if r is not None)
    for expression in (*rates, *(v for o in network.observables for v in o.values), *expressions):
        _note(expression, places)
    return tuple(_axis(entry.name, entry.positive, places) for entry in network.symbols)


def _note(whole: Expression, places: Places) -> None:
    stack = [(whole, 1)]
    while stack:
        part, root = stack.pop()
        match part:
            case Symbol(name):
                places.roots[name] = lcm(places.roots.get(name, 1), root)
            case Power(base, exponent):
                stack.append((base, root * exponent.denominator))
            case Sum(parts) | Product(parts):
                stack += [(inner, root) for inner in parts]
            case Function("exp", argument):
                _note_exponent(argument, root, places)
            case Function(_, argument):
                stack.append((argument, 1))
            case Response(quantity, _):
                stack.append((quantity, 1))
            case Change(quantity, _, amount):
                stack.append((quantity, 1))
                _note_exponent(amount, 1, places)


def _note_exponent(argument: Expression, root: int, places: Places) -> None:
    for term in argument.terms if isinstance(argument, Sum) else (argument,):
        parts = list(walk(term))
        below = root * lcm(*(p.value.denominator for p in parts if isinstance(p, Number)))
        logarithms = [p for p in parts if isinstance(p, Function) and p.name == "ln"]
        for inner in logarithms:
            _note(power(inner.argument, Fraction(1, below)), places)
        if not logarithms:
            names = sorted(symbols_of(term), key=lambda name: (name in places.positive, name))
            for name in names[:1]:
                places.inside[name] = lcm(places.inside.get(name, 1), below)
            places.coupled.update(names[1:])


def _axis(name: str, positive: bool, places: Places) -> Axis:
    if name in places.inside and name not in places.roots and name not in places.coupled:
        return Axis(name, "logarithm", places.inside[name], positive)
    if positive:
        return Axis(name, "power", places.roots.get(name, 1), True)
    return Axis(name, "plain", 1, False)


# -- points ----------------------------------------------------------------------------------------


def mixed_points(
    axes: tuple[Axis, ...], count: int, root: int = 1
) -> Iterator[dict[str, Expression]]:
    """Yield points at which symbols have different small values, none of them special."""
    size = len(SMALL_NUMBERS)
    for trial in range(count):
        stride, shift = 1 + trial % (size - 1), 3 * trial
        yield {
            axis.name: axis.value(
                SMALL_NUMBERS[(stride * place + shift + place // size) % size], root)
            for place, axis in enumerate(axes)
        }


def plain_points(axes: tuple[Axis, ...]) -> Iterator[dict[str, Expression]]:
    """Yield points with most symbols at 1 or 0, those with the fewest other values first."""
    base = {axis.name: axis.value(Fraction(1)) for axis in axes}
    yield base
    singles = ((axis, q) for q in SINGLES for axis in axes)
    for axis, q in islice(singles, MAX_SINGLES):
        yield {**base, axis.name: axis.value(Fraction(q))}
    for one, other in islice(combinations(axes, 2), MAX_PAIRS):
        yield {**base, one.name: one.value(Fraction(2)), other.name: other.value(Fraction(3))}
    yield from mixed_points(axes, MAX_MIXED)


# -- values at a point -----------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Sides:
    """Both results at a point, as constants; None where one has no value that is known there.

    ``differ`` is decided exactly: True, False, or None where it was not. ``fails``: a side
    certainly has no value; ``trouble`` says why.
    """

    derived: Expression | None
    hand: Expression | None
    differ: bool | None
    trouble: str = ""
    fails: bool = False


def sides_at(network: Network, quantity: Expression, hand: Expression, values: Values) -> Sides:
    """Return both results at a point; ``trouble`` says why one has no value there."""
    try:
        point = Point(network, values)
        derived = constant_at(point, quantity)
    except NO_VALUE as error:
        return Sides(None, None, None, str(error), isinstance(error, EvaluationError))
    try:
        by_hand = constant_at(point, hand)
    except NO_VALUE as error:
        return Sides(derived, None, None, str(error), isinstance(error, EvaluationError))
    return Sides(derived, by_hand, _differ(derived, by_hand))


def constant_at(point: Point, node: Expression) -> Expression:
    """Return the value of a quantity at a point: a number, or a constant where it is irrational.

    Raises EvaluationError where it has no value, UndecidedError where a rate is irrational.
    """
    exact = direct_value(node, point.values)
    if exact is None:
        constant = point.expression(node)
        if constant is None:
            raise UndecidedError("a rate is irrational at this point")
        exact = direct_value(constant, {})
        if exact is None:
            exact = rational_constant(constant)
        if exact is None:
            return constant
    return number(Fraction(int(exact.p), int(exact.q)))


def _differ(left: Expression, right: Expression) -> bool | None:
    if isinstance(left, Number) and isinstance(right, Number):
        return left.value != right.value
    difference = add([left, negate(right)])
    try:
        if normal_form(difference, NO_SYMBOLS).is_zero():
            return False
        return sign_of_constant(difference) != 0
    except NO_VALUE:
        return None


# -- the witness -----------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Witness:
    """A point at which both results have values that differ."""

    values: Values
    hand: Value
    derived: Value


def find_witness(
    analysis: Analysis,
    quantity: Expression,
    hand: Expression,
    axes: tuple[Axis, ...],
    fallback: Iterable[Values] = (),
) -> Witness | None:
    """Return a point with small numbers at which the results differ, rational values preferred.

    None where none of the points tried, ``fallback`` the last of them, shows a difference.
    """
    network, irrational = analysis.network, []
    for values in (*plain_points(axes), *fallback):
        sides = sides_at(network, quantity, hand, values)
        if not sides.differ:
            continue
        if isinstance(sides.derived, Number) and isinstance(sides.hand, Number):
            return Witness(values, *(Value(side.value, side) for side in (sides.hand,
                                                                         sides.derived)))
        irrational.append(values)
        if len(irrational) >= MAX_IRRATIONAL:
            break
    for values in irrational:
        witness = _irrational_witness(analysis, quantity, hand, values)
        if witness is not None:
            return witness
    return None


def irrational_rates_witness(
    analysis: Analysis, quantity: Expression, hand: Expression, axes: tuple[Axis, ...]
) -> Witness | None:
    """Return a witness where no tried point makes the rates rational: by closed form and balls."""
    for values in islice(mixed_points(axes, 4), 4):
        witness = _irrational_witness(analysis, quantity, hand, values)
        if witness is not None:
            return witness
    return None


def _irrational_witness(
    analysis: Analysis, quantity: Expression, hand: Expression, values: Values
) -> Witness | None:
    try:
        derived = derive_quantity(analysis, quantity, "the quantity", values).value
        by_hand = derive_quantity(analysis, hand, "the hand result", values).value
    except (*NO_VALUE, AssignmentError, QuantityError):
        return None
    if derived is None or by_hand is None or not _disjoint(derived, by_hand):
        return None
    return Witness(values, by_hand, derived)


def _disjoint(left: Value, right: Value) -> bool:
    (low, high), (bottom, top) = (_ends(value) for value in (left, right))
    return high < bottom or top < low


def _ends(value: Value) -> tuple[Fraction, Fraction]:
    if value.enclosure is None:
        assert value.exact is not None
        return value.exact, value.exact
    return Fraction(value.enclosure[0]), Fraction(value.enclosure[1])
