"""A hand result that differs: both sides at a few exact points, and exact confirmation.

Hypotheses are refuted at points, where a steady state costs next to nothing; what no point refutes
is confirmed by closed forms.
"""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction
from functools import cached_property

import flint

from symbolic_response.errors import SymbolicResponseError
from symbolic_response.expressions.enclosure import ball
from symbolic_response.expressions.ring import plain
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    Number,
    Symbol,
    add,
    children,
    negate,
    number,
    walk,
)
from symbolic_response.hand.judging.equality import equal
from symbolic_response.hand.judging.witness import axes_of, mixed_points
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_form import closed_form
from symbolic_response.response.direct import direct_value
from symbolic_response.response.values import Point

NO_ANSWER = (SymbolicResponseError, ArithmeticError)
"""What a hypothesis may run into: no value, no such quantity, past a limit, no steady state."""

POINTS, TRIED = 2, 8
CONFIRMATIONS, CONFIRMATIONS_OF_LARGE = 60, 3
LARGE = 3_000
TOO_LARGE = 20_000

Values = Mapping[str, Expression]


class Case:
    """A quantity of a network and a hand result known to differ from it.

    ``points``: exact points at which both have values, none where rates are irrational at all
    that were tried. ``trees``: the number of rooted spanning trees.
    """

    def __init__(self, analysis: Analysis, quantity: Expression, hand: Expression) -> None:
        self.analysis, self.network = analysis, analysis.network
        self.domain = analysis.domain
        self.quantity, self.hand = quantity, hand
        self.axes = axes_of(self.network, (quantity, hand))
        self.trees = sum(analysis.tree_counts)
        self.left = CONFIRMATIONS if self.trees <= LARGE else CONFIRMATIONS_OF_LARGE
        self._at: dict[int, Point | None] = {}

    # -- points --------------------------------------------------------------------------------

    @cached_property
    def points(self) -> tuple[Values, ...]:
        """A few points at which both sides have values that are known exactly."""
        found: list[Values] = []
        for values in mixed_points(self.axes, TRIED):
            point = point_at(self.network, values)
            if point is None:
                continue
            sides = value_at(point, self.quantity), value_at(point, self.hand)
            if None not in sides:
                self._at[len(found)] = point
                found.append(values)
            if len(found) == POINTS:
                break
        return tuple(found)

    @cached_property
    def hand_values(self) -> tuple[Expression, ...]:
        """The values of the hand result at the points."""
        points = (self._at[place] for place in range(len(self.points)))
        return tuple(found for point in points if point is not None
                     and (found := value_at(point, self.hand)) is not None)

    def point(self, place: int) -> Point:
        """Return the network at a point."""
        _ = self.points
        found = self._at[place]
        assert found is not None
        return found

    def may_be(self, quantity: Expression, network: Network | None = None) -> bool:
        """Return False where a point shows that the hand result is not this quantity."""
        for place, (values, by_hand) in enumerate(zip(self.points, self.hand_values, strict=True)):
            point = self.point(place) if network is None else point_at(network, values)
            found = None if point is None else value_at(point, quantity)
            if found is None or not may_agree(found, by_hand):
                return False
        return True

    # -- confirmation --------------------------------------------------------------------------

    @cached_property
    def hand_form(self) -> Expression | None:
        """The hand result in the symbols of the network; None where it cannot be made."""
        return self.form_of(self.hand)

    @cached_property
    def derived_form(self) -> Expression | None:
        """The derived form in the symbols of the network; None where it cannot be made."""
        return self.form_of(self.quantity)

    def form_of(self, quantity: Expression, analysis: Analysis | None = None) -> Expression | None:
        """Return a quantity in symbols, itself where it has no atoms; None past a limit."""
        if is_plain(quantity):
            return quantity
        try:
            return closed_form(quantity, analysis or self.analysis).expression
        except NO_ANSWER:
            return None

    def is_hand(self, quantity: Expression, network: Network | None = None) -> bool:
        """Return whether the hand result is proved to be a quantity, of this network or another."""
        if self.left <= 0 or self.hand_form is None or not self.may_be(quantity, network):
            return False
        self.left -= 1
        other = None if network is None else Analysis(network, tree_limit=self.analysis.tree_limit)
        form = self.form_of(quantity, other)
        return form is not None and self.proved(form, self.hand_form)

    def is_derived(self, hand: Expression) -> bool:
        """Return whether a corrected hand result is proved to be the derived one."""
        if self.left <= 0 or self.derived_form is None:
            return False
        self.left -= 1
        form = self.form_of(hand)
        return form is not None and self.proved(form, self.derived_form)

    def proved(self, left: Expression, right: Expression) -> bool:
        """Return whether two forms are proved equal."""
        try:
            return equal(left, right, self.domain) is True
        except NO_ANSWER:
            return False

    @cached_property
    def hand_vanishes(self) -> bool:
        """Whether the hand result is zero at the points."""
        return bool(self.hand_values) and all(value == ZERO for value in self.hand_values)

    @cached_property
    def plain_hand(self) -> Expression | None:
        """The hand result in symbols, no polynomial left as a leaf."""
        return None if self.hand_form is None else plain(self.hand_form)


def is_plain(node: Expression) -> bool:
    """Return whether an expression holds symbols and numbers alone, no quantity to be derived."""
    return all(isinstance(part, Symbol | Number) or children(part) for part in walk(node))


def point_at(network: Network, values: Values) -> Point | None:
    """Return a network at a point, None where a rate is not positive or not known there."""
    try:
        return Point(network, values)
    except NO_ANSWER:
        return None


def value_at(point: Point, quantity: Expression) -> Expression | None:
    """Return the exact value of a quantity at a point as a constant, None where it has none.

    A constant that is no number is left as it is: it may be irrational.
    """
    try:
        exact = direct_value(quantity, point.values)
        if exact is None:
            constant = point.expression(quantity)
            exact = None if constant is None else direct_value(constant, {})
            if exact is None:
                return constant
    except NO_ANSWER:
        return None
    return number(Fraction(int(exact.p), int(exact.q)))


def may_agree(left: Expression, right: Expression) -> bool:
    """Return False where two constants are certainly different."""
    if isinstance(left, Number) and isinstance(right, Number):
        return left.value == right.value
    with flint.ctx.workprec(128):
        difference = ball(add([left, negate(right)]))
        return not (difference > 0 or difference < 0)
