"""The family of pieces into which changes of the rates are taken apart; part of every statement.

Pieces whose effect on ln(p_i/p_j) has a known limit: energies, bundles, separations of order 0,
drives, and sets of rates out of one state. The limits are named in :class:`Family`.
"""

from __future__ import annotations

from dataclasses import dataclass

from symbolic_response.control.separations import Part, separations
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import blocks

MOST_BUNDLES = 2_000


@dataclass(frozen=True, slots=True)
class Family:
    """Pieces of d ln(rates), and how much a piece of amount x moves ln(p_i/p_j) at the most.

    - energies of the states 0 .. ``size`` - 1 (all rates out of a state): together max - min;
    - ``blocks``, separations of order 0 (all rates of a block): nothing;
    - ``bundles`` (all rates of transitions of which every spanning tree uses r or r + 1): |x|
      tanh(F/4), F the largest force of a cycle with transitions inside and outside; Owen, Gingrich
      & Horowitz, Phys. Rev. X 10, 011066 (2020) for single ones, derived here for the others, see
      DEVELOPERS.md;
    - ``drives`` of all transitions (forward x/2, backward -x/2): |x|, one-way |x|/2;
    - where ``directed``, every set of rates out of one state: |x|.

    ``complete``: every bundle is a union of blocks and one of ``bundles``, or the rest of one.
    ``rates``: transition and direction of each directed rate, by place; ``sources``: its state.
    ``single``: the bundles were restricted to single transitions.
    """

    size: int
    rates: tuple[tuple[int, bool], ...]
    sources: tuple[int, ...]
    blocks: tuple[Part, ...]
    bundles: tuple[Part, ...]
    complete: bool
    drives: tuple[int, ...]
    directed: bool
    single: bool

    def words(self) -> str:
        """Return what the family is, as a statement made with it has to say.

        >>> from symbolic_response.network import Rates, build_network
        >>> network = build_network("pair", states=["A", "B"], symbols={"k": {}}, transitions=[
        ...     Rates("A", "B", "k", "1", name="one"), Rates("A", "B", "2", "1", name="two")])
        >>> family_of(Analysis(network), single=True, directed=False).words()
        'energies of the states; unions of blocks; single transitions, no other bundles; drives'
        """
        count = len(self.bundles)
        if self.single:
            bundles = "single transitions, no other bundles"
        elif self.complete:
            bundles = "all bundles"
        else:
            bundles = (f"the first {count} bundles up to complements in their blocks, in the order"
                       " of their number of transitions, then of these in the file")
        parts = ["energies of the states", "unions of blocks", bundles, "drives"]
        return "; ".join([*parts, *(["sets of rates out of one state"] if self.directed else [])])

    def data(self) -> dict[str, object]:
        """Return the same as data."""
        return {
            "energies": self.size, "blocks": len(self.blocks), "bundles": len(self.bundles),
            "largest_bundle": max(map(len, self.bundles), default=0), "complete": self.complete,
            "single_transitions_only": self.single, "drives": len(self.drives),
            "sets_of_rates_out_of_a_state": self.directed, "words": self.words(),
        }

    def places(self, transitions: Part) -> tuple[int, ...]:
        """Return the places of all rates of some transitions."""
        return tuple(r for r, (e, _) in enumerate(self.rates) if e in transitions)

    def is_one_way(self, transition: int) -> bool:
        """Return whether a transition has no backward rate."""
        return (transition, True) not in self.rates


def family_of(
    analysis: Analysis, *, most: int = MOST_BUNDLES, single: bool = False, directed: bool = True
) -> Family:
    """Return the family of a network.

    ``most``: bundles at the most, in the order of their number of transitions, then of these;
    single transitions are always there. ``single``: no other bundles. ``directed``: with the sets
    of rates out of one state.
    """
    graph = analysis.graph
    found, complete = separations(graph, 0 if single else most)
    if single:
        found = tuple(part for part in found if len(part) == 1)
    rates = tuple(analysis.rates.directions())
    sources = tuple(graph.ends[e][1 if backward else 0] for e, backward in rates)
    return Family(graph.size, rates, sources, blocks(graph), found, complete,
                  tuple(range(len(graph.ends))), directed, single)


def classes_of(family: Family, analysis: Analysis) -> tuple[int, ...]:
    """Return a number for each bundle, the same for those with the same cycles.

    The cycles with transitions inside and outside a bundle set its t.
    """
    cycles = [cycle.forward | cycle.backward for cycle in analysis.cycles]
    numbers: dict[tuple[int, ...], int] = {}
    found = []
    for part in family.bundles:
        mask = sum(1 << e for e in part)
        key = tuple(i for i, cycle in enumerate(cycles) if cycle & mask and cycle & ~mask)
        found.append(numbers.setdefault(key, len(numbers)))
    return tuple(found)
