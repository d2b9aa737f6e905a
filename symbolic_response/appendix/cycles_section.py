"""The section on cycles, their forces and detailed balance."""

from __future__ import annotations

from collections.abc import Sequence

from symbolic_response.algebra.factored import Factored
from symbolic_response.appendix.formulas import _filled
from symbolic_response.appendix.model_section import table, table_width
from symbolic_response.appendix.paper import Paper
from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.breaking import Equation, align, line_limit
from symbolic_response.expressions.tree import divide, function
from symbolic_response.response.closed_trees import cycle_force
from symbolic_response.topology import Cycle, can_run_along

MAX_LISTED = 40


def cycles_section(paper: Paper) -> str:
    """Return the cycles with their forces, and whether detailed balance holds identically."""
    analysis = paper.analysis
    text = [r"\section{Cycles and forces}"]
    independent = analysis.fundamental_cycles
    if not independent:
        return "\n\n".join([*text, "The network has no cycles: all currents vanish, and detailed "
                            "balance holds for all values of the rates."])
    try:
        every: Sequence[Cycle] = analysis.cycles
        count = f"{len(every)}"
    except SizeLimitError:
        every, count = (), f"more than {analysis.cycle_limit:,}"
    listed = every if 0 < len(every) <= MAX_LISTED else independent
    text.append(_filled(paper, _definition(count, len(listed), len(every))))
    text.append(_route_table(paper, listed))
    text.append(_forces(paper, listed))
    text.append(_balance(paper, independent, listed))
    return "\n\n".join(part for part in text if part)


def _definition(count: str, listed: int, known: int) -> str:
    one = count == "1"
    opening = (
        r"""A cycle $c$ is a closed walk that repeats no state and no transition. Its force is
\begin{equation}
@force@_c = \ln \frac{\prod_{c} @rate@ \ \text{along}}{\prod_{c} @rate@ \ \text{against}} ,
\end{equation}
the logarithm of the product of the rates along its orientation over the product of the rates
against it. """
    )
    noun = "cycle" if one else "cycles"
    opening += f"The network has {count} {noun}"
    if listed == known:
        return opening + ("." if one else ", each counted once:")
    return opening + (
        r"""; listed are fundamental ones, of whose forces every cycle force is a sum with
coefficients $\pm 1$~\cite{schnakenberg}:"""
    )


def _route_table(paper: Paper, cycles: Sequence[Cycle]) -> str:
    notation = paper.notation
    rows = []
    for number, cycle in enumerate(cycles, start=1):
        states = [notation.states[k] for k in (*cycle.states, cycle.states[0])]
        steps = [
            ("" if ahead else "-") + notation.transitions[e]
            for e, ahead in zip(cycle.transitions, cycle.along, strict=True)
        ]
        rows.append([f"{number}", r" \to ".join(states), r",\ ".join(steps)])
    wide = table_width(rows) > paper.width - 10
    columns = (
        r"l>{\raggedright\arraybackslash}p{0.42\linewidth}>{\raggedright\arraybackslash}"
        r"p{0.42\linewidth}" if wide else "lll"
    )
    separator = {True: r"$, $", False: r",\ "}[wide]
    arrow = {True: r"$ $\to$ $", False: r" \to "}[wide]
    body = [
        f"${n}$ & ${states}$ & ${steps}$".replace(r",\ ", separator).replace(r" \to ", arrow)
        for n, states, steps in rows
    ]
    return table(columns, r"Cycle $c$ & States & Transitions ($-$: run backwards)", body)


def _forces(paper: Paper, cycles: Sequence[Cycle]) -> str:
    equations = []
    for number, cycle in enumerate(cycles, start=1):
        left = paper.notation.indexed("force", f"{number}")
        limit = line_limit(left, paper.width)
        force = _force(paper, cycle)
        if force is None:
            sign = "" if can_run_along(paper.analysis.graph, cycle) else "-"
            from symbolic_response.expressions.breaking import Piece

            equations.append(Equation(left, (Piece(sign, r"\infty"),)))
            continue
        pieces = paper.pieces([force.expression()], limit)
        if len(pieces) > 1 and pieces[1].forced:
            pieces = paper.pieces(_step_by_step(paper, cycle), limit)
        equations.append(Equation(left, tuple(pieces)))
    return "Their forces are\n" + align(equations, paper.width)


def _force(paper: Paper, cycle: Cycle) -> Factored | None:
    if any(paper.analysis.graph.one_way[e] for e in cycle.transitions):
        return None
    return paper.analysis.simplified(cycle_force(cycle, paper.analysis))


def _step_by_step(paper: Paper, cycle: Cycle) -> list:  # type: ignore[type-arg]
    analysis = paper.analysis
    return [
        function("ln", divide(analysis.rate_expression(e, not ahead),
                              analysis.rate_expression(e, ahead)))
        for e, ahead in zip(cycle.transitions, cycle.along, strict=True)
    ]


def _balance(paper: Paper, independent: Sequence[Cycle], listed: Sequence[Cycle]) -> str:
    forces = [_force(paper, cycle) for cycle in independent]
    if any(force is None for force in forces):
        return ("A force is infinite where a cycle contains a one-way transition; such a network "
                "is never in detailed balance.")
    if all(force is not None and force.is_zero() for force in forces):
        return ("All forces vanish identically: the network obeys detailed balance for all values "
                "of its symbols, and all stationary currents are zero.")
    del listed
    return ("Detailed balance, and with it the vanishing of all stationary currents, holds where "
            "all of these forces vanish, and only there.")
