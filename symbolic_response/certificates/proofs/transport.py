"""The transport proof: a bundle of transitions, tree products matched one to one.

Every spanning tree uses r or r + 1 of the transitions of a set E'; N_k = z^r (a_k + z b_k) where z
scales their rates. The terms of b_i a_j are matched with those of a_i b_j, each pair equal or
differing by the reversal of one cycle with transitions inside and outside E'. So b_i a_j is at most
exp(F) a_i b_j, and the lemma on (a + z b)/(a' + z b') gives tanh(F/4).
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from itertools import combinations

from symbolic_response.errors import SizeLimitError
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology.cycles import Cycle, can_run_against, can_run_along
from symbolic_response.topology.trees import rooted

MOST_PRODUCTS = 200_000
BITS = 2  # two trees use a rate at most twice

Products = Counter[int]
"""Products of rates with their numbers; the exponent of rate i stands in bits 2i and 2i + 1."""


@dataclass(frozen=True, slots=True)
class Move:
    """``times`` products w(cycle) rest, matched with those of the reversed cycle."""

    cycle: int
    rest: tuple[int, ...]
    times: int


@dataclass(frozen=True, slots=True)
class TransportProof:
    """``cycles``: the numbers of the rates along each cycle used; a matching per pair of states."""

    transitions: tuple[int, ...]
    cycles: tuple[tuple[int, ...], ...]
    pairs: tuple[tuple[int, int, tuple[Move, ...]], ...]

    def subject(self, network: Network) -> str:
        """Return what the proof is about in the words of the file."""
        return ", ".join(network.transitions[e].name for e in self.transitions)


def transport_proof(
    analysis: Analysis, bundle: tuple[int, ...], step: Callable[[], None] = lambda: None
) -> TransportProof:
    """Return the transport proof of a bundle: every cycle in question must run both ways.

    Raises SizeLimitError where there are too many products, or no matching was found.
    """
    parts = _parts(analysis, bundle)
    states = range(analysis.graph.size)
    total = sum(len(parts[i][1]) * len(parts[j][0]) + len(parts[i][0]) * len(parts[j][1])
                for i, j in combinations(states, 2))
    if total > MOST_PRODUCTS:
        raise SizeLimitError(f"{total} products of trees are more than the limit of {MOST_PRODUCTS}"
                             " of a transport proof")
    turns = _turns(mixed_cycles(analysis, bundle))
    numbers: dict[int, int] = {}
    pairs = []
    for i, j in combinations(states, 2):
        above, below = _times(parts[i][1], parts[j][0]), _times(parts[i][0], parts[j][1])
        moves = []
        for turn, rest, times in match(above, below, turns):
            number = numbers.setdefault(turn, len(numbers))
            moves.append(Move(number, _rates(rest), times))
        pairs.append((i, j, tuple(sorted(moves, key=lambda move: (move.cycle, move.rest)))))
        step()
    return TransportProof(bundle, tuple(turns[turn].along for turn in numbers), tuple(pairs))


def mixed_cycles(analysis: Analysis, bundle: tuple[int, ...]) -> list[Cycle]:
    """Return the cycles that have transitions both inside and outside a bundle."""
    inside = set(bundle)
    return [cycle for cycle in analysis.cycles
            if inside & set(cycle.transitions) and not inside >= set(cycle.transitions)]


def runs_both_ways(analysis: Analysis, cycle: Cycle) -> bool:
    """Return whether one-way transitions let a cycle be run in either direction."""
    return can_run_along(analysis.graph, cycle) and can_run_against(analysis.graph, cycle)


@dataclass(frozen=True, slots=True)
class _Turn:
    """A cycle in one direction: its rates, their product, that of the reversed cycle."""

    along: tuple[int, ...]
    product: int
    reversed: int


def _turns(cycles: list[Cycle]) -> list[_Turn]:
    found = []
    for cycle in cycles:
        one = tuple(2 * e + (0 if ahead else 1)
                    for e, ahead in zip(cycle.transitions, cycle.along, strict=True))
        other = tuple(rate ^ 1 for rate in reversed(one))
        found += [_Turn(one, _product(one), _product(other)),
                  _Turn(other, _product(other), _product(one))]
    return found


def _product(rates: tuple[int, ...]) -> int:
    return sum(1 << BITS * rate for rate in rates)


def _rates(product: int) -> tuple[int, ...]:
    found: list[int] = []
    rate = 0
    while product:
        found += [rate] * (product & (1 << BITS) - 1)
        product >>= BITS
        rate += 1
    return tuple(found)


def _parts(analysis: Analysis, bundle: tuple[int, ...]) -> list[tuple[list[int], list[int]]]:
    """Return for each root the trees that use r and r + 1 transitions of the bundle."""
    mask = sum(1 << e for e in bundle)
    least = min((int(tree) & mask).bit_count() for tree in analysis.trees.masks)
    parts = []
    for root in range(analysis.graph.size):
        split: tuple[list[int], list[int]] = ([], [])
        forward, backward = rooted(analysis.trees, root)
        for ahead, back in zip(forward.tolist(), backward.tolist(), strict=True):
            used = ((ahead | back) & mask).bit_count() - least
            split[used].append(_product(tuple(_numbers(ahead, 0)) + tuple(_numbers(back, 1))))
        parts.append(split)
    return parts


def _numbers(mask: int, backward: int) -> Iterator[int]:
    e = 0
    while mask:
        if mask & 1:
            yield 2 * e + backward
        mask >>= 1
        e += 1


def _times(one: list[int], other: list[int]) -> Products:
    return Counter(a + b for a in one for b in other)


def match(above: Products, below: Products, turns: list[_Turn]) -> list[tuple[int, int, int]]:
    """Return (turn, rest, times): what must be reversed to make one sum of products the other.

    First with equal products left out, then, where that finds no matching, with all of them.
    """
    common = above & below
    for one, other in ((above - common, below - common), (above, below)):
        found = _flow(one, other, turns)
        if found is not None:
            return found
    raise SizeLimitError("no matching of products by the reversal of one cycle each was found for"
                         " this bundle")


def _flow(
    above: Products, below: Products, turns: list[_Turn]
) -> list[tuple[int, int, int]] | None:
    import networkx as nx

    links: dict[tuple[int, int], int] = {}
    graph = nx.DiGraph()
    graph.add_nodes_from(("source", "goal"))
    for product, count in above.items():
        graph.add_edge("source", ("above", product), capacity=count)
        if product in below:
            graph.add_edge(("above", product), ("below", product))
        for number, turn in enumerate(turns):
            if _divides(turn.product, product):
                other = product - turn.product + turn.reversed
                if other in below and (product, other) not in links:
                    links[product, other] = number
                    graph.add_edge(("above", product), ("below", other))
    for product, count in below.items():
        graph.add_edge(("below", product), "goal", capacity=count)
    value, flow = nx.maximum_flow(graph, "source", "goal")
    if value < above.total() or value < below.total():
        return None
    return [(number, product - turns[number].product, flow["above", product]["below", other])
            for (product, other), number in links.items() if flow["above", product]["below", other]]


def _divides(part: int, product: int) -> bool:
    """Return whether a product of different rates divides another product."""
    return part & ~(product | product >> 1) == 0
