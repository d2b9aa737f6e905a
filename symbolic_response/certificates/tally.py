"""Exact verdicts of several claims at many points, and the largest ratio of each.

Tallies of neighbouring stretches of points merge into that of both, so work can be cut anywhere
and the outcome stays the same to the last digit.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from symbolic_response.bounds.claim import Claim
from symbolic_response.bounds.decide import Weighted
from symbolic_response.bounds.evaluate import ClaimPoint, Evaluated
from symbolic_response.certificates.sampling import Sampler, Values
from symbolic_response.expressions.tree import Expression
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.values import Point


@dataclass(frozen=True, slots=True)
class Place:
    """A claim at one of the points: both sides there; ``ratio`` None where only the right is 0."""

    point: int
    left: Fraction
    right: tuple[Weighted, ...]
    ratio: Fraction | None


@dataclass(frozen=True, slots=True)
class Tally:
    """A claim at many points: where it holds, its largest ratio, the first failure."""

    holds: int
    worst: Place | None
    failing: Place | None
    undecided: int | None

    def then(self, later: Tally) -> Tally:
        """Return the tally of these points and later ones."""
        worst = self.worst
        if worst is None or (later.worst is not None and _larger(later.worst, worst)):
            worst = later.worst
        return Tally(
            self.holds + later.holds,
            worst,
            later.failing if self.failing is None else self.failing,
            later.undecided if self.undecided is None else self.undecided,
        )


def _larger(place: Place, other: Place) -> bool:
    assert place.ratio is not None and other.ratio is not None
    return place.ratio > other.ratio


EMPTY = Tally(0, None, None, None)


def tally_point(claim: Claim, place: ClaimPoint, index: int) -> Tally:
    """Return the tally of one claim at one point."""
    found = place.evaluate(claim)
    spot = Place(index, found.left, found.right, _ratio(found))
    if found.holds is False:
        return Tally(0, None, spot, None)
    if found.holds is None or spot.ratio is None:
        return Tally(0, None, None, index)
    return Tally(1, spot, None, None)


def _ratio(found: Evaluated) -> Fraction | None:
    try:
        return found.ratio()
    except ZeroDivisionError:
        return None


def tally_points(
    analysis: Analysis,
    claims: Sequence[Claim],
    points: Sequence[Values],
    first: int,
    step: Callable[[], None] = lambda: None,
) -> tuple[Tally, ...]:
    """Return the tally of each claim at points numbered from ``first``; ``step`` after each point.

    Stops after a point at which a claim does not hold.
    """
    tallies = [EMPTY] * len(claims)
    for index, values in enumerate(points, first):
        place = ClaimPoint(analysis, Point(analysis.network, values))
        for which, claim in enumerate(claims):
            tallies[which] = tallies[which].then(tally_point(claim, place, index))
        step()
        if any(tally.failing is not None for tally in tallies):
            break
    return tuple(tallies)


@dataclass(frozen=True, slots=True)
class Stretch:
    """Sample points ``start`` to ``stop`` - 1 of a network and the claims to be tried there."""

    network: Network
    claims: tuple[Claim, ...]
    expressions: tuple[Expression, ...]
    seed: str
    start: int
    stop: int
    cycle_limit: int


@dataclass(frozen=True, slots=True)
class Tried:
    """The points of a stretch, and the tally of each claim there."""

    points: tuple[Values, ...]
    tallies: tuple[Tally, ...]

    def then(self, later: Tried) -> Tried:
        """Return both stretches as one."""
        tallies = tuple(a.then(b) for a, b in zip(self.tallies, later.tallies, strict=True))
        return replace(self, points=self.points + later.points, tallies=tallies)


def try_stretch(
    stretch: Stretch,
    analysis: Analysis | None = None,
    step: Callable[[], None] = lambda: None,
) -> Tried:
    """Draw the points of a stretch and try every claim at each; fit for a process of its own."""
    if analysis is None:
        analysis = Analysis(stretch.network, cycle_limit=stretch.cycle_limit)
    sampler = Sampler(analysis, stretch.seed, stretch.expressions)
    points = tuple(sampler.point(index) for index in range(stretch.start, stretch.stop))
    return Tried(points, tally_points(analysis, stretch.claims, points, stretch.start, step))
