"""A claim: |response| <= sum of factors, some of them times tanh(force/4)."""

from __future__ import annotations

from dataclasses import dataclass

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


Force = CycleMaximum | EndPair | OneCycle


@dataclass(frozen=True, slots=True)
class Term:
    """``factor``, or ``factor * tanh(force/divisor)``; the factor is a non-negative quantity.

    The theorems have 4 for the divisor; other values serve to test conjectures.
    """

    factor: Expression
    force: Force | None = None
    divisor: int = 4


@dataclass(frozen=True, slots=True)
class Claim:
    """One inequality of the catalogue for one response of one network.

    ``left`` is the quantity whose absolute value is bounded; ``data`` what in the topology sets the
    limit, in the words of the file; ``hypotheses`` what was checked before the bound was offered.
    ``equality``: the statement is an identity.
    """

    name: str
    left: Expression
    right: tuple[Term, ...]
    data: dict[str, object]
    hypotheses: str
    source: str
    equality: bool = False


@dataclass(frozen=True, slots=True)
class Question:
    """What every bound of the catalogue is asked about."""

    analysis: Analysis
    response: Response
    target: Target
