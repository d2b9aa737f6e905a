"""Two symbols, two states, or two rates exchanged; one symbol written for another."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from itertools import combinations, islice

from symbolic_response.expressions.tree import (
    Expression,
    Symbol,
    substitute,
    symbols_of,
)
from symbolic_response.hand.diagnosis.case import Case
from symbolic_response.hand.diagnosis.finding import EXCHANGE, NETWORK, Finding, Ranked
from symbolic_response.hand.diagnosis.products import rate_text
from symbolic_response.network.model import Network

MAX_PAIRS = 300

Rate = tuple[int, bool]


def exchange_findings(case: Case) -> list[Ranked]:
    """Return exchanges that make the hand result right."""
    found: list[Ranked] = []
    seen = {case.network}
    for rank, hypotheses in ((EXCHANGE, _by_rates(case)), (EXCHANGE, _by_symbols(case)),
                             (NETWORK, _by_states(case.network))):
        for network, text in hypotheses:
            if network not in seen and case.is_hand(case.quantity, network):
                found.append(Ranked(rank, Finding("exchange", text)))
                if rank == NETWORK:
                    break
            seen.add(network)
    return found


def with_rates(network: Network, rates: dict[Rate, Expression]) -> Network:
    """Return a network with some rates replaced."""
    return replace(network, transitions=tuple(
        replace(t, forward=rates.get((e, False), t.forward),
                backward=rates.get((e, True), t.backward))
        for e, t in enumerate(network.transitions)))


def rates_of(network: Network) -> dict[Rate, Expression]:
    """Return all directed rates."""
    found = {}
    for e, t in enumerate(network.transitions):
        found[e, False] = t.forward
        if t.backward is not None:
            found[e, True] = t.backward
    return found


# -- symbols ---------------------------------------------------------------------------------------


def _by_symbols(case: Case) -> Iterator[tuple[Network, str]]:
    """Yield networks in which two symbols are exchanged, or one stands for another as well."""
    network = case.network
    if case.plain_hand is None:
        return
    used = symbols_of(case.plain_hand)
    entries = network.symbols
    for one, other in islice(combinations(entries, 2), MAX_PAIRS):
        if one.positive == other.positive and {one.name, other.name} & used:
            swap: dict[str, Expression] = {one.name: Symbol(other.name),
                                           other.name: Symbol(one.name)}
            yield (renamed(network, swap), f"right if {one.name} and {other.name} are exchanged")
    absent = [entry for entry in entries if entry.name not in used]
    pairs = ((gone, there) for gone in absent for there in entries if there.name in used)
    for gone, there in islice(pairs, MAX_PAIRS):
        if gone.positive == there.positive:
            yield (renamed(network, {gone.name: Symbol(there.name)}),
                   f"right if {there.name} is put for {gone.name}: {there.name} is written in the"
                   f" place of {gone.name} throughout")


def renamed(network: Network, values: dict[str, Expression]) -> Network:
    """Return a network with symbols replaced, in rates and observables."""
    return replace(
        with_rates(network, {rate: substitute(expression, values)
                             for rate, expression in rates_of(network).items()}),
        observables=tuple(
            replace(entry, values=tuple(substitute(v, values) for v in entry.values))
            for entry in network.observables))


# -- rates and states ------------------------------------------------------------------------------


def _by_rates(case: Case) -> Iterator[tuple[Network, str]]:
    network = case.network
    rates = rates_of(network)
    both = [e for e, t in enumerate(network.transitions) if t.backward is not None]
    for e in both:
        swap = {(e, False): rates[e, True], (e, True): rates[e, False]}
        yield (with_rates(network, swap), "right if the forward and the backward rate of"
               f" {network.transitions[e].name} are exchanged")
    if len(both) == len(network.transitions):
        swap = {(e, back): rates[e, not back] for e, back in rates}
        yield (with_rates(network, swap),
               "right if the forward and backward rates of all transitions are exchanged")
    for one, other in islice(combinations(rates, 2), MAX_PAIRS):
        if one[0] != other[0]:
            swap = {one: rates[other], other: rates[one]}
            yield (with_rates(network, swap), f"right if the rates {rate_text(one, network)} and"
                   f" {rate_text(other, network)} are exchanged")


def _by_states(network: Network) -> Iterator[tuple[Network, str]]:
    """Yield networks in which each rate is that between the states with two of them exchanged."""
    rates = rates_of(network)
    places: dict[tuple[int, int], list[Rate]] = {}
    for e, back in rates:
        t = network.transitions[e]
        ends = (t.second, t.first) if back else (t.first, t.second)
        places.setdefault(ends, []).append((e, back))
    for k, m in islice(combinations(range(len(network.states)), 2), MAX_PAIRS):
        other = {k: m, m: k}
        swap: dict[Rate, Expression] = {}
        for (tail, head), here in places.items():
            there = places.get((other.get(tail, tail), other.get(head, head)), [])
            if len(there) != len(here):
                break
            swap |= {one: rates[two] for one, two in zip(here, there, strict=True)}
        else:
            yield (with_rates(network, swap), f"right if the states {network.states[k].name} and"
                   f" {network.states[m].name} are exchanged in all rates")
