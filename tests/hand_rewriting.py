"""Correct formulas from brute force over trees, and random equivalent ways to write them."""

from __future__ import annotations

import random
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.expressions.tree import (
    Expression,
    Sum,
    Symbol,
    add,
    divide,
    function,
    multiply,
    negate,
    number,
    power,
)
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import Current, Probability
from symbolic_response.topology import Graph
from tests.proof_networks import rooted_trees

ONE = number(1)


@dataclass(frozen=True)
class Correct:
    """A quantity, and its terms above and below: the sums are its numerator and denominator."""

    quantity: Expression
    above: tuple[Expression, ...]
    below: tuple[Expression, ...]


def correct_formulas(network: Network) -> list[Correct]:
    """Return all probabilities and currents by the diagram method (Hill 1966), trees by force."""
    graph = Graph(len(network.states), tuple((t.first, t.second) for t in network.transitions),
                  tuple(t.backward is None for t in network.transitions))

    def rate(e: int, back: bool) -> Expression:
        t = network.transitions[e]
        found = t.backward if back else t.forward
        assert found is not None
        return found

    trees = [tuple(multiply([rate(*step) for step in tree]) for tree in rooted_trees(graph, k))
             for k in range(graph.size)]
    below = tuple(term for terms in trees for term in terms)
    found = [Correct(Probability((k,)), terms, below) for k, terms in enumerate(trees)]
    for e, t in enumerate(network.transitions):
        above = [multiply([rate(e, False), term]) for term in trees[t.first]]
        if t.backward is not None:
            above += [negate(multiply([rate(e, True), term])) for term in trees[t.second]]
        found.append(Correct(Current(e), tuple(above), below))
    return found


def rewritten(correct: Correct, factors: Sequence[Expression], rng: random.Random) -> Expression:
    """Return the formula after a few random changes that keep its value."""
    start = rng.choice((whole, expanded, divided, nested, complement, grouped))
    form = start(correct, factors, rng)
    for _ in range(rng.randint(0, 2)):
        form = rng.choice(AFTERWARDS)(form, factors, rng)
    return form


def shuffled(terms: Sequence[Expression], rng: random.Random) -> Expression:
    return add(rng.sample(list(terms), len(terms)))


def whole(c: Correct, factors: Sequence[Expression], rng: random.Random) -> Expression:
    return divide(shuffled(c.above, rng), shuffled(c.below, rng))


def expanded(c: Correct, factors: Sequence[Expression], rng: random.Random) -> Expression:
    below = shuffled(c.below, rng)
    return add([divide(term, below) for term in c.above])


def divided(c: Correct, factors: Sequence[Expression], rng: random.Random) -> Expression:
    """Divide numerator and denominator, term by term, by a rate or a product of rates."""
    by = multiply(rng.sample(list(factors), min(len(factors), rng.randint(1, 2))))
    return divide(add([divide(t, by) for t in c.above]), add([divide(t, by) for t in c.below]))


def nested(c: Correct, factors: Sequence[Expression], rng: random.Random) -> Expression:
    """Write N/D as 1/(1 + (D - N)/N), where the numerator does not vanish identically."""
    if not isinstance(c.quantity, Probability):
        return whole(c, factors, rng)
    rest = [term for term in c.below if term not in c.above]
    return power(add([ONE, *(divide(term, add(c.above)) for term in rest)]), -1)


def complement(c: Correct, factors: Sequence[Expression], rng: random.Random) -> Expression:
    """Write p as 1 minus the sum of the others."""
    if not isinstance(c.quantity, Probability):
        return whole(c, factors, rng)
    rest = [term for term in c.below if term not in c.above]
    return add([ONE, negate(divide(shuffled(rest, rng), shuffled(c.below, rng)))])


def grouped(c: Correct, factors: Sequence[Expression], rng: random.Random) -> Expression:
    """Take one factor out of the terms that hold it: x (...) + (...), in both sums."""
    x = rng.choice(list(factors))

    def collected(terms: Sequence[Expression]) -> Expression:
        chosen = rng.sample(list(terms), rng.randint(1, len(terms)))
        rest = list(terms)
        for term in chosen:
            rest.remove(term)
        return add([multiply([x, add([divide(t, x) for t in chosen])]), *rest])

    return divide(collected(c.above), collected(c.below))


def added_and_subtracted(f: Expression, factors: Sequence[Expression],
                         rng: random.Random) -> Expression:
    term = divide(rng.choice(list(factors)), add([ONE, rng.choice(list(factors))]))
    return add([negate(term), f, term])


def by_a_sum(f: Expression, factors: Sequence[Expression], rng: random.Random) -> Expression:
    a, b = (rng.choice(list(factors)) for _ in range(2))
    return multiply([f, add([a, b]), power(add([b, a]), -1)])


def by_an_exponential(f: Expression, factors: Sequence[Expression],
                      rng: random.Random) -> Expression:
    x = rng.choice(list(factors))
    return multiply([function("exp", multiply([number(2), x])), f,
                     power(function("exp", x), -2)])


def through_tanh(f: Expression, factors: Sequence[Expression], rng: random.Random) -> Expression:
    """Add the half of 1 + tanh(x/2) and take off its other form, 1/(1 + exp(-x))."""
    x = rng.choice(list(factors))
    e = function("exp", x)
    tanh = divide(add([e, number(-1)]), add([e, ONE]))
    half = number(Fraction(1, 2))
    return add([f, multiply([half, add([ONE, tanh])]),
                negate(power(add([ONE, function("exp", negate(x))]), -1))])


def twice_inverted(f: Expression, factors: Sequence[Expression], rng: random.Random) -> Expression:
    x = rng.choice(list(factors))
    return divide(x, divide(x, f)) if f != number(0) else f


def in_partial_fractions(f: Expression, factors: Sequence[Expression],
                         rng: random.Random) -> Expression:
    """Multiply by x/(x + y) + y/(x + y) = 1 in two separate fractions."""
    x, y = (rng.choice(list(factors)) for _ in range(2))
    below = add([x, y])
    return add([multiply([f, divide(x, below)]), divide(multiply([f, y]), below)])


def under_a_root(f: Expression, factors: Sequence[Expression], rng: random.Random) -> Expression:
    x = rng.choice(list(factors))
    root = power(x, Fraction(1, 2))
    return divide(multiply([root, f, root]), x)


Step = Callable[[Expression, Sequence[Expression], random.Random], Expression]
AFTERWARDS: tuple[Step, ...] = (added_and_subtracted, by_a_sum, by_an_exponential, through_tanh,
                                twice_inverted, in_partial_fractions, under_a_root)


def slipped(c: Correct, rng: random.Random) -> Expression:
    """Return the formula with one slip, which may or may not change its value."""
    above, below = list(c.above), list(c.below)
    place = rng.randrange(len(below))
    match rng.randrange(5):
        case 0 if len(below) > 1:
            del below[place]
        case 1:
            above[rng.randrange(len(above))] = above[0]
        case 2:
            below[place] = multiply([number(2), below[place]])
        case 3:
            above[-1] = negate(above[-1])
        case _:
            names = sorted({part.name for part in _leaves(below[place])})
            other = rng.choice(names) if names else None
            below[place] = multiply([below[place], Symbol(other)]) if other else ONE
    return divide(add(above), add(below))


def _leaves(node: Expression) -> list[Symbol]:
    from symbolic_response.expressions.tree import walk

    parts = node.terms if isinstance(node, Sum) else (node,)
    return [leaf for part in parts for leaf in walk(part) if isinstance(leaf, Symbol)]
