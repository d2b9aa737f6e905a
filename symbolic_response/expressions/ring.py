"""Polynomial rings over symbols, exponentials, logarithms, roots and rates, on FLINT.

A ring is a tuple of generators, each with a root index L: the ring's variable is the generator to
the power 1/L, so that ``exp(F/2)`` and ``sqrt(c)`` are ordinary monomials. Rings are values; two
polynomials over different rings are lifted to the union of both.

Generators of kind ``root`` carry a relation (the L-th power of the variable is ``base``); all the
others are treated as independent. Hence a polynomial that reduces to zero here *is* zero, while
one that does not is known to differ only once an enclosure excludes zero.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import reduce
from math import lcm

import flint

from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.tree import (
    ONE,
    Expression,
    Symbol,
    add,
    function,
    multiply,
    number,
    power,
    rebuild,
    walk,
)

Poly = flint.fmpz_mpoly
MAX_PRODUCTS = 4_000_000
KINDS = ("symbol", "exp", "ln", "root", "rate")


@dataclass(frozen=True, slots=True)
class Domain:
    """The symbols an expression may contain, in the order of the file, and which are positive."""

    names: tuple[str, ...]
    positive: frozenset[str]


@dataclass(frozen=True, slots=True)
class Generator:
    """What one variable of a ring stands for.

    ``base`` is the symbol itself, the argument of the exponential or logarithm, or what a root is
    taken of; ``relation`` is the latter as a polynomial, None where it is not one. ``rank`` orders
    generators of a kind; ``key`` is unique within the kind.
    """

    kind: str
    rank: int
    key: str
    base: Expression
    positive: bool
    relation: Polynomial | None = None

    def order(self) -> tuple[int, int, str]:
        """Return the canonical sort key."""
        return KINDS.index(self.kind), self.rank, self.key

    def expression(self, exponent: Fraction) -> Expression:
        """Return the generator to a rational power as a tree."""
        if self.kind == "exp":
            return function("exp", multiply([number(exponent), self.base]))
        if self.kind == "ln":
            return power(function("ln", self.base), exponent)
        return power(self.base, exponent)


class Ring:
    """A polynomial ring over the integers in the given generators, in canonical order."""

    __slots__ = ("context", "generators", "index", "roots")

    def __init__(self, generators: Iterable[Generator], roots: Iterable[int]) -> None:
        self.generators = tuple(generators)
        self.roots = tuple(roots)
        self.index = {generator: place for place, generator in enumerate(self.generators)}
        names = [f"{generator.kind}:{generator.key}" for generator in self.generators]
        self.context = flint.fmpz_mpoly_ctx.get(names, "lex")

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Ring):
            return NotImplemented
        return self is other or (
            self.roots == other.roots and self.generators == other.generators
        )

    def __hash__(self) -> int:
        return hash((self.generators, self.roots))

    def constant(self, value: int) -> Poly:
        """Return an integer as a polynomial of this ring."""
        return self.context.constant(value)

    def monomial(self, exponents: Sequence[int]) -> Poly:
        """Return the monomial with the given exponents of the ring's variables."""
        return self.context.from_dict({tuple(exponents): 1})

    def powers(self, exponents: Sequence[int]) -> list[tuple[Generator, Fraction]]:
        """Return the generators that occur in a monomial with their rational exponents."""
        return [
            (generator, Fraction(int(exponent), root))
            for generator, root, exponent in zip(
                self.generators, self.roots, exponents, strict=True
            )
            if exponent
        ]


EMPTY_RING = Ring((), ())


def union(rings: Iterable[Ring]) -> Ring:
    """Return the smallest ring that contains all the given ones."""
    distinct = list(dict.fromkeys(rings))
    if not distinct:
        return EMPTY_RING
    if len(distinct) == 1:
        return distinct[0]
    roots: dict[Generator, int] = {}
    for ring in distinct:
        for generator, root in zip(ring.generators, ring.roots, strict=True):
            roots[generator] = lcm(roots.get(generator, 1), root)
    ordered = sorted(roots, key=Generator.order)
    return Ring(ordered, [roots[generator] for generator in ordered])


def lift(poly: Poly, source: Ring, target: Ring) -> Poly:
    """Return ``poly`` of ``source`` as an element of ``target``, which must contain it."""
    if source == target:
        return poly
    lifted = poly.project_to_context(target.context)
    factors = [1] * len(target.generators)
    for generator, root in zip(source.generators, source.roots, strict=True):
        place = target.index[generator]
        factors[place] = target.roots[place] // root
    return lifted if max(factors, default=1) == 1 else lifted.inflate(factors)


def lift_exponents(exponents: Sequence[int], source: Ring, target: Ring) -> tuple[int, ...]:
    """Return the exponents (of any sign) of a monomial of ``source`` in ``target``."""
    if source == target:
        return tuple(exponents)
    lifted = [0] * len(target.generators)
    for generator, root, exponent in zip(source.generators, source.roots, exponents, strict=True):
        place = target.index[generator]
        lifted[place] = exponent * (target.roots[place] // root)
    return tuple(lifted)


@dataclass(frozen=True, slots=True, eq=False)
class Polynomial(Expression):
    """A polynomial of a ring as a leaf of an expression tree."""

    ring: Ring
    poly: Poly

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Polynomial):
            return NotImplemented
        return self.ring == other.ring and bool(self.poly == other.poly)

    def __hash__(self) -> int:
        return hash((len(self.poly), tuple(self.poly.degrees())))


def product_of(factors: Sequence[tuple[Poly, int]], ring: Ring, limit: int = MAX_PRODUCTS) -> Poly:
    """Return the expanded product of powers; SizeLimitError past ``limit`` term products."""
    result = ring.constant(1)
    for poly, exponent in sorted(factors, key=lambda pair: len(pair[0])):
        for _ in range(exponent):
            if len(result) * len(poly) > limit:
                raise SizeLimitError(
                    f"expanding a product needs more than {limit} term products"
                )
            result = result * poly
    return result


def monomial_content(poly: Poly) -> tuple[int, ...]:
    """Return the exponents of the largest monomial that divides a non-zero polynomial."""
    return tuple(int(exponent) for exponent in poly.term_content().monoms()[0])


def expression_of(ring: Ring, poly: Poly) -> Expression:
    """Return a polynomial as a plain tree of symbols, exponentials, logarithms and roots."""
    terms = [
        multiply([number(int(coefficient)), monomial_expression(ring, exponents)])
        for exponents, coefficient in poly.terms()
    ]
    return add(terms)


def monomial_expression(ring: Ring, exponents: Sequence[int]) -> Expression:
    """Return a monomial (exponents of any sign) as a tree, its exponentials gathered in one."""
    plain, argument = [], []
    for generator, exponent in ring.powers(exponents):
        if generator.kind == "exp":
            argument.append(multiply([number(exponent), generator.base]))
        else:
            plain.append(generator.expression(exponent))
    if argument:
        plain.append(function("exp", add(argument)))
    return multiply(plain) if plain else ONE


def plain(node: Expression) -> Expression:
    """Return a tree with every polynomial leaf written out as a sum."""

    def leaf(part: Expression) -> Expression:
        return expression_of(part.ring, part.poly) if isinstance(part, Polynomial) else part

    return rebuild(node, leaf)


def all_symbols(node: Expression) -> frozenset[str]:
    """Return the names of all symbols in a tree, those inside polynomial leaves included."""
    found: set[str] = set()
    for part in walk(node):
        if isinstance(part, Symbol):
            found.add(part.name)
        elif isinstance(part, Polynomial):
            for generator in part.ring.generators:
                found |= all_symbols(generator.base)
    return frozenset(found)


def symbol_ring(name: str, domain: Domain) -> Ring:
    """Return the ring in one symbol."""
    rank = domain.names.index(name)
    return Ring([Generator("symbol", rank, name, Symbol(name), name in domain.positive)], [1])


def common_denominator(values: Iterable[Fraction]) -> int:
    """Return the least common multiple of the denominators."""
    return reduce(lcm, (value.denominator for value in values), 1)
