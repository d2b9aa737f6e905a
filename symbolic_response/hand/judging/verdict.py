"""The verdict on a hand result: equal, equal under a condition, different, or undecided.

Points are tried first: one exact difference settles "not equal" for a network of any size. Only
where they agree, closed forms are made and compared.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import islice

from symbolic_response.errors import EvaluationError, SizeLimitError, UndecidedError
from symbolic_response.expressions.enclosure import nonzero_somewhere
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.ring import plain
from symbolic_response.expressions.signs import certain_sign
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    Number,
    Symbol,
    add,
    children,
    negate,
    substitute,
    walk,
)
from symbolic_response.hand.judging.conditions import (
    Condition,
    Relation,
    condition_of,
    force_conditions,
    forces_of,
    read_relations,
)
from symbolic_response.hand.judging.equality import vanishes_exactly
from symbolic_response.hand.judging.solving import Solved
from symbolic_response.hand.judging.witness import (
    NO_VALUE,
    Sides,
    Values,
    Witness,
    axes_of,
    find_witness,
    irrational_rates_witness,
    mixed_points,
    plain_points,
    sides_at,
)
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_form import ClosedForm, closed_form
from symbolic_response.response.deriving import Value
from symbolic_response.response.placing import placed
from symbolic_response.response.values import NO_SYMBOLS

QUICK = 3  # points tried before any closed form
ON_CONDITION, MAX_ON_CONDITION = 2, 12


@dataclass(frozen=True, slots=True)
class Verdict:
    """What was found about a hand result.

    ``kind``: ``equal``, ``conditional``, ``different`` or ``undecided``. ``condition``: where it
    holds, in words and as a formula. ``witness``: for ``different`` and ``conditional`` values of
    every symbol at which the two differ, their values there beside it. ``reason``: one line.
    """

    kind: str
    condition: str | None
    witness: Mapping[str, Expression] | None
    hand_value: Value | None
    derived_value: Value | None
    reason: str


def judge(
    analysis: Analysis, quantity: Expression, hand: Expression, given: Sequence[str] = ()
) -> Verdict:
    """Return whether a hand result is the quantity of a network, exactly.

    ``hand``: in symbols of the network; atoms and responses in it are derived as well. ``given``:
    relations such as ``k1*k2 = k3*k4`` that may be used. Raises QuantityError for a quantity that
    does not exist for the network and for a relation that cannot be used, EvaluationError where
    one side has no value.

    >>> from symbolic_response.expressions.reader import read_expression
    >>> from symbolic_response.network.build import build_network
    >>> from symbolic_response.network.quantity_reader import read_quantity
    >>> pair = build_network("pair", states="A B", transitions=[("A", "B", "k*c", "r")])
    >>> found = judge(Analysis(pair), read_quantity("p[B]", pair), read_expression("k/(r + k*c)"))
    >>> found.kind, {name: str(value.value) for name, value in found.witness.items()}
    ('different', {'k': '1', 'c': '2', 'r': '1'})
    >>> str(found.hand_value), str(found.derived_value)
    ('1/3', '2/3')
    """
    relations = read_relations(given, analysis)
    question = _Question(analysis, quantity, hand)
    if not question.differs_quickly():
        settled = _proved_or_undecided(question)
        if settled is not None:
            return settled
    witness = question.witness()
    if witness is None:
        return _undecided("no difference was found at the points tried, and the normal form of the"
                          " difference is not zero")
    condition = _stated(question, relations) or _of_forces(question)
    sides = witness.values, witness.hand, witness.derived
    if condition is None:
        return Verdict("different", None, *sides,
                       "the two differ at the witness" + question.unsettled)
    return Verdict("conditional", condition.describe(), *sides,
                   "the two are equal under the condition; they differ elsewhere")


def _proved_or_undecided(question: _Question) -> Verdict | None:
    """Return the verdict where closed forms prove equality or cannot be made; None else."""
    try:
        proved = question.proved()
    except (SizeLimitError, UndecidedError) as error:
        if question.witness() is not None:
            return None
        return _undecided(f"the two agree at the points tried, but {error}")
    if proved:
        question.require_values()
        return Verdict("equal", None, None, None, None,
                       "the normal form of the difference is zero")
    return None


def _undecided(reason: str) -> Verdict:
    return Verdict("undecided", None, None, None, None, reason)


class _Question:
    """A quantity and a hand result of one network, with what was worked out about them."""

    def __init__(self, analysis: Analysis, quantity: Expression, hand: Expression) -> None:
        self.analysis, self.network = analysis, analysis.network
        self.quantity, self.hand = quantity, hand
        self.axes = axes_of(self.network, (quantity, hand))
        self.differing: list[Values] = []
        self.tried: list[Sides] = []
        self.unsettled = ""

    def at(self, values: Values) -> Sides:
        """Return both sides at a point."""
        return sides_at(self.network, self.quantity, self.hand, values)

    def differs_quickly(self) -> bool:
        """Return whether one of a few points shows a difference."""
        for values in mixed_points(self.axes, QUICK):
            sides = self.at(values)
            self.tried.append(sides)
            if sides.differ:
                self.differing.append(values)
                return True
        return False

    @cached_property
    def derived_form(self) -> ClosedForm:
        """The closed form of the quantity."""
        return closed_form(self.quantity, self.analysis)

    @cached_property
    def hand_form(self) -> Expression:
        """The hand result in the symbols of the network."""
        if all(isinstance(part, Symbol | Number) or children(part) for part in walk(self.hand)):
            return self.hand
        return closed_form(self.hand, self.analysis).expression

    def proved(self) -> bool:
        """Return whether closed forms prove the two equal."""
        derived = self.derived_form.expression
        try:
            difference = add([derived, negate(self.hand_form)])
            return vanishes_exactly(difference, self.analysis.domain) is True
        except EvaluationError as error:
            raise EvaluationError(f"the hand result has no value: {error}") from None

    def require_values(self) -> None:
        """Raise EvaluationError where one side was seen to have no value at any point."""
        if any(sides.hand is not None for sides in self.tried):
            return
        for values in islice(plain_points(self.axes), 60):
            sides = self.at(values)
            self.tried.append(sides)
            if sides.hand is not None:
                return
        self._refuse_without_value()

    def _refuse_without_value(self) -> None:
        known = [sides for sides in self.tried if sides.derived is not None]
        if known and all(sides.hand is None for sides in known) and known[-1].fails:
            raise EvaluationError(f"the hand result has no value at any of {len(known)} points"
                                  f" tried: {known[-1].trouble}")
        if not known and all(sides.fails for sides in self.tried):
            raise EvaluationError("the quantity has no value at any of"
                                  f" {len(self.tried)} points tried: {self.tried[-1].trouble}")

    @cached_property
    def _witness(self) -> Witness | None:
        found = find_witness(self.analysis, self.quantity, self.hand, self.axes, self.differing)
        if found is None:
            self.require_values()
            found = irrational_rates_witness(self.analysis, self.quantity, self.hand, self.axes)
        return found

    def witness(self) -> Witness | None:
        """Return a point with small numbers at which the two differ, None if none was found."""
        return self._witness

    # -- conditions ----------------------------------------------------------------------------

    def holds_under(self, condition: Condition) -> bool:
        """Return whether the two are proved equal, and not both zero, under a condition."""
        agreed, vanishing = self.agree_on(condition.solved)
        if not agreed:
            return False
        try:
            return self._proved_under(condition.solved, vanishing)
        except EvaluationError:
            return False  # a division by what is zero under the condition
        except (SizeLimitError, UndecidedError) as error:
            if not vanishing and not self.unsettled:
                self.unsettled = (f"; whether they agree under a condition ({condition.describe()})"
                                  f" was not settled: {error}")
            return False

    def agree_on(self, solved: Solved) -> tuple[bool, bool]:
        """Return whether the two agree at points of a condition, and are zero at all of them."""
        compared, vanishing = 0, True
        for values in self._points_on(solved):
            sides = self.at(values)
            if sides.differ:
                return False, False
            if sides.differ is False:
                compared += 1
                vanishing &= sides.derived == ZERO
            if compared == ON_CONDITION:
                break
        return True, vanishing

    def _points_on(self, solved: Solved) -> Iterator[Values]:
        free = tuple(axis for axis in self.axes if axis.name not in solved)
        for root in (1, 2):
            for values in mixed_points(free, MAX_ON_CONDITION // 2, root):
                complete = self._completed(values, solved)
                if complete is not None:
                    yield complete

    def _completed(self, values: dict[str, Expression], solved: Solved) -> Values | None:
        """Return values with those of the symbols a condition was solved for."""
        complete = dict(values)
        try:
            for name, expression in solved.items():
                found = normal_form(substitute(expression, values), NO_SYMBOLS).expression()
                if self.network.symbol(name).positive and certain_sign(found, frozenset()) != 1:
                    return None
                complete[name] = found
        except NO_VALUE:
            return None
        return {entry.name: complete[entry.name] for entry in self.network.symbols}

    def _proved_under(self, solved: Solved, vanishing: bool) -> bool:
        domain = self.analysis.domain
        form = placed(self.derived_form, solved, domain)
        if form is None:
            return False
        derived, by_hand = form.expression, substitute(plain(self.hand_form), dict(solved))
        if vanishing and not nonzero_somewhere(derived) and (
            vanishes_exactly(derived, domain) is not False
        ):
            return False
        return vanishes_exactly(add([derived, negate(by_hand)]), domain) is True


def _stated(question: _Question, relations: Sequence[Relation]) -> Condition | None:
    """Return the condition made of stated relations under which the two are equal."""
    analysis = question.analysis
    for relation in relations:
        condition = condition_of([relation], analysis)
        if question.holds_under(condition):
            return condition
    if len(relations) < 2 or not question.holds_under(condition_of(relations, analysis)):
        return None
    needed = list(relations)
    for relation in relations:
        rest = [other for other in needed if other is not relation]
        if rest and question.holds_under(condition_of(rest, analysis)):
            needed = rest
    return condition_of(needed, analysis)


def _of_forces(question: _Question) -> Condition | None:
    """Return the condition on cycle forces under which the two are equal."""
    found = forces_of(question.analysis)
    if found.all_zero is not None and not question.agree_on(found.all_zero)[0]:
        return None
    for condition in force_conditions(found, question.analysis):
        if question.holds_under(condition):
            return condition
    return None
