"""The first sections of a document: model and conventions, symbols, transitions, observables."""

from __future__ import annotations

from collections.abc import Sequence

from symbolic_response.appendix.escape import escaped, paragraphs
from symbolic_response.appendix.formulas import _filled
from symbolic_response.appendix.paper import Paper
from symbolic_response.expressions.breaking import Equation, align, line_limit
from symbolic_response.expressions.tree import ZERO, Expression, Number, Sum
from symbolic_response.expressions.widths import formula_width
from symbolic_response.network.quantities import (
    BarrierOf,
    DriveOf,
    EnergyOf,
    Response,
    walk_quantity,
)
from symbolic_response.response.quantity_latex import upright

COLUMN_GAP = 12.0


def model_section(paper: Paper, quantities: Sequence[Expression]) -> str:
    """Return the statement of the model, its symbols, transitions and observables."""
    parts = [r"\section{Model and conventions}"]
    if paper.network.about.strip():
        parts.append(paragraphs(paper.network.about))
    parts += [_statement(paper), _perturbations(paper, quantities), _symbols(paper),
              _transitions(paper), _energy_form(paper), _observables(paper)]
    return "\n\n".join(part for part in parts if part)


def _statement(paper: Paper) -> str:
    network = paper.network
    states = ", ".join(f"${label}$" for label in paper.notation.states)
    one_way = [f"${paper.notation.transitions[e]}$"
               for e, t in enumerate(network.transitions) if t.backward is None]
    ends = [frozenset((t.first, t.second)) for t in network.transitions]
    text = rf"""The network has the {len(network.states)} states {states} and
{len(network.transitions)} transitions. We write $@generator@_{{ij}}$ for the rate from state $j$ to
state $i$, so that probabilities obey
\begin{{equation}}
\frac{{\mathrm{{d}} p_i}}{{\mathrm{{d}} t}}
 = \sum_{{j \neq i}} \bigl( @generator@_{{ij}} p_j - @generator@_{{ji}} p_i \bigr) .
\end{{equation}}
A transition $e$ leads from its first state $m$ to its second state $n$ with rate $@rate@^+_e$, and
back with rate $@rate@^-_e$"""
    if len(set(ends)) < len(ends):
        text += r"""; where several transitions join the same two states, each is a mechanism of
its own, and $@generator@_{ij}$ is the sum of their rates"""
    text += ". "
    if one_way:
        noun = "The transition" if len(one_way) == 1 else "The transitions"
        verb = "is" if len(one_way) == 1 else "are"
        text += f"{noun} {', '.join(one_way)} {verb} one-way, $@rate@^-_e = 0$. "
    text += r"""Rates and currents are in units of inverse time, energies and forces in units of
$k_{\mathrm B} T$. Stationary probabilities are denoted by $@probability@_k$."""
    return _filled(paper, text)


_ACTIONS = {
    EnergyOf: r"raising the energy $@energy@_j$ of a state $j$ by $\epsilon$ multiplies every rate "
              r"out of $j$ by $e^{\epsilon}$",
    BarrierOf: r"raising the barrier $@barrier@_e$ of a transition by $\epsilon$ multiplies both "
               r"its rates by $e^{-\epsilon}$",
    DriveOf: r"raising the drive $@drive@_e$ of a transition by $\epsilon$ multiplies "
             r"$@rate@^+_e$ by $e^{\epsilon/2}$ and $@rate@^-_e$ by $e^{-\epsilon/2}$",
}


def _perturbations(paper: Paper, quantities: Sequence[Expression]) -> str:
    used = {
        type(part.perturbation)
        for quantity in quantities for part in walk_quantity(quantity)
        if isinstance(part, Response)
    }
    actions = [text for kind, text in _ACTIONS.items() if kind in used]
    if not actions:
        return ""
    listed = actions[0] if len(actions) == 1 else "; ".join(actions[:-1]) + "; and " + actions[-1]
    return _filled(paper, "Responses are derivatives of stationary quantities, all else being "
                   r"held fixed. However the rates are written~\cite{owen}, " + listed + ".")


def _symbols(paper: Paper) -> str:
    entries = paper.network.symbols
    if not entries:
        return "All rates are numbers."
    names = paper.notation.symbols
    if not any(entry.about for entry in entries):
        texts = []
        for positive, word in ((True, "positive"), (False, "real")):
            listed = [f"${names[entry.name]}$" for entry in entries if entry.positive == positive]
            if listed:
                noun = "The symbol" if len(listed) == 1 else "The symbols"
                texts.append(f"{noun} {_and(listed)} {'is' if len(listed) == 1 else 'are'} {word}.")
        return " ".join(texts)
    rows = [
        f"${names[e.name]}$ & {escaped(e.about)} & {'positive' if e.positive else 'real'}"
        for e in entries
    ]
    room = paper.width - 2 * COLUMN_GAP - 45 - max(formula_width(names[e.name]) for e in entries)
    return "The symbols are listed below.\n" + table(
        rf"l>{{\raggedright\arraybackslash}}p{{{room:.0f}pt}}l", "Symbol & Meaning & Sign", rows
    )


def _and(items: Sequence[str]) -> str:
    return items[0] if len(items) == 1 else ", ".join(items[:-1]) + " and " + items[-1]


def table(columns: str, head: str, rows: Sequence[str]) -> str:
    """Return a table that may cross pages, its head repeated."""
    body = " \\\\\n".join(rows)
    return (
        f"\\begin{{longtable}}{{@{{}}{columns}@{{}}}}\n\\toprule\n{head} \\\\\n\\midrule\n"
        f"\\endhead\n{body} \\\\\n\\bottomrule\n\\end{{longtable}}"
    )


def table_width(rows: Sequence[Sequence[str]]) -> float:
    """Return the width of a table of formulas."""
    columns = zip(*rows, strict=True)
    widths = [max(formula_width(cell) for cell in column) for column in columns]
    return sum(widths) + COLUMN_GAP * (len(widths) - 1)


def _transitions(paper: Paper) -> str:
    notation, sums = paper.notation, paper.sums
    head = [r"\mathrm{Transition}", r"\mathrm{from}", r"\mathrm{to}",
            f"{notation.letters['rate']}^+_e", f"{notation.letters['rate']}^-_e"]
    rows = []
    for e, transition in enumerate(paper.network.transitions):
        rates = [transition.forward, transition.backward or ZERO]
        rows.append([
            upright(transition.name), notation.states[transition.first],
            notation.states[transition.second], *(paper.latex(rate) for rate in rates),
        ])
    del sums
    shown_head = f"Transition $e$ & from & to & ${head[3]}$ & ${head[4]}$"
    if table_width([head, *rows]) <= paper.width - 5:
        body = [" & ".join(f"$\\displaystyle {cell}$" for cell in row) for row in rows]
        return "The transitions and their rates are:\n" + table("lllll", shown_head, body)
    body = [" & ".join(f"${cell}$" for cell in row[:3]) for row in rows]
    equations = []
    for e, transition in enumerate(paper.network.transitions):
        for backward, rate in ((False, transition.forward), (True, transition.backward)):
            if rate is not None:
                left = notation.rate(e, backward)
                terms = list(rate.terms) if isinstance(rate, Sum) else [rate]
                pieces = paper.pieces(terms, line_limit(left, paper.width))
                equations.append(Equation(left, tuple(pieces)))
    return ("The transitions are:\n" + table("lll", "Transition $e$ & from & to", body)
            + "\nTheir rates are\n" + align(equations, paper.width))


def _energy_form(paper: Paper) -> str:
    chosen = [t for t in paper.network.transitions if t.barrier is not None]
    if not chosen:
        return ""
    which = "All transitions" if len(chosen) == len(paper.network.transitions) else "The following"
    text = _filled(paper, which + r""" are given by the energies of the states, barriers and drives,
\begin{equation}
@rate@^+_e = e^{@energy@_m - @barrier@_e + @drive@_e/2} , \qquad
@rate@^-_e = e^{@energy@_n - @barrier@_e - @drive@_e/2} :
\end{equation}""")
    head = r"Transition $e$ & $@barrier@_e$ & $@drive@_e$"
    rows = [
        f"${upright(t.name)}$ & ${paper.latex(t.barrier)}$ & ${paper.latex(t.drive or ZERO)}$"
        for t in chosen if t.barrier is not None
    ]
    energies = [
        f"${label}$ & ${paper.latex(state.energy)}$"
        for state, label in zip(paper.network.states, paper.notation.states, strict=True)
        if state.energy is not None
    ]
    return (
        text + "\n" + table("lll", _filled(paper, head), rows) + "\n"
        + table("ll", _filled(paper, r"State $k$ & $@energy@_k$"), energies)
    )


def _observables(paper: Paper) -> str:
    if not paper.network.observables:
        return ""
    notation = paper.notation
    equations = []
    for place, observable in enumerate(paper.network.observables):
        for state, value in enumerate(observable.values):
            if value != ZERO:
                left = f"({notation.observables[place]})_{{{notation.states[state]}}}"
                terms = list(value.terms) if isinstance(value, Sum) else [value]
                pieces = paper.pieces(terms, line_limit(left, paper.width))
                equations.append(Equation(left, tuple(pieces)))
    names = _and([f"${name}$" for name in notation.observables])
    count = len(paper.network.observables)
    text = (
        f"The observable{'' if count == 1 else 's'} {names} "
        f"{'is a function' if count == 1 else 'are functions'} of the state; "
        + r"the mean of $q$ is $\langle q \rangle = \sum_k q_k @probability@_k$."
    )
    if not equations:
        return _filled(paper, text)
    return _filled(paper, text + " The values that differ from zero are") + "\n" + align(
        equations, paper.width
    )


__all__ = ["Number", "model_section", "table", "table_width"]
