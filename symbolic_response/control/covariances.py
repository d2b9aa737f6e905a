"""A finer limit on the response of one observable at a point, piece by piece."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.bounds.evaluate import IrrationalError
from symbolic_response.control.at_points import Limit, Place
from symbolic_response.control.decomposition import Piece
from symbolic_response.expressions.tree import Expression, Number
from symbolic_response.network.quantities import Probability
from symbolic_response.topology import splittings
from symbolic_response.topology.graph import members


@dataclass(frozen=True, slots=True)
class ObservableLimits:
    """Two limits on |d<Q>/d x| at a point.

    ``range`` is H (<Q> - low)(high - <Q>)/(high - low), low and high the extremes of Q.
    ``covariance`` replaces what it can by covariances; it is never above ``range``.
    """

    range: Fraction
    covariance: Fraction


def observable_limits(
    place: Place, limit: Limit, observable: Sequence[Fraction]
) -> ObservableLimits:
    """Return both limits for an observable that does not depend on x, one value for each state.

    With the pieces of the limit: energies a give exactly |Cov(Q, a)|; a single transition e gives
    |b| tanh(F_max(e)/4), a drive |f| (one-way: half), a single rate |c|, each times the largest
    |Cov(Q, 1_S)| over the splittings S of e; Fernandes Martins & Horowitz, Phys. Rev. E 108, 044113
    (2023). Larger bundles and sets of rates count by the range. Raises IrrationalError where a
    probability is not rational.
    """
    given = _Given(place, tuple(observable))
    pieces, graph = limit.decomposition, place.analysis.graph
    rates = place.analysis.rates.directions()
    t = {part: high for part, (_, high) in limit.t}
    fine = abs(given.covariance([_size(energy) for energy in pieces.energies]))
    for piece in pieces.bundles:
        only = piece.members[0] if len(piece.members) == 1 else None
        fine += abs(_value(piece)) * t[piece.members] * given.spread(only)
    for piece in pieces.drives:
        e = piece.members[0]
        fine += abs(_value(piece)) / (2 if graph.one_way[e] else 1) * given.spread(e)
    for piece in pieces.directed:
        only = rates[piece.members[0]][0] if len(piece.members) == 1 else None
        fine += abs(_value(piece)) * given.spread(only)
    coarse = limit.high * given.spread(None)
    return ObservableLimits(coarse, min(fine + limit.error * given.spread(None), coarse))


def _value(piece: Piece) -> Fraction:
    return _size(piece.amount)


def _size(amount: Expression) -> Fraction:
    assert isinstance(amount, Number)  # the pieces of a limit at a point are numbers
    return amount.value


class _Given:
    """An observable and the probabilities at a point."""

    def __init__(self, place: Place, observable: tuple[Fraction, ...]) -> None:
        self.graph = place.analysis.graph
        self.observable = observable
        self.p: list[Fraction] = []
        for k in range(self.graph.size):
            low, high = place.number(Probability((k,)))
            if low != high:
                raise IrrationalError
            self.p.append(low)
        self.mean = sum((p * q for p, q in zip(self.p, observable, strict=True)), Fraction(0))
        self._spreads: dict[int | None, Fraction] = {}

    def covariance(self, other: Sequence[Fraction]) -> Fraction:
        """Return Cov(Q, other)."""
        return sum((p * (q - self.mean) * x
                    for p, q, x in zip(self.p, self.observable, other, strict=True)), Fraction(0))

    def spread(self, transition: int | None) -> Fraction:
        """Return the largest |Cov(Q, 1_S)| over splittings; for no transition the range form."""
        if transition not in self._spreads:
            self._spreads[transition] = self._spread(transition)
        return self._spreads[transition]

    def _spread(self, transition: int | None) -> Fraction:
        if transition is None:
            low, high = min(self.observable), max(self.observable)
            if low == high:
                return Fraction(0)
            return (self.mean - low) * (high - self.mean) / (high - low)
        part = [p * (q - self.mean) for p, q in zip(self.p, self.observable, strict=True)]
        return max((abs(sum((part[k] for k in members(int(mask))), Fraction(0)))
                    for mask in splittings(self.graph, transition)), default=Fraction(0))
