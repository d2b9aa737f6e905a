"""How a parameter changes the rates, and the pieces into which the change is taken apart."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from symbolic_response.appendix.bounds_section import side_latex
from symbolic_response.appendix.formulas import filled
from symbolic_response.appendix.paper import Paper
from symbolic_response.appendix.tables import Column, table
from symbolic_response.control.changes import Change
from symbolic_response.control.decomposition import Decomposition
from symbolic_response.control.separations import Part
from symbolic_response.expressions.breaking import Equation, align, line_limit
from symbolic_response.expressions.tree import ZERO, Expression
from symbolic_response.expressions.widths import DISPLAY, formula_width
from symbolic_response.response.quantity_latex import perturbation_in

INLINE_SHARE = 0.3


def listed(parts: Sequence[str]) -> str:
    """Return a list in words.

    >>> listed(["a", "b", "c"])
    'a, b and c'
    """
    return parts[0] if len(parts) == 1 else f"{', '.join(parts[:-1])} and {parts[-1]}"


def set_latex(paper: Paper, transitions: Part) -> str:
    """Return a set of transitions as formulas between which a line may end."""
    return r"$\{" + ",$ $".join(paper.notation.transitions[e] for e in transitions) + r"\}$"


def rate_latex(paper: Paper, place: int) -> str:
    """Return the name of a directed rate."""
    return paper.notation.rate(*paper.analysis.rates.directions()[place])


# -- the change of the rates -----------------------------------------------------------------------


def change_text(paper: Paper, change: Change) -> str:
    """Return how ln of each rate changes: a table, or equations where the changes are wide."""
    groups: dict[str, list[int]] = {}
    amounts: dict[str, Expression] = {}
    for place in range(len(change.numbers)):
        amount = paper.analysis.tidy(change.expression(place))
        if amount != ZERO:
            key = paper.latex(amount)
            groups.setdefault(key, []).append(place)
            amounts[key] = amount
    by = perturbation_in(paper.notation, change.by)
    if not groups:
        return "No rate depends on it."
    derivative = rf"\partial \ln {paper.letters['rate']} / \partial {by}"
    every = sum(map(len, groups.values()))
    text = f"It changes {_count(every, len(change.numbers))} by"
    rest = "" if every == len(change.numbers) else "\nThe other rates do not depend on it."
    if all(formula_width(key, style=DISPLAY) < 0.5 * paper.width for key in groups):
        return text + "\n" + _table(paper, derivative, groups) + rest
    equations = []
    for key, places in groups.items():
        for place in places:
            left = rf"\frac{{\partial \ln {rate_latex(paper, place)}}}{{\partial {by}}}"
            pieces = paper.pieces([amounts[key]], line_limit(left, paper.width))
            equations.append(Equation(left, tuple(pieces)))
    return text + "\n" + align(equations, paper.width) + rest


def _count(changed: int, every: int) -> str:
    if changed == 1:
        return f"the logarithm of one of the {every} rates"
    which = f"all {every}" if changed == every else f"{changed} of the {every}"
    return f"the logarithms of {which} rates"


def _table(paper: Paper, derivative: str, groups: dict[str, list[int]]) -> str:
    columns = (Column("Rates", "wrap"), Column(rf"${derivative}$"))
    return table(paper.page, columns, [
        [", ".join(f"${rate_latex(paper, place)}$" for place in places), rf"$\displaystyle {key}$"]
        for key, places in groups.items()])


# -- pieces in words -------------------------------------------------------------------------------


@dataclass(slots=True)
class PieceWords:
    """The pieces of a change in words; amounts too wide for a line get a name and an equation."""

    paper: Paper
    named: list[tuple[str, Expression]] = field(default_factory=list)

    def text(self, pieces: Decomposition, end: str = ".") -> str:
        """Return the pieces, and behind them what the names of amounts stand for, else ``end``."""
        phrases = [*self._energies(pieces), *self._transitions(pieces), *self._rates(pieces)]
        text = "; ".join(phrases)
        if not self.named:
            return text + end
        equations = []
        for name, amount in self.named:
            terms = self.paper.pieces([amount], line_limit(name, self.paper.width))
            equations.append(Equation(name, tuple(terms)))
        self.named.clear()
        return text + ", with\n" + align(equations, self.paper.width)

    def _energies(self, pieces: Decomposition) -> list[str]:
        groups: dict[Expression, list[str]] = {}
        for state, amount in zip(self.paper.notation.states, pieces.energies, strict=True):
            if amount != ZERO:
                groups.setdefault(amount, []).append(f"${state}$")
        return [f"the energ{'y' if len(states) == 1 else 'ies'} of"
                f" state{'' if len(states) == 1 else 's'} {listed(states)}{self._by(amount)}"
                for amount, states in groups.items()]

    def _transitions(self, pieces: Decomposition) -> list[str]:
        paper = self.paper
        phrases = []
        for piece in pieces.bundles:
            e = piece.members[0]
            if len(piece.members) > 1:
                what = f"all rates of the bundle {set_latex(paper, piece.members)}"
            elif paper.analysis.graph.one_way[e]:
                what = f"the rate of ${paper.notation.transitions[e]}$"
            else:
                what = f"both rates of ${paper.notation.transitions[e]}$"
            phrases.append(what + self._by(piece.amount))
        for piece in pieces.blocks:
            every = len(piece.members) == len(paper.network.transitions)
            what = "of the network" if every else (
                f"of {set_latex(paper, piece.members)}, one block or more")
            phrases.append(f"all rates {what}{self._by(piece.amount)}")
        for piece in pieces.drives:
            phrases.append(f"the drive of ${paper.notation.transitions[piece.members[0]]}$"
                           + self._by(piece.amount))
        return phrases

    def _rates(self, pieces: Decomposition) -> list[str]:
        phrases = []
        for piece in pieces.directed:
            names = [f"${rate_latex(self.paper, place)}$" for place in piece.members]
            noun = "rate" if len(names) == 1 else "rates"
            phrases.append(f"the {noun} {listed(names)}{self._by(piece.amount)}")
        return phrases

    def _by(self, amount: Expression) -> str:
        return f" (amount~{self._amount(amount)})"

    def _amount(self, amount: Expression) -> str:
        latex = side_latex(self.paper, amount)
        if formula_width(latex) < INLINE_SHARE * self.paper.width:
            return f"${latex}$"
        for name, other in self.named:
            if other == amount:
                return f"${name}$"
        name = filled(self.paper, f"@amount@_{{{len(self.named) + 1}}}")
        self.named.append((name, amount))
        return f"${name}$"
