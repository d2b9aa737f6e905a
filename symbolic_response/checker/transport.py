"""The proof of a bundle: products of trees go into each other by reversing cycles."""

from __future__ import annotations

from .network import Graph, Path
from .reading import invalid, items, malformed, members, numbers, places, whole
from .record import Network
from .trees import Polynomial, Polynomials

MAX_MOVES = 1_000_000  # of a pair


def check_transport(trees: Polynomials, network: Network, values: dict[str, object],
                    entry: str) -> list[int]:
    """Check a proof, and return the transitions it is about."""
    graph = trees.graph
    chosen = places(values["transitions"], f"{entry}.transitions", network.transitions, 1)
    mask = sum(1 << e for e in chosen)
    uses = [(one & mask).bit_count() for one in trees.masks]
    if max(uses) > min(uses) + 1:
        raise invalid(f"{entry}.transitions", "trees that use r or r + 1 of them",
                      f"{min(uses)} to {max(uses)}")
    cycles = [_cycle(one, f"{entry}.cycles[{k}]", graph, set(chosen))
              for k, one in enumerate(items(values["cycles"], f"{entry}.cycles", MAX_MOVES, 0))]
    parts = [[trees.there(x for x, use in zip(trees.directed(k), uses, strict=True)
                          if use == min(uses) + more) for more in (0, 1)]
             for k in range(graph.states)]
    missing = {(i, j) for j in range(graph.states) for i in range(j)}
    for k, one in enumerate(items(values["pairs"], f"{entry}.pairs", MAX_MOVES, 0)):
        here = f"{entry}.pairs[{k}]"
        states, moves = members(one, here, "states", "moves")
        i, j = places(states, f"{here}.states", network.states, 2, 2)
        if (i, j) not in missing:
            raise invalid(f"{here}.states", "each pair once", states)
        missing.remove((i, j))
        _check_pair(trees, cycles, moves, here, [parts[i][1], parts[j][0]],
                    [parts[i][0], parts[j][1]])
    if missing:
        raise invalid(f"{entry}.pairs", "every pair of states", f"{len(missing)} missing")
    return list(chosen)


def _cycle(value: object, entry: str, graph: Graph, chosen: set[int]) -> Path:
    rates = numbers(value, entry, len(graph.every), 2)
    steps = [graph.step(i) for i in rates]
    joined = all(a[1] == b[0] for a, b in zip(steps, [*steps[1:], steps[0]], strict=True))
    inside = {i >> 1 in chosen for i in rates}
    if not joined or len({a for a, _ in steps}) < len(steps) or len(inside) < 2:
        raise invalid(entry, "a cycle with transitions inside and outside the bundle", value)
    return rates


def _check_pair(trees: Polynomials, cycles: list[Path], moves: object, entry: str,
                ahead: list[Polynomial], behind: list[Polynomial]) -> None:
    """Take cycles and their reverses times the rest from two products; the same must remain."""
    graph = trees.graph
    left: Polynomial = {}
    right: Polynomial = {}
    trees.add(left, ahead)
    trees.add(right, behind)
    for k, move in enumerate(items(moves, f"{entry}.moves", MAX_MOVES, 0)):
        here = f"{entry}.moves[{k}]"
        which, rest, times = members(move, here, "cycle", "rest", "times")
        cycle = cycles[whole(which, f"{here}.cycle", len(cycles))]
        others = numbers(rest, f"{here}.rest", len(graph.every), 0)
        if list(others) != sorted(others):
            raise malformed(f"{here}.rest", "a sorted list", rest)
        number = whole(times, f"{here}.times", least=1)
        graph.work.charge(20 * len(others), 0)
        if len(cycle) + len(others) != 2 * (graph.states - 1):
            raise invalid(f"{here}.rest", "as many rates as two trees have, with the cycle", rest)
        for total, part in ((left, cycle), (right, [i ^ 1 for i in cycle])):
            monomial = trees.monomial((*part, *others))
            total[monomial] = total.get(monomial, 0) - number
            if total[monomial] < 0:
                raise invalid(here, "no more than the products of trees have", "more")
    if not trees.equal([[left]], [[right]]):
        raise invalid(f"{entry}.moves", "the same rest of both products", "others")
