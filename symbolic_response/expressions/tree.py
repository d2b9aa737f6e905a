"""The expression tree: immutable nodes, and the few constructors that keep them tidy.

Exact throughout: every number is a :class:`fractions.Fraction`, every exponent a constant one.
The constructors fold numbers and flatten sums and products; deciding whether two expressions are
the same function is the business of :mod:`symbolic_response.expressions.normal_form`.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.errors import EvaluationError, SizeLimitError

MAX_NUMBER_BITS = 100_000
MAX_DEPTH = 250
FUNCTIONS = ("exp", "ln")


class Expression:
    """Base of all nodes; compare with ``==``, which is equality of form, not of value."""

    __slots__ = ()


@dataclass(frozen=True, slots=True)
class Number(Expression):
    """An exact rational number."""

    value: Fraction

    def __repr__(self) -> str:
        if max(self.value.numerator.bit_length(), self.value.denominator.bit_length()) < 10_000:
            return f"Number(value={self.value!r})"
        # Python refuses to write longer ones in decimal digits
        return f"Number(value=Fraction({self.value.numerator:#x}, {self.value.denominator:#x}))"


@dataclass(frozen=True, slots=True)
class Symbol(Expression):
    """A symbol of the network file, by name."""

    name: str


@dataclass(frozen=True, slots=True)
class Sum(Expression):
    """The sum of two or more terms."""

    terms: tuple[Expression, ...]


@dataclass(frozen=True, slots=True)
class Product(Expression):
    """The product of two or more factors; a number, if any, comes first."""

    factors: tuple[Expression, ...]


@dataclass(frozen=True, slots=True)
class Power(Expression):
    """A base to a constant rational exponent, other than 0 and 1."""

    base: Expression
    exponent: Fraction


@dataclass(frozen=True, slots=True)
class Function(Expression):
    """``exp`` or ``ln`` of an argument; square roots are powers of 1/2."""

    name: str
    argument: Expression


ZERO = Number(Fraction(0))
ONE = Number(Fraction(1))


def number(value: int | Fraction) -> Number:
    """Return ``value`` as a node; SizeLimitError beyond 100,000 bits."""
    exact = Fraction(value)
    if max(exact.numerator.bit_length(), exact.denominator.bit_length()) > MAX_NUMBER_BITS:
        raise SizeLimitError(f"a number is longer than {MAX_NUMBER_BITS} bits")
    return Number(exact)


def add(terms: Iterable[Expression]) -> Expression:
    """Return the sum, flattened, its numbers added up.

    >>> add([number(2), Symbol("c"), number(-2)])
    Symbol(name='c')
    """
    constant = Fraction(0)
    rest: list[Expression] = []
    for term in terms:
        for piece in term.terms if isinstance(term, Sum) else (term,):
            if isinstance(piece, Number):
                constant += piece.value
            else:
                rest.append(piece)
    if constant:
        rest.append(number(constant))
    if not rest:
        return ZERO
    return rest[0] if len(rest) == 1 else Sum(tuple(rest))


def multiply(factors: Iterable[Expression]) -> Expression:
    """Return the product, flattened, its numbers multiplied and put first.

    >>> multiply([Symbol("c"), number(2), number(3)])
    Product(factors=(Number(value=Fraction(6, 1)), Symbol(name='c')))
    """
    constant = Fraction(1)
    rest: list[Expression] = []
    for factor in factors:
        for piece in factor.factors if isinstance(factor, Product) else (factor,):
            if isinstance(piece, Number):
                constant = number(constant * piece.value).value
            else:
                rest.append(piece)
    if constant == 0:
        return ZERO
    if constant != 1 or not rest:
        rest.insert(0, Number(constant))
    return rest[0] if len(rest) == 1 else Product(tuple(rest))


def negate(term: Expression) -> Expression:
    """Return minus ``term``."""
    return multiply([Number(Fraction(-1)), term])


def power(base: Expression, exponent: int | Fraction) -> Expression:
    """Return ``base ** exponent``; EvaluationError for 0 to a negative power, and for a root of a
    negative number.

    >>> power(number(2), -3)
    Number(value=Fraction(1, 8))
    """
    exact = Fraction(exponent)
    if exact == 0:
        return ONE
    if exact == 1:
        return base
    if isinstance(base, Number):
        if base.value == 0 and exact < 0:
            raise EvaluationError("division by zero")
        if exact.denominator == 1:
            return _number_power(base.value, exact.numerator)
        if base.value in (0, 1):
            return base
        if base.value < 0:
            raise EvaluationError("a root of a negative number")
    if exact.denominator == 1:
        if isinstance(base, Power):
            return power(base.base, base.exponent * exact)
        if isinstance(base, Product):
            return multiply([power(factor, exact) for factor in base.factors])
    return Power(base, exact)


def _number_power(value: Fraction, exponent: int) -> Number:
    bits = max(value.numerator.bit_length(), value.denominator.bit_length())
    if bits > 1 and bits * abs(exponent) > 2 * MAX_NUMBER_BITS:
        raise SizeLimitError(f"a number is longer than {MAX_NUMBER_BITS} bits")
    return number(value**exponent)


def divide(numerator: Expression, denominator: Expression) -> Expression:
    """Return the quotient of two expressions."""
    return multiply([numerator, power(denominator, -1)])


def function(name: str, argument: Expression) -> Expression:
    """Return ``exp`` or ``ln`` of ``argument``, at 0 and 1 as a number."""
    if name == "exp" and argument == ZERO:
        return ONE
    if name == "ln" and argument == ONE:
        return ZERO
    return Function(name, argument)


def children(node: Expression) -> tuple[Expression, ...]:
    """Return the direct parts of a node; none for a leaf."""
    match node:
        case Sum(terms):
            return terms
        case Product(factors):
            return factors
        case Power(base, _):
            return (base,)
        case Function(_, argument):
            return (argument,)
    return ()


def walk(node: Expression) -> Iterator[Expression]:
    """Yield every node of the tree, a parent before its parts."""
    stack = [node]
    while stack:
        current = stack.pop()
        yield current
        stack.extend(reversed(children(current)))


def symbols_of(node: Expression) -> frozenset[str]:
    """Return the names of all symbols in the tree."""
    return frozenset(part.name for part in walk(node) if isinstance(part, Symbol))


def rebuild(node: Expression, leaf: Callable[[Expression], Expression]) -> Expression:
    """Return the tree with each leaf replaced by ``leaf(leaf)``, tidied on the way up."""
    match node:
        case Sum(terms):
            return add([rebuild(term, leaf) for term in terms])
        case Product(factors):
            return multiply([rebuild(factor, leaf) for factor in factors])
        case Power(base, exponent):
            return power(rebuild(base, leaf), exponent)
        case Function(name, argument):
            return function(name, rebuild(argument, leaf))
    return leaf(node)


def substitute(node: Expression, values: dict[str, Expression]) -> Expression:
    """Return the tree with symbols replaced, all at once.

    SizeLimitError where the result is nested more than 250 deep.

    >>> substitute(Symbol("c"), {"c": number(3)})
    Number(value=Fraction(3, 1))
    """

    def leaf(part: Expression) -> Expression:
        return values.get(part.name, part) if isinstance(part, Symbol) else part

    result = rebuild(node, leaf)
    if any(children(value) for value in values.values()) and _depth(result) > MAX_DEPTH:
        raise SizeLimitError(f"an expression is nested more than {MAX_DEPTH} deep")
    return result


def _depth(node: Expression) -> int:
    deepest, level = 0, [node]
    while level:
        deepest += 1
        level = list({id(part): part for above in level for part in children(above)}.values())
    return deepest
