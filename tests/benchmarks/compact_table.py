"""The table of compact formulas: characters (literals) of ours beside those published.

Run as ``python -m tests.benchmarks.compact_table``. Every rate is written ``W_{21}``: 6 characters;
``+`` and ``-`` count 1, parentheses 2, a bar of a fraction 1, spaces and products nothing. Names
(``N_1``, ``C_1``, ``S_1``) have 3, forest differences and effective rates 6. Left sides count for
named sums that were not asked for.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TypeVar

from rich.console import Console
from rich.table import Table

from symbolic_response.algebra.compact.factor import factored
from symbolic_response.algebra.compact.measure import characters, literals
from symbolic_response.algebra.compact.network import NetworkSums, compact_network
from symbolic_response.algebra.compact.states import eliminated
from symbolic_response.expressions.ring import expression_of
from symbolic_response.network import Network
from symbolic_response.response.analysis import Analysis
from tests.benchmarks.networks import complete, cube, ladder, square_with_chord

T = TypeVar("T")


def sums_of(network: Network, *, forests: bool = True) -> NetworkSums:
    """Return the sums of a network over its rates."""
    analysis = Analysis(network)
    transitions = range(len(network.transitions))
    states = range(analysis.graph.size)
    rates = analysis.rates
    return NetworkSums(
        analysis.graph,
        rates.ring,
        [(rates.generator(e), None if analysis.graph.one_way[e] else rates.generator(e, True))
         for e in transitions],
        [analysis.tree_sum(k) for k in states],
        analysis.normalisation,
        {e: analysis.current_numerator(e) for e in transitions},
        {(k, e): analysis.forest_difference(k, e) for k in states for e in transitions}
        if forests else {},
    )


@dataclass(frozen=True, slots=True)
class Published:
    """What the table of the design notes says: expanded, kernel division, elimination, whole."""

    name: str
    make: Callable[[], Network]
    expanded: tuple[int, int]
    kernel: tuple[int, int]
    elimination: int
    whole: int | None


LISTED = (
    Published("square with chord", square_with_chord, (151, 24), (79, 11), 153, 2192),
    Published("K4", lambda: complete(4), (303, 48), (144, 20), 292, 4188),
    Published("six-state ladder", lambda: ladder(3), (464, 75), (170, 25), 374, 10939),
    Published("cube", cube, (16511, 2688), (1980, 282), 1277, None),
)


def timed(work: Callable[[], T]) -> tuple[T, float]:
    """Return a result and the seconds it took."""
    start = time.perf_counter()
    result = work()
    return result, time.perf_counter() - start


def rows(entry: Published) -> list[tuple[str, str, str, str]]:
    """Return what is measured, the published number, ours and the seconds."""
    network = entry.make()
    sums = sums_of(network)
    first = sums.trees[0]
    flat = expression_of(sums.ring, first)
    form, by_kernel = timed(lambda: factored(first, sums.ring))
    one, by_names = timed(lambda: eliminated(sums.graph, sums.ring, sums.rates, root=0))
    found = [
        ("N_1 expanded", pair(*entry.expanded), pair(characters(flat), literals(flat)), ""),
        ("N_1, kernel division", pair(*entry.kernel), pair(characters(form), literals(form)),
         f"{by_kernel:.3f}"),
        ("N_1, elimination where shorter", str(entry.elimination),
         pair(one.characters(), one.literals()), f"{by_names:.3f}"),
    ]
    every, seconds = timed(
        lambda: compact_network(NetworkSums(sums.graph, sums.ring, sums.rates, sums.trees)))
    found.append(("all N_k", "", pair(every.characters(), every.literals()), f"{seconds:.3f}"))
    return found + whole_rows(sums, entry)


def whole_rows(sums: NetworkSums, entry: Published) -> list[tuple[str, str, str, str]]:
    """Return the rows of all N_k, C_e and Phi_{k,e}, each by itself and together."""
    found = []
    published = "" if entry.whole is None else str(entry.whole)
    if entry.whole is not None:
        polys = [*sums.trees, *sums.currents.values(), *sums.forests.values()]
        forms, seconds = timed(lambda: [factored(poly, sums.ring) for poly in polys])
        size, count = sum(map(characters, forms)), sum(map(literals, forms))
        found.append(("N_k, C_e, Phi_ke, each alone", published, pair(size, count),
                      f"{seconds:.3f}"))
    together, seconds = timed(lambda: compact_network(sums))
    found.append(("N_k, C_e, Phi_ke, D together", published,
                  pair(together.characters(), together.literals()), f"{seconds:.3f}"))
    found.append(("the same, left sides counted", published,
                  pair(together.characters(left_sides=True), together.literals()), ""))
    return found


def pair(size: int, count: int) -> str:
    """Return characters and literals as the table writes them."""
    return f"{size} ({count})"


def table(listed: Sequence[Published] = LISTED) -> str:
    """Return the table as text."""
    shown = Table("network", "what", "published", "ours", "seconds", title="Compact formulas")
    for entry in listed:
        for row in rows(entry):
            shown.add_row(entry.name, *row)
    console = Console(width=110, color_system=None)
    with console.capture() as capture:
        console.print(shown)
    return capture.get()


if __name__ == "__main__":
    print(table())
