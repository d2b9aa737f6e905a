"""Both sides of claims in floating point at many points at once: only to choose candidates.

Arrays have one entry a point. Probabilities come from the elimination without subtractions of
Grassmann, Taksar & Heyman (1985), responses from W p' = -W' p.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from functools import reduce

import numpy as np
from numpy.typing import NDArray

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
from symbolic_response.bounds.curves import Curve, FiniteChange, LocalChange, Tanh
from symbolic_response.bounds.target import Absolute, Extreme
from symbolic_response.bounds.topological import competing
from symbolic_response.errors import UndecidedError
from symbolic_response.expressions.derivative import by_symbol
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
    BarrierOf,
    BarriersOf,
    BySymbol,
    Current,
    DirectedRate,
    DriveOf,
    EnergyOf,
    Mean,
    Perturbation,
    Probability,
    Response,
    Traffic,
)
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import Cycle, can_run_against, can_run_along

Floats = NDArray[np.float64]
Dual = tuple[Floats, Floats]
SMALLEST = 1e-4
SMALLEST_SHARE = 1e-7  # of the traffic: smaller currents are noise


class CycleSteps:
    """For each largest force its cycles as a matrix: transitions by cycles, +1, -1 or 0."""

    def __init__(self, analysis: Analysis) -> None:
        self.analysis = analysis
        self._matrices: dict[LargestForce, Floats | None] = {}

    def of(self, force: LargestForce) -> Floats | None:
        """Return the matrix, None where one of the cycles has an infinite force."""
        if force not in self._matrices:
            self._matrices[force] = self._matrix(competing(force, self.analysis))
        return self._matrices[force]

    def _matrix(self, cycles: Sequence[Cycle]) -> Floats | None:
        matrix = np.zeros((len(self.analysis.graph.ends), len(cycles)))
        for which, cycle in enumerate(cycles):
            if not _finite(cycle, self.analysis):
                return None
            for e, ahead in zip(cycle.transitions, cycle.along, strict=True):
                matrix[e, which] = 1 if ahead else -1
        return matrix


def _finite(cycle: Cycle, analysis: Analysis) -> bool:
    return can_run_along(analysis.graph, cycle) and can_run_against(analysis.graph, cycle)


class NumericPoints:
    """A network at many points; ``values``: an array for each symbol (exponents as they stand).

    Raises UndecidedError for quantities it has no arithmetic for.
    """

    def __init__(
        self, cycles: CycleSteps, values: Mapping[str, Floats], count: int
    ) -> None:
        self.cycles = cycles
        self.analysis = analysis = cycles.analysis
        self.values = values
        self.count = count
        self.rates = [
            [self._array(rate) for rate in (t.forward, t.backward)]
            for t in analysis.network.transitions
        ]
        self.usable = reduce(
            np.logical_and,
            [np.isfinite(rate) & (rate > 0) for pair, t in
             zip(self.rates, analysis.network.transitions, strict=True)
             for rate in (pair if t.backward is not None else pair[:1])],
        )
        self._p: Floats | None = None
        self._dp: dict[Perturbation, Floats] = {}

    def ratio(self, claim: Claim) -> Floats:
        """Return left/right of a claim; 0 where it is not trusted or not defined."""
        with np.errstate(all="ignore"):
            left = np.abs(self.value(claim.left))
            right = sum((self._term(term) for term in claim.right), np.zeros(self.count))
            found = left / right
        trusted: Floats = np.where(np.isfinite(found) & self.usable & (right > 0), found, 0.0)
        return trusted

    def _term(self, term: Term) -> Floats:
        factor = self.value(term.factor)
        if term.force is None:
            return factor
        force = self.force(term.force)
        # near balance both sides are noise: such points are left aside
        share = np.where(force > SMALLEST, _curve(term.curve, force), np.nan)
        return np.asarray(factor * share, dtype=np.float64)

    # -- forces ----------------------------------------------------------------------------

    def force(self, force: Force) -> Floats:
        """Return a force."""
        match force:
            case CycleMaximum() | MixedCycles():
                matrix = self.cycles.of(force)
                if matrix is None:
                    return np.full(self.count, np.inf)
                # one-way transitions are on none of these cycles
                steps = np.array([np.log(ahead) - np.log(np.where(back > 0, back, ahead))
                                  for ahead, back in self.rates])
                return np.asarray(np.abs(steps.T @ matrix).max(axis=1, initial=0.0))
            case OneCycle(cycle):
                return self._cycle(cycle)
            case EndPair(e):
                return self._end_pair(e)

    def _cycle(self, cycle: Cycle) -> Floats:
        if not _finite(cycle, self.analysis):
            return np.full(self.count, np.inf)
        total = np.zeros(self.count)
        for e, ahead in zip(cycle.transitions, cycle.along, strict=True):
            step = np.log(self.rates[e][0]) - np.log(self.rates[e][1])
            total = total + step if ahead else total - step
        return np.abs(total)

    def _end_pair(self, e: int) -> Floats:
        generator = self._generator(without=e)
        sides = [rate * self._trees(generator, root)
                 for root, rate in zip(self.analysis.graph.ends[e], self.rates[e], strict=True)]
        return np.asarray(np.abs(np.log(sides[0]) - np.log(sides[1])), dtype=np.float64)

    def _trees(self, generator: Floats, root: int) -> Floats:
        kept = [k for k in range(self.analysis.graph.size) if k != root]
        return np.asarray(np.linalg.det(-generator[:, kept][:, :, kept]), dtype=np.float64)

    # -- the steady state ------------------------------------------------------------------

    def _generator(self, without: int = -1, change: Perturbation | None = None) -> Floats:
        size = self.analysis.graph.size
        generator = np.zeros((self.count, size, size))
        for e, (first, second) in enumerate(self.analysis.graph.ends):
            if e == without:
                continue
            for tail, head, backward in ((first, second, False), (second, first, True)):
                rate = (self.rates[e][backward] if change is None
                        else self._rate_change(e, backward, change))
                generator[:, head, tail] += rate
                generator[:, tail, tail] -= rate
        return generator

    def probabilities(self) -> Floats:
        """Return all probabilities: an array of points by states."""
        if self._p is None:
            size = self.analysis.graph.size
            flow = self._generator().transpose(0, 2, 1).copy()
            for k in range(size - 1, 0, -1):
                flow[:, :k, k] /= flow[:, k, :k].sum(axis=1)[:, None]
                flow[:, :k, :k] += flow[:, :k, k, None] * flow[:, k, None, :k]
            p = np.ones((self.count, size))
            for k in range(1, size):
                p[:, k] = (p[:, :k] * flow[:, :k, k]).sum(axis=1)
            self._p = p / p.sum(axis=1)[:, None]
        return self._p

    def changes(self, by: Perturbation) -> Floats:
        """Return the derivatives of all probabilities: an array of points by states."""
        if by not in self._dp:
            p = self.probabilities()
            flows = self._generator() * p[:, None, :]
            right = -(self._generator(change=by) @ p[:, :, None])
            scale = -np.einsum("nii->ni", flows)
            flows, right = flows / scale[:, :, None], right / scale[:, :, None]
            flows[:, -1, :], right[:, -1] = p, 0.0
            bad = ~(np.isfinite(flows).all(axis=(1, 2)) & np.isfinite(right).all(axis=(1, 2)))
            flows[bad], right[bad] = np.eye(self.analysis.graph.size), np.nan
            try:
                self._dp[by] = np.linalg.solve(flows, right)[:, :, 0] * p
            except np.linalg.LinAlgError:
                self._dp[by] = np.full_like(p, np.nan)
        return self._dp[by]

    def _rate_change(self, e: int, backward: bool, by: Perturbation) -> Floats:
        transition, rate = self.analysis.network.transitions[e], self.rates[e][backward]
        source = transition.second if backward else transition.first
        match by:
            case EnergyOf(state):
                return rate * float(state == source)
            case BarrierOf(which):
                return -rate * float(which == e)
            case BarriersOf(several):
                return -rate * float(e in several)
            case DriveOf(which):
                return rate * (0.5 - backward) * float(which == e)
            case BySymbol():
                formula = transition.backward if backward else transition.forward
                return np.zeros(self.count) if formula is None else self._slope(formula, by)
        raise UndecidedError("no arithmetic for this perturbation")

    def _slope(self, formula: Expression, by: BySymbol) -> Floats:
        changed = by_symbol(formula, by.name)
        return self._array(multiply([Symbol(by.name), changed]) if by.logarithmic else changed)

    # -- quantities ------------------------------------------------------------------------

    def _array(self, formula: Expression | None) -> Floats:
        if formula is None:
            return np.zeros(self.count)
        return self.value(formula)

    def value(self, node: Expression) -> Floats:
        """Return the values of a quantity; maxima, absolute values and responses included."""
        with np.errstate(all="ignore"):
            return self._dual(node, None)[0]

    def _dual(self, node: Expression, by: Perturbation | None) -> Dual:
        """Return the values of a quantity and their derivatives by a perturbation."""
        zero = np.zeros(self.count)
        match node:
            case Number(value):
                return np.full(self.count, float(value)), zero
            case Symbol(name):
                slope = zero
                if isinstance(by, BySymbol) and by.name == name:
                    slope = self.values[name] if by.logarithmic else zero + 1
                return self.values[name], slope
            case Sum(terms):
                pairs = [self._dual(term, by) for term in terms]
                return sum((a for a, _ in pairs), zero), sum((b for _, b in pairs), zero)
            case Product(factors):
                return reduce(_product, (self._dual(factor, by) for factor in factors))
            case Power(base, exponent):
                x, dx = self._dual(base, by)
                n = float(exponent)
                return x**n, n * x ** (n - 1) * dx
            case Function("exp", argument):
                x, dx = self._dual(argument, by)
                return np.exp(x), np.exp(x) * dx
            case Function(_, argument):
                x, dx = self._dual(argument, by)
                return np.log(x), dx / x
            case Extreme(name, parts):
                choose = np.maximum if name == "max" else np.minimum
                return reduce(choose, [self._dual(part, by)[0] for part in parts]), zero
            case Absolute(inner):
                return np.abs(self._dual(inner, by)[0]), zero
            case Response(inner, perturbation) if by is None:
                return self._dual(inner, perturbation)[1], zero
        return self._atom(node, by)

    def _atom(self, node: Expression, by: Perturbation | None) -> Dual:
        match node:
            case DirectedRate(e, backward):
                return self._rate(e, backward, by)
            case Probability(states):
                chosen = list(states)
                p, dp = self._steady(by)
                return p[:, chosen].sum(axis=1), dp[:, chosen].sum(axis=1)
            case Mean(place):
                values = self.analysis.network.observables[place].values
                pairs = [_product(self._dual(value, by), self._state(k, by))
                         for k, value in enumerate(values)]
                zero = np.zeros(self.count)
                return sum((a for a, _ in pairs), zero), sum((b for _, b in pairs), zero)
            case Current(e):
                found, slope = self._flow(e, -1, by)
                trusted = np.abs(found) > SMALLEST_SHARE * self._flow(e, 1, by)[0]
                return np.where(trusted, found, np.nan), np.where(trusted, slope, np.nan)
            case Traffic(e):
                return self._flow(e, 1, by)
        raise UndecidedError(f"no arithmetic for {type(node).__name__}")

    def _steady(self, by: Perturbation | None) -> tuple[Floats, Floats]:
        p = self.probabilities()
        return p, (np.zeros_like(p) if by is None else self.changes(by))

    def _state(self, k: int, by: Perturbation | None) -> Dual:
        p, dp = self._steady(by)
        return p[:, k], dp[:, k]

    def _rate(self, e: int, backward: bool, by: Perturbation | None) -> Dual:
        slope = np.zeros(self.count) if by is None else self._rate_change(e, backward, by)
        return self.rates[e][backward], slope

    def _flow(self, e: int, sign: int, by: Perturbation | None) -> Dual:
        transition = self.analysis.network.transitions[e]
        ahead = _product(self._rate(e, False, by), self._state(transition.first, by))
        back = _product(self._rate(e, True, by), self._state(transition.second, by))
        return ahead[0] + sign * back[0], ahead[1] + sign * back[1]


def _curve(curve: Curve, force: Floats) -> Floats:
    match curve:
        case Tanh(divisor):
            return np.tanh(force / divisor)
        case LocalChange():
            u, v = float(curve.larger), float(curve.smaller)
            ratio = np.exp(force)
            above = np.maximum(np.sqrt(v * ratio) - np.sqrt(u), 0)
            found = np.where(np.isinf(ratio), u, u - v + above**2 / (ratio - 1))
            return np.asarray(found, dtype=np.float64)
        case FiniteChange():
            raise UndecidedError("no arithmetic for a finite change")


def _product(a: Dual, b: Dual) -> Dual:
    return a[0] * b[0], a[0] * b[1] + a[1] * b[0]
