"""One point of a record: rates, steady state, and its derivative from W p = 0."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any

from .changes import elementary
from .expressions import ONE, ZERO, Dual, Expression, Inexact, bits, log, times
from .network import Graph, solve
from .reading import Work, fraction, invalid, malformed, members
from .record import Network, Record, Target

_LOGARITHM = re.compile(r"(-?[1-9][0-9]*)\*ln\(([^()]*)\)")


@dataclass
class Solved:
    """All that claims need to know at one point."""

    where: str
    symbols: dict[str, Dual]
    rates: list[Fraction]  # by number of the rate; 0 where a transition is one-way
    moves: list[Fraction]  # d ln rate / d theta
    p: list[Fraction] = field(default_factory=list)
    left: Fraction = ZERO
    above: list[Fraction] = field(default_factory=list)
    below: list[Fraction] = field(default_factory=list)

    def evaluate(self, expression: Expression, entry: str, work: Work) -> Fraction:
        """Return the value of an observable or a piece: these are not differentiated."""
        return evaluate(expression, entry, self.where, self.symbols, work)[0]


def evaluate(expression: Expression, entry: str, where: str, symbols: dict[str, Dual],
             work: Work) -> tuple[Fraction, Fraction]:
    """Return value and derivative of an expression at a point."""
    try:
        return expression.at(symbols, work)
    except Inexact as error:
        raise invalid(entry, f"a fraction at {where}", str(error)) from None


def solve_point(record: Record, k: int, graph: Graph) -> Solved:
    """Read a point, find rates and steady state there, and the left side of the claims."""
    where, moved = f"points[{k}]", record.perturbation
    symbols = _read_values(record.points[k], where, record.network.positive, graph.work)
    moving = dict(symbols)
    if moved is not None and moved.symbol:
        value = symbols[moved.symbol][0]
        moving[moved.symbol] = value, value if moved.logarithmic else ONE
    made = Solved(where, symbols, *_rates(record.network, graph, where, moving))
    rows = graph.generator(made.rates)[:-1]
    reduced = [row[:-1] for row in rows]
    weights = [*solve(reduced, [-row[-1] for row in rows], graph.work), ONE]
    total = sum(weights, ZERO)
    made.p = [x / total for x in weights]
    if record.path is not None:
        start, goal = record.path
        made.left = made.p[goal] / made.p[start]
    else:
        assert moved is not None and record.target is not None
        elementary(made.moves, graph, moved)
        change = _derivative(made, graph, reduced)
        made.above, made.below = (*observe(
            record.target, record.network.states,
            lambda one, entry: made.evaluate(one, entry, graph.work),
            "no negative value", f" at {where}"), [], [])[:2]
        made.left = abs(_slope(made, record.target, graph, change))
    return made


def _read_values(given: object, where: str, positive: dict[str, bool],
                 work: Work) -> dict[str, Dual]:
    """Return the values of the symbols at a point."""
    found: dict[str, Dual] = {}
    for symbol, text in zip(positive, members(given, where, *positive), strict=True):
        entry = f"{where}.{symbol}"
        logarithm = _LOGARITHM.fullmatch(text) if type(text) is str else None
        if logarithm and not positive[symbol]:
            q = fraction(logarithm[2], entry)
            if q <= 0:
                raise malformed(entry, "the logarithm of a positive fraction", text)
            value = times(fraction(logarithm[1], entry), log(q))
        else:
            value = fraction(text, entry)
            if positive[symbol] and value <= 0:
                raise invalid(entry, "a positive value", value)
        found[symbol] = value, ZERO
        work.charge(3, bits(value))
    return found


def _rates(network: Network, graph: Graph, where: str,
           symbols: dict[str, Dual]) -> tuple[list[Fraction], list[Fraction]]:
    """Return the rates and the changes of their logarithms by a symbol."""
    rates, moves = [ZERO] * len(graph.every), [ZERO] * len(graph.every)
    for i in graph.rates:
        expression = network.rates[i >> 1][i & 1]
        assert expression is not None
        rates[i], change = evaluate(expression, network.entry(i), where, symbols, graph.work)
        if rates[i] <= 0:
            raise invalid(network.entry(i), f"a positive rate at {where}", rates[i])
        moves[i] = change / rates[i] if change else ZERO
    return rates, moves


def _derivative(made: Solved, graph: Graph, reduced: list[list[Fraction]]) -> list[Fraction]:
    """Return dp/d theta from W p' = -W' p with p' summing to 0."""
    source = [ZERO] * graph.states  # -W' p
    for i in graph.rates:
        a, b = graph.step(i)
        flow = made.rates[i] * made.moves[i] * made.p[a]
        source[a] += flow
        source[b] -= flow
    change = [*solve(reduced, source[:-1], graph.work), ZERO]
    total = sum(change, ZERO)
    return [x - total * p for x, p in zip(change, made.p, strict=True)]


def observe(target: Target, states: list[str], find: Callable[[Expression, str], Any],
            expected: str, where: str) -> list[list[Any]]:
    """Return what is found of each observable: of ratios not negative, and not all 0."""
    values = []
    for entry, side in target.sides():
        found = [find(one, f"{entry}.{state}") for one, state in zip(side, states, strict=True)]
        for value, one, state in zip(found, side, states, strict=True):
            if target.kind != "mean" and (value is None or value < 0):
                raise invalid(f"{entry}.{state}", f"{expected}{where}",
                              one.text[:80] if value is None else value)
        if target.kind != "mean" and not any(found):
            raise invalid(entry, f"a value other than 0{where}", "0 for every state")
        values.append(found)
    return values


def _slope(made: Solved, target: Target, graph: Graph, change: list[Fraction]) -> Fraction:
    """Return dX/d theta."""
    if target.kind == "current":
        flows = [made.rates[i] * (made.moves[i] * made.p[k] + change[k])
                 for i, k in enumerate(graph.ends[target.place], 2 * target.place)]
        return flows[0] - flows[1]
    slope = dot(made.above, change)
    if target.kind != "mean":
        mean, other = dot(made.above, made.p), dot(made.below, made.p)
        slope = slope / mean - dot(made.below, change) / other
        if target.kind == "ratio":
            slope *= mean / other
    return slope


def dot(a: list[Fraction], b: list[Fraction]) -> Fraction:
    """Return the sum of products."""
    return sum((x * y for x, y in zip(a, b, strict=True) if x and y), ZERO)
