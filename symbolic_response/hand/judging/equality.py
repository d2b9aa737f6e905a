"""Whether two expressions are the same function: yes, no, or not settled."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from math import lcm

from symbolic_response.errors import EvaluationError, SizeLimitError
from symbolic_response.expressions.enclosure import nonzero_somewhere
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.ring import (
    Domain,
    Generator,
    Poly,
    Polynomial,
    Ring,
    common_divisor,
    key_of,
    lift,
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
    add,
    children,
    negate,
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

    None where a normal form with functions is not zero, which proves nothing; exponentials of
    linear combinations of symbols, and roots of positive symbols, are independent of each other
    and do not count as functions here. Raises EvaluationError for a division by what is
    identically zero, SizeLimitError past a limit.

    >>> from symbolic_response.expressions.reader import read_expression as read
    >>> d = Domain(("a", "b"), frozenset({"a", "b"}))
    >>> [vanishes_exactly(read(x), d) for x in ("a/b - 1/(b/a)", "exp(a) - b", "ln(a) - ln(a + b)")]
    [True, False, None]
    """
    ring = _one_ring(node, domain)
    if ring is not None:
        return len(_Fractions(ring).of(node)[0]) == 0
    form = normal_form(node, domain)
    if form.is_zero():
        return True
    return None if any(g.kind != "symbol" for g in form.ring.generators) else False


# -- rational functions of symbols, their roots and exponentials: one ring for the whole tree ------


Name = tuple[str, str]
"""The kind of a generator, ``symbol`` or ``exp``, and the symbol behind it."""


def _name(generator: Generator) -> Name:
    assert isinstance(generator.base, Symbol)
    return generator.kind, generator.base.name


def _one_ring(node: Expression, domain: Domain) -> Ring | None:
    """Return a ring that holds all leaves; None where one is no power of a generator."""
    rings: list[Ring] = []
    roots: dict[Name, int] = {}
    stack = [node]
    while stack:
        part = stack.pop()
        if isinstance(part, Polynomial):
            if not all(g.kind in ("symbol", "exp") and isinstance(g.base, Symbol)
                       for g in part.ring.generators):
                return None
            rings.append(part.ring)
        elif (powers := _powers(part, domain.positive)) is not None:
            for power_of, exponent in powers.items():
                roots[power_of] = lcm(roots.get(power_of, 1), exponent.denominator)
        elif isinstance(part, Function) or (
            isinstance(part, Power) and part.exponent.denominator != 1
        ):
            return None
        else:
            stack.extend(children(part))
    for (kind, name), root in roots.items():
        base, rank = Symbol(name), domain.names.index(name)
        key = name if kind == "symbol" else key_of(base)
        positive = kind == "exp" or name in domain.positive
        rings.append(Ring([Generator(kind, rank, key, base, positive)], [root]))
    return union(rings)


def _powers(node: Expression, positive: frozenset[str]) -> dict[Name, Fraction] | None:
    """Return a leaf as a product of powers of generators, None where it is none."""
    match node:
        case Symbol(name):
            return {("symbol", name): Fraction(1)}
        case Power(Symbol(name), exponent) if exponent.denominator == 1 or name in positive:
            return {("symbol", name): exponent}
        case Function("exp", argument):
            found: dict[Name, Fraction] = {}
            for term in argument.terms if isinstance(argument, Sum) else (argument,):
                match term:
                    case Symbol(name):
                        factor = Fraction(1)
                    case Product((Number(factor), Symbol(name))):
                        pass
                    case _:
                        return None
                found["exp", name] = found.get(("exp", name), Fraction(0)) + factor
            return found
    return None


class _Fractions:
    """Numerators and denominators in a ring that holds all leaves, not in lowest terms."""

    def __init__(self, ring: Ring) -> None:
        self.ring, self.one = ring, ring.constant(1)
        self.places = {_name(generator): p for p, generator in enumerate(ring.generators)}
        self.names = frozenset(name for _, name in self.places)
        self.inverses: dict[Expression, tuple[Poly, Poly]] = {}  # sums occur below again and again

    def of(self, node: Expression) -> tuple[Poly, Poly]:
        """Return numerator and denominator of a tree."""
        ring = self.ring
        match node:
            case Number(value):
                return ring.constant(value.numerator), ring.constant(value.denominator)
            case Symbol(name):
                place = self.places["symbol", name]
                return ring.context.gen(place) ** ring.roots[place], self.one
            case Polynomial():
                return lift(node.poly, node.ring, ring), self.one
            case Sum(terms):
                return _sum([self.of(term) for term in terms], ring)
            case Product(factors):
                pairs = [self.of(factor) for factor in factors]
                return (product_of([(top, 1) for top, _ in pairs], ring),
                        product_of([(bottom, 1) for _, bottom in pairs], ring))
            case Power(base, exponent) if not isinstance(base, Symbol):
                return self._power(node, base, exponent)
        return self._monomials(node)

    def _power(self, node: Expression, base: Expression, exponent: Fraction) -> tuple[Poly, Poly]:
        if node not in self.inverses:
            top, bottom = self.of(base)
            if exponent < 0:
                top, bottom = bottom, top
            if len(bottom) == 0:
                raise EvaluationError("division by an expression that is identically zero")
            size = abs(exponent.numerator)
            self.inverses[node] = (product_of([(top, size)], self.ring),
                                   product_of([(bottom, size)], self.ring))
        return self.inverses[node]

    def _monomials(self, node: Expression) -> tuple[Poly, Poly]:
        powers = _powers(node, self.names)  # which roots may be taken: asked for the ring
        assert powers is not None
        steps = [0] * len(self.ring.generators)
        for name, exponent in powers.items():
            steps[self.places[name]] += int(exponent * self.ring.roots[self.places[name]])
        return (self.ring.monomial([max(step, 0) for step in steps]),
                self.ring.monomial([max(-step, 0) for step in steps]))


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
