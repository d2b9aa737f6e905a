"""Normal form: a quotient of two coprime polynomials over symbols and exponential generators.

Rational arithmetic, exponentials, logarithms and rational powers of what is certainly
positive are brought to independent generators (``exp(a + b/2)`` is a product of powers of
``exp(a)`` and ``exp(b)``; ``ln(6*c)`` is ``ln(2) + ln(3) + ln(c)``); what is left over stays
as it is. A normal form of zero proves that the expression is zero.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

import flint

from symbolic_response.errors import EvaluationError
from symbolic_response.expressions.ring import (
    EMPTY_RING,
    Domain,
    Generator,
    Poly,
    Polynomial,
    Ring,
    common_divisor,
    expression_of,
    factors_of,
    key_of,
    lift,
    monomial_content,
    product_of,
    symbol_ring,
    union,
)
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    divide,
    multiply,
    number,
)

MAX_FACTORED_BITS = 128
MAX_TRIAL_PRIMES = 1_000


@dataclass(frozen=True, slots=True, eq=False)
class Quotient:
    """``numerator / denominator`` over one ring, coprime, the denominator's lead positive."""

    ring: Ring
    numerator: Poly
    denominator: Poly

    def is_zero(self) -> bool:
        """Return whether the normal form is zero, which proves the expression to be zero."""
        return len(self.numerator) == 0

    def as_fraction(self) -> Fraction | None:
        """Return the value if it is a rational constant, else None."""
        if self.is_zero():
            return Fraction(0)
        top, bottom = self.numerator.terms(), self.denominator.terms()
        if len(self.numerator) != len(self.denominator):
            return None
        ratios = set()
        for (high, a), (low, b) in zip(top, bottom, strict=True):
            if high != low:
                return None
            ratios.add(Fraction(int(a), int(b)))
        return ratios.pop() if len(ratios) == 1 else None

    def expression(self) -> Expression:
        """Return the quotient as a plain tree."""
        return divide(
            expression_of(self.ring, self.numerator), expression_of(self.ring, self.denominator)
        )


def constant(value: Fraction) -> Quotient:
    """Return a rational number as a normal form."""
    return Quotient(
        EMPTY_RING,
        EMPTY_RING.constant(value.numerator),
        EMPTY_RING.constant(value.denominator),
    )


def quotient(ring: Ring, numerator: Poly, denominator: Poly) -> Quotient:
    """Return the reduced quotient; EvaluationError if the denominator is zero."""
    ring, (numerator, denominator) = reduce_roots([numerator, denominator], ring)
    if len(denominator) == 0:
        raise EvaluationError("division by an expression that is identically zero")
    common = common_divisor(numerator, denominator)
    if not common.is_one():
        numerator, denominator = numerator // common, denominator // common
    if denominator.leading_coefficient() < 0:
        numerator, denominator = -numerator, -denominator
    return Quotient(ring, numerator, denominator)


def normal_form(node: Expression, domain: Domain) -> Quotient:
    """Return the normal form of an expression in the symbols of ``domain``.

    Raises EvaluationError for a division by what is identically zero, and SizeLimitError where
    expanding would need more than four million term products.

    >>> from symbolic_response.expressions.reader import read_expression
    >>> d = Domain(("a", "b"), frozenset({"a", "b"}))
    >>> normal_form(read_expression("exp(a+b)/exp(a) - exp(b/2)**2"), d).is_zero()
    True
    """
    match node:
        case Number(value):
            return constant(value)
        case Symbol(name):
            ring = symbol_ring(name, domain)
            return Quotient(ring, ring.context.gen(0), ring.constant(1))
        case Polynomial():
            return quotient(node.ring, node.poly, node.ring.constant(1))
        case Sum(terms):
            return sum_of([normal_form(term, domain) for term in terms])
        case Product(factors):
            return times([normal_form(factor, domain) for factor in factors])
        case Power(base, exponent) if exponent.denominator == 1:
            return integer_power(normal_form(base, domain), exponent.numerator)
        case Power(base, exponent):
            return rational_power(normal_form(base, domain), exponent, domain)
        case Function("exp", argument):
            return exponential(normal_form(argument, domain), domain)
        case Function(_, argument):
            return logarithm(normal_form(argument, domain), domain)
    raise TypeError(f"no normal form for {type(node).__name__}")


def _lifted(values: Sequence[Quotient]) -> tuple[Ring, list[tuple[Poly, Poly]]]:
    ring = union(value.ring for value in values)
    return ring, [
        (lift(value.numerator, value.ring, ring), lift(value.denominator, value.ring, ring))
        for value in values
    ]


def sum_of(values: Sequence[Quotient]) -> Quotient:
    """Return the sum of normal forms."""
    ring, pairs = _lifted(values)
    gathered: list[tuple[Poly, Poly]] = []
    for top, bottom in pairs:
        for place, (other_top, other_bottom) in enumerate(gathered):
            if other_bottom == bottom:
                gathered[place] = (other_top + top, bottom)
                break
        else:
            gathered.append((top, bottom))
    total, below = gathered[0]
    for top, bottom in gathered[1:]:
        common = common_divisor(below, bottom)
        left, right = bottom // common, below // common
        total = product_of([(total, 1), (left, 1)], ring) + product_of([(top, 1), (right, 1)], ring)
        below = product_of([(below, 1), (left, 1)], ring)
    return quotient(ring, total, below)


def times(values: Sequence[Quotient]) -> Quotient:
    """Return the product of normal forms."""
    ring, pairs = _lifted(values)
    return quotient(
        ring,
        product_of([(top, 1) for top, _ in pairs], ring),
        product_of([(bottom, 1) for _, bottom in pairs], ring),
    )


def integer_power(value: Quotient, exponent: int) -> Quotient:
    """Return an integer power; EvaluationError for 0 to a negative power."""
    top, bottom = value.numerator, value.denominator
    if exponent < 0:
        top, bottom = bottom, top
    size = abs(exponent)
    return quotient(
        value.ring,
        product_of([(top, size)], value.ring),
        product_of([(bottom, size)], value.ring),
    )


# -- roots and logarithms ----------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class PositiveFactor:
    """A generator that is positive, or a root and not negative, to a rational power."""

    generator: Generator
    exponent: Fraction


def positive_factors(value: Quotient, domain: Domain) -> list[PositiveFactor] | None:
    """Return the factors of a normal form that is certainly nowhere negative, else None.

    Each is nowhere negative itself, so that roots and logarithms may be taken one by one.
    """
    if value.is_zero():
        return None
    top = _poly_factors(value.numerator, value.ring, domain)
    bottom = _poly_factors(value.denominator, value.ring, domain)
    if top is None or bottom is None:
        return None
    return top + [PositiveFactor(f.generator, -f.exponent) for f in bottom]


def _poly_factors(poly: Poly, ring: Ring, domain: Domain) -> list[PositiveFactor] | None:
    if len(poly) == 0 or any(coefficient < 0 for coefficient in poly.coeffs()):
        return None
    used = [bool(degree) for degree in poly.degrees()]
    occurring = [g for g, u in zip(ring.generators, used, strict=True) if u]
    if not all(g.positive or g.kind == "root" for g in occurring):
        return None
    exponents = monomial_content(poly)
    content = int(poly.primitive()[0])
    factors = [PositiveFactor(g, e) for g, e in ring.powers(exponents)]
    factors += [
        PositiveFactor(_root_of(EMPTY_RING, EMPTY_RING.constant(prime)), Fraction(e))
        for prime, e in _prime_powers(content)
    ]
    rest = poly // (ring.monomial(exponents) * content)
    if rest.is_one():
        return factors
    _, pieces = factors_of(rest)
    if any(coefficient < 0 for piece, _ in pieces for coefficient in piece.coeffs()):
        pieces = [(rest, 1)]
    for piece, exponent in pieces:
        factors.append(PositiveFactor(_root_of(ring, piece), Fraction(exponent)))
    return factors


def _prime_powers(value: int) -> list[tuple[int, int]]:
    limit = MAX_TRIAL_PRIMES if value.bit_length() > MAX_FACTORED_BITS else None
    return [(int(prime), int(e)) for prime, e in flint.fmpz(value).factor(limit)]


def _root_of(ring: Ring, poly: Poly) -> Generator:
    base = expression_of(ring, poly)
    positive = all(coefficient > 0 for coefficient in poly.coeffs()) and any(
        all(generator.positive for generator, _ in ring.powers(exponents))
        for exponents in poly.monoms()
    )
    return Generator("root", 0, key_of(base), base, positive, Polynomial(ring, poly))


def _opaque_root(value: Quotient) -> Generator:
    if value.denominator.is_one():
        return _root_of(value.ring, value.numerator)
    base = value.expression()
    return Generator("root", 0, key_of(base), base, False)


def rational_power(value: Quotient, exponent: Fraction, domain: Domain) -> Quotient:
    """Return a fractional power; what is not certainly positive is left under one root."""
    if value.is_zero():
        if exponent < 0:
            raise EvaluationError("division by an expression that is identically zero")
        return value
    factors = positive_factors(value, domain)
    if factors is None:
        known = value.as_fraction()
        if known is not None and known < 0:
            raise EvaluationError("a root of a negative number")
        factors = [PositiveFactor(_opaque_root(value), Fraction(1))]
    return monomial_quotient([PositiveFactor(f.generator, f.exponent * exponent) for f in factors],
                             domain)


def monomial_quotient(factors: Sequence[PositiveFactor], domain: Domain) -> Quotient:
    """Return a product of rational powers of generators as a normal form."""
    totals: dict[Generator, Fraction] = {}
    for factor in factors:
        totals[factor.generator] = totals.get(factor.generator, Fraction(0)) + factor.exponent
    whole: list[Quotient] = []
    fractional: dict[Generator, Fraction] = {}
    for generator, exponent in totals.items():
        if generator.kind == "root":
            steps = exponent.numerator // exponent.denominator
            if steps:
                whole.append(integer_power(normal_form(generator.base, domain), steps))
            exponent -= steps
        if exponent:
            fractional[generator] = exponent
    ordered = sorted(fractional, key=Generator.order)
    ring = Ring(ordered, [fractional[g].denominator for g in ordered])
    exponents = [fractional[g].numerator for g in ordered]
    top = ring.monomial([max(e, 0) for e in exponents])
    bottom = ring.monomial([max(-e, 0) for e in exponents])
    return times([Quotient(ring, top, bottom), *whole])


def reduce_roots(
    polys: Sequence[Poly], ring: Ring, *, lowest: int = 1
) -> tuple[Ring, list[Poly]]:
    """Return the polynomials with every power of a root variable brought below its index.

    Variables of an index below ``lowest`` are left alone: one of index 1 stands for a whole sum.
    """
    while True:
        place = _excessive_root(polys, ring, lowest)
        if place is None:
            return ring, list(polys)
        relation = ring.generators[place].relation
        assert relation is not None
        larger = union([ring, relation.ring])
        polys = [lift(poly, ring, larger) for poly in polys]
        place, ring = larger.index[ring.generators[place]], larger
        base = lift(relation.poly, relation.ring, ring)
        polys = [_reduce_root(poly, ring, place, base) for poly in polys]


def _excessive_root(polys: Sequence[Poly], ring: Ring, lowest: int) -> int | None:
    candidates = [p for p, g in enumerate(ring.generators)
                  if g.relation is not None and ring.roots[p] >= lowest]
    for place in candidates:
        if any(poly.degrees()[place] >= ring.roots[place] for poly in polys):
            return place
    return None


def _reduce_root(poly: Poly, ring: Ring, place: int, base: Poly) -> Poly:
    parts: dict[int, dict[tuple[int, ...], int | flint.fmpz]] = {}
    for exponents, coefficient in poly.terms():
        steps, rest = divmod(int(exponents[place]), ring.roots[place])
        reduced = (*exponents[:place], rest, *exponents[place + 1 :])
        parts.setdefault(steps, {})[reduced] = coefficient
    total = ring.constant(0)
    for steps, terms in parts.items():
        total = total + product_of([(ring.context.from_dict(terms), 1), (base, steps)], ring)
    return total


def exponential(value: Quotient, domain: Domain) -> Quotient:
    """Return exp of a normal form as a monomial in exponentials of its separate terms."""
    content = int(value.denominator.primitive()[0])
    below = value.denominator // content
    factors: list[PositiveFactor] = []
    for exponents, coefficient in value.numerator.terms():
        exponent = Fraction(int(coefficient), content)
        powers = value.ring.powers(exponents)
        if below.is_one() and len(powers) == 1 and powers[0][0].kind == "ln" and powers[0][1] == 1:
            logarithm_of = normal_form(powers[0][0].base, domain)
            factors += [
                PositiveFactor(f.generator, f.exponent * exponent)
                for f in positive_factors(logarithm_of, domain)
                or [PositiveFactor(_opaque_root(logarithm_of), Fraction(1))]
            ]
            continue
        term = quotient(value.ring, value.ring.monomial(exponents), below)
        argument = term.expression()
        generator = Generator("exp", _rank(argument, domain), key_of(argument), argument, True)
        factors.append(PositiveFactor(generator, exponent))
    return monomial_quotient(factors, domain)


def _rank(argument: Expression, domain: Domain) -> int:
    return domain.names.index(argument.name) if isinstance(argument, Symbol) else len(domain.names)


def logarithm(value: Quotient, domain: Domain) -> Quotient:
    """Return ln of a normal form as a sum of logarithms of its certainly positive factors."""
    known = value.as_fraction()
    if known is not None and known <= 0:
        raise EvaluationError("a logarithm of zero or of a negative number")
    factors = positive_factors(value, domain)
    if factors is None:
        return _logarithm_generator(value.expression())
    terms = [constant(Fraction(0))]
    for factor in factors:
        base = factor.generator.base
        if factor.generator.kind == "exp":
            inner = normal_form(base, domain)
        else:
            inner = _logarithm_generator(base)
        terms.append(times([constant(factor.exponent), inner]))
    return sum_of(terms)


def _logarithm_generator(base: Expression) -> Quotient:
    ring = Ring([Generator("ln", 0, key_of(base), base, False)], [1])
    return Quotient(ring, ring.context.gen(0), ring.constant(1))


def same_function(left: Expression, right: Expression, domain: Domain) -> bool:
    """Return whether the normal form proves two expressions equal (False proves nothing)."""
    return normal_form(Sum((left, multiply([number(-1), right]))), domain).is_zero()
