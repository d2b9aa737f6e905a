"""Whether two expressions are the same function: yes, no, or not settled."""

from __future__ import annotations

from collections.abc import Sequence

from symbolic_response.errors import EvaluationError, SizeLimitError
from symbolic_response.expressions.enclosure import nonzero_somewhere
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.ring import (
    Domain,
    Poly,
    Polynomial,
    Ring,
    common_divisor,
    lift,
    product_of,
    symbol_ring,
    union,
)
from symbolic_response.expressions.tree import (
    Expression,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    add,
    negate,
    walk,
)


def equal(left: Expression, right: Expression, domain: Domain) -> bool | None:
    """Return whether two expressions in the symbols of ``domain`` are the same function.

    True is proved by a normal form of zero, False by an enclosure of the difference that excludes
    zero at a point or, for rational functions of the symbols, by the normal form; None is neither.

    >>> from symbolic_response.expressions.reader import read_expression as read
    >>> d = Domain(("a", "b"), frozenset({"a", "b"}))
    >>> [equal(read(x), read("a/(a + b)"), d) for x in ("1 - b/(a + b)", "b/(a + b)")]
    [True, False]
    """
    difference = add([left, negate(right)])
    if nonzero_somewhere(difference):
        return False
    try:
        return vanishes_exactly(difference, domain)
    except (EvaluationError, SizeLimitError):
        return None


def vanishes_exactly(node: Expression, domain: Domain) -> bool | None:
    """Return whether an expression is zero by its normal form alone, no enclosure tried.

    None where a normal form with functions is not zero, which proves nothing. Raises
    EvaluationError for a division by what is identically zero, SizeLimitError past a limit.

    >>> from symbolic_response.expressions.reader import read_expression as read
    >>> d = Domain(("a", "b"), frozenset({"a", "b"}))
    >>> [vanishes_exactly(read(x), d) for x in ("a/b - 1/(b/a)", "a - b", "ln(a) - ln(a + b)")]
    [True, False, None]
    """
    if _is_rational(node):
        return len(_fraction(node, _ring_of(node, domain))[0]) == 0
    form = normal_form(node, domain)
    if form.is_zero():
        return True
    return None if any(g.kind != "symbol" for g in form.ring.generators) else False


# -- rational functions of the symbols: one ring for the whole tree ------------------------------


def _is_rational(node: Expression) -> bool:
    for part in walk(node):
        match part:
            case Number() | Symbol() | Sum() | Product():
                continue
            case Power(_, exponent) if exponent.denominator == 1:
                continue
            case Polynomial() if all(g.kind == "symbol" for g in part.ring.generators):
                continue
        return False
    return True


def _ring_of(node: Expression, domain: Domain) -> Ring:
    parts = list(walk(node))
    rings = [part.ring for part in parts if isinstance(part, Polynomial)]
    names = {part.name for part in parts if isinstance(part, Symbol)}
    return union([*rings, *(symbol_ring(name, domain) for name in sorted(names))])


def _fraction(node: Expression, ring: Ring) -> tuple[Poly, Poly]:
    """Return numerator and denominator in a ring that holds all symbols, not in lowest terms."""
    match node:
        case Number(value):
            return ring.constant(value.numerator), ring.constant(value.denominator)
        case Polynomial():
            return lift(node.poly, node.ring, ring), ring.constant(1)
        case Symbol(name):
            place = next(p for p, g in enumerate(ring.generators) if g.key == name)
            return _variable(ring, place), ring.constant(1)
        case Sum(terms):
            return _sum([_fraction(term, ring) for term in terms], ring)
        case Product(factors):
            pairs = [_fraction(factor, ring) for factor in factors]
            return (product_of([(top, 1) for top, _ in pairs], ring),
                    product_of([(bottom, 1) for _, bottom in pairs], ring))
        case Power(base, exponent):
            top, bottom = _fraction(base, ring)
            if exponent < 0:
                top, bottom = bottom, top
            if len(bottom) == 0:
                raise EvaluationError("division by an expression that is identically zero")
            size = abs(exponent.numerator)
            return product_of([(top, size)], ring), product_of([(bottom, size)], ring)
    raise TypeError(f"{type(node).__name__} in a rational function")


def _variable(ring: Ring, place: int) -> Poly:
    """Return the symbol itself, a power of the ring's variable where that is a root of it."""
    return ring.context.gen(place) ** ring.roots[place]


def _sum(pairs: Sequence[tuple[Poly, Poly]], ring: Ring) -> tuple[Poly, Poly]:
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
        shared = common_divisor(total, below)
        if len(total) and not shared.is_one():
            total, below = total // shared, below // shared
    return total, below
