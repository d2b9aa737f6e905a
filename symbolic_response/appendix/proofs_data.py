"""The data of the proofs: cycles, splittings and paths with the numbers of their forests."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from symbolic_response.appendix.cycles_section import MAX_LISTED
from symbolic_response.appendix.forests import forests_into
from symbolic_response.appendix.formulas import filled
from symbolic_response.appendix.paper import Paper
from symbolic_response.appendix.tables import Column, table, table_width
from symbolic_response.certificates.proofs.edge import EdgeProof
from symbolic_response.certificates.proofs.rows import PathsProof, Row, undirected
from symbolic_response.certificates.proofs.splitting import SplittingProof
from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.latex import latex_terms
from symbolic_response.expressions.widths import formula_width
from symbolic_response.topology import Cycle, count_undirected_trees
from symbolic_response.topology.graph import members

MAX_WEIGHT_TERMS = 6
MAX_CYCLES = 12
MAX_SPLITTINGS = 12
MAX_PATHS = 12
MAX_WHOLE_SET = 60.0


def cycles_data(paper: Paper, proofs: Sequence[EdgeProof]) -> str:
    """Return the cycles through each transition with their forests; large networks: numbers only.

    ArithmeticError where the forests do not add up to the trees without the transition.
    """
    for proof in proofs:
        _require(paper, proof)
    with_cycles = [proof for proof in proofs if proof.rows]
    if not with_cycles:
        return ""
    every = _listed_cycles(paper)
    found = {proof.transition: [_place(every, proof.transition, row) for row in proof.rows]
             for proof in with_cycles} if every else {}
    unlisted = any(None in places for places in found.values())
    if unlisted:
        every = ()
    through = {e: [place for place in places if place is not None]
               for e, places in found.items()} if every else {}
    used = sorted({place for places in through.values() for place in places})
    if len(every) == 1:
        return _single(paper, every[used[0]], with_cycles[0].rows[0].weight)
    parts = [_completeness(paper)]
    if every and len(used) <= MAX_CYCLES:
        weights = {place: row.weight for proof in with_cycles
                   for place, row in zip(through[proof.transition], proof.rows, strict=True)}
        parts += [_weights(paper, [(place, every[place], weights[place]) for place in used]),
                  _sums(paper, with_cycles, through)]
    else:
        parts.append(_counts(paper, with_cycles))
    if unlisted:
        parts.append("Among them are cycles that one-way transitions let be run neither way: their "
                     "products of rates vanish both ways.")
    return "\n\n".join(parts)


def _listed_cycles(paper: Paper) -> Sequence[Cycle]:
    """Return the cycles if all of them are listed in their section, else none."""
    try:
        every = paper.analysis.cycles
    except SizeLimitError:
        return ()
    return every if len(every) <= MAX_LISTED else ()


def _place(every: Sequence[Cycle], transition: int, row: Row) -> int | None:
    """Return the place of the cycle that a transition closes a path to, None if it is not listed:
    it can be run neither way."""
    wanted = {transition, *(step // 2 for step in row.steps)}
    return next((i for i, cycle in enumerate(every) if set(cycle.transitions) == wanted), None)


def _require(paper: Paper, proof: EdgeProof) -> None:
    total = sum(row.weight for row in proof.rows)
    if total != count_undirected_trees(undirected(paper.analysis.graph, proof.transition)):
        raise ArithmeticError(f"the cycles through transition {proof.transition} are incomplete")


def _single(paper: Paper, cycle: Cycle, weight: int) -> str:
    """Return the sum over forests of the only cycle of a network, in a sentence."""
    shown = _weight(paper, cycle.states, weight, ("", "", ""))
    trees = "one spanning tree does" if weight == 1 else f"{weight:,} spanning trees do"
    noun = "forest" if weight == 1 else "forests"
    printed = "terms" not in shown
    value = "= 1$" if shown == "1" else f"= {shown}$, of" if printed else "$, a sum over"
    value += "" if shown == "1" else f" {weight:,} {noun}"
    return filled(paper, rf"The only cycle has $@into@_1 {value}, and {trees} not use a given "
                  "transition of it: no cycle is missing.")


def _completeness(paper: Paper) -> str:
    text = (r"The numbers of forests of the cycles through $e$ add up to the number of spanning "
            r"trees that do not use $e$, which a determinant gives as well: no cycle is missing.")
    if any(paper.analysis.graph.one_way):
        text += " Forests and trees are counted here whatever the directions of their transitions."
    return text


def _weights(paper: Paper, cycles: Sequence[tuple[int, Cycle, int]]) -> str:
    """Return the table of the sums over forests that lead into the cycles."""
    letter = filled(paper, "@into@_c")
    head = [r"\mathrm{Cycle\ }c", letter, r"\mathrm{Forests}"]
    rows = [[f"{place + 1}", _weight(paper, cycle.states, weight, head), f"{weight:,}"]
            for place, cycle, weight in cycles]
    columns = (Column("Cycle $c$"), Column(f"${letter}$"), Column("Forests", "r"))
    return table(paper.page, columns, [[f"${cell}$" for cell in row] for row in rows])


def _weight(paper: Paper, states: Sequence[int], weight: int, head: Sequence[str]) -> str:
    """Return a sum over forests where it is short, else its number of terms."""
    room = paper.width - table_width([[head[0], "", head[-1]]])
    if weight <= MAX_WEIGHT_TERMS:
        node = forests_into(paper.analysis, states)
        shown = paper.latex(node)
        terms = len(latex_terms(node, paper.sums.names()))
        if terms <= MAX_WEIGHT_TERMS and formula_width(shown) <= room:
            return (r"\displaystyle " if r"\frac" in shown else "") + shown
    return rf"{weight:,}\ \mathrm{{terms}}"


def _sums(
    paper: Paper, proofs: Sequence[EdgeProof], through: dict[int, list[int]]
) -> str:
    """Return the table of transitions: their cycles, and that these are complete."""
    rows = []
    for proof in proofs:
        ordered = sorted(zip(through[proof.transition], proof.rows, strict=True),
                         key=lambda pair: pair[0])
        name = paper.notation.transitions[proof.transition]
        cycles = ",$ $".join(f"{place + 1}" for place, _ in ordered)
        total = _total([row.weight for _, row in ordered])
        rows.append([f"${name}$", f"${cycles}$", f"${total}$"])
    columns = (Column("Transition $e$"), Column("Cycles through $e$", "wrap", "cycles "),
               Column("Trees without $e$", "wrap", "trees without it "))
    return table(paper.page, columns, rows)


def _total(weights: Sequence[int]) -> str:
    if len(weights) == 1:
        return f"{weights[0]}"
    return r" + {}$\allowbreak$".join(f"{weight}" for weight in weights) + f" = {sum(weights)}"


def _counts(paper: Paper, proofs: Sequence[EdgeProof]) -> str:
    columns = (Column("Transition $e$"), Column("Cycles through $e$", "r", "cycles "),
               Column("Trees without $e$", "r", "trees without it "))
    return table(paper.page, columns, [
        [f"${paper.notation.transitions[p.transition]}$", f"{len(p.rows):,}",
         f"{sum(row.weight for row in p.rows):,}"] for p in proofs])


def splittings_data(paper: Paper, proofs: Sequence[SplittingProof]) -> str:
    """Return the splittings of each transition with their numbers of pairs of trees.

    ArithmeticError where these do not add up to the trees that use the transition.
    """
    graph = paper.analysis.graph
    every = (1 << graph.size) - 1
    trees = count_undirected_trees(undirected(graph))
    rows = []
    for proof in proofs:
        e, total = proof.transition, sum(side.weight for side in proof.sides)
        if total != trees - count_undirected_trees(undirected(graph, e)):
            raise ArithmeticError(f"the splittings of transition {e} are incomplete")
        name = f"${paper.notation.transitions[e]}$"
        if len(proof.sides) > MAX_SPLITTINGS:
            rows.append([name, f"{len(proof.sides):,} splittings", f"{total:,}"])
            continue
        sets = [_set(paper, members(every ^ side.mask)) + f" ({side.weight:,})"
                for side in sorted(proof.sides, key=lambda side: every ^ side.mask)]
        rows.append([name, ", ".join(sets), f"{total:,}"])
    columns = (Column("Transition $e$"), Column("Splittings", "wrap", ""),
               Column("Trees with $e$", "r", "trees with it "))
    return ("The splittings, each with its number of such pairs of trees; with $e$ a pair is a "
            "spanning tree, so that the numbers add up to the number of spanning trees that use "
            "$e$, and no splitting is missing:\n"
            + table(paper.page, columns, rows))


def _set(paper: Paper, states: Iterable[int]) -> str:
    labels = [paper.notation.states[k] for k in states]
    whole = r"\{" + ", ".join(labels) + r"\}"
    return f"${whole}$" if formula_width(whole) < MAX_WHOLE_SET else (
        r"$\{" + ",$ $".join(labels) + r"\}$")


def paths_data(paper: Paper, proofs: Sequence[PathsProof]) -> str:
    """Return the paths between two states with their forests.

    ArithmeticError where these do not add up to the number of spanning trees.
    """
    texts = [_paths(paper, proof) for proof in proofs]
    return "\n\n".join(texts)


def _paths(paper: Paper, proof: PathsProof) -> str:
    graph, states = paper.analysis.graph, paper.notation.states
    total = sum(row.weight for row in proof.rows)
    if total != count_undirected_trees(undirected(graph)):
        raise ArithmeticError("the paths between two states are incomplete")
    ends = f"from ${states[proof.start]}$ to ${states[proof.goal]}$"
    noun = "path" if len(proof.rows) == 1 else "paths"
    if len(proof.rows) > MAX_PATHS:
        return (f"There are {len(proof.rows):,} {noun} {ends}; the numbers of their forests add up "
                f"to {total:,}, the number of spanning trees: none is missing.")
    letter = filled(paper, "@into@_P")
    head = [r"\mathrm{Path\ }P" + r"\qquad" * 4, letter, r"\mathrm{Forests}"]
    rows = []
    for row in proof.rows:
        route = _route(paper, proof.start, row)
        shown = _weight(paper, _visited(paper, proof.start, row), row.weight, head)
        rows.append([f"${route}$", f"${shown}$", f"{row.weight:,}"])
    columns = (Column("Path $P$", "wrap"), Column(f"${letter}$"), Column("Forests", "r"))
    return (f"The {noun} {ends}; the numbers of forests add up to {total:,}, the number of "
            f"spanning trees, and none is missing:\n"
            + table(paper.page, columns, rows))


def _visited(paper: Paper, start: int, row: Row) -> list[int]:
    """Return the states of a path in its order."""
    found = [start]
    for step in row.steps:
        first, second = paper.analysis.graph.ends[step // 2]
        found.append(first if step % 2 else second)
    return found


def _route(paper: Paper, start: int, row: Row) -> str:
    """Return a path as its states, and its transitions where parallel ones make it ambiguous."""
    labels = [paper.notation.states[k] for k in _visited(paper, start, row)]
    ends = [frozenset(pair) for pair in paper.analysis.graph.ends]
    parts = [labels[0]]
    for step, label in zip(row.steps, labels[1:], strict=True):
        alone = ends.count(ends[step // 2]) == 1
        arrow = r"\to" if alone else (
            rf"\xrightarrow{{{paper.notation.transitions[step // 2]}}}")
        parts.append(rf"{arrow}$ ${label}")
    return " ".join(parts)
