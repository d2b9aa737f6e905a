"""Exact places on the real line: rational numbers, real roots of polynomials, constants.

All are compared by balls that shrink until they are apart; equality of roots is settled by greatest
common divisors.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import flint

from symbolic_response.control.rational import Poly, real_roots
from symbolic_response.errors import UndecidedError
from symbolic_response.expressions.enclosure import MAX_PRECISION, ball
from symbolic_response.expressions.tree import Expression
from symbolic_response.response.deriving import arb_fraction

PRECISIONS = (128, 256, 512, 1024, 2048, MAX_PRECISION)
_RECOGNISED = 2**64


def square_free(poly: Poly) -> Poly:
    """Return the primitive polynomial with the same roots, each once."""
    if poly.degree() < 1:
        return Poly([1])
    reduced = poly // poly.gcd(poly.derivative())
    return reduced // reduced.content()


def without(poly: Poly, divisor: Poly) -> Poly:
    """Return the square-free polynomial whose roots are those of ``poly`` but not of another."""
    reduced = square_free(poly)
    return reduced // reduced.gcd(divisor)


class Roots:
    """The distinct real roots of a polynomial, in rising order."""

    def __init__(self, poly: Poly) -> None:
        self.poly = square_free(poly)
        self._balls: dict[int, list[flint.arb]] = {}
        self.count = len(self.balls(PRECISIONS[0]))

    def balls(self, precision: int) -> list[flint.arb]:
        """Return disjoint balls, one for each root."""
        if precision not in self._balls:
            with flint.ctx.workprec(precision):
                found = real_roots(self.poly) if self.poly.degree() > 0 else []
            self._balls[precision] = sorted(found, key=lambda root: arb_fraction(root.mid()))
        return self._balls[precision]

    def places(self) -> list[Place]:
        """Return the roots as places, rational where their denominators are below 2^64."""
        return [self._place(index) for index in range(self.count)]

    def _place(self, index: int) -> Place:
        low, high = ball_ends(self.balls(PRECISIONS[1])[index])
        near = ((low + high) / 2).limit_denominator(_RECOGNISED)
        if low <= near <= high and self.poly(flint.fmpq(near.numerator, near.denominator)) == 0:
            return Place(exact=near)
        return Place(roots=self, index=index)

    def touched(self, other: flint.arb, precision: int) -> list[int]:
        """Return the numbers of the roots whose balls meet a ball."""
        return [k for k, root in enumerate(self.balls(precision)) if root.overlaps(other)]


@dataclass(frozen=True, slots=True, eq=False)
class Place:
    """A real number: ``exact``, or the root of a number, or the value of a constant expression."""

    exact: Fraction | None = None
    roots: Roots | None = None
    index: int = 0
    expression: Expression | None = None

    @property
    def poly(self) -> Poly | None:
        """An integer polynomial with this root, None where none is known."""
        if self.exact is not None:
            return Poly([-self.exact.numerator, self.exact.denominator])
        return None if self.roots is None else self.roots.poly

    def ball(self, precision: int) -> flint.arb:
        """Return a ball that holds the number."""
        if self.roots is not None:
            return self.roots.balls(precision)[self.index]
        with flint.ctx.workprec(precision):
            if self.exact is not None:
                return flint.arb(flint.fmpq(self.exact.numerator, self.exact.denominator))
            assert self.expression is not None
            return ball(self.expression)

    def is_below(self, other: Place) -> bool:
        """Return whether this is less than another; UndecidedError where 4096 bits do not tell."""
        if self.exact is not None and other.exact is not None:
            return self.exact < other.exact
        for precision in PRECISIONS:
            left, right = self.ball(precision), other.ball(precision)
            if left < right:
                return True
            if left > right:
                return False
        raise UndecidedError(f"two places cannot be told apart at {MAX_PRECISION} bits")

    def is_root_of(self, poly: Poly) -> bool:
        """Return whether a polynomial vanishes here; UndecidedError as for :meth:`is_below`."""
        if self.exact is not None:
            return bool(poly(flint.fmpq(self.exact.numerator, self.exact.denominator)) == 0)
        if self.roots is None:
            return self._sign(poly) is None
        shared = self.roots.poly.gcd(poly)
        if shared.degree() < 1:
            return False
        if shared.degree() == self.roots.poly.degree():
            return True
        common, rest = Roots(shared), Roots(self.roots.poly // shared)
        for precision in PRECISIONS:
            here = self.ball(precision)
            inside, outside = common.touched(here, precision), rest.touched(here, precision)
            if not inside or not outside:
                return bool(inside)
        raise UndecidedError(f"two places cannot be told apart at {MAX_PRECISION} bits")

    def _sign(self, poly: Poly) -> int | None:
        for precision in PRECISIONS:
            with flint.ctx.workprec(precision):
                value = poly(self.ball(precision))
            if value > 0 or value < 0:
                return 1 if value > 0 else -1
        return None

    def sign_of(self, poly: Poly) -> int:
        """Return the sign of a polynomial here; UndecidedError where 4096 bits do not tell."""
        if self.is_root_of(poly):
            return 0
        sign = self._sign(poly)
        if sign is None:
            raise UndecidedError(f"a value cannot be told from zero at {MAX_PRECISION} bits")
        return sign


def ball_ends(enclosure: flint.arb) -> tuple[Fraction, Fraction]:
    """Return the ends of a ball as fractions."""
    middle, radius = arb_fraction(enclosure.mid()), arb_fraction(enclosure.rad())
    return middle - radius, middle + radius
