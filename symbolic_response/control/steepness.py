"""How steep a response to a control parameter can be: limits for all forces, and read backwards.

For 0 <= Q <= 1 that does not depend on x: |d<Q>/d x| <= H <Q>(1 - <Q>), with H the least limit that
a family of pieces gives (:mod:`symbolic_response.control.program`). As a function of t = tanh(F/4)
of the bundles H is concave and piecewise linear: the minimum of linear forms.
"""

from __future__ import annotations

import random
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise, product

import flint

from symbolic_response.bounds.enclose import Enclosure, decimals
from symbolic_response.control.at_points import Limit as Limit
from symbolic_response.control.at_points import limit_at as limit_at
from symbolic_response.control.changes import Change, Vector, change_of
from symbolic_response.control.decomposition import LinearForm, combined, linear_form
from symbolic_response.control.family import Family, classes_of, family_of
from symbolic_response.control.program import Amounts, Optimum, cost, optimum
from symbolic_response.control.separations import Part
from symbolic_response.errors import QuantityError
from symbolic_response.network.quantities import Perturbation
from symbolic_response.response.analysis import Analysis

NEAR_ZERO, NEAR_ONE = Fraction(1, 1000), Fraction(999, 1000)
_DRAWN = 12
_MOST_ALL_CORNERS = 4
_MOST_SINGLE_CORNERS = 32

MEANING = (
    "Each form limits the response for all forces. Where all t are equal their minimum is the least"
    " limit of the family, exactly; elsewhere it is an upper bound of it, least at the values of t"
    " that were tried: near corners and drawn ones. A change that is not a number times a fixed"
    " vector is limited part by part."
)


def forms(
    analysis: Analysis, by: Perturbation, family: Family | None = None
) -> tuple[LinearForm, ...]:
    """Return linear forms in t whose minimum limits the response of ln(p_i/p_j), see MEANING.

    From the least limit at all equal t, whose breakpoints between 0 and 1 are found exactly, and,
    where bundles have different cycles, at t near corners of the cube and at drawn t. ``family``:
    that of the network if left out. Raises SizeLimitError past the limit of cycles.
    """
    family = family or family_of(analysis)
    change = change_of(analysis, by)
    vectors = (change.numbers, *(u for _, u in change.parts))
    breaks = {Fraction(0), Fraction(1)}.union(*(breakpoints(family, u) for u in vectors))
    places = [(sum(pair, Fraction(0)) / 2,) * len(family.bundles)
              for pair in pairwise(sorted(breaks))]
    classes = classes_of(family, analysis)
    if len(set(classes)) > 1:
        places += [tuple(drawn[c] for c in classes)
                   for drawn in _other_values(max(classes) + 1)]
    found: dict[tuple[Amounts, ...], None] = {}
    for t in places:
        found.setdefault(tuple(optimum(family, u, t).amounts for u in vectors))
    return _least(analysis, change, family, list(found))


def _other_values(count: int) -> Iterator[tuple[Fraction, ...]]:
    """Yield values of several t: corners, moved inwards so that no cost vanishes; drawn ones."""
    if count <= _MOST_ALL_CORNERS:
        yield from product((NEAR_ZERO, NEAR_ONE), repeat=count)
    elif count <= _MOST_SINGLE_CORNERS:
        for usual, other in ((NEAR_ZERO, NEAR_ONE), (NEAR_ONE, NEAR_ZERO)):
            for place in range(count):
                yield tuple(other if i == place else usual for i in range(count))
    rng = random.Random("values of t")
    for _ in range(_DRAWN):
        yield tuple(Fraction(rng.randint(1, 999), 1000) for _ in range(count))


def _least(
    analysis: Analysis, change: Change, family: Family, found: Sequence[tuple[Amounts, ...]]
) -> tuple[LinearForm, ...]:
    """Return the forms of some amounts, without those that another one is never above."""
    classes = dict(zip(family.bundles, classes_of(family, analysis), strict=True))
    kept: list[LinearForm] = []
    for amounts in found:
        form = linear_form(combined(analysis, change, family, amounts), analysis)
        if not any(_below(other, form, classes) for other in kept):
            kept = [other for other in kept if not _below(form, other, classes)]
            kept.append(form)
    return tuple(kept)


def _below(one: LinearForm, other: LinearForm, classes: Mapping[Part, int]) -> bool:
    """Return whether a form is certainly nowhere above another; t is the same within a class."""
    sides = []
    for form in (one, other):
        numbers = form.numbers()
        if numbers is None:
            return (one.constant, set(one.slopes)) == (other.constant, set(other.slopes))
        slopes: dict[int, Fraction] = {}
        for part, slope in numbers[1].items():
            slopes[classes[part]] = slopes.get(classes[part], Fraction(0)) + slope
        sides.append((numbers[0], slopes))
    (constant, slopes), (other_constant, others) = sides
    return constant <= other_constant and all(
        slope <= others.get(c, 0) for c, slope in slopes.items())


# -- one t for all bundles -------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Line:
    constant: Fraction
    slope: Fraction

    def at(self, t: Fraction) -> Fraction:
        return self.constant + self.slope * t


def breakpoints(family: Family, change: Vector) -> list[Fraction]:
    """Return where the least limit bends as one t of all bundles goes from 0 to 1, exactly.

    Between two of them (and 0 and 1) it is linear; a place where it does not bend may be among
    them.
    """
    def solved(t: Fraction) -> Optimum:
        return optimum(family, change, (t,) * len(family.bundles))

    def line(found: Optimum) -> _Line:
        ends = [cost(family, found.amounts, (Fraction(t),) * len(family.bundles)) for t in (0, 1)]
        return _Line(ends[0], ends[1] - ends[0])

    bends: list[Fraction] = []
    open_ = [(Fraction(0), line(solved(Fraction(0))), Fraction(1), line(solved(Fraction(1))))]
    while open_:
        low, first, high, last = open_.pop()
        if first.slope == last.slope:
            continue
        t = (last.constant - first.constant) / (first.slope - last.slope)
        if not low < t < high:
            continue
        bends.append(t)
        found = solved(t)
        if found.value < first.at(t):
            between = line(found)
            open_ += [(low, first, t, between), (t, between, high, last)]
    return sorted(set(bends))


# -- read backwards --------------------------------------------------------------------------------

NO_FORCE = "no force needed by this bound"
FORCE = "a force needed"
NO_DRIVING = "no driving suffices"


@dataclass(frozen=True, slots=True)
class Reading:
    """What a measured steepness says about the forces, by a bound.

    ``verdict``: NO_FORCE (at or below H at t = 0; equilibrium need not reach it), FORCE (some t of
    the pieces must be at least ``t``: a cycle has a force F >= 4 artanh(t), enclosed by ``force``;
    None where t is 1 and only an infinite one will do), NO_DRIVING (above H at t = 1).
    """

    verdict: str
    t: Fraction | None = None
    force: Enclosure | None = None


def read_backwards(found: Sequence[LinearForm], h: Fraction) -> Reading:
    """Return the smallest t, the same for all bundles, at which H(t) >= h, exactly.

    Raises QuantityError for forms whose coefficients are not all numbers.
    """
    needed = Fraction(0)
    for form in found:
        parts = form.numbers()
        if parts is None:
            raise QuantityError(
                "the limit on the steepness depends on symbols, maybe the parameter itself; a"
                " measured steepness cannot be read backwards here: leave it out")
        constant, slope = parts[0], sum(parts[1].values(), Fraction(0))
        if h > constant + slope:
            return Reading(NO_DRIVING)
        if h > constant:
            needed = max(needed, (h - constant) / slope)
    if needed == 0:
        return Reading(NO_FORCE)
    return Reading(FORCE, needed, force_enclosure(needed))


def force_enclosure(t: Fraction) -> Enclosure | None:
    """Return decimals that enclose 4 artanh(t), None for t = 1.

    >>> force_enclosure(Fraction(3, 5))
    ('2.772588722239781237668928', '2.772588722239781237668929')
    """
    if t == 1:
        return None
    with flint.ctx.workprec(192):
        ratio = (1 + t) / (1 - t)
        return decimals(2 * flint.arb(flint.fmpq(ratio.numerator, ratio.denominator)).log())
