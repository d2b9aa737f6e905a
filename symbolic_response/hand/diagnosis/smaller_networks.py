"""The network without a transition, or with one that runs one way only."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

from symbolic_response.expressions.tree import Expression, negate, rebuild
from symbolic_response.hand.diagnosis.case import Case
from symbolic_response.hand.diagnosis.finding import NETWORK, Finding, Ranked
from symbolic_response.hand.diagnosis.products import rate_text
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import (
    BarrierOf,
    BarriersOf,
    Change,
    Current,
    DirectedRate,
    DriveOf,
    EntropyProduction,
    Response,
    Traffic,
    walk_quantity,
)
from symbolic_response.response.analysis import graph_of
from symbolic_response.topology import count_rooted_trees, is_connected


def network_findings(case: Case) -> list[Ranked]:
    """Return smaller networks for which the hand result is right."""
    return [
        Ranked(NETWORK, Finding("network", text))
        for network, quantity, text in _smaller(case)
        if _has_steady_state(network) and case.is_hand(quantity, network)
    ]


def _has_steady_state(network: Network) -> bool:
    """Return whether there is one steady state: some state can be reached from all others."""
    graph = graph_of(network)
    return is_connected(graph) and any(
        count_rooted_trees(graph, root) for root in range(graph.size))


def _smaller(case: Case) -> Iterator[tuple[Network, Expression, str]]:
    network, quantity = case.network, case.quantity
    named = {e for part in walk_quantity(quantity) for e in _transitions_of(part)}
    for e, entry in enumerate(network.transitions):
        if e not in named:
            beside = [t for t in network.transitions
                      if {t.first, t.second} == {entry.first, entry.second}]
            what = "channel" if len(beside) > 1 else "transition"
            yield (without(network, {e}), moved(quantity, {e}),
                   f"right for the network without the {what} {entry.name}")
    for group in _parallel(network):
        if not group & named:
            names = ", ".join(network.transitions[e].name for e in sorted(group))
            yield (without(network, group), moved(quantity, group),
                   f"right for the network without the transitions {names}")
    if any(isinstance(part, EntropyProduction) for part in walk_quantity(quantity)):
        return
    for e, entry in enumerate(network.transitions):
        if entry.backward is not None:
            text = "right for the network without the rate "
            yield (_changed(network, e, backward=None), quantity,
                   text + rate_text((e, True), network))
            yield (_changed(network, e, first=entry.second, second=entry.first,
                            forward=entry.backward, backward=None),
                   turned(quantity, e), text + rate_text((e, False), network))


def _parallel(network: Network) -> list[set[int]]:
    groups: dict[frozenset[int], set[int]] = {}
    for e, t in enumerate(network.transitions):
        groups.setdefault(frozenset((t.first, t.second)), set()).add(e)
    return [group for group in groups.values() if len(group) > 1]


def without(network: Network, removed: set[int]) -> Network:
    """Return a network without some transitions."""
    kept = (t for e, t in enumerate(network.transitions) if e not in removed)
    return replace(network, transitions=tuple(kept))


def _changed(network: Network, e: int, **entries: object) -> Network:
    transitions = list(network.transitions)
    transitions[e] = replace(transitions[e], **entries)  # type: ignore[arg-type]
    return replace(network, transitions=tuple(transitions))


def _transitions_of(part: Expression) -> tuple[int, ...]:
    match part:
        case Current(e) | Traffic(e) | DirectedRate(e, _) | Change(_, e, _):
            return (e,)
        case Response(_, BarrierOf(e) | DriveOf(e)):
            return (e,)
        case Response(_, BarriersOf(transitions)):
            return transitions
    return ()


def moved(quantity: Expression, removed: set[int]) -> Expression:
    """Return a quantity of a network for the network without transitions it does not name."""

    def place(e: int) -> int:
        return e - sum(1 for other in removed if other < e)

    def leaf(part: Expression) -> Expression:
        match part:
            case Current(e):
                return Current(place(e))
            case Traffic(e):
                return Traffic(place(e))
            case DirectedRate(e, backward):
                return DirectedRate(place(e), backward)
            case Change(inner, e, amount):
                return Change(rebuild(inner, leaf), place(e), amount)
            case Response(inner, by):
                match by:
                    case BarrierOf(e):
                        by = BarrierOf(place(e))
                    case DriveOf(e):
                        by = DriveOf(place(e))
                    case BarriersOf(several):
                        by = BarriersOf(tuple(place(e) for e in several))
                return Response(rebuild(inner, leaf), by)
        return part

    return rebuild(quantity, leaf)


def turned(quantity: Expression, e: int) -> Expression:
    """Return a quantity of a network for the network in which a transition is written from its
    second to its first state."""

    def leaf(part: Expression) -> Expression:
        match part:
            case Current(other) if other == e:
                return negate(part)
            case DirectedRate(other, backward) if other == e:
                return DirectedRate(e, not backward)
            case Change(inner, other, amount):
                return Change(rebuild(inner, leaf), other, amount)
            case Response(inner, by):
                response = Response(rebuild(inner, leaf), by)
                return negate(response) if by == DriveOf(e) else response
        return part

    return rebuild(quantity, leaf)
