"""One polynomial in a short nested form."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from symbolic_response.algebra.compact.build import Builder, require_equal
from symbolic_response.algebra.compact.expansion import Quotient
from symbolic_response.algebra.compact.kernels import Search
from symbolic_response.algebra.compact.measure import (
    Width,
    default_width,
    floored,
    generator_width,
)
from symbolic_response.algebra.compact.nested import Sizes, Term
from symbolic_response.algebra.compact.packed import Packing, Terms
from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.ring import Poly, Polynomial, Ring, factors_of
from symbolic_response.expressions.tree import ZERO, Expression, rebuild

MAX_TERMS = 5_000
MAX_DEGREE = 1_000


def factored(poly: Poly, ring: Ring, width: Width = default_width) -> Expression:
    """Return a polynomial as nested sums and products of the ring's generators, as short as found.

    Exact factors first, then kernel division; the result is multiplied out again and compared with
    the polynomial before it is returned. ``width``: the printed characters of a symbol, which count
    as 3 at least.
    SizeLimitError past 5,000 terms or a degree above 1,000 in one generator.

    >>> from symbolic_response.expressions.ring import symbol_ring, union, Domain
    >>> from symbolic_response.expressions.text import expression_text
    >>> domain = Domain(("a", "b", "c"), frozenset("abc"))
    >>> ring = union(symbol_ring(name, domain) for name in domain.names)
    >>> a, b, c = ring.context.gens()
    >>> print(expression_text(factored(a*b + a*c - b**2*c, ring, len)))
    a*(b + c) - b**2*c
    """
    return factored_with_leaves(poly, ring, width)[0]


def compacted(node: Expression, width: Width = default_width) -> Expression:
    """Return an expression with every polynomial leaf in its short form; see ``factored``.

    >>> from symbolic_response.expressions.ring import Polynomial, Domain, symbol_ring, union
    >>> from symbolic_response.expressions.text import expression_text
    >>> from symbolic_response.expressions.tree import Symbol, divide
    >>> ring = union(symbol_ring(name, Domain(tuple("abc"), frozenset())) for name in "abc")
    >>> a, b, c = ring.context.gens()
    >>> print(expression_text(compacted(divide(Symbol("x"), Polynomial(ring, a*b + a*c)), len)))
    x/(a*(b + c))
    """

    def leaf(part: Expression) -> Expression:
        return factored(part.poly, part.ring, width) if isinstance(part, Polynomial) else part

    return rebuild(node, leaf)


def factored_with_leaves(
    poly: Poly, ring: Ring, width: Width
) -> tuple[Expression, dict[Expression, Quotient]]:
    """Return the short form, and what each of its leaves (powers of generators) stands for."""
    if not len(poly):
        return ZERO, {}
    packing, sizes = prepared([poly], ring, width)
    builder = Builder(packing)
    form = builder.expression(short_terms(Search(packing, sizes), source(packing, poly)))
    require_equal(form, poly, builder.leaves, ring, "a polynomial")
    return form, builder.leaves


def prepared(polys: Iterable[Poly], ring: Ring, width: Width) -> tuple[Packing, Sizes]:
    """Return how the monomials of polynomials are packed and measured; SizeLimitError."""
    degree = 1
    for poly in polys:
        if len(poly) > MAX_TERMS:
            raise SizeLimitError(f"a sum of {len(poly)} terms is too long for a compact form, which"
                                 f" is made of up to {MAX_TERMS}")
        degree = max([degree, *map(int, poly.degrees())]) if len(poly) else degree
    if degree > MAX_DEGREE:
        raise SizeLimitError(f"a power of {degree} is too high for a compact form, which is made of"
                             f" powers up to {MAX_DEGREE}")
    packing = Packing(ring, degree)
    wide = floored(width)
    widths = tuple(generator_width(generator, wide) for generator in ring.generators)
    return packing, Sizes(widths, packing.bits)


@dataclass(frozen=True, slots=True)
class Source:
    """A polynomial packed: all its terms, and its exact factors."""

    terms: Terms
    content: int
    factors: tuple[tuple[Terms, int], ...]


def source(packing: Packing, poly: Poly) -> Source:
    """Return a polynomial as a search takes it."""
    content, factors = factors_of(poly) if len(poly) > 1 else (1, [])
    packed = tuple((packing.pack(piece), exponent) for piece, exponent in factors)
    return Source(packing.pack(poly), content, packed)


def short_terms(search: Search, poly: Source) -> tuple[Term, ...]:
    """Return a non-zero polynomial as terms, a product of its exact factors if it has some."""
    product = search.product(poly.content, poly.factors)
    return search.terms(poly.terms) if product is None else search.shorter(product, poly.terms)
