"""A form as the quotient of two polynomials, as it is written: nothing is cancelled.

Only where fractions with different denominators are added, these are brought over their least
common multiple.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from math import lcm
from operator import add

from symbolic_response.errors import EvaluationError
from symbolic_response.expressions.normal_form import Quotient, normal_form
from symbolic_response.expressions.ring import (
    Domain,
    Poly,
    Polynomial,
    Ring,
    common_divisor,
    lift,
    lift_exponents,
    monomial_expression,
    product_of,
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
    multiply,
    number,
)

MAX_TERM_PRODUCTS = 400_000

Monomial = tuple[int, ...]
Terms = dict[Monomial, Fraction]
"""A sum of terms over a ring: the coefficients by exponents, which may be negative."""


@dataclass(frozen=True, slots=True)
class Side:
    """A sum of terms with exponents of any sign: ``scale`` times the monomial of exponents
    ``shift`` times ``poly``."""

    poly: Poly
    shift: Monomial
    scale: Fraction

    def terms(self) -> Terms:
        """Return the terms one by one."""
        found = {tuple(int(e) for e in exponents): Fraction(int(coefficient))
                 for exponents, coefficient in self.poly.terms()}
        return scaled(found, self.shift, self.scale)

    def over(self, source: Ring, ring: Ring) -> Side:
        """Return the same over a larger ring."""
        return Side(lift(self.poly, source, ring), lift_exponents(self.shift, source, ring),
                    self.scale)


@dataclass(frozen=True, slots=True)
class Written:
    """``top / bottom`` over one ring."""

    ring: Ring
    top: Side
    bottom: Side

    def reduced(self) -> Written:
        """Return the quotient without common factors, itself where there are none but monomials."""
        common = common_divisor(self.top.poly, self.bottom.poly)
        if len(common) == 1:
            return self
        return Written(self.ring, replace(self.top, poly=self.top.poly // common),
                       replace(self.bottom, poly=self.bottom.poly // common))

    def over(self, ring: Ring) -> Written:
        """Return the quotient over a larger ring."""
        return Written(ring, self.top.over(self.ring, ring), self.bottom.over(self.ring, ring))


def written(node: Expression, domain: Domain) -> Written:
    """Return an expression in symbols as a quotient of sums of terms.

    Raises EvaluationError for a division by zero, SizeLimitError past a limit.

    >>> from symbolic_response.expressions.reader import read_expression
    >>> form = written(read_expression("1/(1 + c/b)"), Domain(("b", "c"), frozenset("bc")))
    >>> list(form.top.terms()), list(form.bottom.terms())
    ([(0, 0)], [(0, 0), (-1, 1)])
    """
    forms: dict[Expression, Quotient] = {}
    _collect(node, forms, domain)
    ring = union(form.ring for form in forms.values())
    one = Side(ring.constant(1), (0,) * len(ring.generators), Fraction(1))
    leaves = {}
    for leaf, form in forms.items():
        top, bottom = (replace(one, poly=lift(side, form.ring, ring))
                       for side in (form.numerator, form.denominator))
        leaves[leaf] = _divided(top, bottom, one)
    return Written(ring, *_fraction(node, _Leaves(ring, one, leaves)))


@dataclass(frozen=True, slots=True)
class _Leaves:
    """What leaves stand for, over one ring; ``one``: the number 1."""

    ring: Ring
    one: Side
    forms: Mapping[Expression, tuple[Side, Side]]


def _is_leaf(node: Expression) -> bool:
    return isinstance(node, Symbol | Function | Polynomial) or (
        isinstance(node, Power) and node.exponent.denominator != 1)


def _collect(node: Expression, forms: dict[Expression, Quotient], domain: Domain) -> None:
    stack = [node]
    while stack:
        part = stack.pop()
        match part:
            case _ if _is_leaf(part):
                if part not in forms:
                    forms[part] = normal_form(part, domain)
            case Sum(parts) | Product(parts):
                stack.extend(parts)
            case Power(base, _):
                stack.append(base)


def _fraction(node: Expression, leaves: _Leaves) -> tuple[Side, Side]:
    one = leaves.one
    match node:
        case Number(value):
            return replace(one, poly=one.poly * int(value != 0), scale=value or Fraction(1)), one
        case Sum(terms):
            return _sum([_fraction(term, leaves) for term in terms], leaves)
        case Product(factors):
            top, bottom = one, one
            for factor in factors:
                above, below = _fraction(factor, leaves)
                top, bottom = _product(top, above, leaves), _product(bottom, below, leaves)
            return top, bottom
        case Power(base, exponent) if exponent.denominator == 1:
            above, below = _fraction(base, leaves)
            top, bottom = one, one
            for _ in range(abs(exponent.numerator)):
                top, bottom = _product(top, above, leaves), _product(bottom, below, leaves)
            return (top, bottom) if exponent > 0 else _divided(bottom, top, one)
    return leaves.forms[node]


def _divided(top: Side, bottom: Side, one: Side) -> tuple[Side, Side]:
    """Return a quotient of two sums; a denominator of one term goes up."""
    if len(bottom.poly) == 0:
        raise EvaluationError("division by an expression that is identically zero")
    if len(bottom.poly) > 1:
        return top, bottom
    (exponents, coefficient), = bottom.terms().items()
    shift = tuple(a - b for a, b in zip(top.shift, exponents, strict=True))
    return Side(top.poly, shift, top.scale / coefficient), one


def _product(left: Side, right: Side, leaves: _Leaves) -> Side:
    poly = product_of([(left.poly, 1), (right.poly, 1)], leaves.ring, MAX_TERM_PRODUCTS)
    return Side(poly, tuple(a + b for a, b in zip(left.shift, right.shift, strict=True)),
                left.scale * right.scale)


def _sum(pairs: Sequence[tuple[Side, Side]], leaves: _Leaves) -> tuple[Side, Side]:
    if all(bottom == pairs[0][1] for _, bottom in pairs):
        return _added([top for top, _ in pairs], leaves.ring), pairs[0][1]
    total, below = _bare(*pairs[0])
    for top, bottom in (_bare(*pair) for pair in pairs[1:]):
        common = common_divisor(below, bottom)
        left, right = bottom // common, below // common
        ones = leaves.one
        total = _added([_product(total, replace(ones, poly=left), leaves),
                        _product(top, replace(ones, poly=right), leaves)], leaves.ring)
        below = product_of([(below, 1), (left, 1)], leaves.ring, MAX_TERM_PRODUCTS)
    return total, replace(leaves.one, poly=below)


def _bare(top: Side, bottom: Side) -> tuple[Side, Poly]:
    """Return a quotient with its denominator a plain polynomial."""
    shift = tuple(a - b for a, b in zip(top.shift, bottom.shift, strict=True))
    return Side(top.poly, shift, top.scale / bottom.scale), bottom.poly


def _added(sides: Sequence[Side], ring: Ring) -> Side:
    lowest = tuple(min(column) for column in zip(*(side.shift for side in sides), strict=True))
    scale = lcm(*(side.scale.denominator for side in sides))
    total = ring.constant(0)
    for side in sides:
        steps = [a - b for a, b in zip(side.shift, lowest, strict=True)]
        total = total + side.poly * ring.monomial(steps) * int(side.scale * scale)
    return Side(total, lowest, Fraction(1, scale))


# -- sums of terms ---------------------------------------------------------------------------------


def product_of_terms(left: Terms, right: Terms) -> Terms:
    """Return the product of two sums."""
    found: Terms = {}
    for one, a in left.items():
        for other, b in right.items():
            key = tuple(x + y for x, y in zip(one, other, strict=True))
            found[key] = found.get(key, Fraction(0)) + a * b
    return found


def sum_of_terms(sums: Iterable[Terms]) -> Terms:
    """Return the sum of sums; terms that cancel are left out."""
    found: Terms = {}
    for terms in sums:
        for key, coefficient in terms.items():
            found[key] = found.get(key, Fraction(0)) + coefficient
    return {key: coefficient for key, coefficient in found.items() if coefficient}


def scaled(terms: Terms, shift: Monomial, factor: Fraction) -> Terms:
    """Return the terms times a monomial."""
    if factor == 1 and not any(shift):
        return dict(terms)
    return {tuple(map(add, key, shift)): coefficient * factor
            for key, coefficient in terms.items()}


def term_expression(ring: Ring, exponents: Monomial, coefficient: Fraction) -> Expression:
    """Return one term as a tree."""
    return multiply([number(coefficient), monomial_expression(ring, exponents)])
