"""Search for points at which left/right of a claim is as large as can be.

Starts: the tight points by construction, the largest ratio among the samples, random places. From
there steps on the grid of the symbols, one or a few symbols at a time, the steps halved down to a
grid of 12 bits. Floating point chooses the candidates; what counts is evaluated exactly.
"""

from __future__ import annotations

import hashlib
import math
import random
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from symbolic_response.bounds.claim import Claim
from symbolic_response.bounds.evaluate import ClaimPoint
from symbolic_response.certificates.axes import PLAIN_BITS, Axis
from symbolic_response.certificates.construct import constructed
from symbolic_response.certificates.numeric import CycleSteps, NumericPoints
from symbolic_response.certificates.sampling import Sampler, Values
from symbolic_response.certificates.tally import Place, Stretch, tally_point
from symbolic_response.errors import EvaluationError, UndecidedError
from symbolic_response.expressions.tree import Expression, Function, Number, Product
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.values import Point

BITS = 12
FIRST_STEP = 4 << BITS
RANDOM_STARTS = 512
CLIMBERS = 6
MAX_ROUNDS = 150
NEAR_ONE = 1 - 1e-10
CLEARLY_ABOVE = 1 + 1e-6
MAX_CYCLES = 3000

Places = NDArray[np.int64]
Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Found:
    """What a search found for one claim: its best point, or a point at which the claim fails.

    ``skipped``: why there are no points by construction, or why nothing was searched.
    """

    best: Values | None
    place: Place | None
    failing: Place | None
    skipped: str | None


def search(
    claim: Claim, analysis: Analysis, sampler: Sampler, starts: Sequence[Values] = ()
) -> Found:
    """Return the point of largest ratio that the search reaches, judged exactly.

    The same for the same claim, seed and starts. ``starts``: points to begin with.
    """
    if claim.equality:
        return Found(None, None, None, "an equality has no ratio to push up")
    made = constructed(claim, analysis, sampler)
    candidates: list[Values] = [*made.points, *starts]
    try:
        candidates += _Climb(claim, analysis, sampler).tops(candidates)
    except UndecidedError as error:
        return _judge(claim, analysis, sampler, candidates, str(error))
    return _judge(claim, analysis, sampler, candidates, made.skipped)


def search_stretch(stretch: Stretch, starts: Sequence[Values]) -> Found:
    """Search for the only claim of a stretch; fit for a process of its own."""
    analysis = Analysis(stretch.network, cycle_limit=stretch.cycle_limit)
    sampler = Sampler(analysis, stretch.seed, stretch.expressions)
    return search(stretch.claims[0], analysis, sampler, starts)


def _judge(
    claim: Claim,
    analysis: Analysis,
    sampler: Sampler,
    candidates: Sequence[Values],
    skipped: str | None,
) -> Found:
    """Evaluate candidates exactly; the best of them, or the first at which the claim fails."""
    best: Values | None = None
    top: Place | None = None
    for values in candidates:
        try:
            if sampler.not_positive(values) is not None:
                continue
            tally = tally_point(claim, ClaimPoint(analysis, Point(analysis.network, values)), 0)
        except EvaluationError:
            continue
        if tally.failing is not None:
            return Found(values, None, tally.failing, skipped)
        worst = tally.worst
        if worst is not None and (top is None or (worst.ratio or 0) > (top.ratio or 0)):
            best, top = values, worst
    return Found(best, top, None, skipped)


class _Climb:
    """Steps on the grid from several starts at once."""

    def __init__(self, claim: Claim, analysis: Analysis, sampler: Sampler) -> None:
        self.claim = claim
        self.analysis = analysis
        self.sampler = sampler
        self.cycles = CycleSteps(analysis)
        digest = hashlib.sha256(f"search {claim.name} {sampler.seed}".encode()).digest()
        self.random = random.Random(int.from_bytes(digest, "big"))
        limits = [axis.limits(BITS) for axis in sampler.axes]
        self.low = np.array([low for low, _ in limits], dtype=np.int64)
        self.high = np.array([high for _, high in limits], dtype=np.int64)

    def tops(self, starts: Sequence[Values]) -> list[Values]:
        """Return the points reached, best first; none where the left side vanishes everywhere."""
        if not self.sampler.axes:
            return []
        if any(True for term in self.claim.right if term.force is not None) and (
            len(self.analysis.cycles) > MAX_CYCLES
        ):
            raise UndecidedError(f"more than {MAX_CYCLES} cycles: no search")
        given = [[_place_of(axis, values[axis.name]) for axis in self.sampler.axes]
                 for values in starts]
        places = self._clip(np.array(given + self._random_places(), dtype=np.int64))
        scores = self.scores(places)
        if not scores.any():
            return []
        order = np.argsort(-scores, kind="stable")[:CLIMBERS]
        reached, scores = self._climb(places[order], scores[order])
        order = np.argsort(-scores, kind="stable")[:3]
        return [self._values(reached[which]) for which in order]

    def scores(self, places: Places) -> Floats:
        """Return left/right at many places, in floating point."""
        values = {axis.name: _floats(axis, places[:, k])
                  for k, axis in enumerate(self.sampler.axes)}
        return NumericPoints(self.cycles, values, len(places)).ratio(self.claim)

    def _climb(self, places: Places, scores: Floats) -> tuple[Places, Floats]:
        count = places.shape[1]
        steps = np.full(len(places), FIRST_STEP, dtype=np.int64)
        drift = np.zeros_like(places)
        for _ in range(MAX_ROUNDS):
            if scores.max() > CLEARLY_ABOVE or scores.max() > NEAR_ONE or not steps.any():
                break
            moves = np.concatenate([np.eye(count, dtype=np.int64),
                                    -np.eye(count, dtype=np.int64), self._mixed(count)])
            shifts = moves[None] * steps[:, None, None]
            trial = self._clip(places[:, None] + np.concatenate([shifts, drift[:, None]], axis=1))
            width = trial.shape[1]
            tried = self.scores(trial.reshape(-1, count)).reshape(-1, width)
            choice = tried.argmax(axis=1)
            best = tried[np.arange(len(places)), choice]
            better = best > scores * (1 + 1e-12)
            chosen = trial[np.arange(len(places)), choice]
            drift = np.where(better[:, None], chosen - places, 0)
            places = np.where(better[:, None], chosen, places)
            gained = best > scores * (1 + 1e-3)
            scores = np.where(better, best, scores)
            steps = np.where(better & (gained | (choice == width - 1)), steps, steps // 2)
        return places, scores

    def _mixed(self, count: int) -> Places:
        """Return random steps of two or three symbols."""
        moves = np.zeros((count, count), dtype=np.int64)
        for row in moves:
            for _ in range(self.random.choice((2, 3))):
                row[self.random.randrange(count)] = self.random.choice((-1, 1))
        return moves

    def _random_places(self) -> list[list[int]]:
        pairs = list(zip(self.low.tolist(), self.high.tolist(), strict=True))
        return [[self.random.randint(low, high) for low, high in pairs]
                for _ in range(RANDOM_STARTS)]

    def _clip(self, places: Places) -> Places:
        return np.clip(places, self.low, self.high)

    def _values(self, places: Places) -> Values:
        return {axis.name: axis.value(int(place), BITS)
                for axis, place in zip(self.sampler.axes, places, strict=True)}


def _floats(axis: Axis, places: Places) -> Floats:
    if axis.kind == "plain":
        step = float(axis.high - axis.low) / (1 << (BITS + PLAIN_BITS))
        return np.asarray(float(axis.low) + step * places, dtype=np.float64)
    octaves, parts = (places >> BITS).astype(np.float64), places & ((1 << BITS) - 1)
    base = np.exp2(octaves) * (1 + parts / (1 << BITS))
    result = base**axis.order if axis.kind == "power" else axis.order * np.log(base)
    return np.asarray(result, dtype=np.float64)


def _place_of(axis: Axis, value: Expression) -> int:
    """Return the grid number next to a value."""
    match value:
        case Number(exact) if axis.kind == "plain":
            step = (axis.high - axis.low) / (1 << (BITS + PLAIN_BITS))
            return round((exact - axis.low) / step)
        case Number(exact) if axis.kind == "power":
            return _place_of_logarithm(_log2(exact) / axis.order)
        case Product((Number(order), Function("ln", Number(base)))):
            return _place_of_logarithm(_log2(base) * float(order) / axis.order)
        case Function("ln", Number(base)):
            return _place_of_logarithm(_log2(base) / axis.order)
    return 0


def _log2(value: Fraction) -> float:
    return math.log2(value.numerator) - math.log2(value.denominator)


def _place_of_logarithm(logarithm: float) -> int:
    octave = math.floor(logarithm)
    return (octave << BITS) + round((2 ** (logarithm - octave) - 1) * (1 << BITS))
