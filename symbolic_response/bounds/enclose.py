"""Both sides of a claim at a point where they are irrational: rigorous balls, and the verdict."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from decimal import MAX_EMAX, MIN_EMIN, ROUND_CEILING, ROUND_FLOOR, Context, Decimal

import flint

from symbolic_response.bounds.balls import BallPoint
from symbolic_response.bounds.claim import Claim
from symbolic_response.bounds.sides import with_shares
from symbolic_response.bounds.target import Absolute
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    add,
    negate,
    rebuild,
)
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_form import closed_form
from symbolic_response.response.deriving import arb_fraction

PRECISIONS = (128, 256, 512, 1024, 2048, 4096)
_ACCURACY_BITS = 72  # relative width of what is shown: at most 1e-20
_SHOWN_DIGITS = 25

Enclosure = tuple[str, str]


@dataclass(frozen=True, slots=True)
class Enclosed:
    """A claim at a point: decimals that enclose both sides, whether it holds (None: undecided)."""

    left: Enclosure | None
    right: Enclosure | None
    holds: bool | None


def enclose(claim: Claim, analysis: Analysis, values: Mapping[str, Expression]) -> Enclosed:
    """Return enclosures of both sides of a claim and the verdict they allow, at up to 4096 bits."""
    verdict: bool | None = None
    shown: tuple[Enclosure | None, Enclosure | None] = (None, None)
    for bits in PRECISIONS:
        with flint.ctx.workprec(bits):
            try:
                place = BallPoint(analysis, values)
                left = abs(place.value(claim.left))
                right = sum((place.term(term) for term in claim.right), flint.arb(0))
            except ZeroDivisionError:  # a matrix not known to be regular at this precision
                continue
            shown = (decimals(left), decimals(right))
            if left > right or (claim.equality and left < right):
                verdict = False
            elif left == right or (not claim.equality and left <= right):
                verdict = True
            if verdict is not None and _accurate(left) and _accurate(right):
                return Enclosed(*shown, verdict)
    if verdict is None and claim.equality and _identical(claim, analysis):
        verdict = True
    return Enclosed(*shown, verdict)


def _accurate(value: flint.arb) -> bool:
    return bool(value == 0) or value.rel_accuracy_bits() >= _ACCURACY_BITS


def _identical(claim: Claim, analysis: Analysis) -> bool:
    """Return whether the two sides are the same up to sign for all rates, by closed forms."""

    def without_bars(leaf: Expression) -> Expression:
        return rebuild(leaf.inner, without_bars) if isinstance(leaf, Absolute) else leaf

    right = rebuild(add([with_shares(term.factor, analysis) for term in claim.right]), without_bars)
    return any(
        closed_form(add([claim.left, side]), analysis).expression == ZERO
        for side in (right, negate(right))
    )


def decimals(value: flint.arb) -> Enclosure | None:
    """Return decimals that enclose a ball, rounded outwards; None for an infinite one."""
    if not value.is_finite():
        return None
    low, high = (
        _decimal(end, rounding)
        for end, rounding in ((value.lower(), ROUND_FLOOR), (value.upper(), ROUND_CEILING))
    )
    return low, high


def _decimal(end: flint.arb, rounding: str) -> str:
    exact = arb_fraction(end)
    context = Context(prec=_SHOWN_DIGITS, rounding=rounding, Emin=MIN_EMIN, Emax=MAX_EMAX)
    return str(context.divide(Decimal(exact.numerator), Decimal(exact.denominator))).replace(
        "E", "e"
    )
