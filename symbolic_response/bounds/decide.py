"""Exact verdicts on |X| <= sum of Y_j tanh(F_j/n_j) at a point where g_j = exp(F_j) is rational.

Nothing transcendental is needed: tanh(F/n) = (g^(2/n) - 1)/(g^(2/n) + 1).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

import flint

PRECISIONS = (64, 256, 1024, 4096)


@dataclass(frozen=True, slots=True)
class Weighted:
    """``factor`` >= 0 times tanh(F/``divisor``), g = exp(F) >= 1; no tanh where g is None.

    g is None where there is no force, or an infinite one.
    """

    factor: Fraction
    g: Fraction | None = None
    divisor: int = 4


def holds(left: Fraction, right: Sequence[Weighted]) -> bool | None:
    """Return whether |left| <= sum of Y tanh(F/n), decided exactly; None if undecided.

    One tanh: |X| <= Y tanh(F/n) exactly when Y >= |X| and (Y + |X|)^n <= g^2 (Y - |X|)^n. Several:
    rational lower and upper bounds of the roots, to 4096 bits.

    >>> holds(Fraction(3, 5), [Weighted(Fraction(1), Fraction(16))])
    True
    >>> holds(Fraction(2), [Weighted(Fraction(1), Fraction(9))])
    False
    """
    size = abs(left)
    plain = sum((term.factor for term in right if term.g is None), Fraction(0))
    curved = [t for t in right if t.g is not None and t.g != 1 and t.factor != 0]
    if size <= plain:
        return True
    if not curved:
        return False
    if len(curved) == 1:
        return _single(size - plain, curved[0])
    for bits in PRECISIONS:
        low, high = right_bounds(curved, bits)
        if size <= plain + low:
            return True
        if size > plain + high:
            return False
    return None


def _single(x: Fraction, term: Weighted) -> bool:
    assert term.g is not None
    y, n = term.factor, term.divisor
    return y >= x and (y + x) ** n <= term.g**2 * (y - x) ** n


def change_holds(ratio: Fraction, factor: Fraction, g: Fraction | None) -> bool:
    """Return whether |ln ratio| <= 2 ln(cosh((F + h)/4)/cosh((F - h)/4)), decided exactly.

    h = |ln factor|, g = exp(F) >= 1, None for an infinite F. With q = exp|ln ratio|, H = exp(h):
    sqrt(q) (sqrt(g) + sqrt(H)) <= sqrt(g H) + 1, both sides squared twice.

    >>> change_holds(Fraction(4, 9), Fraction(4), Fraction(16))
    True
    """
    q, h = max(ratio, 1 / ratio), max(factor, 1 / factor)
    if g is None:
        return q <= h
    gap = g * h + 1 - q * (g + h)
    return gap >= 0 and 4 * (q - 1) ** 2 * g * h <= gap**2


def tanh_bounds(g: Fraction, divisor: int, bits: int) -> tuple[Fraction, Fraction]:
    """Return rational bounds of tanh(ln(g)/divisor), g >= 1; equal where the root is rational.

    The lower one takes g^(2/n) as floor(2^bits b g^(2/n))/(2^bits b), with b the denominator of g
    (of g^2 for an odd divisor): for 4 the one that the record of a certificate prescribes.

    >>> tanh_bounds(Fraction(16), 4, 64)
    (Fraction(3, 5), Fraction(3, 5))
    """
    power, index = (g, divisor // 2) if divisor % 2 == 0 else (g**2, divisor)
    bottom = power.denominator
    scaled = flint.fmpz(power.numerator * bottom ** (index - 1) << (index * bits))
    root = scaled.root(index)
    low = Fraction(int(root), bottom << bits)
    high = low if root**index == scaled else Fraction(int(root) + 1, bottom << bits)
    return (low - 1) / (low + 1), (high - 1) / (high + 1)


def right_bounds(right: Sequence[Weighted], bits: int = 128) -> tuple[Fraction, Fraction]:
    """Return rational bounds of the right side; equal where it is rational."""
    low = high = Fraction(0)
    for term in right:
        below, above = Fraction(1), Fraction(1)
        if term.g is not None:
            below, above = tanh_bounds(term.g, term.divisor, bits)
        low, high = low + term.factor * below, high + term.factor * above
    return low, high
