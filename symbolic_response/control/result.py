"""The steepness of a response to a control parameter: what limits it, what it is."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.bounds.claim import MixedCycles
from symbolic_response.bounds.topological import competing
from symbolic_response.control.asked import Asked, asked_of, observable_values, rescaled
from symbolic_response.control.changes import change_of
from symbolic_response.control.decomposition import Decomposition, LinearForm, sparsest
from symbolic_response.control.extrema import Maximum, maximum
from symbolic_response.control.family import Family, family_of
from symbolic_response.control.function import function_of
from symbolic_response.control.rational import RationalFunction
from symbolic_response.control.separations import Part
from symbolic_response.control.steepness import Reading, forms, read_backwards
from symbolic_response.control.user_decomposition import (
    PIECES,
    parameter_of,
    user_decomposition,
)
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis, as_analysis
from symbolic_response.response.deriving import Given
from symbolic_response.response.forces import force_of
from symbolic_response.response.survey import cycle_path, force_text

ALSO = ("observables", "at", "from", "to", "points")
"""Keys of a ``[[control]]`` entry that say what is followed, and where; see the appendix."""


@dataclass(frozen=True, slots=True)
class Actual:
    """The observable as an exact function of the parameter, all other symbols given.

    ``function``: brought to 0 .. 1. ``sensitivity``: its derivative by ln x (x where it is real).
    ``exponent``: the local exponent, d logit of it by the same. ``steepest`` and ``largest``: the
    largest size of each over the range; ``largest`` is what H limits.
    """

    function: RationalFunction
    sensitivity: RationalFunction
    exponent: RationalFunction
    steepest: Maximum
    largest: Maximum


@dataclass(frozen=True, slots=True)
class Steepness:
    """What limits |d<Q>/d ln x| by H <Q>(1 - <Q>), and the actual sensitivity.

    ``forms``: H is at most each of them, for all forces; ``bundles``: for each bundle in them the
    cycles that set its force, with their forces. ``simplest``: the change of the rates in fewest
    pieces; ``own``: that of the file. ``range``: the extremes of an observable that was brought to
    0 .. 1. ``actual``: None where a symbol has no value (``missing``). ``reading``: of a measured
    steepness.
    """

    network: Network
    asked: Asked
    family: Family
    forms: tuple[LinearForm, ...]
    bundles: dict[Part, list[tuple[str, str]]]
    simplest: Decomposition
    own: tuple[Decomposition, ...]
    range: tuple[Fraction, Fraction] | None
    missing: tuple[str, ...]
    actual: Actual | None
    reading: Reading | None

    def at_equal(self, t: Fraction) -> Fraction | None:
        """Return H where all tanh(F/4) are equal to t, None where it depends on symbols."""
        parts = [form.numbers() for form in self.forms]
        known = [part for part in parts if part is not None]
        if len(known) < len(parts):
            return None
        return min(constant + t * sum(slopes.values(), Fraction(0)) for constant, slopes in known)


def steepness(
    subject: Network | Analysis,
    observable: str,
    parameter: str,
    at: Mapping[str, Given] | None = None,
    *,
    low: Given | None = None,
    high: Given | None = None,
    measured: Fraction | None = None,
) -> Steepness:
    """Return the limit on the steepness of an observable in a parameter, and the actual one.

    |d<Q>/d ln x| <= H <Q>(1 - <Q>) for 0 <= Q <= 1; observables of another range are brought to
    it. ``at``: the other symbols; with all of them given, the exact function of the parameter and
    its steepest places between ``low`` and ``high`` (None: open). ``measured``: a steepness to be
    read backwards. Raises QuantityError, AssignmentError, EvaluationError, SizeLimitError.
    """
    analysis = as_analysis(subject)
    asked = asked_of(analysis, observable, parameter, at)
    family = family_of(analysis)
    found = forms(analysis, asked.by, family)
    change = change_of(analysis, asked.by)
    missing = tuple(asked.missing(analysis))
    actual, extremes = None, None
    if not missing:
        values = observable_values(asked)
        quantity, changed = rescaled(asked, values)
        extremes = (min(values), max(values)) if changed else None
        actual = _actual(function_of(analysis, quantity, asked.symbol, asked.values), low, high)
    return Steepness(
        analysis.network, asked, family, found, _bundles(found, analysis),
        sparsest(analysis, change, family), _own(analysis, asked), extremes, missing, actual,
        None if measured is None else read_backwards(found, measured),
    )


def _actual(function: RationalFunction, low: Given | None, high: Given | None) -> Actual:
    sensitivity, exponent = function.sensitivity(), function.exponent()
    return Actual(function, sensitivity, exponent,
                  maximum(sensitivity, low, high, absolute=True),
                  maximum(exponent, low, high, absolute=True))


def _own(analysis: Analysis, asked: Asked) -> tuple[Decomposition, ...]:
    """Return the decompositions that the file gives for this parameter, each checked."""
    network = analysis.network
    found = []
    for ordinal, entry in enumerate(network.control):
        place = ("control", ordinal)
        by = parameter_of(entry, network, place)
        if by.name == asked.symbol and any(key in entry for key in PIECES):
            made = user_decomposition(analysis, by, entry, place, ALSO)
            if by == asked.by:
                found.append(made)
    return tuple(found)


def _bundles(
    found: tuple[LinearForm, ...], analysis: Analysis
) -> dict[Part, list[tuple[str, str]]]:
    """Return the cycles that set the force of each bundle that occurs, with their forces."""
    parts = dict.fromkeys(part for form in found for part, _ in form.slopes)
    return {
        part: [(cycle_path(cycle, analysis.network), force_text(force_of(cycle, analysis)))
               for cycle in competing(MixedCycles(part), analysis)]
        for part in parts
    }
