"""Both sides of a claim at an exact point, and the verdict."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import flint

from symbolic_response.bounds.claim import (
    Claim,
    CycleMaximum,
    EndPair,
    Force,
    LargestForce,
    MixedCycles,
    OneCycle,
    Term,
)
from symbolic_response.bounds.curves import FiniteChange, weighted
from symbolic_response.bounds.decide import Weighted, change_holds, holds, right_bounds
from symbolic_response.bounds.target import Absolute, Extreme, ShareWithout
from symbolic_response.bounds.topological import competing
from symbolic_response.errors import EvaluationError
from symbolic_response.expressions.tree import Expression, Number, Power, Product, Sum, function
from symbolic_response.network.quantities import Change
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.direct import direct_value
from symbolic_response.response.values import Point
from symbolic_response.topology import Cycle, can_run_against, can_run_along


class IrrationalError(EvaluationError):
    """A side of a claim is not rational at the point."""

    def __init__(self) -> None:
        super().__init__(
            "a side of the inequality is not rational at this point; give energies, barriers and"
            " drives as 2*ln(fraction), so that every rate is rational"
        )


@dataclass(frozen=True, slots=True)
class Evaluated:
    """A claim at a point: |left|, the terms of the right side, whether it holds."""

    left: Fraction
    right: tuple[Weighted, ...]
    holds: bool | None

    def right_value(self) -> Fraction | None:
        """Return the right side if it is rational."""
        low, high = right_bounds(self.right)
        return low if low == high else None

    def ratio(self) -> Fraction:
        """Return left over right, the right side by its lower bound to 128 bits; 0 if left is 0.

        Raises ZeroDivisionError where only the right side vanishes.
        """
        return self.left / right_bounds(self.right)[0] if self.left else Fraction(0)


class ClaimPoint:
    """A network at one exact point; what several claims share is computed once."""

    def __init__(self, analysis: Analysis, point: Point) -> None:
        self.analysis = analysis
        self.point = point
        self._forces: dict[Force, Fraction | None] = {}
        self._values: dict[Expression, Fraction] = {}
        self._rates: dict[tuple[int, bool], Fraction] = {}

    def evaluate(self, claim: Claim) -> Evaluated:
        """Return both sides of a claim and the exact verdict.

        Raises IrrationalError where a side is not rational at the point.
        """
        left = abs(self.value(claim.left))
        right = tuple(part for term in claim.right for part in self._weighted(term))
        if claim.equality:
            return Evaluated(left, right, left == sum((w.factor for w in right), Fraction(0)))
        return Evaluated(left, right, holds(left, right))

    def _weighted(self, term: Term) -> list[Weighted]:
        factor = self.value(term.factor)
        if term.force is None:
            return [Weighted(factor)]
        if isinstance(term.curve, FiniteChange):
            raise IrrationalError
        return weighted(term.curve, factor, self.force(term.force))

    def change_verdict(self, claim: Claim) -> bool | None:
        """Return the exact verdict on a claim about a finite change of a logarithm.

        None where a ratio, the factor of the rates or a force is not rational.
        """
        (term,), change = claim.right, claim.left
        assert term.force is not None and isinstance(change, Change)
        left = self.point.expression(change)
        if left is None:
            return None
        ratio = direct_value(function("exp", left), {})
        factor = direct_value(function("exp", change.amount), self.point.values)
        if ratio is None or factor is None:
            return None
        try:
            g = self.force(term.force)
        except IrrationalError:
            return None
        exact = [Fraction(int(x.p), int(x.q)) for x in (ratio, factor)]
        return change_holds(exact[0], exact[1], g)

    def value(self, node: Expression) -> Fraction:
        """Return the value of a quantity in which maxima and absolute values may occur."""
        if isinstance(node, (Sum, Product, Power, Absolute, Number)):
            return self._value(node)  # quicker than to look it up
        if node not in self._values:
            self._values[node] = self._value(node)
        return self._values[node]

    def _value(self, node: Expression) -> Fraction:
        match node:
            case Number(value):
                return value
            case Extreme(name, parts):
                values = [self.value(part) for part in parts]
                return max(values) if name == "max" else min(values)
            case Absolute(inner):
                return abs(self.value(inner))
            case Sum(terms):
                return sum((self.value(term) for term in terms), Fraction(0))
            case Product(factors):
                result = Fraction(1)
                for factor in factors:
                    result *= self.value(factor)
                return result
            case ShareWithout(e):
                return self._all_trees(e) / self._all_trees(None)
            case Power(base, exponent) if exponent.denominator == 1:
                inner_value = self.value(base)
                if inner_value == 0 and exponent < 0:
                    raise EvaluationError("division by zero")
                return inner_value**exponent.numerator
        exact = self.point.value(node)
        if exact is None:
            raise IrrationalError
        return exact

    # -- forces ----------------------------------------------------------------------------

    def force(self, force: Force) -> Fraction | None:
        """Return g = exp(force) >= 1, None for an infinite force."""
        if force not in self._forces:
            self._forces[force] = self._force(force)
        return self._forces[force]

    def _force(self, force: Force) -> Fraction | None:
        match force:
            case CycleMaximum() | MixedCycles():
                return self._largest_cycle(force)[0]
            case OneCycle(cycle):
                g = self.cycle_ratio(cycle)
                return None if g is None else max(g, 1 / g)
            case EndPair(e):
                return self._end_pair(e)

    def cycle_in_force(self, force: LargestForce) -> Cycle | None:
        """Return the cycle that gives a largest force, None where there are no cycles."""
        return self._largest_cycle(force)[1]

    def _largest_cycle(self, force: LargestForce) -> tuple[Fraction | None, Cycle | None]:
        largest, winner = Fraction(1), None
        for cycle in competing(force, self.analysis):
            g = self.cycle_ratio(cycle)
            if g is None:
                return None, cycle
            size = max(g, 1 / g)
            if winner is None or size > largest:
                largest, winner = size, cycle
        return largest, winner

    def cycle_ratio(self, cycle: Cycle) -> Fraction | None:
        """Return exp(force) of a cycle along its orientation, None where it is infinite."""
        graph = self.analysis.graph
        if not (can_run_along(graph, cycle) and can_run_against(graph, cycle)):
            return None
        ratio = Fraction(1)
        for e, ahead in zip(cycle.transitions, cycle.along, strict=True):
            ratio *= self.rate(e, not ahead) / self.rate(e, ahead)
        return ratio

    def rate(self, transition: int, backward: bool) -> Fraction:
        """Return a directed rate."""
        key = (transition, backward)
        if key not in self._rates:
            try:
                self._rates[key] = self.point.rate(transition, backward)
            except EvaluationError:
                raise IrrationalError from None
        return self._rates[key]

    def _end_pair(self, e: int) -> Fraction | None:
        """Return max(r, 1/r) with r = w+ a_m/(w- a_n), None where it is infinite."""
        first, second = self.analysis.graph.ends[e]
        above = self.rate(e, False) * self._trees_without(e, first)
        below = self.rate(e, True) * self._trees_without(e, second)
        if above == below:
            return Fraction(1)  # a bridge has neither
        if above == 0 or below == 0:
            return None
        return max(above / below, below / above)

    def _all_trees(self, without: int | None) -> Fraction:
        """Return the sum over all rooted trees, those that use a transition left out."""
        roots = range(self.analysis.graph.size)
        return sum((self._trees_without(without, root) for root in roots), Fraction(0))

    def _trees_without(self, without: int | None, root: int) -> Fraction:
        """Return the sum over trees towards ``root`` that do not use a transition, by a minor."""
        size = self.analysis.graph.size
        matrix = [[Fraction(0)] * size for _ in range(size)]
        for e, (first, second) in enumerate(self.analysis.graph.ends):
            if e == without:
                continue
            for tail, head, backward in ((first, second, False), (second, first, True)):
                rate = self.rate(e, backward)
                matrix[tail][tail] += rate
                matrix[head][tail] -= rate
        kept = [k for k in range(size) if k != root]
        entries = [flint.fmpq(matrix[i][j].numerator, matrix[i][j].denominator)
                   for i in kept for j in kept]
        value = flint.fmpq_mat(len(kept), len(kept), entries).det()
        return Fraction(int(value.p), int(value.q))
