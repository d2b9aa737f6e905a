"""How a right side depends on a force: the curves that the theorems have.

With F the force and R = exp(F): tanh(F/n); psi(u, v, F) for a change local to one transition;
the largest change of ln of a ratio when one barrier is raised by an amount.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import flint

from symbolic_response.bounds.decide import Weighted
from symbolic_response.expressions.tree import Expression


@dataclass(frozen=True, slots=True)
class Tanh:
    """tanh(F/divisor). The theorems have 4; other values serve to test conjectures."""

    divisor: int = 4


TANH = Tanh()


@dataclass(frozen=True, slots=True)
class LocalChange:
    """psi(u, v, F) for u = ``larger`` >= v = ``smaller`` >= 0.

    (sqrt(u R) - sqrt(v))^2/(R - 1) where v R >= u and R > 1, u where R is infinite, else u - v;
    u tanh(F/4) for u = v.
    """

    larger: Fraction
    smaller: Fraction


@dataclass(frozen=True, slots=True)
class FiniteChange:
    """2 ln(cosh((F + h)/4)/cosh((F - h)/4)), h = ``size`` >= 0; h where F is infinite."""

    size: Expression


Curve = Tanh | LocalChange | FiniteChange


def weighted(curve: Tanh | LocalChange, factor: Fraction, g: Fraction | None) -> list[Weighted]:
    """Return ``factor`` times a curve at exp(F) = g (None: infinite) as multiples of tanh.

    psi is (u - v) + (v R - u)/(R - 1) tanh(ln(v R/u)/4) where v R >= u.

    >>> weighted(LocalChange(Fraction(2), Fraction(1)), Fraction(1), Fraction(4))
    ... # doctest: +NORMALIZE_WHITESPACE
    [Weighted(factor=Fraction(1, 1), g=None, divisor=4),
     Weighted(factor=Fraction(2, 3), g=Fraction(2, 1), divisor=4)]
    """
    match curve:
        case Tanh(divisor):
            return [Weighted(factor, g, divisor)]
        case LocalChange(u, v):
            if g is None:
                return [Weighted(factor * u)]
            flat = [Weighted(factor * (u - v))] if u > v else []
            if g == 1 or v * g <= u:
                return flat or [Weighted(Fraction(0))]
            return [*flat, Weighted(factor * (v * g - u) / (g - 1), v * g / u)]


def curve_ball(
    curve: Curve, force: flint.arb | None, size: flint.arb | None = None
) -> flint.arb:
    """Return an enclosure of a curve; ``force`` None: infinite; ``size``: that of a change."""
    match curve:
        case Tanh(divisor):
            return flint.arb(1) if force is None else (force / divisor).tanh()
        case LocalChange(larger, smaller):
            return _local_ball(larger, smaller, force)
        case FiniteChange():
            assert size is not None
            if force is None:
                return size
            return 2 * (((force + size) / 4).cosh() / ((force - size) / 4).cosh()).log()


def _local_ball(larger: Fraction, smaller: Fraction, force: flint.arb | None) -> flint.arb:
    u, v = (flint.arb(flint.fmpq(x.numerator, x.denominator)) for x in (larger, smaller))
    if force is None:
        return u
    if larger == smaller:
        return u * (force / 4).tanh()
    ratio = force.exp()
    if v * ratio < u:
        return u - v
    above = ((v * ratio).sqrt() - u.sqrt()).max(flint.arb(0))
    return u - v + above * above / (ratio - 1)
