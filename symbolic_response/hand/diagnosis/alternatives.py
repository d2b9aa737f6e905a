"""Quantities that may be meant in the place of a quantity: one change at a time.

Each atom is changed everywhere it occurs. w+ alone has no perturbation of its own: with drive
(w+ by 1/2, w- by -1/2) and barrier (both by -1), d/d ln w+ = d/d drive - (1/2) d/d barrier and
d/d ln w- = -d/d drive - (1/2) d/d barrier.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from fractions import Fraction
from itertools import combinations

from symbolic_response.bounds.sides import quantity_text
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    add,
    divide,
    function,
    multiply,
    negate,
    number,
    power,
    rebuild,
    walk,
)
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import (
    BarrierOf,
    BarriersOf,
    BySymbol,
    Current,
    DirectedRate,
    DriveOf,
    EnergyOf,
    EntropyProduction,
    Mean,
    Perturbation,
    Probability,
    Response,
    Traffic,
)

MAX_STATES_IN_PAIRS = 8
HALF = Fraction(1, 2)


@dataclass(frozen=True, slots=True)
class Alternative:
    """A quantity and its name: what follows the words "right for"."""

    quantity: Expression
    what: str


def alternatives(quantity: Expression, network: Network) -> Iterator[Alternative]:
    """Yield quantities that differ from the one asked for by one change."""
    seen = {quantity}
    for other in _alternatives(quantity, network):
        if other.quantity not in seen:
            seen.add(other.quantity)
            yield other


def _alternatives(quantity: Expression, network: Network) -> Iterator[Alternative]:
    yield from _whole(quantity, network)
    if isinstance(quantity, Response):
        yield from _responses(quantity, network)
        return
    atoms = dict.fromkeys(part for part in walk(quantity) if _is_atom(part))
    for atom in atoms:
        for other in _atoms(atom, network):
            changed = rebuild(quantity, _replacing({atom: other.quantity}))
            named = other.what if quantity == atom else quantity_text(changed, network)
            yield Alternative(changed, named)
    for one, other_ in combinations(atoms, 2):
        changed = rebuild(quantity, _replacing({one: other_, other_: one}))
        yield Alternative(changed, quantity_text(changed, network))


def _is_atom(part: Expression) -> bool:
    return isinstance(part, Probability | Mean | Current | Traffic | DirectedRate
                      | EntropyProduction | Response)


def _replacing(values: dict[Expression, Expression]) -> Callable[[Expression], Expression]:
    return lambda leaf: values.get(leaf, leaf)


def _named(quantity: Expression, network: Network, words: str = "") -> Alternative:
    shown = quantity_text(quantity, network)
    return Alternative(quantity, f"{words}, {shown}" if words else shown)


def _whole(quantity: Expression, network: Network) -> Iterator[Alternative]:
    if isinstance(quantity, Function) and quantity.name == "ln":
        yield _named(quantity.argument, network, "the quantity itself and not its logarithm")
    elif not isinstance(quantity, Response):
        yield _named(function("ln", quantity), network, "the logarithm of the quantity")
        yield _named(power(quantity, -1), network, "the inverse of the quantity")


# -- atoms -----------------------------------------------------------------------------------------


def _atoms(atom: Expression, network: Network) -> Iterator[Alternative]:
    match atom:
        case Probability(states):
            yield from _sets(states, network)
        case Mean(place):
            yield from _means(place, network)
        case Current(e) | Traffic(e):
            for kind in (Current, Traffic):
                yield _named(kind(e), network)
            yield from _flows(e, network)
            for other in range(len(network.transitions)):
                for kind in (type(atom), Current, Traffic):
                    yield _named(kind(other), network)
                if other != e:
                    yield from _flows(other, network)
            yield from _summed(atom, network)
        case DirectedRate(e, backward):
            for other in range(len(network.transitions)):
                yield _named(DirectedRate(other, backward), network)
                yield _named(DirectedRate(other, not backward), network)
        case EntropyProduction():
            yield from _parts_of_production(network)
        case Response():
            yield from _responses(atom, network)


def _sets(states: tuple[int, ...], network: Network) -> Iterator[Alternative]:
    size = len(network.states)
    rest = tuple(k for k in range(size) if k not in states)
    if rest:
        yield _named(Probability(rest), network, "the other states")
    for k in range(size):
        yield _named(Probability((k,)), network)
    for k in rest:
        yield _named(Probability(tuple(sorted((*states, k)))), network)
    if size <= MAX_STATES_IN_PAIRS:
        for pair in combinations(range(size), 2):
            yield _named(Probability(pair), network)


def _means(place: int, network: Network) -> Iterator[Alternative]:
    for other in range(len(network.observables)):
        yield _named(Mean(other), network)
    entry = network.observables[place]
    names = [state.name for state in network.states]
    for k, m in combinations(range(len(names)), 2):
        values = list(entry.values)
        values[k], values[m] = values[m], values[k]
        yield Alternative(weighted(values), f"the mean of {entry.name} with its values in"
                          f" {names[k]} and {names[m]} exchanged")
    for k, name in enumerate(names):
        values = list(entry.values)
        values[k] = number(0)
        yield Alternative(weighted(values), f"the mean of {entry.name} with its value in {name}"
                          " left out")
    squares = weighted([power(value, 2) if value != number(0) else value
                        for value in entry.values])
    yield Alternative(squares, f"the mean of the square of {entry.name}")
    variance = add([squares, negate(power(Mean(place), 2))])
    yield Alternative(variance, f"the variance of {entry.name}")


def weighted(values: list[Expression]) -> Expression:
    """Return the sum of values times probabilities."""
    return add([multiply([value, Probability((k,))]) for k, value in enumerate(values)])


def _flows(e: int, network: Network) -> Iterator[Alternative]:
    entry = network.transitions[e]
    ways = [(False, entry.first, "forward"), (True, entry.second, "backward")]
    for backward, tail, word in ways:
        flow = multiply([DirectedRate(e, backward), Probability((tail,))])
        yield _named(flow, network, f"the {word} flow of {entry.name} alone")


def _summed(atom: Expression, network: Network) -> Iterator[Alternative]:
    """Yield the sum over all channels between the two states, counted in one direction."""
    assert isinstance(atom, Current | Traffic)
    entry = network.transitions[atom.transition]
    terms: list[Expression] = []
    for e, t in enumerate(network.transitions):
        if {t.first, t.second} == {entry.first, entry.second}:
            same = t.first == entry.first or isinstance(atom, Traffic)
            terms.append(type(atom)(e) if same else negate(type(atom)(e)))
    if len(terms) > 1:
        yield _named(add(terms), network, "all channels between the two states together")


def _parts_of_production(network: Network) -> Iterator[Alternative]:
    terms = []
    for e, t in enumerate(network.transitions):
        if t.backward is None:
            return
        ratio = divide(DirectedRate(e, False), DirectedRate(e, True))
        flows = multiply([ratio, divide(Probability((t.first,)), Probability((t.second,)))])
        terms.append(multiply([Current(e), function("ln", flows)]))
    for e, t in enumerate(network.transitions):
        yield Alternative(terms[e], f"the part of {t.name} alone")
        rest = add([*terms[:e], *terms[e + 1 :]])
        yield Alternative(rest, f"the sum over all transitions but {t.name}")
        force = function("ln", divide(DirectedRate(e, False), DirectedRate(e, True)))
        yield Alternative(multiply([Current(e), force]),
                          f"current[{t.name}] times the logarithm of its rates")


# -- responses -------------------------------------------------------------------------------------


def _responses(asked: Response, network: Network) -> Iterator[Alternative]:
    inner, by = asked.quantity, asked.perturbation
    yield from _logarithmic(inner, by, network)
    for other in _perturbations(inner, by, network):
        yield other
    for other in _alternatives(inner, network):
        if not isinstance(other.quantity, Response) or isinstance(inner, Response):
            changed = Response(other.quantity, by)
            yield Alternative(changed, f"the response of {other.what}")
    for other in _perturbations(inner, by, network):
        yield Alternative(multiply([number(2), other.quantity]), f"twice {other.what}")
        yield Alternative(multiply([number(HALF), other.quantity]), f"half of {other.what}")


def _logarithmic(
    inner: Expression, by: Perturbation, network: Network
) -> Iterator[Alternative]:
    """Yield derivatives of the quantity or its logarithm, by a symbol or its logarithm."""
    is_ln = isinstance(inner, Function) and inner.name == "ln"
    assert not is_ln or isinstance(inner, Function)
    bare = inner.argument if isinstance(inner, Function) and is_ln else inner
    ways: list[Perturbation] = [by]
    if isinstance(by, BySymbol) and by.name in network.positive_symbols:
        ways = [BySymbol(by.name, by.logarithmic), BySymbol(by.name, not by.logarithmic)]
    for way in ways:
        for quantity in (inner, bare, function("ln", bare)):
            yield _named(Response(quantity, way), network)
    if isinstance(by, DriveOf):
        words = "twice the response to the drive, the factor 1/2 of its definition left out"
        yield Alternative(multiply([number(2), Response(inner, by)]), words)


def _perturbations(
    inner: Expression, by: Perturbation, network: Network
) -> Iterator[Alternative]:
    for e in _first(by, range(len(network.transitions))):
        entry = network.transitions[e]
        drive, barrier = Response(inner, DriveOf(e)), Response(inner, BarrierOf(e))
        yield _named(drive, network)
        yield _named(barrier, network)
        half = multiply([number(-HALF), barrier])
        shown = quantity_text(inner, network)
        for word, signed in (("forward", drive), ("backward", negate(drive))):
            yield Alternative(add([signed, half]), f"the response of {shown} to ln of the {word}"
                              f" rate of {entry.name} alone")
    for k in range(len(network.states)):
        yield _named(Response(inner, EnergyOf(k)), network)
    for entry_ in network.symbols:
        yield _named(Response(inner, BySymbol(entry_.name)), network)
        if entry_.positive:
            yield _named(Response(inner, BySymbol(entry_.name, True)), network)
    if isinstance(by, BarriersOf):
        for e in by.transitions:
            rest = tuple(other for other in by.transitions if other != e)
            one = BarriersOf(rest) if len(rest) > 1 else BarrierOf(rest[0])
            yield _named(Response(inner, one), network)


def _first(by: Perturbation, places: range) -> list[int]:
    """Return the places, that of the perturbation itself first."""
    own = by.transition if isinstance(by, BarrierOf | DriveOf) else -1
    return sorted(places, key=lambda e: e != own)
