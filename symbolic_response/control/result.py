"""The steepness of a response to a control parameter: what limits it, what it is."""

from __future__ import annotations

import contextlib
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.bounds.claim import MixedCycles
from symbolic_response.bounds.topological import competing
from symbolic_response.control.asked import Asked, asked_of, extremes, rescaled
from symbolic_response.control.changes import change_of
from symbolic_response.control.decomposition import Decomposition, LinearForm, sparsest
from symbolic_response.control.extrema import Maximum, maximum
from symbolic_response.control.family import Family, classes_of, family_of
from symbolic_response.control.function import function_of
from symbolic_response.control.limits import Leading, leading
from symbolic_response.control.rational import RationalFunction
from symbolic_response.control.separations import Part
from symbolic_response.control.steepness import Reading, forms, read_backwards
from symbolic_response.control.user_decomposition import (
    PIECES,
    parameter_of,
    user_decomposition,
)
from symbolic_response.errors import (
    AssignmentError,
    EvaluationError,
    SizeLimitError,
    UndecidedError,
)
from symbolic_response.network.entries import DocumentError, check_keys
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import BySymbol
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
    cycles that set its force, with their forces; ``same``: the one that stands for those with the
    same cycles. ``simplest``: the change of the rates in fewest
    pieces; ``own``: those of the file, each with the parameter or its logarithm that it is for.
    ``range``: the extremes of the observable, which is brought to 0 .. 1; None where a symbol in
    them has no value. ``actual``: None where any symbol has none (``missing``); ``tends`` then says
    how the observable behaves at the ends of the parameter. ``reading``: of a
    measured steepness.
    """

    network: Network
    asked: Asked
    family: Family
    forms: tuple[LinearForm, ...]
    bundles: dict[Part, list[tuple[str, str]]]
    same: dict[Part, Part]
    simplest: Decomposition
    own: tuple[tuple[BySymbol, Decomposition], ...]
    range: tuple[Fraction, Fraction] | None
    missing: tuple[str, ...]
    actual: Actual | None
    tends: tuple[Leading, ...]
    reading: Reading | None

    def at_equal(self, t: Fraction | int | str) -> Fraction | None:
        """Return H where all tanh(F/4) are equal to t, None where it depends on symbols.

        ``t``: from 0 to 1; AssignmentError otherwise.
        """
        t = _exact(t)
        if not 0 <= t <= 1:
            raise AssignmentError(f"tanh(F/4) is from 0 to 1; {t} is not")
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
    measured: Fraction | int | str | None = None,
) -> Steepness:
    """Return the limit on the steepness of an observable in a parameter, and the actual one.

    |d<Q>/d ln x| <= H <Q>(1 - <Q>) for 0 <= Q <= 1; observables of another range are brought to
    it. ``at``: the other symbols; with all of them given, the exact function of the parameter and
    its steepest places between ``low`` and ``high`` (None: open). ``measured``: a steepness, not
    negative, to be read backwards. Raises QuantityError, AssignmentError, EvaluationError,
    SizeLimitError.
    """
    analysis = as_analysis(subject)
    asked = asked_of(analysis, observable, parameter, at)
    ends, missing = extremes(asked), tuple(asked.missing(analysis))
    if missing and (low is not None or high is not None):
        raise AssignmentError(f"a range of {asked.symbol} needs a value for every other symbol;"
                              f" {missing[0]} has none")
    h = None if measured is None else _exact(measured)
    if h is not None and h < 0:
        raise AssignmentError(f"a steepness is the size of a slope; {measured} is negative")
    family = family_of(analysis)
    found = forms(analysis, asked.by, family)
    same = _same(family, analysis)
    change = change_of(analysis, asked.by)
    own = _own(analysis, asked)
    actual = None
    if not missing and ends is not None:
        function = function_of(analysis, rescaled(asked, ends)[0], asked.symbol, asked.values)
        actual = _actual(function, low, high)
    tends = _tends(analysis, asked) if actual is None else ()
    return Steepness(
        analysis.network, asked, family, found, _bundles(found, same, analysis), same,
        sparsest(analysis, change, family), own, ends, missing, actual, tends,
        None if h is None else read_backwards(found, h),
    )


def _exact(value: Fraction | int | str) -> Fraction:
    """Return an exact number; AssignmentError for a float or for what is no number."""
    if isinstance(value, Fraction | int | str):
        with contextlib.suppress(ValueError, ZeroDivisionError):
            return Fraction(value)
    raise AssignmentError(f"{value!r} is no exact number; write a fraction, an integer or a text"
                          " such as '3/2'")


def _actual(function: RationalFunction, low: Given | None, high: Given | None) -> Actual:
    sensitivity, exponent = function.sensitivity(), function.exponent()
    return Actual(function, sensitivity, exponent,
                  maximum(sensitivity, low, high, absolute=True),
                  maximum(exponent, low, high, absolute=True))


def _tends(analysis: Analysis, asked: Asked) -> tuple[Leading, ...]:
    """Return how the observable behaves at both ends of the parameter, in the other symbols.

    Nothing where the closed form is beyond a limit, or where no leading term is found.
    """
    try:
        return tuple(leading(analysis, asked.quantity, asked.symbol, end)
                     for end in (("0", "inf") if asked.by.logarithmic else ("-inf", "inf")))
    except (SizeLimitError, UndecidedError, EvaluationError):
        return ()


def _own(analysis: Analysis, asked: Asked) -> tuple[tuple[BySymbol, Decomposition], ...]:
    """Return the decompositions that the file gives for this parameter, each checked.

    Entries of other parameters are not looked into.
    """
    network = analysis.network
    found = []
    for ordinal, entry in enumerate(network.control):
        place = ("control", ordinal)
        try:
            by = parameter_of(entry, network, place)
            if by.name != asked.symbol:
                continue
            if any(key in entry for key in PIECES):
                found.append((by, user_decomposition(analysis, by, entry, place, ALSO)))
            else:
                check_keys(entry, ("parameter", *PIECES, *ALSO), "a control entry", place)
        except DocumentError as error:
            raise DocumentError(f"[[control]], entry {ordinal + 1}: {error}", *error.place
                                ) from None
    return tuple(found)


def _same(family: Family, analysis: Analysis) -> dict[Part, Part]:
    """Return for each bundle the first one with the same cycles."""
    first: dict[int, Part] = {}
    return {part: first.setdefault(number, part) for part, number in zip(
        family.bundles, classes_of(family, analysis), strict=True)}


def _bundles(
    found: tuple[LinearForm, ...], same: dict[Part, Part], analysis: Analysis
) -> dict[Part, list[tuple[str, str]]]:
    """Return the cycles that set the force of each bundle that occurs, with their forces."""
    parts = dict.fromkeys(same[part] for form in found for part, _ in form.slopes)
    return {
        part: [(cycle_path(cycle, analysis.network), force_text(force_of(cycle, analysis)))
               for cycle in competing(MixedCycles(part), analysis)]
        for part in parts
    }
