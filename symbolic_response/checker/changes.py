"""How rates change: v = d ln w/d theta of each directed rate, and what claims ask of these."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

from .expressions import HALF, ONE, ZERO
from .extremes import extremes
from .forms import read_form
from .network import Graph, rank
from .reading import invalid
from .record import Network, Perturbation

Moves = Sequence[Fraction]  # v by number of the rate, 0 where there is no rate


def elementary(moves: list[Fraction], graph: Graph, moved: Perturbation) -> None:
    """Put the effect of an energy, of barriers or of a drive on the logarithms of the rates."""
    for i in graph.rates:
        if moved.kind == "energy" and graph.step(i)[0] == moved.place:
            moves[i] = ONE
        elif i >> 1 in moved.transitions:
            moves[i] = (-HALF if i & 1 else HALF) if moved.kind == "drive" else -ONE


def changes(network: Network, moved: Perturbation, graph: Graph) -> list[Fraction]:
    """Return v of each rate as it is for all values of the symbols."""
    moves = [ZERO] * len(graph.every)
    elementary(moves, graph, moved)
    for i in graph.rates if moved.symbol else ():
        expression = network.rates[i >> 1][i & 1]
        assert expression is not None
        found = read_form(expression, network.positive, moved, graph.work).change
        if found is None:
            raise invalid(network.entry(i), "a form that shows how its logarithm changes",
                          expression.text)
        moves[i] = found
    return moves


def changed(moves: Moves) -> list[int]:
    """Return the transitions whose rates change."""
    return sorted({i >> 1 for i, move in enumerate(moves) if move})


def support(moves: Moves, graph: Graph, entry: str, where: str) -> Fraction:
    """Return m kappa; the rates that leave one state must change alike."""
    leaving = {(graph.step(i)[0], move) for i, move in enumerate(moves) if move}
    states, sizes = {state for state, _ in leaving}, {abs(move) for _, move in leaving}
    if len(sizes) > 1 or len(states) < len(leaving):
        raise invalid(entry, f"rates that change alike{where}", _some(sizes))
    return sum(sizes, ZERO) * len(states)


def _some(values: set[Fraction]) -> str:
    return ", ".join(sorted(map(str, values))[:4])


def common(moves: Moves, entry: str, where: str) -> Fraction:
    """Return what the logarithms of all rates that change change by."""
    found = {move for move in moves if move}
    if len(found) > 1:
        raise invalid(entry, f"rates that all change alike{where}", _some(found))
    return sum(found, ZERO)


def directed(moves: Moves, graph: Graph, entry: str, where: str) -> Fraction:
    """Return kappa (hi - lo) of a directed bundle."""
    common(moves, entry, where)
    low, high = extremes(graph, moves)
    return high - low


def bundle(moves: Moves, graph: Graph, entry: str, where: str) -> tuple[Fraction, list[int]]:
    """Return kappa and the transitions of a bundle: kappa 0 where every tree uses r of them."""
    kappa, chosen = abs(common(moves, entry, where)), changed(moves)
    for i in graph.rates:
        if i >> 1 in chosen and not moves[i]:
            raise invalid(entry, f"transitions both of whose rates change{where}", f"rate {i}")
    inside = [graph.ends[e] for e in chosen]
    outside = [ends for e, ends in enumerate(graph.ends) if e not in chosen]
    order = rank(graph.states, inside) + rank(graph.states, outside) - (graph.states - 1)
    if order > 1:
        raise invalid(entry, f"trees that use r or r + 1 of these transitions{where}",
                      f"r to r + {order}")
    return kappa * order, chosen


def check_pieces(moves: Moves, graph: Graph, pieces: dict[str, dict[int, Fraction]],
                 network: Network, entry: str, where: str) -> None:
    """Check that energies, barriers and singles give the changes of the rates."""
    energies, barriers, singles = pieces.values()
    for key in ("barriers", "singles"):
        for e, value in pieces[key].items():
            if value < 0:
                raise invalid(f"{entry}.{key}.{network.transitions[e]}",
                              f"no negative value{where}", value)
    for e, (first, second) in enumerate(graph.ends):
        x = moves[2 * e] - energies.get(first, ZERO)
        y = None if graph.one_way[e] else moves[2 * e + 1] - energies.get(second, ZERO)
        if not _covered(x, y, barriers.get(e, ZERO), singles.get(e, ZERO)):
            raise invalid(entry, f"pieces that give the changes of {network.transitions[e]}{where}",
                          "others")


def _covered(x: Fraction, y: Fraction | None, barrier: Fraction, single: Fraction) -> bool:
    if y is None:
        return abs(x) <= single
    return any(abs(x - b) + abs(y - b) <= single or (x + y == 2 * b and abs(x - y) <= single)
               for b in (barrier, -barrier))
