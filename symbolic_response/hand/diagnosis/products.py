"""Products of rates: named by their transitions, and why one is no spanning tree."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from symbolic_response.expressions.text import expression_text
from symbolic_response.hand.diagnosis.references import Rate
from symbolic_response.hand.diagnosis.written import Monomial, Terms
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis

MAX_STEPS = 4_000


def rate_text(rate: Rate, network: Network) -> str:
    """Return a directed rate as ``bind backward (k_off)``."""
    e, backward = rate
    entry = network.transitions[e]
    expression = entry.backward if backward else entry.forward
    assert expression is not None
    direction = "backward" if backward else "forward"
    return f"{entry.name} {direction} ({expression_text(expression)})"


def rates_text(rates: Sequence[Rate], network: Network) -> str:
    """Return directed rates as a list."""
    return ", ".join(rate_text(rate, network) for rate in rates)


def decompositions(
    monomial: Monomial, rates: Mapping[Rate, Terms], most: int
) -> Iterator[tuple[Rate, ...]]:
    """Yield products of at most ``most`` rates whose monomial is the given one.

    Rates that are sums are left out; a number of steps bounds the search.
    """
    single = [(rate, next(iter(terms))) for rate, terms in rates.items() if len(terms) == 1]
    bounded = all(e >= 0 for _, exponents in single for e in exponents)
    stack: list[tuple[int, Monomial, tuple[Rate, ...]]] = [(0, monomial, ())]
    for _ in range(MAX_STEPS):
        if not stack:
            return
        start, rest, chosen = stack.pop()
        if chosen and not any(rest):
            yield chosen
            continue
        if len(chosen) == most:
            continue
        for place in range(len(single) - 1, start - 1, -1):
            rate, exponents = single[place]
            left = tuple(a - b for a, b in zip(rest, exponents, strict=True))
            if not bounded or min(left) >= 0:
                stack.append((place, left, (*chosen, rate)))


def why_no_tree(
    monomial: Monomial, rates: Mapping[Rate, Terms], roots: frozenset[int], analysis: Analysis
) -> str | None:
    """Return why a product of rates is no spanning tree towards ``roots``; None if unknown."""
    size = analysis.graph.size
    found = [_reason(chosen, roots, analysis)
             for chosen in decompositions(monomial, rates, size + 1)]
    return min(found)[1] if found else None


def _reason(
    rates: tuple[Rate, ...], roots: frozenset[int], analysis: Analysis
) -> tuple[int, str]:
    """Return a reason, and a number that is small for readings close to a tree."""
    network, needed = analysis.network, analysis.graph.size - 1
    shown = rates_text(rates, network)
    if len(rates) != needed:
        few = "few" if len(rates) < needed else "many"
        counted = "1 rate" if len(rates) == 1 else f"{len(rates)} rates"
        return 2 + abs(len(rates) - needed), (
            f"it has too {few} rates, {counted} where a spanning tree has {needed}: {shown}")
    ways: dict[int, int] = {}
    for e, backward in rates:
        tail, head = analysis.graph.ends[e][::-1] if backward else analysis.graph.ends[e]
        if tail in ways:
            name = network.states[tail].name
            return 1, f"it has two rates out of {name}: {shown}"
        ways[tail] = head
    cycle = _cycle(ways)
    if cycle:
        path = " -> ".join(network.states[k].name for k in (*cycle, cycle[0]))
        return 1, f"it contains the cycle {path}: {shown}"
    root, = set(range(needed + 1)) - ways.keys()
    name = network.states[root].name
    if root in roots:
        return 0, f"it is a spanning tree towards {name}: {shown}"
    return 0, f"it is a spanning tree towards {name}, a wrong root here: {shown}"


def _cycle(ways: Mapping[int, int]) -> tuple[int, ...]:
    for start in ways:
        path = [start]
        while path[-1] in ways and len(path) <= len(ways):
            path.append(ways[path[-1]])
            if path[-1] == start:
                return tuple(path[:-1])
    return ()
