"""The topological data of a bound, in the words of the network file."""

from __future__ import annotations

from dataclasses import dataclass

from symbolic_response.bounds.claim import Claim, CycleMaximum, LargestForce, MixedCycles
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.forces import force_of
from symbolic_response.response.survey import cycle_path, force_text
from symbolic_response.topology import Cycle, splittings
from symbolic_response.topology.graph import members

MOST_SHOWN = 1_000


def cycles_through(e: int, analysis: Analysis) -> tuple[Cycle, ...]:
    """Return the cycles that contain a transition."""
    return tuple(cycle for cycle in analysis.cycles if e in cycle.transitions)


def competing(force: LargestForce, analysis: Analysis) -> tuple[Cycle, ...]:
    """Return the cycles of which a force is the largest."""
    if isinstance(force, CycleMaximum):
        return cycles_through(force.transition, analysis)
    inside = set(force.transitions)
    return tuple(
        cycle for cycle in analysis.cycles
        if inside & set(cycle.transitions) and set(cycle.transitions) - inside
    )


def force_label(force: LargestForce, analysis: Analysis) -> str:
    """Return what the cycles of a largest force run through, in words."""
    names = force_names(force, analysis)
    return f"{names} and others" if isinstance(force, MixedCycles) else names


def force_names(force: LargestForce, analysis: Analysis) -> str:
    """Return the transitions that a largest force is about, by name."""
    chosen = force.transitions if isinstance(force, MixedCycles) else (force.transition,)
    return ", ".join(analysis.network.transitions[e].name for e in chosen)


def transition_data(e: int, analysis: Analysis) -> dict[str, object]:
    """Return the transition that a bound is about; its cycles are listed where they are shown."""
    return {"transition": analysis.network.transitions[e].name}


@dataclass(frozen=True, slots=True)
class Competing:
    """How many cycles a force is the largest of, and the first 1,000 with their forces."""

    number: int
    shown: list[dict[str, str]]


def competing_cycles(claim: Claim, analysis: Analysis) -> dict[str, Competing]:
    """Return the cycles that compete for each force of a claim, by what they run through."""
    found: dict[str, Competing] = {}
    for term in claim.right:
        if isinstance(term.force, LargestForce):
            cycles = competing(term.force, analysis)
            found[force_label(term.force, analysis)] = Competing(len(cycles), [
                {"cycle": cycle_path(cycle, analysis.network),
                 "force": force_text(force_of(cycle, analysis))}
                for cycle in cycles[:MOST_SHOWN]
            ])
    return found


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
