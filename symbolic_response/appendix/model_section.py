"""The first sections of a document: model and conventions, symbols, transitions, observables."""

from __future__ import annotations

from collections.abc import Sequence

from symbolic_response.appendix.escape import escaped, paragraphs
from symbolic_response.appendix.formulas import filled
from symbolic_response.appendix.paper import Paper
from symbolic_response.appendix.tables import Column, table, table_width
from symbolic_response.expressions.breaking import Equation, line_limit
from symbolic_response.expressions.tree import ZERO, Expression, Sum
from symbolic_response.expressions.widths import DISPLAY, formula_width
from symbolic_response.network.quantities import (
    BarrierOf,
    BarriersOf,
    DriveOf,
    EnergyOf,
    Response,
    walk_quantity,
)


def model_section(paper: Paper, quantities: Sequence[Expression]) -> str:
    """Return the statement of the model, its symbols, transitions and observables."""
    parts = [r"\section{Model and conventions}"]
    if paper.network.about.strip():
        parts.append(paragraphs(paper.network.about))
    parts += [_statement(paper), _perturbations(paper, quantities), _symbols(paper),
              _transitions(paper), _observables(paper)]
    return "\n\n".join(part for part in parts if part)


def _statement(paper: Paper) -> str:
    network = paper.network
    states = _and([f"${label}$" for label in paper.notation.states])
    count, steps = len(network.states), len(network.transitions)
    one_way = [f"${paper.notation.transitions[e]}$"
               for e, t in enumerate(network.transitions) if t.backward is None]
    ends = [frozenset((t.first, t.second)) for t in network.transitions]
    text = rf"""The network has the {_number(count)} states {states}, joined by {_number(steps)}
transition{'' if steps == 1 else 's'}. We write $@generator@_{{ij}}$ for the rate from state $j$ to
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
    text += ". " + _indices(paper, len(set(ends)) < len(ends))
    if one_way:
        noun = "The transition" if len(one_way) == 1 else "The transitions"
        verb = "is" if len(one_way) == 1 else "are"
        text += f"{noun} {', '.join(one_way)} {verb} one-way, $@rate@^-_e = 0$. "
    text += "Rates and currents are in units of inverse time, "
    beta = paper.notation.beta
    if beta:
        text += (r"forces in units of $k_{\mathrm B} T$; energies, barriers and drives come times"
                 rf" the inverse temperature ${beta} = 1/(k_{{\mathrm B}} T)$.")
    else:
        text += r"energies and forces in units of $k_{\mathrm B} T$."
    return filled(paper, text + " Stationary probabilities are denoted by $@probability@_k$.")


def _indices(paper: Paper, parallel: bool) -> str:
    """Return how single rates are written where that is not by transition."""
    if paper.notation.indices == "transition":
        return ""
    if paper.notation.indices == "to-from":
        letter, direction = "@generator@", ""
    else:
        letter, direction = "@rate@", ", the rate from state $i$ to state $j$"
    text = f"Single rates are written ${letter}_{{ij}}${direction}"
    if parallel:
        text += f"; of several transitions ${letter}_{{ij}}^{{(e)}}$ is that of $e$"
    return text + ". "


_ACTIONS = {
    EnergyOf: r"raising the energy $@energy@_j$ of a state $j$ by $\epsilon$ multiplies every rate "
              r"out of $j$ by $e^{\epsilon}$",
    BarrierOf: r"raising the barrier $@barrier@_e$ of a transition by $\epsilon$ multiplies both "
               r"its rates by $e^{-\epsilon}$",
    BarriersOf: r"raising several barriers together, $@barrier@_{\{\ldots\}}$, by $\epsilon$ "
                r"multiplies all rates of these transitions by $e^{-\epsilon}$",
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
    return filled(paper, "Responses are derivatives of stationary quantities, all else being "
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
    columns = (Column("Symbol"), Column("Meaning", "wrap", ""), Column("Sign", "l", ""))
    return "The symbols are:\n" + table(paper.page, columns, [
        [f"${names[e.name]}$", escaped(e.about), "positive" if e.positive else "real"]
        for e in entries])


def _number(count: int) -> str:
    words = ("one", "two", "three", "four", "five", "six", "seven", "eight", "nine", "ten")
    return words[count - 1] if count <= len(words) else f"{count}"


def _and(items: Sequence[str]) -> str:
    return items[0] if len(items) == 1 else ", ".join(items[:-1]) + " and " + items[-1]


def _transitions(paper: Paper) -> str:
    """Return the table of transitions, rates that are too wide for it as equations behind it."""
    notation, letters = paper.notation, paper.notation.letters
    energy_form = any(t.barrier is not None for t in paper.network.transitions)
    parts = [_energy_form(paper)] if energy_form else []
    head = [r"\mathrm{Transition\ }e", r"\mathrm{from}", r"\mathrm{to}"]
    shown = ["Transition $e$", "from", "to"]
    columns = [f"{letters['barrier']}_e", f"{letters['drive']}_e"] if energy_form else []
    rates = [f"{letters['rate']}^+_e", f"{letters['rate']}^-_e"]
    rows, long_rows = [], []
    for e, t in enumerate(paper.network.transitions):
        row = [notation.transitions[e], notation.states[t.first], notation.states[t.second]]
        if energy_form:
            row += ["", ""] if t.barrier is None else [
                paper.latex(t.barrier), paper.latex(t.drive or ZERO)
            ]
        rows.append(row)
        long_rows.append([*row, *(paper.latex(rate or ZERO) for rate in (t.forward, t.backward))])
    whole = [*head, *columns, *rates]
    if table_width([whole, *long_rows], style=DISPLAY) <= paper.width:
        parts.append("The transitions and their rates are:\n" + _formula_table(
            paper, [*shown, *(f"${c}$" for c in (*columns, *rates))], long_rows
        ))
        return "\n\n".join(parts)
    if table_width([[*head, *columns], *rows], style=DISPLAY) > paper.width:
        rows, columns = [row[:3] for row in rows], []
    parts.append("The transitions are:\n" + _formula_table(
        paper, [*shown, *(f"${c}$" for c in columns)], rows
    ))
    parts.append("Their rates are\n" + paper.align(_rate_equations(paper)))
    return "\n\n".join(parts)


def _formula_table(
    paper: Paper, head: Sequence[str], rows: Sequence[Sequence[str]]
) -> str:
    return table(paper.page, [Column(name) for name in head], [
        [rf"$\displaystyle {cell}$" if r"\frac" in cell else f"${cell}$" for cell in row]
        for row in rows])


def _rate_equations(paper: Paper) -> list[Equation]:
    equations = []
    for e, transition in enumerate(paper.network.transitions):
        for backward, rate in ((False, transition.forward), (True, transition.backward)):
            if rate is not None:
                left = paper.notation.rate(e, backward)
                equations.append(_equation(paper, left, rate))
    return equations


def _equation(paper: Paper, left: str, value: Expression) -> Equation:
    terms = list(value.terms) if isinstance(value, Sum) else [value]
    pieces = tuple(paper.pieces(terms, line_limit(left, paper.width)))
    return Equation(left, pieces, meanings=(value,))


def _energy_form(paper: Paper) -> str:
    """Return how rates follow from energies, barriers and drives, and the energies."""
    network = paper.network
    complete = all(t.barrier is not None for t in network.transitions)
    which = "The rates" if complete else "The rates of transitions with a barrier"
    text = filled(paper, which + r""" follow from the energies $@energy@_k$ of the states, the
barriers $@barrier@_e$ and the drives $@drive@_e$ as
\begin{equation}
@rate@^+_e = e^{@energy@_m - @barrier@_e + @drive@_e/2} , \qquad
@rate@^-_e = e^{@energy@_n - @barrier@_e - @drive@_e/2} .
\end{equation}""")
    equations = [
        _equation(paper, left, state.energy)
        for state, label in zip(network.states, paper.notation.states, strict=True)
        if state.energy is not None
        and (left := filled(paper, f"@energy@_{{{label}}}")) != paper.latex(state.energy)
    ]
    if not equations:
        return text
    return text + "\nThe energies are\n" + paper.align(equations)


def _observables(paper: Paper) -> str:
    """Return the values of the observables, in a sentence where they are short."""
    if not paper.network.observables:
        return ""
    notation = paper.notation
    equations = []
    for place, observable in enumerate(paper.network.observables):
        name = notation.observables[place]
        base = f"({name})" if "_" in name or "^" in name else name
        equations += [
            _equation(paper, f"{base}_{{{label}}}", value)
            for label, value in zip(notation.states, observable.values, strict=True)
            if value != ZERO
        ]
    names = _and([f"${name}$" for name in notation.observables])
    count = len(paper.network.observables)
    text = filled(paper, (
        f"The observable{'' if count == 1 else 's'} {names} "
        f"{'is a function' if count == 1 else 'are functions'} of the state; "
        r"$\langle q \rangle = \sum_k q_k @probability@_k$ is the mean of $q$."
    ))
    if not equations:
        return text
    inline = [f"${e.left} = {_one_line(e)}$" for e in equations]
    if len(inline) <= 8 and all(formula_width(text_[1:-1]) < 120 for text_ in inline):
        return text + f" The values other than zero are {_and(inline)}."
    return text + " The values other than zero are\n" + paper.align(equations)


def _one_line(equation: Equation) -> str:
    first, *rest = equation.pieces
    return first.sign + first.body + "".join(f" {piece.sign} {piece.body}" for piece in rest)
