"""The range of sums over trees, from determinants whose rates are powers of one large integer."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from math import gcd, lcm

from .network import Graph
from .reading import too_large

MAX_POWER = 64


def extremes(graph: Graph, v: Sequence[Fraction]) -> tuple[Fraction, Fraction]:
    """Return the least and largest sum of v over the rates of a tree directed to any root.

    All v are brought to integers from 0: every tree has as many rates, and shifts alike.
    """
    rates, steps = graph.rates, graph.states - 1
    least, scale = min(v[i] for i in rates), lcm(*(v[i].denominator for i in rates))
    powers = {i: int((v[i] - least) * scale) for i in rates}
    unit = gcd(*powers.values()) or 1
    if max(powers.values()) > MAX_POWER * unit:
        raise too_large("network.transitions", MAX_POWER, "more different changes of rates")
    digit = graph.number_of_trees().bit_length()
    weights = [1 << digit * (powers[i] // unit) if i in powers else 0 for i in range(len(v))]
    sums = []
    for root in range(graph.states):
        found = int(graph.forests(weights, 1 << root))
        lowest = (found & -found).bit_length() - 1
        sums += [lowest // digit, (found.bit_length() - 1) // digit]
    return (min(sums) * Fraction(unit, scale) + least * steps,
            max(sums) * Fraction(unit, scale) + least * steps)
