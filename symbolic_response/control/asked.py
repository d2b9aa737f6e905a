"""What is asked of a control parameter: an observable, a symbol, and what else is given."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.bounds.target import depends_on, target_of
from symbolic_response.errors import AssignmentError, EvaluationError, QuantityError
from symbolic_response.expressions.names import nearest
from symbolic_response.expressions.tree import (
    Expression,
    Sum,
    add,
    divide,
    negate,
    number,
    symbols_of,
)
from symbolic_response.network.quantities import BySymbol
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.deriving import Given, check_values, given
from symbolic_response.response.direct import direct_value

_SAME = "the observable is the same in every state: nothing responds"


@dataclass(frozen=True, slots=True)
class Asked:
    """An observable <Q> and the symbol x it is followed in; ``by``: ln x where x is positive.

    ``values``: of the other symbols, where given. ``text``: the observable as it was written.
    """

    text: str
    quantity: Expression
    observable: tuple[Expression, ...]
    by: BySymbol
    values: Mapping[str, Expression]

    @property
    def term(self) -> str:
        """The observable as a term of a difference or quotient: a sum in parentheses."""
        return f"({self.text})" if isinstance(self.quantity, Sum) else self.text

    @property
    def symbol(self) -> str:
        """The name of the parameter."""
        return self.by.name

    def missing(self, analysis: Analysis) -> list[str]:
        """Return the other symbols that have no value."""
        return [entry.name for entry in analysis.network.symbols
                if entry.name not in self.values and entry.name != self.symbol]


def asked_of(
    analysis: Analysis, text: str, parameter: str, at: Mapping[str, Given] | None = None
) -> Asked:
    """Return what is asked; ``parameter``: a symbol, ``ln`` before it allowed where it is positive.

    Raises QuantityError for anything but the mean of an observable that does not depend on the
    parameter, AssignmentError for values that do not fit.
    """
    network = analysis.network
    name = parameter.removeprefix("ln ").strip()
    entry = next((entry for entry in network.symbols if entry.name == name), None)
    if entry is None:
        known = [entry.name for entry in network.symbols]
        raise QuantityError(f"there is no symbol {name!r} in the network{nearest(name, known)}")
    if name != parameter and not entry.positive:
        raise QuantityError(f"{name} is a real symbol, which has no logarithm; write {name}")
    values = given(at)
    if name in values:
        raise AssignmentError(f"{name} is the parameter; give values to the other symbols only")
    check_values(values, network)
    quantity = read_quantity(text, network)
    target = target_of(quantity, network)
    if target is None or target.asked.kind != "mean":
        raise QuantityError("a control parameter acts on the mean of an observable: p[A], p[A, B],"
                            " mean[name] or a combination of them with constant factors")
    if depends_on(target, name):
        raise QuantityError(f"the observable itself depends on {name}; no limit of this kind holds"
                            " for it")
    return Asked(text, quantity, target.asked.above, BySymbol(name, entry.positive), values)


def extremes(asked: Asked) -> tuple[Fraction, Fraction] | None:
    """Return the least and the largest value of the observable.

    None where a symbol in it has no value. Raises QuantityError for an observable that is the same
    in every state, EvaluationError for values that are not rational.
    """
    symbols = set().union(*(symbols_of(value) for value in asked.observable))
    if len(set(asked.observable)) > 1 and symbols - asked.values.keys():
        return None
    values = observable_values(asked)
    low, high = min(values), max(values)
    if low == high:
        raise QuantityError(_SAME)
    return low, high


def observable_values(asked: Asked) -> tuple[Fraction, ...]:
    """Return the observable in each state; EvaluationError where a symbol in it has no value."""
    found = []
    for value in asked.observable:
        exact = direct_value(value, asked.values)
        if exact is None:
            raise EvaluationError("the observable is not rational in every state; give its symbols"
                                  " rational values with --at")
        found.append(Fraction(int(exact.p), int(exact.q)))
    return tuple(found)


def rescaled(asked: Asked, values: Sequence[Fraction]) -> tuple[Expression, bool]:
    """Return the observable brought to 0 .. 1, and whether that changed it.

    Raises QuantityError for an observable that is the same in every state.
    """
    low, high = min(values), max(values)
    if low == high:
        raise QuantityError(_SAME)
    if low == 0 and high == 1:
        return asked.quantity, False
    shifted = add([asked.quantity, negate(number(low))])
    return divide(shifted, number(high - low)), True
