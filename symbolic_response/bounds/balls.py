"""A network at one point in rigorous balls: quantities, nested responses, forces, right sides."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

import flint

from symbolic_response.bounds.claim import (
    CycleMaximum,
    EndPair,
    Force,
    LargestForce,
    MixedCycles,
    OneCycle,
    Term,
)
from symbolic_response.bounds.curves import FiniteChange, curve_ball
from symbolic_response.bounds.target import Absolute, Extreme, ShareWithout
from symbolic_response.bounds.topological import competing
from symbolic_response.expressions.derivative import by_symbol
from symbolic_response.expressions.enclosure import ball
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    multiply,
)
from symbolic_response.network.quantities import (
    BySymbol,
    Change,
    Current,
    DirectedRate,
    Mean,
    Perturbation,
    Probability,
    Response,
    Traffic,
)
from symbolic_response.network.raised import with_barrier_raised
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.values import atomic, elementary_weight
from symbolic_response.topology import Cycle, can_run_against, can_run_along

_HELD = "held"
Stack = tuple[Perturbation, ...]


class BallPoint:
    """A network at one point, all values balls at the precision in force.

    Raises ZeroDivisionError where the precision does not suffice to solve W p = 0.
    """

    def __init__(self, analysis: Analysis, values: Mapping[str, Expression]) -> None:
        self.analysis = analysis
        self.network = analysis.network
        self.values = values
        self.symbols = {name: ball(value) for name, value in values.items()}
        self._size = len(self.network.states)
        self._inverse = self._solver()
        unit = flint.arb_mat(self._size, 1)
        unit[self._size - 1, 0] = flint.arb(1)
        self._changes: dict[Stack, flint.arb_mat] = {(): self._inverse * unit}

    # -- rates and the steady state --------------------------------------------------------

    def rate(self, e: int, backward: bool, stack: Stack = ()) -> flint.arb:
        """Return a directed rate, or its derivative by several perturbations."""
        transition = self.network.transitions[e]
        rate = transition.backward if backward else transition.forward
        if rate is None:
            return flint.arb(0)
        source = transition.second if backward else transition.first
        weight = flint.fmpq(1)
        for by in stack:
            if isinstance(by, BySymbol):
                rate = _changed(rate, by)
            else:
                found = elementary_weight(by, e, backward, source) or 0
                weight *= flint.fmpq(found.numerator, found.denominator)
        return ball(rate, self.symbols) * weight if weight != 0 else flint.arb(0)

    def _generator(self, stack: Stack, without: int | None = None) -> flint.arb_mat:
        matrix = flint.arb_mat(self._size, self._size)
        for e, (first, second) in enumerate(self.analysis.graph.ends):
            for source, target, backward in ((first, second, False), (second, first, True)):
                if e != without:
                    rate = self.rate(e, backward, stack)
                    matrix[target, source] += rate
                    matrix[source, source] -= rate
        return matrix

    def _solver(self) -> flint.arb_mat:
        system = self._generator(())
        for column in range(self._size):
            system[self._size - 1, column] = flint.arb(1)
        return system.inv()

    def probabilities(self, stack: Stack) -> flint.arb_mat:
        """Return the mixed derivatives of all probabilities, those themselves for no stack.

        W p_S = - sum over non-empty T in S of W_T p_(S - T).
        """
        if stack not in self._changes:
            right = flint.arb_mat(self._size, 1)
            for part, rest in _parts(stack):
                if part:
                    right -= self._generator(part) * self.probabilities(rest)
            right[self._size - 1, 0] = flint.arb(0)
            self._changes[stack] = self._inverse * right
        return self._changes[stack]

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
            case ShareWithout(e):
                return self._all_trees(e) / self._all_trees(None)
            case Change(inner, e, amount):
                raised = Analysis(with_barrier_raised(self.network, e, amount))
                return BallPoint(raised, self.values).value(inner) - self.value(inner)
        return self._response(node)

    def _response(self, node: Expression) -> flint.arb:
        """Return an atom or a response, nested or not."""
        atom: Expression = node
        stack: Stack = ()
        while isinstance(atom, Response):
            stack, atom = (*stack, atom.perturbation), atom.quantity
        match atom:
            case Probability(states):
                changes = self.probabilities(stack)
                return sum((changes[k, 0] for k in states), flint.arb(0))
            case Mean(place):
                return self._mean(place, stack)
            case DirectedRate(e, backward):
                return self.rate(e, backward, stack)
            case Current(e):
                return self._flow(e, False, stack) - self._flow(e, True, stack)
            case Traffic(e):
                return self._flow(e, False, stack) + self._flow(e, True, stack)
        if not stack:
            raise TypeError(f"no enclosure for {type(node).__name__}")
        return self.value(atomic(node, self.network))

    def _flow(self, e: int, backward: bool, stack: Stack) -> flint.arb:
        source = self.analysis.graph.ends[e][1 if backward else 0]
        return sum((self.rate(e, backward, part) * self.probabilities(rest)[source, 0]
                    for part, rest in _parts(stack)), flint.arb(0))

    def _mean(self, place: int, stack: Stack) -> flint.arb:
        total = flint.arb(0)
        for part, rest in _parts(stack):
            weights = self.probabilities(rest)
            for k, value in enumerate(self.network.observables[place].values):
                changed: Expression | None = value
                for by in part:
                    if isinstance(by, BySymbol) and changed is not None:
                        changed = _changed(changed, by)
                    else:
                        changed = None
                if changed is not None:
                    total += ball(changed, self.symbols) * weights[k, 0]
        return total

    # -- right sides -----------------------------------------------------------------------

    def term(self, term: Term) -> flint.arb:
        """Return one term of a right side."""
        factor = self.value(term.factor)
        if term.force is None:
            return factor
        curve = term.curve
        size = self.value(curve.size) if isinstance(curve, FiniteChange) else None
        return factor * curve_ball(curve, self.force(term.force), size)

    def force(self, force: Force) -> flint.arb | None:
        """Return a force, None for an infinite one."""
        match force:
            case CycleMaximum() | MixedCycles():
                return self._largest_cycle(force)[0]
            case OneCycle(cycle):
                return self._cycle_force(cycle)
            case EndPair(e):
                return self._end_pair(e)

    def cycle_in_force(self, force: LargestForce) -> Cycle | None:
        """Return the cycle that gives a largest force (of equal ones any), None without cycles."""
        return self._largest_cycle(force)[1]

    def _largest_cycle(self, force: LargestForce) -> tuple[flint.arb | None, Cycle | None]:
        largest, middle, winner = flint.arb(0), flint.arb(-1), None
        for cycle in competing(force, self.analysis):
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
        generator = self._generator((), e)
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

    def _all_trees(self, without: int | None) -> flint.arb:
        """Return the sum over all rooted trees, those that use a transition left out."""
        if without is not None and not any(
            self._reached_without(without, root) for root in range(self._size)
        ):
            return flint.arb(0)
        generator = self._generator((), without)
        return sum((self._trees(generator, root) for root in range(self._size)), flint.arb(0))

    def _trees(self, generator: flint.arb_mat, root: int) -> flint.arb:
        kept = [k for k in range(self._size) if k != root]
        entries = [-generator[i, j] for i in kept for j in kept]
        return flint.arb_mat(len(kept), len(kept), entries).det()


def _changed(node: Expression, by: BySymbol) -> Expression:
    changed = by_symbol(node, by.name)
    return multiply([Symbol(by.name), changed]) if by.logarithmic else changed


def _parts(stack: Stack) -> Iterator[tuple[Stack, Stack]]:
    """Yield every part of a stack of perturbations, with the rest of it."""
    for mask in range(2 ** len(stack)):
        chosen = [mask >> place & 1 for place in range(len(stack))]
        yield (tuple(by for by, taken in zip(stack, chosen, strict=True) if taken),
               tuple(by for by, taken in zip(stack, chosen, strict=True) if not taken))
