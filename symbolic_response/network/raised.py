"""A network with one barrier raised."""

from __future__ import annotations

from dataclasses import replace

from symbolic_response.expressions.tree import Expression, function, multiply, negate
from symbolic_response.network.model import Network


def with_barrier_raised(network: Network, transition: int, amount: Expression) -> Network:
    """Return the network with both rates of a transition multiplied by exp(-amount)."""
    factor = function("exp", negate(amount))
    entry = network.transitions[transition]
    changed = replace(
        entry,
        forward=multiply([factor, entry.forward]),
        backward=None if entry.backward is None else multiply([factor, entry.backward]),
    )
    rest = network.transitions
    return replace(network, transitions=(*rest[:transition], changed, *rest[transition + 1 :]))
