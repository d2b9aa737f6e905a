"""What a network is: its states, transitions, trees, cycles, forces and splittings."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis, as_analysis
from symbolic_response.response.forces import (
    CycleForce,
    detailed_balance_holds,
    force_basis,
    force_of,
    independent_forces,
)
from symbolic_response.topology import (
    Cycle,
    blocks,
    bridges,
    count_undirected_trees,
    splittings,
)
from symbolic_response.topology.graph import members

MAX_RELATED = 200


@dataclass(frozen=True, slots=True)
class IndependentForce:
    """A cycle whose force is independent of the earlier ones."""

    cycle: Cycle
    force: str


@dataclass(frozen=True, slots=True)
class ForceRelation:
    """A cycle whose force is a combination of the independent ones: pairs (factor, place)."""

    cycle: Cycle
    terms: tuple[tuple[Fraction, int], ...]


@dataclass(frozen=True, slots=True)
class Survey:
    """What ``survey`` reports; ``beyond`` lists what exceeded a limit and is None here."""

    network: Network
    rooted_trees: tuple[int, ...]
    undirected_trees: int
    blocks: tuple[tuple[int, ...], ...]
    bridges: tuple[int, ...]
    detailed_balance: bool
    cycles: tuple[CycleForce, ...] | None
    independent: tuple[IndependentForce, ...] | None
    relations: tuple[ForceRelation, ...]
    splittings: tuple[tuple[tuple[int, ...], ...], ...] | None
    beyond: tuple[str, ...]

    def path(self, cycle: Cycle) -> str:
        """Return a cycle as its states."""
        return cycle_path(cycle, self.network)


def cycle_path(cycle: Cycle, network: Network) -> str:
    """Return a cycle as its states, with transitions where several join two states."""
    names = [network.states[k].name for k in cycle.states]
    steps = [names[0]]
    for place, e in enumerate(cycle.transitions):
        ends = {network.transitions[e].first, network.transitions[e].second}
        parallel = sum({t.first, t.second} == ends for t in network.transitions) > 1
        arrow = f" -[{network.transitions[e].name}]-> " if parallel else " -> "
        steps += [arrow, names[(place + 1) % len(names)]]
    return "".join(steps)


def survey(subject: Network | Analysis) -> Survey:
    """Return what a network is; what exceeds a limit is left out and named in ``beyond``."""
    analysis = as_analysis(subject)
    graph, beyond = analysis.graph, []
    cycle_forces = independent = cuts = None
    relations: tuple[ForceRelation, ...] = ()
    try:
        cycle_forces = tuple(force_of(cycle, analysis) for cycle in analysis.cycles)
    except SizeLimitError as error:
        beyond.append(f"cycles: {error}")
    try:
        independent, relations = _independence(analysis, cycle_forces is not None)
    except SizeLimitError as error:
        beyond.append(f"independent forces: {error}")
    try:
        cuts = tuple(_splittings(e, analysis) for e in range(len(graph.ends)))
    except SizeLimitError as error:
        beyond.append(f"splittings: {error}")
    return Survey(
        analysis.network,
        analysis.tree_counts,
        count_undirected_trees(graph),
        blocks(graph),
        bridges(graph),
        detailed_balance_holds(analysis),
        cycle_forces,
        independent,
        relations,
        cuts,
        tuple(beyond),
    )


def _independence(
    analysis: Analysis, listed: bool
) -> tuple[tuple[IndependentForce, ...], tuple[ForceRelation, ...]]:
    cycles = _finite_cycles(analysis, listed)
    found = independent_forces(cycles, analysis)
    chosen = []
    for place in found.basis:
        force = force_of(cycles[place], analysis).force
        assert force is not None
        chosen.append(IndependentForce(cycles[place], expression_text(force)))
    relations = [
        ForceRelation(
            cycles[place], tuple((factor, i) for i, factor in enumerate(row) if factor)
        )
        for place, row in found.relations.items()
    ]
    return tuple(chosen), tuple(relations)


def _finite_cycles(analysis: Analysis, listed: bool) -> tuple[Cycle, ...]:
    """Return all cycles of finite force while they are listed and few, else a basis of them."""
    if not listed or len(analysis.cycles) > MAX_RELATED:
        return force_basis(analysis)
    return tuple(
        cycle
        for cycle in analysis.cycles
        if not any(analysis.graph.one_way[e] for e in cycle.transitions)
    )


def _splittings(e: int, analysis: Analysis) -> tuple[tuple[int, ...], ...]:
    return tuple(tuple(members(int(mask))) for mask in splittings(analysis.graph, e))


def force_text(force: CycleForce) -> str:
    """Return a force in the syntax of the file, or ``infinite`` with its sign."""
    if force.force is None:
        return "infinite" if force.sign > 0 else "-infinite"
    return expression_text(force.force)


def relation_text(relation: ForceRelation) -> str:
    """Return a relation as ``F1 - 2*F2``; ``0`` where the force vanishes identically."""
    parts: list[str] = []
    for factor, place in relation.terms:
        size = "" if abs(factor) == 1 else fraction_text(abs(factor)) + "*"
        sign = ("-" if factor < 0 else "") if not parts else (" - " if factor < 0 else " + ")
        parts.append(f"{sign}{size}F{place + 1}")
    return "".join(parts) or "0"


def survey_data(result: Survey) -> dict[str, object]:
    """Return the survey as plain data for JSON."""
    network = result.network
    states = [state.name for state in network.states]
    names = [t.name for t in network.transitions]
    return {
        "network": network.title,
        "about": network.about,
        "states": states,
        "symbols": {s.name: {"sign": "positive" if s.positive else "real", "about": s.about}
                    for s in network.symbols},
        "transitions": [
            {
                "name": t.name,
                "between": [states[t.first], states[t.second]],
                "forward": expression_text(t.forward),
                "backward": None if t.backward is None else expression_text(t.backward),
            }
            for t in network.transitions
        ],
        "observables": [o.name for o in network.observables],
        "trees": {
            "rooted": dict(zip(states, result.rooted_trees, strict=True)),
            "total": sum(result.rooted_trees),
            "undirected": result.undirected_trees,
        },
        "blocks": [[names[e] for e in block] for block in result.blocks],
        "bridges": [names[e] for e in result.bridges],
        "detailed_balance": result.detailed_balance,
        "cycles": None if result.cycles is None else [
            {
                "states": [states[k] for k in c.cycle.states],
                "transitions": [names[e] for e in c.cycle.transitions],
                "force": force_text(c),
            }
            for c in result.cycles
        ],
        "independent_forces": None if result.independent is None else [
            {"cycle": result.path(f.cycle), "force": f.force} for f in result.independent
        ],
        "force_relations": [
            {"cycle": result.path(r.cycle), "force": relation_text(r)} for r in result.relations
        ],
        "splittings": None if result.splittings is None else {
            name: [[states[k] for k in cut] for cut in cuts]
            for name, cuts in zip(names, result.splittings, strict=True)
        },
        "beyond_limits": list(result.beyond),
    }


MAX_SHOWN = 12


def survey_text(result: Survey) -> str:
    """Return the survey for people to read."""
    network = result.network
    states = [state.name for state in network.states]
    lines = [network.title, f"states ({len(states)}): {', '.join(states)}",
             f"transitions ({len(network.transitions)}):"]
    width = max(len(t.name) for t in network.transitions)
    for t in network.transitions:
        arrow = "->" if t.backward is None else "<->"
        rates = expression_text(t.forward)
        if t.backward is not None:
            rates += f", {expression_text(t.backward)}"
        lines.append(f"  {t.name:<{width}}  {states[t.first]} {arrow} {states[t.second]}   {rates}")
    if network.observables:
        lines.append(f"observables: {', '.join(o.name for o in network.observables)}")
    counts = ", ".join(f"{s} {n}" for s, n in zip(states, result.rooted_trees, strict=True))
    lines.append(f"spanning trees: {result.undirected_trees} without direction;"
                 f" {sum(result.rooted_trees)} rooted ({counts})")
    lines += _cycle_lines(result) + _force_lines(result) + _splitting_lines(result)
    return "\n".join(lines)


def _cycle_lines(result: Survey) -> list[str]:
    if result.cycles is None:
        return ["cycles: beyond the limit"]
    lines = [f"cycles ({len(result.cycles)}), each with its force:"]
    lines += [f"  {result.path(c.cycle)}   {force_text(c)}" for c in result.cycles[:MAX_SHOWN]]
    return lines + _rest(len(result.cycles))


def _force_lines(result: Survey) -> list[str]:
    holds = "holds identically" if result.detailed_balance else "does not hold identically"
    lines = [f"detailed balance: {holds}"]
    if result.independent is not None:
        lines.append(f"independent finite cycle forces: {len(result.independent)}")
        for place, found in enumerate(result.independent[:MAX_SHOWN]):
            lines.append(f"  F{place + 1} = {found.force}   ({result.path(found.cycle)})")
        lines += _rest(len(result.independent))
        for relation in result.relations[:MAX_SHOWN]:
            lines.append(f"  {result.path(relation.cycle)}: {relation_text(relation)}")
        lines += _rest(len(result.relations))
    return lines


def _splitting_lines(result: Survey) -> list[str]:
    if result.splittings is None:
        return ["splittings: beyond the limit"]
    states = [state.name for state in result.network.states]
    lines = ["splittings of each transition:"]
    for t, cuts in zip(result.network.transitions, result.splittings, strict=True):
        shown = [_cut_text(cut, states) for cut in cuts[:MAX_SHOWN]]
        more = f" and {len(cuts) - MAX_SHOWN} more" if len(cuts) > MAX_SHOWN else ""
        lines.append(f"  {t.name} ({len(cuts)}): {', '.join(shown)}{more}")
    if result.bridges:
        names = ", ".join(result.network.transitions[e].name for e in result.bridges)
        lines.append(f"bridges (in no cycle): {names}")
    return lines


def _cut_text(cut: tuple[int, ...], states: list[str]) -> str:
    inside = " ".join(states[k] for k in cut)
    outside = " ".join(name for k, name in enumerate(states) if k not in cut)
    return f"{inside} | {outside}"


def _rest(count: int) -> list[str]:
    return [f"  ... and {count - MAX_SHOWN} more (all with --json)"] if count > MAX_SHOWN else []
