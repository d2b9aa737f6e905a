"""The topological data of a bound, in the words of the network file."""

from __future__ import annotations

from symbolic_response.response.analysis import Analysis
from symbolic_response.response.forces import force_of
from symbolic_response.response.survey import cycle_path, force_text
from symbolic_response.topology import Cycle, splittings
from symbolic_response.topology.graph import members


def cycles_through(e: int, analysis: Analysis) -> tuple[Cycle, ...]:
    """Return the cycles that contain a transition."""
    return tuple(cycle for cycle in analysis.cycles if e in cycle.transitions)


def cycle_data(e: int, analysis: Analysis) -> dict[str, object]:
    """Return the cycles that compete for F_max(e), each with its force."""
    return {
        "transition": analysis.network.transitions[e].name,
        "cycles": [
            {
                "cycle": cycle_path(cycle, analysis.network),
                "force": force_text(force_of(cycle, analysis)),
            }
            for cycle in cycles_through(e, analysis)
        ],
    }


def end_pair_data(e: int, analysis: Analysis) -> dict[str, object]:
    """Return the two ends of a transition."""
    transition, states = analysis.network.transitions[e], analysis.network.states
    return {
        "transition": transition.name,
        "ends": [states[transition.first].name, states[transition.second].name],
    }


def splitting_data(e: int, analysis: Analysis) -> dict[str, object]:
    """Return the splittings of a transition, each as the side of its first end."""
    states = analysis.network.states
    return {
        "splittings": [
            [states[k].name for k in members(int(mask))]
            for mask in splittings(analysis.graph, e)
        ]
    }
