"""Both sides of a claim at a point where they are irrational: rigorous balls, and the verdict."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from decimal import MAX_EMAX, MIN_EMIN, ROUND_CEILING, ROUND_FLOOR, Context, Decimal

import flint

from symbolic_response.bounds.claim import Claim, CycleMaximum, EndPair, Force, OneCycle, Term
from symbolic_response.bounds.target import Absolute, Extreme
from symbolic_response.bounds.topological import cycles_through
from symbolic_response.expressions.derivative import by_symbol
from symbolic_response.expressions.enclosure import ball
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    add,
    multiply,
    negate,
    rebuild,
)
from symbolic_response.network.quantities import (
    BySymbol,
    DirectedRate,
    Mean,
    Perturbation,
    Probability,
    Response,
)
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_form import closed_form
from symbolic_response.response.deriving import arb_fraction
from symbolic_response.response.values import atomic, elementary_weight
from symbolic_response.topology import Cycle, can_run_against, can_run_along

PRECISIONS = (128, 256, 512, 1024, 2048, 4096)
_ACCURACY_BITS = 72  # relative width of what is shown: at most 1e-20
_SHOWN_DIGITS = 25
_HELD = "held"

Enclosure = tuple[str, str]


@dataclass(frozen=True, slots=True)
class Enclosed:
    """A claim at a point: decimals that enclose both sides, whether it holds (None: undecided)."""

    left: Enclosure | None
    right: Enclosure | None
    holds: bool | None


def enclose(claim: Claim, analysis: Analysis, values: Mapping[str, Expression]) -> Enclosed:
    """Return enclosures of both sides of a claim and the verdict they allow, at up to 4096 bits."""
    verdict: bool | None = None
    shown: tuple[Enclosure | None, Enclosure | None] = (None, None)
    for bits in PRECISIONS:
        with flint.ctx.workprec(bits):
            try:
                place = BallPoint(analysis, values)
                left = abs(place.value(claim.left))
                right = sum((place.term(term) for term in claim.right), flint.arb(0))
            except ZeroDivisionError:  # a matrix not known to be regular at this precision
                continue
            shown = (decimals(left), decimals(right))
            if left > right or (claim.equality and left < right):
                verdict = False
            elif left == right or (not claim.equality and left <= right):
                verdict = True
            if verdict is not None and _accurate(left) and _accurate(right):
                return Enclosed(*shown, verdict)
    if verdict is None and claim.equality and _identical(claim, analysis):
        verdict = True
    return Enclosed(*shown, verdict)


def _accurate(value: flint.arb) -> bool:
    return bool(value == 0) or value.rel_accuracy_bits() >= _ACCURACY_BITS


def _identical(claim: Claim, analysis: Analysis) -> bool:
    """Return whether the two sides are the same up to sign for all rates, by closed forms."""

    def without_bars(leaf: Expression) -> Expression:
        return rebuild(leaf.inner, without_bars) if isinstance(leaf, Absolute) else leaf

    right = rebuild(add([term.factor for term in claim.right]), without_bars)
    return any(
        closed_form(add([claim.left, side]), analysis).expression == ZERO
        for side in (right, negate(right))
    )


def decimals(value: flint.arb) -> Enclosure | None:
    """Return decimals that enclose a ball, rounded outwards; None for an infinite one."""
    if not value.is_finite():
        return None
    low, high = (
        _decimal(end, rounding)
        for end, rounding in ((value.lower(), ROUND_FLOOR), (value.upper(), ROUND_CEILING))
    )
    return low, high


def _decimal(end: flint.arb, rounding: str) -> str:
    exact = arb_fraction(end)
    context = Context(prec=_SHOWN_DIGITS, rounding=rounding, Emin=MIN_EMIN, Emax=MAX_EMAX)
    return str(context.divide(Decimal(exact.numerator), Decimal(exact.denominator))).replace(
        "E", "e"
    )


class BallPoint:
    """A network at one point, all values balls at the precision in force.

    Raises ZeroDivisionError where the precision does not suffice to solve W p = 0.
    """

    def __init__(self, analysis: Analysis, values: Mapping[str, Expression]) -> None:
        self.analysis = analysis
        self.network = analysis.network
        self.symbols = {name: ball(value) for name, value in values.items()}
        self._size = len(self.network.states)
        self._inverse = self._solver()
        unit = flint.arb_mat(self._size, 1)
        unit[self._size - 1, 0] = flint.arb(1)
        self._probabilities = self._inverse * unit
        self._responses: dict[Perturbation, flint.arb_mat] = {}

    # -- rates and the steady state --------------------------------------------------------

    def rate(self, e: int, backward: bool, by: Perturbation | None = None) -> flint.arb:
        """Return a directed rate, or its derivative."""
        transition = self.network.transitions[e]
        rate = transition.backward if backward else transition.forward
        if rate is None:
            return flint.arb(0)
        if by is None or isinstance(by, BySymbol):
            return ball(rate if by is None else _changed(rate, by), self.symbols)
        source = transition.second if backward else transition.first
        weight = elementary_weight(by, e, backward, source) or 0
        return ball(rate, self.symbols) * weight.numerator / weight.denominator

    def _generator(self, by: Perturbation | None, without: int | None = None) -> flint.arb_mat:
        matrix = flint.arb_mat(self._size, self._size)
        for e, (first, second) in enumerate(self.analysis.graph.ends):
            for source, target, backward in ((first, second, False), (second, first, True)):
                if e != without:
                    rate = self.rate(e, backward, by)
                    matrix[target, source] += rate
                    matrix[source, source] -= rate
        return matrix

    def _solver(self) -> flint.arb_mat:
        system = self._generator(None)
        for column in range(self._size):
            system[self._size - 1, column] = flint.arb(1)
        return system.inv()

    def _response(self, by: Perturbation) -> flint.arb_mat:
        if by not in self._responses:
            right = self._generator(by) * self._probabilities * flint.arb(-1)
            right[self._size - 1, 0] = flint.arb(0)
            self._responses[by] = self._inverse * right
        return self._responses[by]

    # -- quantities ------------------------------------------------------------------------

    def value(self, node: Expression) -> flint.arb:
        """Return a quantity in which responses, maxima and absolute values may occur."""
        match node:
            case Extreme(name, parts):
                result, *rest = (self.value(part) for part in parts)
                for other in rest:
                    result = result.max(other) if name == "max" else result.min(other)
                return result
            case Absolute(inner):
                return abs(self.value(inner))
            case Sum(terms):
                return sum((self.value(term) for term in terms), flint.arb(0))
            case Product(factors):
                result = flint.arb(1)
                for factor in factors:
                    result *= self.value(factor)
                return result
            case Power(base, exponent):
                return ball(Power(Symbol(_HELD), exponent), {_HELD: self.value(base)})
            case Function(name, argument):
                return ball(Function(name, Symbol(_HELD)), {_HELD: self.value(argument)})
            case Number() | Symbol():
                return ball(node, self.symbols)
            case DirectedRate(e, backward):
                return self.rate(e, backward)
            case Probability(states):
                return sum((self._probabilities[k, 0] for k in states), flint.arb(0))
            case Mean(place):
                return self._mean(place, None)
            case Response(inner, by):
                return self._response_value(node, inner, by)
        raise TypeError(f"no enclosure for {type(node).__name__}")

    def _response_value(
        self, node: Expression, inner: Expression, by: Perturbation
    ) -> flint.arb:
        match inner:
            case Probability(states):
                changes = self._response(by)
                return sum((changes[k, 0] for k in states), flint.arb(0))
            case Mean(place):
                return self._mean(place, by)
        return self.value(atomic(node, self.network))

    def _mean(self, place: int, by: Perturbation | None) -> flint.arb:
        weights = self._probabilities if by is None else self._response(by)
        total = flint.arb(0)
        for k, value in enumerate(self.network.observables[place].values):
            total += ball(value, self.symbols) * weights[k, 0]
            if isinstance(by, BySymbol):
                total += ball(_changed(value, by), self.symbols) * self._probabilities[k, 0]
        return total

    # -- forces ----------------------------------------------------------------------------

    def term(self, term: Term) -> flint.arb:
        """Return one term of a right side."""
        factor = self.value(term.factor)
        force = None if term.force is None else self.force(term.force)
        return factor if force is None else factor * (force / term.divisor).tanh()

    def force(self, force: Force) -> flint.arb | None:
        """Return a force, None for an infinite one."""
        match force:
            case CycleMaximum(e):
                return self._largest_cycle(e)[0]
            case OneCycle(cycle):
                return self._cycle_force(cycle)
            case EndPair(e):
                return self._end_pair(e)

    def cycle_in_force(self, transition: int) -> Cycle | None:
        """Return the cycle that gives F_max (of equal ones any), None for a bridge."""
        return self._largest_cycle(transition)[1]

    def _largest_cycle(self, e: int) -> tuple[flint.arb | None, Cycle | None]:
        largest, middle, winner = flint.arb(0), flint.arb(-1), None
        for cycle in cycles_through(e, self.analysis):
            size = self._cycle_force(cycle)
            if size is None:
                return None, cycle
            largest = size.max(largest)
            if size.mid() > middle:
                middle, winner = size.mid(), cycle
        return largest, winner

    def _cycle_force(self, cycle: Cycle) -> flint.arb | None:
        graph = self.analysis.graph
        if not (can_run_along(graph, cycle) and can_run_against(graph, cycle)):
            return None
        ratio = flint.arb(1)
        for e, ahead in zip(cycle.transitions, cycle.along, strict=True):
            ratio *= self.rate(e, not ahead) / self.rate(e, ahead)
        return abs(ratio.log())

    def _end_pair(self, e: int) -> flint.arb | None:
        first, second = self.analysis.graph.ends[e]
        exists = [self._reached_without(e, root) for root in (first, second)]
        if self.analysis.graph.one_way[e]:
            exists[1] = False
        if not any(exists):
            return flint.arb(0)
        if not all(exists):
            return None
        generator = self._generator(None, e)
        above = self.rate(e, False) * self._trees(generator, first)
        below = self.rate(e, True) * self._trees(generator, second)
        return abs((above / below).log())

    def _reached_without(self, e: int, root: int) -> bool:
        """Return whether there are trees towards ``root`` that do not use a transition."""
        graph, reached = self.analysis.graph, {root}
        for _ in range(self._size):
            for other, (first, second) in enumerate(graph.ends):
                if other == e:
                    continue
                if second in reached:
                    reached.add(first)
                if first in reached and not graph.one_way[other]:
                    reached.add(second)
        return len(reached) == self._size

    def _trees(self, generator: flint.arb_mat, root: int) -> flint.arb:
        kept = [k for k in range(self._size) if k != root]
        entries = [-generator[i, j] for i in kept for j in kept]
        return flint.arb_mat(len(kept), len(kept), entries).det()


def _changed(node: Expression, by: BySymbol) -> Expression:
    changed = by_symbol(node, by.name)
    return multiply([Symbol(by.name), changed]) if by.logarithmic else changed
