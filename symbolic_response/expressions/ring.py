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
from dataclasses import dataclass, field
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
    children,
    function,
    multiply,
    number,
    power,
    rebuild,
    walk,
)

Poly = flint.fmpz_mpoly
MAX_PRODUCTS = 4_000_000
MAX_COEFFICIENT_BITS = 1_000_000
MAX_GENERATORS = 1_000
MAX_EXPONENTS = 5_000_000
MAX_PARTS = 20_000
MAX_DIVISOR_DEGREE = 10_000
MAX_DIVISOR_TERMS = 30_000
MAX_FACTORED_TERMS = 300
MAX_FACTORED_DEGREE = 128
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
    taken of; ``relation`` is the latter as a polynomial, None where it is not one. ``kind`` and
    ``key`` alone say which generator it is; ``rank`` orders generators of a kind. ``positive`` says
    that it is certainly positive; a root that is not so marked is still never negative.
    """

    kind: str
    rank: int = field(compare=False)
    key: str
    base: Expression = field(compare=False)
    positive: bool = field(compare=False)
    relation: Polynomial | None = field(default=None, compare=False)

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
    """Return the smallest ring that contains all the given ones.

    SizeLimitError where it has more than 1,000 generators.
    """
    distinct = list(dict.fromkeys(rings))
    if not distinct:
        return EMPTY_RING
    if len(distinct) == 1:
        return distinct[0]
    roots: dict[Generator, int] = {}
    for ring in distinct:
        for generator, root in zip(ring.generators, ring.roots, strict=True):
            roots[generator] = lcm(roots.get(generator, 1), root)
        if len(roots) > MAX_GENERATORS:
            raise SizeLimitError(
                f"more than {MAX_GENERATORS} different symbols, exponentials, logarithms and roots"
            )
    ordered = sorted(roots, key=Generator.order)
    return Ring(ordered, [roots[generator] for generator in ordered])


def lift(poly: Poly, source: Ring, target: Ring) -> Poly:
    """Return ``poly`` of ``source`` as an element of ``target``, which must contain it.

    SizeLimitError past five million exponents.
    """
    if source == target:
        return poly
    if len(poly) * len(target.generators) > MAX_EXPONENTS:
        raise SizeLimitError(
            f"a sum of {len(poly)} terms in {len(target.generators)} symbols and functions"
            " is too long to be combined with others"
        )
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
    """Return the expanded product of powers; SizeLimitError past ``limit`` term products.

    Term products count more in rings of many generators and where coefficients grow long.
    """
    result, spent, weight = ring.constant(1), 0, 1 + len(ring.generators) // 64
    for poly, exponent in sorted(factors, key=lambda pair: len(pair[0])):
        if exponent > 1:
            weight += _bits_of_power(poly, exponent) // 512
        if len(poly) <= 1:
            result = result * poly**exponent
            continue
        for _ in range(exponent):
            spent += len(result) * len(poly) * weight
            if spent > limit:
                raise SizeLimitError(f"expanding a product needs more than {limit} term products")
            result = result * poly
    return result


def _bits_of_power(poly: Poly, exponent: int) -> int:
    longest = max((abs(int(c)).bit_length() for c in poly.coeffs()), default=0)
    bits = 0 if longest <= 1 else longest * exponent
    if bits > MAX_COEFFICIENT_BITS:
        raise SizeLimitError(f"a coefficient is longer than {MAX_COEFFICIENT_BITS} bits")
    return bits


def common_divisor(left: Poly, right: Poly) -> Poly:
    """Return the greatest common divisor.

    For sums of more than 30,000 terms or of a degree above 10,000 only the monomial that divides
    every term is found: a quotient reduced by it is right, though perhaps not in lowest terms.
    """
    if len(left) > 1 and len(right) > 1 and _too_large_to_divide(left, right):
        return left.term_content().gcd(right.term_content())
    return left.gcd(right)


def _too_large_to_divide(left: Poly, right: Poly) -> bool:
    # FLINT answers 0, or runs out of memory, where exponents are huge
    return len(left) + len(right) > MAX_DIVISOR_TERMS or (
        max(*left.degrees(), *right.degrees()) > MAX_DIVISOR_DEGREE
    )


def factors_of(poly: Poly) -> tuple[int, list[tuple[Poly, int]]]:
    """Return content and factors: irreducible ones while that is quick, else the primitive part.

    Past 300 terms, or degrees that add up to more than 128, a sum is left as it is.
    """
    if len(poly) <= MAX_FACTORED_TERMS and sum(poly.degrees()) <= MAX_FACTORED_DEGREE:
        lead, pieces = poly.factor()
        return int(lead), [(piece, int(exponent)) for piece, exponent in pieces]
    content = int(poly.primitive()[0])
    return content, [(poly // content, 1)]


def key_of(base: Expression) -> str:
    """Return a key that tells expressions apart; SizeLimitError past 20,000 parts."""
    if _parts(base, {}) > MAX_PARTS:
        raise SizeLimitError(
            f"more than {MAX_PARTS} parts under a root, an exponential or a logarithm"
        )
    return repr(base)


def _parts(node: Expression, known: dict[int, int]) -> int:
    """Count the parts of a tree, each shared one counted wherever it occurs but visited once."""
    if id(node) not in known:
        known[id(node)] = 1 + sum(_parts(part, known) for part in children(node))
    return known[id(node)]


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
