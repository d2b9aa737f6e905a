"""Exact rational functions of one symbol: quotients of two integer polynomials in one variable y.

The variable stands for x^(1/root) of a positive symbol x (kind ``power``), for exp(x/root) of a
real symbol that occurs in exponents only (``exponential``), or for a real symbol itself
(``plain``). Functions of one symbol and kind whose roots differ combine over the common root.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from math import gcd, lcm
from typing import Any

import flint

from symbolic_response.errors import EvaluationError
from symbolic_response.expressions.enclosure import decimal_enclosure
from symbolic_response.expressions.latex import expression_latex
from symbolic_response.expressions.names import default_latex
from symbolic_response.expressions.ring import Generator, Polynomial, Ring, key_of, plain
from symbolic_response.expressions.signs import certain_sign
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import (
    Expression,
    Symbol,
    divide,
    function,
    multiply,
    number,
    power,
    substitute,
)
from symbolic_response.response.deriving import Given, given
from symbolic_response.response.direct import direct_value

POWER, EXPONENTIAL, PLAIN = "power", "exponential", "plain"
MAX_FACTORED_DEGREE = 64
Poly = flint.fmpz_poly


@dataclass(frozen=True, slots=True, eq=False)
class RationalFunction:
    """``numerator / denominator`` in y: coprime, the denominator's leading coefficient positive.

    Made by :func:`rational_function`, which sees to that.
    """

    symbol: str
    kind: str
    root: int
    numerator: Poly
    denominator: Poly

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, RationalFunction):
            return NotImplemented
        return self._key() == other._key()

    def __hash__(self) -> int:
        return hash(self._key())

    def _key(self) -> tuple[object, ...]:
        parts = (tuple(int(c) for c in p.coeffs()) for p in (self.numerator, self.denominator))
        return (self.symbol, self.kind, self.root, *parts)

    # -- arithmetic ------------------------------------------------------------------------

    def __add__(self, other: RationalFunction | int | Fraction) -> RationalFunction:
        root, a, b, c, d = self._pair(other)
        if b == d:
            return self._made(root, a + c, b)
        return self._made(root, a * d + c * b, b * d)

    def __neg__(self) -> RationalFunction:
        return self._made(self.root, -self.numerator, self.denominator)

    def __sub__(self, other: RationalFunction | int | Fraction) -> RationalFunction:
        return self + -other

    def __rsub__(self, other: int | Fraction) -> RationalFunction:
        return -self + other

    def __mul__(self, other: RationalFunction | int | Fraction) -> RationalFunction:
        root, a, b, c, d = self._pair(other)
        return self._made(root, a * c, b * d)

    def __truediv__(self, other: RationalFunction | int | Fraction) -> RationalFunction:
        root, a, b, c, d = self._pair(other)
        if c.is_zero():
            raise EvaluationError("division by a function that is identically zero")
        return self._made(root, a * d, b * c)

    def __rtruediv__(self, other: int | Fraction) -> RationalFunction:
        return self.constant(other) / self

    __radd__, __rmul__ = __add__, __mul__

    def __pow__(self, exponent: int) -> RationalFunction:
        if exponent < 0:
            return 1 / self ** -exponent
        return self._made(self.root, self.numerator**exponent, self.denominator**exponent)

    def _pair(
        self, other: RationalFunction | int | Fraction
    ) -> tuple[int, Poly, Poly, Poly, Poly]:
        if not isinstance(other, RationalFunction):
            other = self.constant(other)
        if (self.symbol, self.kind) != (other.symbol, other.kind):
            raise ValueError(f"functions of {self.symbol} ({self.kind}) and {other.symbol}"
                             f" ({other.kind}) do not combine")
        root = lcm(self.root, other.root)
        return root, *self.over(root), *other.over(root)

    def over(self, root: int) -> tuple[Poly, Poly]:
        """Return numerator and denominator in the variable of a multiple of the root."""
        step = root // self.root
        if step == 1:
            return self.numerator, self.denominator
        return self.numerator.inflate(step), self.denominator.inflate(step)

    def _made(self, root: int, top: Poly, bottom: Poly) -> RationalFunction:
        return rational_function(self.symbol, self.kind, root, top, bottom)

    def constant(self, value: int | Fraction) -> RationalFunction:
        """Return a number as a function of the same symbol."""
        exact = Fraction(value)
        return self._made(1, Poly([exact.numerator]), Poly([exact.denominator]))

    def rescaled(self, scale: int | Fraction, offset: int | Fraction = 0) -> RationalFunction:
        """Return ``offset + scale * f``."""
        return self * scale + offset

    # -- properties ------------------------------------------------------------------------

    @property
    def degree(self) -> int:
        """The larger of the degrees of numerator and denominator in y."""
        return int(max(self.numerator.degree(), self.denominator.degree(), 0))

    def is_zero(self) -> bool:
        """Return whether this is the constant zero."""
        return bool(self.numerator.is_zero())

    def as_constant(self) -> Fraction | None:
        """Return the value of a constant function, else None."""
        if self.degree:
            return None
        return _fraction(flint.fmpq(self.numerator[0], self.denominator[0]))

    def leading_term(self, end: str) -> tuple[Fraction, Fraction]:
        """Return (a, r): f ~ a x^r (``exponential``: a exp(r x)) at an end of the symbol.

        ``end``: ``"low"`` (x to 0, or to -infinity where real) or ``"high"`` (x to infinity). The
        zero function gives (0, 0).
        """
        if self.is_zero():
            return Fraction(0), Fraction(0)
        if end == "low" and self.kind != PLAIN:
            places = [next(place for place, c in enumerate(poly.coeffs()) if c != 0)
                      for poly in (self.numerator, self.denominator)]
        else:
            places = [int(poly.degree()) for poly in (self.numerator, self.denominator)]
        ratio = Fraction(int(self.numerator[places[0]]), int(self.denominator[places[1]]))
        return ratio, Fraction(places[0] - places[1], self.root)

    def limit(self, end: str) -> Fraction | None:
        """Return the limit at an end (as for :meth:`leading_term`), None where it is infinite."""
        coefficient, exponent = self.leading_term(end)
        if exponent == 0:
            return coefficient
        vanishing = (exponent > 0) == (end == "low" and self.kind != PLAIN)
        return Fraction(0) if vanishing else None

    # -- derivatives -----------------------------------------------------------------------

    def sensitivity(self) -> RationalFunction:
        """Return df/d ln x for a positive symbol, df/dx for a real one.

        With y = x^(1/k) or exp(x/k) both are (y/k) df/dy.
        """
        top, bottom = self.numerator, self.denominator
        slope = top.derivative() * bottom - top * bottom.derivative()
        if self.kind != PLAIN:
            slope = slope.left_shift(1)
        return self._made(self.root, slope, bottom * bottom * self.root)

    def exponent(self) -> RationalFunction:
        """Return d logit f / d ln x = sensitivity/(f (1 - f)), for functions between 0 and 1.

        For a real symbol the derivative is by x. EvaluationError if f is constantly 0 or 1.
        """
        below = self * (1 - self)
        if below.is_zero():
            raise EvaluationError("the exponent of a function that is constantly 0 or 1")
        return self.sensitivity() / below

    # -- values ----------------------------------------------------------------------------

    def variable(self) -> Expression:
        """Return y as an expression of the symbol."""
        x = Symbol(self.symbol)
        if self.kind == EXPONENTIAL:
            return function("exp", multiply([number(Fraction(1, self.root)), x]))
        return power(x, Fraction(1, self.root))

    def place(self, x: Given) -> Fraction | None:
        """Return y at an exact x (``3/7``, ``2*ln(3/2)``), None where it is not rational.

        EvaluationError where a positive symbol would not be positive.
        """
        value = given({self.symbol: x})[self.symbol]
        if self.kind == POWER and certain_sign(value, frozenset()) != 1:
            raise EvaluationError(f"{self.symbol} = {expression_text(value)}, and {self.symbol} is"
                                  " a positive symbol")
        found = direct_value(self.variable(), {self.symbol: value})
        return None if found is None else _fraction(found)

    def symbol_at(self, y: Fraction) -> Expression:
        """Return the x at which the variable has the value ``y`` (positive, unless plain)."""
        if self.kind == EXPONENTIAL:
            return multiply([number(self.root), function("ln", number(y))])
        return number(y**self.root)

    def at_place(self, y: Fraction) -> Fraction:
        """Return the value where the variable is ``y``; EvaluationError at a pole."""
        place = flint.fmpq(y.numerator, y.denominator)
        below = self.denominator(place)
        if below == 0:
            raise EvaluationError("division by zero: the function has a pole there")
        return _fraction(self.numerator(place) / below)

    def value(self, x: Given) -> Fraction:
        """Return the exact value at x; EvaluationError where y is irrational or at a pole."""
        y = self.place(x)
        if y is None:
            x_text = expression_text(given({self.symbol: x})[self.symbol])
            write = (f"{self.root}*ln(q) with a fraction q" if self.kind == EXPONENTIAL
                     else f"the power {self.root} of a fraction")
            raise EvaluationError(f"the function is not rational at {self.symbol} = {x_text}; take"
                                  f" {write}, or an enclosure")
        return self.at_place(y)

    def enclosure(self, x: Given) -> tuple[str, str]:
        """Return two decimals that enclose the value at any exact x; relative width 1e-20.

        Raises EvaluationError at a pole, UndecidedError where 4096 bits do not tell the value from
        zero.
        """
        y = self.place(x)
        if y is not None:
            return fraction_enclosure(self.at_place(y))
        at = {self.symbol: given({self.symbol: x})[self.symbol]}
        return decimal_enclosure(substitute(plain(self.expression()), at))

    def ball(self, y: flint.arb) -> flint.arb:
        """Return a ball that holds the values for all y of a ball, at the precision in force."""
        return self.numerator(y) / self.denominator(y)

    # -- printing --------------------------------------------------------------------------

    def expression(self) -> Expression:
        """Return the function as a tree in the symbol, in factors up to degree 64."""
        return divide(self._product(self.numerator), self._product(self.denominator))

    def _product(self, poly: Poly) -> Expression:
        if poly.degree() < 1:
            return number(int(poly[0]))
        if poly.degree() > MAX_FACTORED_DEGREE:
            return self._leaf(poly)
        content, pieces = poly.factor()
        return multiply([number(int(content)),
                         *(power(self._leaf(piece), int(times)) for piece, times in pieces)])

    def _leaf(self, poly: Poly) -> Expression:
        x = Symbol(self.symbol)
        kind = "exp" if self.kind == EXPONENTIAL else "symbol"
        key = key_of(x) if self.kind == EXPONENTIAL else self.symbol
        ring = Ring([Generator(kind, 0, key, x, self.kind != PLAIN)], [self.root])
        if poly == Poly([0, 1]):
            return self.variable()
        return Polynomial(ring, ring.context.from_dict(
            {(place,): c for place, c in enumerate(poly.coeffs()) if c != 0}))

    def text(self) -> str:
        """Return the function in the syntax of the network file."""
        return expression_text(self.expression())

    def latex(self, names: dict[str, str] | None = None) -> str:
        """Return the function as LaTeX, without math delimiters."""
        return expression_latex(self.expression(),
                                names or {self.symbol: default_latex(self.symbol)})

    def __str__(self) -> str:
        return self.text()


def rational_function(
    symbol: str, kind: str, root: int, numerator: Poly, denominator: Poly
) -> RationalFunction:
    """Return a quotient of polynomials in y in lowest terms, over the smallest root."""
    common = numerator.gcd(denominator)
    if not common.is_one():
        numerator, denominator = numerator // common, denominator // common
    if denominator.leading_coefficient() < 0:
        numerator, denominator = -numerator, -denominator
    if root > 1:
        shared = root
        for poly in (numerator, denominator):
            shared = gcd(shared, *(place for place, c in enumerate(poly.coeffs()) if c != 0))
        if shared > 1:
            root //= shared
            numerator, denominator = (Poly(poly.coeffs()[::shared])
                                      for poly in (numerator, denominator))
    return RationalFunction(symbol, kind, root, numerator, denominator)


def real_roots(poly: Poly) -> list[flint.arb]:
    """Return disjoint balls that hold one distinct real root each, at the precision in force.

    FLINT isolates all complex roots; those that are real have exactly no imaginary part.
    """
    found: Any = poly.complex_roots()
    return [root.real for root, _ in found if root.imag == 0]


def fraction_enclosure(value: Fraction) -> tuple[str, str]:
    """Return two decimals that enclose a fraction, ``("0", "0")`` for zero."""
    return ("0", "0") if value == 0 else decimal_enclosure(number(value))


def _fraction(value: flint.fmpq) -> Fraction:
    return Fraction(int(value.p), int(value.q))
