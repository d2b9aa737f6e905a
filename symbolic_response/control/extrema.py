"""Critical points and global maxima of rational functions of one symbol, rigorously.

The real roots of the square-free numerator of the derivative are isolated by FLINT, refined as
balls, and recognised where rational. Values that no precision tells apart are compared exactly, as
roots of one polynomial, a resultant.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction

import flint

from symbolic_response.control.rational import (
    EXPONENTIAL,
    PLAIN,
    Poly,
    RationalFunction,
    fraction_enclosure,
)
from symbolic_response.control.roots import PRECISIONS, Place, Roots, ball_ends, without
from symbolic_response.errors import EvaluationError, UndecidedError
from symbolic_response.expressions.tree import (
    Expression,
    Symbol,
    function,
    multiply,
    number,
    power,
    substitute,
)
from symbolic_response.response.deriving import Given, given
from symbolic_response.response.direct import direct_value

EXACT_FROM = 512
WIDTH = Fraction(1, 10**21)
MAX_ROOT = 24


@dataclass(frozen=True, slots=True)
class Extremum:
    """A critical point, or an end of an interval, of a function f.

    ``kind``: ``maximum``, ``minimum`` or ``inflection`` of f, ``end`` or, for an open end where x
    tends to 0 or to an infinity, ``limit``. ``x`` and ``value``: two decimals, of relative width
    at most 1e-20, that enclose the symbol and f (``x`` is None for a limit); ``y`` encloses the
    variable of f in fractions; ``exact_y``, ``exact_value``: the numbers where known rational.
    """

    kind: str
    x: tuple[str, str] | None
    y: tuple[Fraction, Fraction] | None
    exact_y: Fraction | None
    value: tuple[str, str]
    exact_value: Fraction | None


@dataclass(frozen=True, slots=True)
class Maximum:
    """The largest value of f, or of abs(f), over an interval, and all places that share it.

    ``attained`` is False where only limits at open ends reach it (then it is the supremum);
    ``constant``: f is constant, and ``places`` is empty.
    """

    value: tuple[str, str]
    exact_value: Fraction | None
    places: tuple[Extremum, ...]
    attained: bool
    constant: bool = False


def critical_points(
    f: RationalFunction, low: Given | None = None, high: Given | None = None
) -> tuple[Extremum, ...]:
    """Return the points strictly between two values of the symbol where df/dx = 0, in order.

    None stands for an open end: x to 0 or an infinity. A constant function has none. Raises
    EvaluationError for a pole in the closed interval, UndecidedError past 4096 bits.
    """
    return tuple(_extremum(f, candidate) for candidate in _Interval(f, low, high).critical())


def maximum(
    f: RationalFunction,
    low: Given | None = None,
    high: Given | None = None,
    *,
    absolute: bool = False,
) -> Maximum:
    """Return the global maximum of f, or of abs(f), over a closed interval of the symbol.

    None stands for an open end, whose limit counts. Ties are found exactly and all listed. Raises
    EvaluationError for a pole in the interval or an unbounded function, UndecidedError past 4096
    bits.
    """
    interval = _Interval(f, low, high)
    known = f.as_constant()
    if known is not None:
        value = abs(known) if absolute else known
        return Maximum(fraction_enclosure(value), value, (), True, constant=True)
    best = _largest(f, interval.candidates(absolute), 2 if absolute else 1)
    places = tuple(_extremum(f, candidate) for candidate in best)
    enclosure, exact = places[0].value, places[0].exact_value
    if absolute and enclosure[0].startswith("-"):
        enclosure = enclosure[1].removeprefix("-"), enclosure[0].removeprefix("-")
        exact = None if exact is None else -exact
    return Maximum(enclosure, exact, places, any(p.kind != "limit" for p in places))


@dataclass(frozen=True, slots=True, eq=False)
class _Candidate:
    """A place y (None for a limit), and the value of f there where it is known rational."""

    kind: str
    place: Place | None
    value: Fraction | None

    def ball(self, f: RationalFunction, precision: int) -> flint.arb:
        """Return a ball that holds the value."""
        with flint.ctx.workprec(precision):
            if self.value is not None:
                return flint.arb(flint.fmpq(self.value.numerator, self.value.denominator))
            assert self.place is not None
            return f.ball(self.place.ball(precision))


def _candidate(f: RationalFunction, kind: str, place: Place) -> _Candidate:
    if place.exact is not None:
        return _Candidate(kind, place, f.at_place(place.exact))
    vanishes = place.poly is not None and place.is_root_of(f.numerator)
    return _Candidate(kind, place, Fraction(0) if vanishes else None)


class _Interval:
    """The closed interval between two values of the symbol, free of poles."""

    def __init__(self, f: RationalFunction, low: Given | None, high: Given | None) -> None:
        self.f = f
        self.low = None if low is None else _end_place(f, low)
        self.high = None if high is None else _end_place(f, high)
        if self.low is not None and self.high is not None and not self.low.is_below(self.high):
            raise EvaluationError(f"the interval of {f.symbol} is empty; give low below high")
        ends = [end for end in (self.low, self.high) if end is not None]
        poles = [end for end in ends if end.is_root_of(f.denominator)]
        for pole in [*poles, *self._inside(f.denominator)]:
            raise EvaluationError(
                f"the function has a pole at {f.symbol} = {_symbol_enclosure(f, pole)[0]}, in the"
                " interval; choose an interval without it")

    def _inside(self, poly: Poly) -> list[Place]:
        """Return the real roots of a polynomial strictly inside."""
        for end in (self.low, self.high):
            if end is not None and end.poly is not None:
                poly = without(poly, end.poly)
        return [place for place in Roots(poly).places() if self._holds(place)]

    def _holds(self, place: Place) -> bool:
        low = self.low if self.low is not None or self.f.kind == PLAIN else Place(Fraction(0))
        if low is not None and not low.is_below(place):
            return False
        return self.high is None or place.is_below(self.high)

    def critical(self) -> list[_Candidate]:
        """Return the critical points with their kinds, in order."""
        slope = self.f.sensitivity().numerator
        return [_candidate(self.f, _kind_of(slope, place), place) for place in self._inside(slope)]

    def candidates(self, absolute: bool) -> list[_Candidate]:
        """Return the critical points and ends where a maximum may be, in order.

        EvaluationError if the function is unbounded at an open end.
        """
        ends = [self._end(end, side, absolute)
                for end, side in ((self.low, "low"), (self.high, "high"))]
        return [*ends[0], *self.critical(), *ends[1]]

    def _end(self, end: Place | None, side: str, absolute: bool) -> list[_Candidate]:
        if end is not None:
            return [_candidate(self.f, "end", end)]
        limit = self.f.limit(side)
        if limit is not None:
            return [_Candidate("limit", None, limit)]
        coefficient, exponent = self.f.leading_term(side)
        mirrored = self.f.kind == PLAIN and side == "low" and exponent.numerator % 2 == 1
        if absolute or (coefficient < 0) == mirrored:
            raise EvaluationError(f"the function is unbounded as {self.f.symbol} tends to its"
                                  f" {side} end; give that end of the interval")
        return []


def _end_place(f: RationalFunction, end: Given) -> Place:
    """Return an end as an exact place: rational, a root of a rational, or an expression."""
    y = f.place(end)
    if y is not None:
        return Place(exact=y)
    value = given({f.symbol: end})
    for index in range(2, MAX_ROOT + 1):
        raised = direct_value(_variable_power(f, index), value)
        if raised is not None and f.kind != PLAIN:
            roots = Roots(Poly([-raised.p, *[0] * (index - 1), raised.q]))
            return Place(roots=roots, index=roots.count - 1)
    return Place(expression=substitute(f.variable(), value))


def _variable_power(f: RationalFunction, index: int) -> Expression:
    x, exponent = Symbol(f.symbol), Fraction(index, f.root)
    if f.kind == EXPONENTIAL:
        return function("exp", multiply([number(exponent), x]))
    return power(x, exponent)


def _kind_of(slope: Poly, place: Place) -> str:
    """Return what a critical point is, by the first derivative that does not vanish there."""
    order = 0
    while place.is_root_of(slope):
        slope, order = slope.derivative(), order + 1
    if order % 2 == 0:
        return "inflection"
    return "minimum" if place.sign_of(slope) > 0 else "maximum"


# -- the largest of several values ---------------------------------------------------------------


def _largest(
    f: RationalFunction, candidates: list[_Candidate], order: int
) -> list[_Candidate]:
    """Return the candidates with the largest f (order 1) or abs(f) (order 2)."""
    for precision in PRECISIONS:
        with flint.ctx.workprec(precision):
            values = [c.ball(f, precision) ** order for c in candidates]
        kept = [k for k, value in enumerate(values) if not any(value < other for other in values)]
        candidates = [candidates[k] for k in kept]
        known = {None if c.value is None else c.value**order for c in candidates}
        if len(candidates) == 1 or (len(known) == 1 and None not in known):
            return candidates
        if precision >= EXACT_FROM and _tied(f, candidates, order):
            return candidates
    raise UndecidedError("two values cannot be told apart at 4096 bits")


def _tied(f: RationalFunction, candidates: list[_Candidate], order: int) -> bool:
    """Return whether the values of all candidates are one number; False where not settled."""
    product, known = Poly([1]), list[Poly]()
    for candidate in candidates:
        own = _value_polynomial(f, candidate, order)
        if own is None:
            return False
        if own not in known:
            known.append(own)
            product = product * own
    roots = Roots(product)
    for precision in PRECISIONS:
        with flint.ctx.workprec(precision):
            values = [c.ball(f, precision) ** order for c in candidates]
        touched = [roots.touched(value, precision) for value in values]
        if all(len(numbers) == 1 for numbers in touched):
            return all(numbers == touched[0] for numbers in touched)
    return False


def _value_polynomial(f: RationalFunction, candidate: _Candidate, order: int) -> Poly | None:
    """Return a polynomial that vanishes at f(y)^order: the resultant by y of p(y), n^o - w d^o."""
    if candidate.value is not None:
        raised = candidate.value**order
        return Poly([-raised.numerator, raised.denominator])
    place = candidate.place.poly if candidate.place is not None else None
    if place is None:
        return None
    ring = flint.fmpz_mpoly_ctx.get(["y", "w"], "lex")
    top, bottom, own = (
        ring.from_dict({(k, 0): c for k, c in enumerate(poly.coeffs()) if c != 0})
        for poly in (f.numerator**order, f.denominator**order, place))
    found = own.resultant(top - ring.gen(1) * bottom, "y")
    coefficients = [flint.fmpz(0)] * (int(found.degrees()[1]) + 1)
    for exponents, coefficient in found.terms():
        coefficients[int(exponents[1])] = coefficient
    return Poly(coefficients)


# -- enclosures ----------------------------------------------------------------------------------


def _extremum(f: RationalFunction, candidate: _Candidate) -> Extremum:
    place, value = candidate.place, candidate.value
    enclosure = (_decimals(_narrow(lambda precision: candidate.ball(f, precision)))
                 if value is None else fraction_enclosure(value))
    if place is None:
        return Extremum(candidate.kind, None, None, None, enclosure, value)
    y = (place.exact, place.exact) if place.exact is not None else _narrow(place.ball)
    return Extremum(candidate.kind, _symbol_enclosure(f, place), y, place.exact, enclosure, value)


def _symbol_enclosure(f: RationalFunction, place: Place) -> tuple[str, str]:
    """Return two decimals that enclose the symbol where its variable is at a place."""
    if place.exact is not None and (f.kind != EXPONENTIAL or place.exact == 1):
        return fraction_enclosure(place.exact**f.root if f.kind != EXPONENTIAL else Fraction(0))

    def symbol(precision: int) -> flint.arb:
        with flint.ctx.workprec(precision):
            y = place.ball(precision)
            return y.log() * f.root if f.kind == EXPONENTIAL else y**f.root

    return _decimals(_narrow(symbol))


def _narrow(enclose: Callable[[int], flint.arb]) -> tuple[Fraction, Fraction]:
    """Return the ends of the first ball that is narrow enough."""
    for precision in PRECISIONS:
        value = enclose(precision)
        if value.is_finite():
            low, high = ball_ends(value)
            if low * high > 0 and high - low <= WIDTH * min(abs(low), abs(high)):
                return low, high
    raise UndecidedError("a value cannot be told from zero at 4096 bits")


def _decimals(ends: tuple[Fraction, Fraction]) -> tuple[str, str]:
    return fraction_enclosure(ends[0])[0], fraction_enclosure(ends[1])[1]
