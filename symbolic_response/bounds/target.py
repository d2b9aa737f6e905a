"""What a response is a response of: a combination of probabilities, a ratio of two, a current.

With u_k the response of ln p_k, d<Q> = Cov(Q, u) and d ln(<Q>/<R>) is a difference of weighted
means of u. Hence every bound on the spread max u - min u, or on a covariance, turns into a bound on
the response of any target.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.expressions.signs import certain_sign
from symbolic_response.expressions.tree import (
    ONE,
    ZERO,
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    add,
    divide,
    multiply,
    negate,
    number,
    power,
    symbols_of,
    walk,
)
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import Current, Mean, Probability

Values = tuple[Expression, ...]
"""One value for each state, in the symbols of the file."""


@dataclass(frozen=True, slots=True)
class Asked:
    """``kind`` is ``mean`` (<Q>), ``ratio`` (<Q>/<R>) or ``log-ratio`` (ln(<Q>/<R>)).

    Or ``current``, of a ``transition``, without Q and R.
    """

    kind: str
    above: Values
    below: Values | None
    transition: int | None = None


@dataclass(frozen=True, slots=True)
class Target:
    """The response of a quantity is ``prefactor`` times that of <Q>, or of ln(<Q>/<R>).

    ``values``: Q; ``below``: R, None where the target is <Q> itself. ``mean``: <Q> as a quantity.
    ``asked``: the quantity as it was asked for: <Q>, <Q>/<R> or ln(<Q>/<R>), with its Q and R. The
    target of a current has no values: only the claims about currents speak of it.
    """

    prefactor: Expression
    values: Values
    below: Values | None
    mean: Expression
    asked: Asked


def target_of(quantity: Expression, network: Network) -> Target | None:
    """Return the target of a quantity, None where no bound of the catalogue speaks of it."""
    if isinstance(quantity, Current):
        return Target(ONE, (), None, quantity, Asked("current", (), None, quantity.transition))
    linear = linear_values(quantity, network)
    if linear is not None:
        return Target(ONE, linear, None, quantity, Asked("mean", linear, None))
    ratio = _ratio(quantity, network)
    if ratio is not None:
        return _ratio_target("ratio", quantity, *ratio, network)
    logarithm = _logarithm(quantity, network)
    if logarithm is not None:
        return _ratio_target("log-ratio", ONE, *logarithm, network)
    return None


def _ratio_target(
    kind: str, prefactor: Expression, above: Expression, below: Expression, network: Network
) -> Target | None:
    top, bottom = linear_values(above, network), linear_values(below, network)
    if top is None or bottom is None or not (_non_negative(top, network)
                                             and _non_negative(bottom, network)):
        return None
    asked = Asked(kind, top, bottom)
    if len(set(bottom)) == 1:
        return Target(divide(prefactor, above), top, None, above, asked)
    if len(set(top)) == 1:
        return Target(divide(prefactor, below), bottom, None, below, asked)
    return Target(prefactor, top, bottom, above, asked)


def may_be_negative(quantity: Expression, network: Network) -> bool:
    """Return whether a quantity is no target only because a mean in it may be negative or zero."""
    pair = _ratio(quantity, network) or _logarithm(quantity, network)
    if pair is None:
        return False
    sides = [linear_values(side, network) for side in pair]
    return all(sides) and not all(_non_negative(side, network) for side in sides if side)


def _non_negative(values: Values, network: Network) -> bool:
    signs = [certain_sign(value, network.positive_symbols) for value in values]
    return all(sign in (0, 1) for sign in signs) and any(sign == 1 for sign in signs)


def linear_values(node: Expression, network: Network) -> Values | None:
    """Return Q if the quantity is <Q> with values in the symbols of the file, else None."""
    size = len(network.states)
    match node:
        case Probability(states):
            return tuple(ONE if k in states else ZERO for k in range(size))
        case Mean(place):
            return network.observables[place].values
        case Sum(terms):
            parts = [linear_values(term, network) for term in terms]
            known = [part for part in parts if part is not None]
            if len(known) < len(parts):
                return None
            return tuple(add(column) for column in zip(*known, strict=True))
        case Product(factors):
            return _scaled_values(factors, network)
    return (node,) * size if _is_constant(node) else None


def _scaled_values(factors: tuple[Expression, ...], network: Network) -> Values | None:
    constants = [factor for factor in factors if _is_constant(factor)]
    others = [factor for factor in factors if not _is_constant(factor)]
    if not others:
        return (multiply(constants),) * len(network.states)
    values = linear_values(others[0], network) if len(others) == 1 else None
    return None if values is None else tuple(multiply([*constants, v]) for v in values)


def _is_constant(node: Expression) -> bool:
    """Return whether a quantity is made of numbers and symbols alone."""
    composite = (Number, Symbol, Sum, Product, Power, Function)
    return all(isinstance(part, composite) for part in walk(node))


def _ratio(node: Expression, network: Network) -> tuple[Expression, Expression] | None:
    """Return (<Q>, <R>) if the quantity is a number times their quotient."""
    if isinstance(node, Power) and node.exponent == -1:
        return (ONE, node.base) if linear_values(node.base, network) else None
    if not isinstance(node, Product):
        return None
    above: list[Expression] = []
    below: list[Expression] = []
    for factor in node.factors:
        if isinstance(factor, Power) and factor.exponent == Fraction(-1):
            below.append(factor.base)
        else:
            above.append(factor)
    moving = [factor for factor in below if not _is_constant(factor)]
    if len(moving) != 1 or linear_values(multiply(above), network) is None:
        return None
    if any(not _is_constant(f) and linear_values(f, network) is None for f in above):
        return None
    return multiply(above), multiply(below)


def _logarithm(node: Expression, network: Network) -> tuple[Expression, Expression] | None:
    """Return (<Q>, <R>) if the quantity is ln of their ratio, or a difference of logarithms."""
    above: list[Expression] = []
    below: list[Expression] = []
    for term in node.terms if isinstance(node, Sum) else (node,):
        side, inner = above, term
        if isinstance(term, Product) and len(term.factors) == 2 and term.factors[0] == number(-1):
            side, inner = below, term.factors[1]
        if not isinstance(inner, Function) or inner.name != "ln":
            return None
        pair = _ratio(inner.argument, network)
        top, bottom = pair if pair is not None else (inner.argument, ONE)
        side.append(top)
        if bottom != ONE:
            (below if side is above else above).append(bottom)
    moving = [[f for f in side if not _is_constant(f)] for side in (above, below)]
    if len(moving[0]) > 1 or len(moving[1]) > 1:
        return None
    return multiply(above), multiply(below)


def depends_on(target: Target, name: str) -> bool:
    """Return whether the values of the target change with a symbol."""
    values = (*target.values, *(target.below or ()))
    return any(name in symbols_of(value) for value in values) or name in symbols_of(
        target.prefactor
    )


def covariance(target: Target, states: tuple[int, ...]) -> Expression:
    """Return Cov(Q, 1_S) = <Q 1_S> - <Q> p(S) as a quantity."""
    alike: dict[Expression, list[int]] = {}
    for k in states:
        alike.setdefault(target.values[k], []).append(k)
    inside = add([multiply([value, Probability(tuple(ks))]) for value, ks in alike.items()])
    return add([inside, negate(multiply([target.mean, Probability(states)]))])


def spread_factor(target: Target) -> Expression:
    """Return Y such that |response| <= Y (max u - min u).

    A ratio: the prefactor. <Q> with lo <= Q <= hi: (<Q> - lo)(hi - <Q>)/(hi - lo), which is
    p(1 - p) for a set of states (item: rescaled affinely to 0 .. 1).
    """
    size = absolute(target.prefactor)
    if target.below is not None:
        return size
    low, high = extreme("min", target.values), extreme("max", target.values)
    if low == high:
        return ZERO
    rise, fall = add([target.mean, negate(low)]), add([high, negate(target.mean)])
    if low == ZERO and target.prefactor == power(target.mean, -1):
        return multiply([fall, power(high, -1)])
    return multiply([size, rise, fall, power(add([high, negate(low)]), -1)])


@dataclass(frozen=True, slots=True)
class Extreme(Expression):
    """The largest (``max``) or smallest (``min``) of several quantities."""

    name: str
    parts: tuple[Expression, ...]


@dataclass(frozen=True, slots=True)
class Absolute(Expression):
    """The absolute value of a quantity."""

    inner: Expression


@dataclass(frozen=True, slots=True)
class ShareWithout(Expression):
    """S_a/D: the share of the rooted spanning trees, by weight, that do not use a transition."""

    transition: int


def extreme(name: str, parts: tuple[Expression, ...]) -> Expression:
    """Return the largest or smallest of several quantities, numbers compared at once."""
    distinct = tuple(dict.fromkeys(parts))
    numbers = [part.value for part in distinct if isinstance(part, Number)]
    choose = max if name == "max" else min
    rest = [part for part in distinct if not isinstance(part, Number)]
    if numbers:
        rest.insert(0, number(choose(numbers)))
    return rest[0] if len(rest) == 1 else Extreme(name, tuple(rest))


def absolute(inner: Expression) -> Expression:
    """Return the absolute value, without bars where the sign is plain."""
    if isinstance(inner, Number):
        return number(abs(inner.value))
    if isinstance(inner, Product):
        lead = inner.factors[0]
        if isinstance(lead, Number) and lead.value < 0:
            return absolute(multiply([number(-lead.value), *inner.factors[1:]]))
        return inner if all(map(_plainly_positive, inner.factors)) else Absolute(inner)
    return inner if _plainly_positive(inner) or isinstance(inner, Absolute) else Absolute(inner)


def size_of(node: Expression, positive: frozenset[str]) -> Expression:
    """Return the absolute value of an expression of symbols, its sign used where it is certain."""
    sign = certain_sign(node, positive)
    if sign is None:
        return absolute(node)
    return node if sign >= 0 else negate(node)


def _plainly_positive(node: Expression) -> bool:
    if isinstance(node, Number):
        return node.value > 0
    return isinstance(node.base if isinstance(node, Power) else node, Probability)
