"""Points at which barrier bounds are nearly reached, by construction (Moebius lemma at equality).

Detailed balance everywhere but on one transition e, the force on e alone, so that every cycle
through e has it; then both rates of e are scaled by z = sqrt(a_n a_m/(beta_n beta_m)), with a_k and
beta_k the trees towards k without and with e. Translated into the symbols of the file by linear
algebra on the logarithms of the rates, where those are linear in the logarithms of the symbols.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction

import flint

from symbolic_response.bounds.claim import Claim, CycleMaximum, EndPair, OneCycle
from symbolic_response.certificates.axes import Axis, grid_number
from symbolic_response.certificates.sampling import Sampler, Values
from symbolic_response.expressions.tree import Expression, Number, function, multiply, number
from symbolic_response.network.quantities import BarrierOf, BySymbol, Response
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_trees import rate_changes
from symbolic_response.response.direct import direct_value
from symbolic_response.response.jets import rational_root
from symbolic_response.topology import Cycle, splittings
from symbolic_response.topology.graph import members

BITS = 12
FORCE = Fraction(16)
INNER = Fraction(1 << 16)
MAX_SIDES = 16

Vector = list[flint.fmpq]


@dataclass(frozen=True, slots=True)
class Construction:
    """Points made by construction, or the reason why there are none."""

    points: tuple[Values, ...]
    skipped: str | None = None


def constructed(
    claim: Claim, analysis: Analysis, sampler: Sampler, strength: Fraction = FORCE
) -> Construction:
    """Return points at which a barrier-type claim is nearly an equality.

    ``strength``: exp of the force on the transition.
    """
    e = barrier_of(claim)
    if e is None:
        return Construction((), "the claim is not about one barrier")
    if any(analysis.graph.one_way):
        return Construction((), "forces through one-way transitions are infinite")
    if not any(e in cycle.transitions for cycle in analysis.fundamental_cycles):
        return Construction((), "the transition is a bridge")
    space = _Logarithms(analysis, sampler)
    base = space.balanced()
    force = space.with_forces([_orientation(cycle, e) for cycle in analysis.fundamental_cycles])
    if base is None or force is None:
        return Construction((), "the symbols cannot give every cycle its own force")
    barrier = space.with_rates({e: 1})
    if barrier is None:
        return Construction((), "no symbols scale the two rates of the transition alone")
    points = [space.tight_point(e, base, force, barrier, None, strength)]
    for side in splittings(analysis.graph, e)[:MAX_SIDES]:
        inside = set(members(int(side)))
        inner = {i: 1 for i, (a, b) in enumerate(analysis.graph.ends)
                 if i != e and (a in inside) == (b in inside)}
        stiff = space.with_rates(inner)
        if inner and stiff is not None:
            points.append(space.tight_point(e, base, force, barrier, stiff, strength))
    return Construction(tuple(point for point in points if point is not None))


def barrier_of(claim: Claim) -> int | None:
    """Return the transition of a claim about the response to one barrier with a force."""
    forces = [term.force for term in claim.right if term.force is not None]
    if not isinstance(claim.left, Response) or len(forces) != 1:
        return None
    if not isinstance(forces[0], (CycleMaximum, EndPair, OneCycle)):
        return None
    by = claim.left.perturbation
    return by.transition if isinstance(by, BarrierOf) else None


def _orientation(cycle: Cycle, e: int) -> int:
    if e not in cycle.transitions:
        return 0
    return 1 if cycle.along[cycle.transitions.index(e)] else -1


class _Logarithms:
    """ln of the rates as linear functions of ln of positive symbols and of real symbols."""

    def __init__(self, analysis: Analysis, sampler: Sampler) -> None:
        self.analysis = analysis
        self.sampler = sampler
        self.axes: list[Axis] = []
        columns: list[Vector] = []
        for axis in sampler.axes:
            column = self._column(axis)
            if column is not None:
                self.axes.append(axis)
                columns.append(column)
        self.columns = columns
        self.ones: Values = {axis.name: _from_power(axis, flint.fmpq(1)) for axis in sampler.axes}

    def _column(self, axis: Axis) -> Vector | None:
        """Return the derivatives of ln of all directed rates by a symbol, None if they vary."""
        if axis.kind == "plain":
            return None
        changes = rate_changes(BySymbol(axis.name, axis.kind == "power"), self.analysis)
        column = [flint.fmpq(0)] * len(self.analysis.rates.directions())
        for place, change in changes.items():
            if not isinstance(change, Number):
                return None
            column[place] = flint.fmpq(change.value.numerator, change.value.denominator)
        return column if any(x != 0 for x in column) else None

    def _cycle_rows(self) -> list[Vector]:
        """Return the force of each fundamental cycle as a function of the symbols."""
        rates = self.analysis.rates
        rows = []
        for cycle in self.analysis.fundamental_cycles:
            row = []
            for column in self.columns:
                total = flint.fmpq(0)
                for e, ahead in zip(cycle.transitions, cycle.along, strict=True):
                    back = rates.backward[e]
                    assert back is not None
                    step = column[rates.forward[e]] - column[back]
                    total += step if ahead else -step
                row.append(total)
            rows.append(row)
        return rows

    def with_forces(self, forces: Sequence[int]) -> Vector | None:
        """Return a direction that gives the fundamental cycles these forces."""
        return _solution(self._cycle_rows(), [flint.fmpq(force) for force in forces])

    def with_rates(self, changes: Mapping[int, int]) -> Vector | None:
        """Return a direction that scales both rates of some transitions and no others."""
        rows, right = [], []
        for place, (e, _) in enumerate(self.analysis.rates.directions()):
            rows.append([column[place] for column in self.columns])
            right.append(flint.fmpq(changes.get(e, 0)))
        return _solution(rows, right)

    def balanced(self) -> dict[str, flint.fmpq] | None:
        """Return factors e^x for the symbols such that all cycle forces vanish."""
        factors = {axis.name: flint.fmpq(1) for axis in self.axes}
        if self.sampler.not_positive(self.ones) is not None:
            return None
        for which, cycle in enumerate(self.analysis.fundamental_cycles):
            ratio = flint.fmpq(1)
            for e, ahead in zip(cycle.transitions, cycle.along, strict=True):
                forward, backward = self._pair(e, self.ones)
                ratio *= forward / backward if ahead else backward / forward
            if ratio == 1:
                continue
            unit = [int(k == which) for k in range(len(self.analysis.fundamental_cycles))]
            step = self.with_forces(unit)
            if step is None or any((x / axis.order).q != 1
                                   for x, axis in zip(step, self.axes, strict=True)):
                return None
            for x, axis in zip(step, self.axes, strict=True):
                factors[axis.name] *= ratio ** -int(x.p)
        return factors

    def _pair(self, e: int, values: Values) -> tuple[flint.fmpq, flint.fmpq]:
        transition = self.analysis.network.transitions[e]
        assert transition.backward is not None
        pair = direct_value(transition.forward, values), direct_value(transition.backward, values)
        assert pair[0] is not None and pair[1] is not None
        return pair[0], pair[1]

    def tight_point(
        self,
        e: int,
        base: Mapping[str, flint.fmpq],
        force: Vector,
        barrier: Vector,
        stiff: Vector | None,
        strength: Fraction,
    ) -> Values | None:
        """Return the point with force ln(strength) on e and the best z, inner rates stiff or not.
        """
        factors = self._raised(base, force, strength)
        if stiff is not None:
            factors = self._raised(factors, stiff, INNER)
        values = self._values(factors)
        best = self._best_scale(e, values)
        return None if best is None else self._values(self._raised(factors, barrier, best))

    def _raised(
        self, factors: Mapping[str, flint.fmpq], direction: Vector, size: Fraction
    ) -> dict[str, flint.fmpq]:
        """Return the factors after a step of ln(size), rounded so that all powers are integers."""
        scale = math.lcm(*(int((x / axis.order).q)
                           for x, axis in zip(direction, self.axes, strict=True)))
        root = Fraction(size if scale == 1 else grid_number(_nearest_place(size, scale), BITS))
        whole = flint.fmpq(root.numerator, root.denominator)
        return {
            axis.name: factors[axis.name] * whole ** int((x * scale).p)
            for x, axis in zip(direction, self.axes, strict=True)
        }

    def _values(self, factors: Mapping[str, flint.fmpq]) -> Values:
        return {**self.ones, **{axis.name: _from_power(axis, factors[axis.name])
                                for axis in self.axes}}

    def _best_scale(self, e: int, values: Values) -> Fraction | None:
        """Return z = sqrt(a_n a_m/(beta_n beta_m)) to 12 bits."""
        first, second = self.analysis.graph.ends[e]
        square = flint.fmpq(1)
        for root in (first, second):
            free = self._tree_sum(root, e, values)
            used = self._tree_sum(root, None, values) - free
            if used == 0 or free == 0:
                return None
            square *= free / used
        return grid_number(_nearest_place(Fraction(int(square.p), int(square.q)), 2), BITS)

    def _tree_sum(self, root: int, without: int | None, values: Values) -> flint.fmpq:
        size = self.analysis.graph.size
        matrix = flint.fmpq_mat(size, size)
        for e, (first, second) in enumerate(self.analysis.graph.ends):
            if e != without:
                for tail, head, rate in zip((first, second), (second, first),
                                            self._pair(e, values), strict=True):
                    matrix[tail, tail] += rate
                    matrix[head, tail] -= rate
        kept = [k for k in range(size) if k != root]
        entries = [matrix[i, j] for i in kept for j in kept]
        return flint.fmpq_mat(len(kept), len(kept), entries).det()


def _nearest_place(size: Fraction, root: int) -> int:
    """Return the grid number next to the root of a number, from its floating logarithm."""
    logarithm = (math.log2(size.numerator) - math.log2(size.denominator)) / root
    octave = math.floor(logarithm)
    return (octave << BITS) + round((2 ** (logarithm - octave) - 1) * (1 << BITS))


def _from_power(axis: Axis, factor: flint.fmpq) -> Expression:
    """Return the value of a symbol that is ``factor``, or whose exponential is."""
    if axis.kind != "exponent":
        return number(Fraction(int(factor.p), int(factor.q)))
    root = rational_root(factor, Fraction(1, axis.order))
    assert root is not None
    base = number(Fraction(int(root.p), int(root.q)))
    return multiply([number(axis.order), function("ln", base)])


def _solution(rows: Sequence[Vector], right: Vector) -> Vector | None:
    """Return a solution of a linear system, free unknowns 0; None if there is none."""
    if not rows or not rows[0]:
        return None if any(x != 0 for x in right) else []
    width = len(rows[0])
    reduced, rank = flint.fmpq_mat([[*row, x] for row, x in zip(rows, right, strict=True)]).rref()
    result = [flint.fmpq(0)] * width
    for line in range(rank):
        pivot = next(k for k in range(width + 1) if reduced[line, k] != 0)
        if pivot == width:
            return None
        result[pivot] = reduced[line, width]
    return result
