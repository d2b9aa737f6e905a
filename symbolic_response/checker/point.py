"""One point of a record: rates, steady state, and its derivative from W p = 0."""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from fractions import Fraction

from .changes import elementary
from .expressions import ONE, ZERO, Dual, Expression, Inexact, bits, log, times
from .network import Graph, generator, solve
from .reading import Work, fraction, invalid, malformed, members
from .record import Asked, Claim, Network, Record

_LOGARITHM = re.compile(r"(-?[1-9][0-9]*)\*ln\(([^()]*)\)")


@dataclass
class Solved:
    """All that claims need to know at one point."""

    where: str
    symbols: dict[str, Dual]
    rates: list[Fraction]  # by number of the rate; 0 where a transition is one-way
    moves: list[Fraction]  # d ln rate / d theta
    p: list[Fraction]
    left: Fraction = ZERO
    above: list[Fraction] = field(default_factory=list)
    below: list[Fraction] = field(default_factory=list)


def evaluate(expression: Expression, entry: str, where: str, symbols: dict[str, Dual],
             work: Work) -> tuple[Fraction, Fraction]:
    """Return value and derivative of an expression at a point."""
    try:
        return expression.at(symbols, work)
    except Inexact as error:
        raise invalid(entry, f"a fraction at {where}", str(error)) from None


def solve_point(record: Record, k: int, graph: Graph, work: Work) -> Solved:
    """Read a point, find rates and steady state there, and the left side of the claims."""
    network, where = record.network, f"points[{k}]"
    symbols = read_values(record, k, work)
    made = Solved(where, dict(symbols), [], [], [])  # observables and pieces are not differentiated
    moved = record.perturbation
    if moved is not None and moved.symbol:
        value = symbols[moved.symbol][0]
        symbols[moved.symbol] = value, value if moved.logarithmic else ONE
    made.rates, made.moves = _rates(network, where, symbols, work)
    if moved is not None:
        elementary(made.moves, graph, moved)
    rows = generator(graph.states, graph.ends, made.rates)[:-1]
    reduced = [row[:-1] for row in rows]
    weights = [*solve(reduced, [-row[-1] for row in rows], work), ONE]
    total = sum(weights, ZERO)
    made.p = [x / total for x in weights]
    if record.path is not None:
        start, goal = record.path
        made.left = made.p[goal] / made.p[start]
    else:
        _observe(made, record, _derivative(made, graph, reduced, work), work)
    return made


def read_values(record: Record, k: int, work: Work) -> dict[str, Dual]:
    """Return the values of the symbols at a point."""
    found: dict[str, Dual] = {}
    positive = record.network.positive
    for symbol, given in zip(positive, members(record.points[k], f"points[{k}]", *positive),
                             strict=True):
        entry = f"points[{k}].{symbol}"
        logarithm = _LOGARITHM.fullmatch(given) if type(given) is str else None
        if logarithm and not positive[symbol]:
            q = fraction(logarithm[2], entry)
            if q <= 0:
                raise malformed(entry, "the logarithm of a positive fraction", given)
            value = times(fraction(logarithm[1], entry), log(q))
        else:
            value = fraction(given, entry)
            if positive[symbol] and value <= 0:
                raise invalid(entry, "a positive value", value)
        found[symbol] = value, ZERO
        work.charge(3, bits(value))
    return found


def _rates(network: Network, where: str, symbols: dict[str, Dual],
           work: Work) -> tuple[list[Fraction], list[Fraction]]:
    rates: list[Fraction] = []
    moves: list[Fraction] = []
    for e, pair in enumerate(network.rates):
        for key, expression in zip(("forward", "backward"), pair, strict=True):
            rate = change = ZERO
            if expression is not None:
                entry = f"network.transitions[{e}].{key}"
                rate, change = evaluate(expression, entry, where, symbols, work)
                if rate <= 0:
                    raise invalid(entry, f"a positive rate at {where}", rate)
            rates.append(rate)
            moves.append(change / rate if change else ZERO)
    return rates, moves


def pieces(record: Asked, claim: Claim, entry: str, where: str, symbols: dict[str, Dual],
           work: Work) -> list[dict[int, Fraction]]:
    """Return the values of energies, barriers and singles of a claim."""
    network, found = record.network, []
    for key, known, given in zip(
            ("energies", "barriers", "singles"),
            (network.states, network.transitions, network.transitions),
            claim.parts or (), strict=True):
        found.append({k: evaluate(one, f"{entry}.{key}.{known[k]}", where, symbols, work)[0]
                      for k, one in given.items()})
    return found


def _derivative(made: Solved, graph: Graph, reduced: list[list[Fraction]],
                work: Work) -> list[Fraction]:
    """Return dp/d theta from W p' = -W' p with p' summing to 0."""
    source = [ZERO] * graph.states  # W' p
    for e, (first, second) in enumerate(graph.ends):
        i, j = 2 * e, 2 * e + 1
        flow = made.rates[i] * made.moves[i] * made.p[first]
        flow -= made.rates[j] * made.moves[j] * made.p[second]
        source[first] -= flow
        source[second] += flow
    change = [*solve(reduced, [-x for x in source[:-1]], work), ZERO]
    total = sum(change, ZERO)
    return [x - total * p for x, p in zip(change, made.p, strict=True)]


def _observe(made: Solved, record: Record, change: list[Fraction], work: Work) -> None:
    """Evaluate the observables, check their signs, and find abs(dX/d theta)."""
    target, states = record.target, record.network.states
    assert target is not None
    if target.kind == "current":
        flows = [made.rates[i] * (made.moves[i] * made.p[k] + change[k])
                 for i, k in enumerate(record.network.ends[target.place], 2 * target.place)]
        made.left = abs(flows[0] - flows[1])
        return
    sides = [("target.above", target.above)]
    if target.below is not None:
        sides.append(("target.below", target.below))
    values: list[list[Fraction]] = []
    for entry, expressions in sides:
        found = [evaluate(one, f"{entry}.{state}", made.where, made.symbols, work)[0]
                 for one, state in zip(expressions, states, strict=True)]
        for value, state in zip(found, states, strict=True):
            if target.kind != "mean" and value < 0:
                raise invalid(f"{entry}.{state}", f"no negative value at {made.where}", value)
        if target.kind != "mean" and not any(found):
            raise invalid(entry, f"a value other than 0 at {made.where}", "0 for every state")
        values.append(found)
    made.above = values[0]
    slope = dot(made.above, change)
    if target.kind != "mean":
        made.below = values[1]
        mean, other = dot(made.above, made.p), dot(made.below, made.p)
        slope = slope / mean - dot(made.below, change) / other
        if target.kind == "ratio":
            slope *= mean / other
    made.left = abs(slope)


def dot(a: list[Fraction], b: list[Fraction]) -> Fraction:
    """Return the sum of products."""
    return sum((x * y for x, y in zip(a, b, strict=True) if x and y), ZERO)
