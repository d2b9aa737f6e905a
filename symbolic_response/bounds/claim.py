"""A claim: |response| <= sum of factors, some of them times a curve of a force."""

from __future__ import annotations

from dataclasses import dataclass

from symbolic_response.bounds.curves import TANH, Curve
from symbolic_response.bounds.target import Target
from symbolic_response.expressions.tree import Expression
from symbolic_response.network.quantities import Response
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import Cycle


@dataclass(frozen=True, slots=True)
class CycleMaximum:
    """The largest |force| over the cycles through a transition; 0 if there are none."""

    transition: int


@dataclass(frozen=True, slots=True)
class EndPair:
    """|ln r|, r = w+ a_m/(w- a_n) the cross ratio of the two ends of a transition."""

    transition: int


@dataclass(frozen=True, slots=True)
class OneCycle:
    """The |force| of one given cycle."""

    cycle: Cycle


@dataclass(frozen=True, slots=True)
class MixedCycles:
    """The largest |force| over the cycles with transitions both inside and outside a set."""

    transitions: tuple[int, ...]


LargestForce = CycleMaximum | MixedCycles
Force = LargestForce | EndPair | OneCycle


@dataclass(frozen=True, slots=True)
class Term:
    """``factor``, or ``factor * curve(force)``; the factor is a non-negative quantity."""

    factor: Expression
    force: Force | None = None
    curve: Curve = TANH


@dataclass(frozen=True, slots=True)
class Claim:
    """One inequality of the catalogue for one response of one network.

    ``left`` is the quantity whose absolute value is bounded; ``data`` what in the topology sets the
    limit, in the words of the file; ``hypotheses`` what was checked before the bound was offered.
    ``equality``: the statement is an identity. ``has_points``: a record of exact points can hold
    the claim; else only a proof can.
    """

    name: str
    left: Expression
    right: tuple[Term, ...]
    data: dict[str, object]
    hypotheses: str
    source: str
    equality: bool = False
    has_points: bool = True


@dataclass(frozen=True, slots=True)
class Question:
    """What every bound of the catalogue is asked about."""

    analysis: Analysis
    response: Response
    target: Target
