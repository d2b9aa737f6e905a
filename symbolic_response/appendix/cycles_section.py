"""The section on cycles, their forces and detailed balance."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from symbolic_response.algebra.factored import Factored
from symbolic_response.appendix.formulas import filled
from symbolic_response.appendix.paper import Paper
from symbolic_response.appendix.tables import Column, table, table_width
from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.breaking import Equation, Piece, fits, line_limit
from symbolic_response.expressions.tree import Expression, divide, function
from symbolic_response.response.closed_trees import cycle_force
from symbolic_response.topology import Cycle, can_run_along

MAX_LISTED = 40


@dataclass(frozen=True, slots=True)
class _Entry:
    """A cycle of the list; ``force`` is None where it is infinite."""

    number: int
    cycle: Cycle
    force: Factored | None


def cycles_section(paper: Paper) -> str:
    """Return the cycles with their forces, and whether detailed balance holds identically."""
    analysis = paper.analysis
    heading = r"\section{Cycles and forces}"
    independent = analysis.fundamental_cycles
    if not independent:
        return heading + ("\nThe network has no cycles: all stationary currents vanish, "
                          "detailed balance holds for all values of the rates, and no probability "
                          "depends on a barrier.")
    listed, count = listed_cycles(paper)
    entries = [_entry(paper, n, cycle) for n, cycle in enumerate(listed, start=1)]
    return "\n\n".join([
        heading + "\n" + filled(paper, _definition(count, count == f"{len(listed)}")),
        _listing(paper, entries),
        _balance(paper, [_entry(paper, 0, cycle) for cycle in independent]),
    ])


def listed_cycles(paper: Paper) -> tuple[Sequence[Cycle], str]:
    """Return the cycles that are listed, in order, and how many there are, in words or digits.

    All of them, or fundamental ones where all are too many.
    """
    analysis = paper.analysis
    try:
        every: Sequence[Cycle] = analysis.cycles
        count = f"{len(every)}"
    except SizeLimitError:
        every, count = (), f"more than {analysis.cycle_limit:,}"
    return every if 0 < len(every) <= MAX_LISTED else analysis.fundamental_cycles, count


def _entry(paper: Paper, number: int, cycle: Cycle) -> _Entry:
    written = paper.sums.analysis
    if any(written.graph.one_way[e] for e in cycle.transitions):
        return _Entry(number, cycle, None)
    force = written.simplified(cycle_force(cycle, written))
    if number:
        back = Cycle(cycle.states, cycle.transitions, tuple(not ahead for ahead in cycle.along))
        reverse = written.simplified(cycle_force(back, written))
        paper.defined.add(paper.sums.force(number, force, reverse).key)
    return _Entry(number, cycle, force)


def _definition(count: str, complete: bool) -> str:
    opening = r"""A cycle $c$ is a closed walk that repeats no state and no transition. Its force is
\begin{equation}
@force@_c = \ln \frac{\prod_{c} @rate@ \ \text{along}}{\prod_{c} @rate@ \ \text{against}} ,
\end{equation}
the logarithm of the product of the rates along its orientation over the product of the rates
against it. """
    if count == "1":
        return opening + "The network has a single cycle:"
    opening += f"The network has {count} cycles"
    if complete:
        return opening + ", each listed in one of its two orientations:"
    return opening + (
        r"""; listed are fundamental ones, of which every cycle force is a sum with coefficients
$\pm 1$~\cite{schnakenberg}:"""
    )


def _listing(paper: Paper, entries: Sequence[_Entry]) -> str:
    """Return the table of cycles, with the forces where these are short.

    The transitions are listed only where parallel ones make the states ambiguous.
    """
    pairs = [frozenset(ends) for ends in paper.analysis.graph.ends]
    parallel = len(set(pairs)) < len(pairs)
    rows = [_row(paper, entry, parallel) for entry in entries]
    head = [r"\mathrm{Cycle\ }c", r"\mathrm{States}"]
    head += [r"\mathrm{Transitions}"] if parallel else []
    columns = [Column("Cycle $c$"), Column("States", "wrap", ""),
               Column("Transitions", "wrap", "along ")][: len(head)]
    forces = [_force_latex(paper, entry) for entry in entries]
    note = "\nA minus sign marks a transition that is run from its second state to its first."
    note = note if parallel and not all(all(entry.cycle.along) for entry in entries) else ""
    letter = paper.notation.letters["force"] + "_c"
    whole = [[*row, force] for row, force in zip(rows, forces, strict=True)]
    if table_width([[*head, letter], *whole]) <= paper.width and "frac" not in "".join(forces):
        return table(paper.page, [*columns, Column(f"${letter}$")],
                     [[f"${cell}$" for cell in row] for row in whole]) + note
    narrow = table_width([head, *rows]) > paper.width
    routes = table(paper.page, columns, [
        [_breakable(cell) if narrow else f"${cell}$" for cell in row] for row in rows])
    verb = "The force is" if len(entries) == 1 else "The forces are"
    equations = [_equation(paper, entry) for entry in entries]
    return routes + note + f"\n{verb}\n" + paper.align(equations)


def _breakable(cell: str) -> str:
    """Return a list or a route as formulas between which a line may end."""
    return f"${cell}$".replace(r" \to ", r" \to$ $").replace(",\\ ", ",$ $")


def _row(paper: Paper, entry: _Entry, parallel: bool) -> list[str]:
    notation, cycle = paper.notation, entry.cycle
    states = [notation.states[k] for k in (*cycle.states, cycle.states[0])]
    steps = [
        ("" if ahead else "-") + notation.transitions[e]
        for e, ahead in zip(cycle.transitions, cycle.along, strict=True)
    ]
    row = [f"{entry.number}", r" \to ".join(states)]
    return [*row, ",\\ ".join(steps)] if parallel else row


def _force_latex(paper: Paper, entry: _Entry) -> str:
    if entry.force is None:
        return _infinite(paper, entry)
    return paper.latex(entry.force.expression())


def _infinite(paper: Paper, entry: _Entry) -> str:
    return r"\infty" if can_run_along(paper.analysis.graph, entry.cycle) else r"-\infty"


def _equation(paper: Paper, entry: _Entry) -> Equation:
    left = paper.notation.indexed("force", f"{entry.number}")
    limit = line_limit(left, paper.width)
    if entry.force is None:
        infinite = _infinite(paper, entry)
        return Equation(left, (Piece("-" if infinite.startswith("-") else "", r"\infty"),))
    node = entry.force.expression()
    pieces = paper.pieces([node], limit)
    if any(piece.forced or not fits(piece.body, limit) for piece in pieces):
        pieces = paper.pieces(_step_by_step(paper, entry.cycle), limit)
    return Equation(left, tuple(pieces), meanings=(node,))


def _step_by_step(paper: Paper, cycle: Cycle) -> list[Expression]:
    """Return the force as a sum of one logarithm for each step."""
    analysis = paper.sums.analysis
    return [
        function("ln", divide(analysis.rate_expression(e, not ahead),
                              analysis.rate_expression(e, ahead)))
        for e, ahead in zip(cycle.transitions, cycle.along, strict=True)
    ]


def _balance(paper: Paper, independent: Sequence[_Entry]) -> str:
    forces = [entry.force for entry in independent]
    if any(force is None for force in forces):
        return ("The force of a cycle with a one-way transition is infinite; the network is never "
                "in detailed balance.")
    if all(force is not None and force.is_zero() for force in forces):
        return ("All forces vanish identically: the network obeys detailed balance for all values "
                "of its symbols, all stationary currents are zero, and no probability depends on a "
                "barrier.")
    if all(force is not None and force.is_constant() for force in forces) or not (
        paper.network.symbols
    ):
        return "Not all forces vanish: the network is not in detailed balance."
    which = "this force vanishes" if len(forces) == 1 else "all these forces vanish"
    return (f"Detailed balance, and with it the vanishing of all stationary currents, holds where "
            f"{which}, and only there. There no probability responds to a barrier.")
