r"""Quantities and responses as LaTeX: the left sides of formulas, and the letters they use.

Letters are chosen for each network so that none of them is also a symbol of the file: where a
symbol prints as :math:`D` or :math:`\pi_A`, the normalisation or the probability takes the next
letter of an ordered list.
"""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass

from symbolic_response.expressions.latex import expression_latex
from symbolic_response.expressions.names import default_latex, same_latex
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Symbol,
    rebuild,
    symbols_of,
)
from symbolic_response.network.checks import expressions_of
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import (
    BarrierOf,
    BarriersOf,
    BySymbol,
    Change,
    Current,
    DirectedRate,
    DriveOf,
    EnergyOf,
    EntropyProduction,
    Mean,
    Perturbation,
    Probability,
    Response,
    Traffic,
    walk_quantity,
)
from symbolic_response.response.closed_form import symbol_names

LETTERS = {
    "probability": (r"\pi", "p", "P", r"\varpi"),
    "current": ("J", "I", "j", r"\mathcal{J}"),
    "traffic": (r"\tau", "A", r"\mathcal{T}", r"\vartheta"),
    "rate": ("w", r"\omega", "r", r"\varrho"),
    "generator": ("W", r"\mathbf{W}", r"\mathcal{W}", r"\Omega"),
    "entropy": (r"\sigma", r"\Sigma", r"\dot{S}", r"\varsigma"),
    "energy": ("E", r"\varepsilon", r"\epsilon", r"\mathcal{E}"),
    "barrier": ("B", r"\beta", "b", r"\mathcal{B}"),
    "drive": ("F", r"\phi", "f", r"\varphi"),
    "tree sum": ("N", "M", r"\mathcal{N}", r"\nu"),
    "normalisation": ("D", "Z", r"\mathcal{D}", r"\zeta"),
    "current numerator": ("C", "Y", r"\mathcal{C}", r"\gamma"),
    "traffic numerator": ("T", "H", r"\Theta", r"\mathcal{H}"),
    "forest": (r"\Phi", r"\Psi", r"\Xi", r"\Upsilon"),
    "remainder": ("R", "X", r"\mathcal{R}", r"\rho"),
    "force": (r"\mathcal{F}", r"\mathcal{A}", r"\mathbf{F}", r"\Lambda"),
    "factor": ("g", "G", r"\mathcal{G}", r"\kappa"),
    "quantity": ("Q", "U", r"\mathcal{Q}", r"\mathbf{Q}"),
}
"""For each role the letters it may take, the first that no symbol uses being taken."""


@dataclass(frozen=True, slots=True)
class Notation:
    """How one network is written: letters by role, labels by place, own symbols of perturbations.

    ``own`` gives the symbol of the file that is exactly the energy, barrier or drive a
    perturbation raises and is used for nothing else, so that the derivative by it is the response.
    """

    letters: Mapping[str, str]
    symbols: Mapping[str, str]
    states: tuple[str, ...]
    transitions: tuple[str, ...]
    observables: tuple[str, ...]
    own: Mapping[Perturbation, str]

    def indexed(self, role: str, label: str) -> str:
        """Return a letter with a subscript."""
        return f"{self.letters[role]}_{{{label}}}"

    def rate(self, transition: int, backward: bool) -> str:
        """Return the LaTeX of a directed rate."""
        sign = "-" if backward else "+"
        return f"{self.letters['rate']}^{{{sign}}}_{{{self.transitions[transition]}}}"


def notation_of(network: Network, names: Mapping[str, str] | None = None) -> Notation:
    """Return the notation of a network; ``names`` gives the LaTeX of the symbols."""
    symbols = dict(names) if names is not None else symbol_names(network)
    own = _own_symbols(network)
    return Notation(
        letters=_choose_letters(symbols, own),
        symbols=symbols,
        states=tuple(s.latex or default_latex(s.name) for s in network.states),
        transitions=_transition_labels(network),
        observables=_unique([default_latex(o.name) for o in network.observables],
                            [upright(o.name) for o in network.observables]),
        own=own,
    )


def upright(name: str) -> str:
    r"""Return a name as upright letters.

    >>> print(upright("A_B"))
    \mathrm{A\_B}
    """
    return rf"\mathrm{{{name}}}".replace("_", r"\_")


def quantity_latex(quantity: Expression, network: Network, names: Mapping[str, str]) -> str:
    r"""Return a quantity or response as it stands on the left of its formula.

    ``names`` gives the LaTeX of the symbols, as :func:`symbol_names` does.
    """
    return quantity_in(notation_of(network, names), quantity)


def quantity_in(notation: Notation, quantity: Expression) -> str:
    """Return a quantity in a notation made before."""
    if isinstance(quantity, Response):
        return _response(quantity, notation)
    if isinstance(quantity, Function) and quantity.name == "ln":
        inner = _atom(quantity.argument, notation)
        if inner is not None:
            return rf"\ln {inner}"
    names = dict(notation.symbols)

    def leaf(part: Expression) -> Expression:
        if isinstance(part, Change):
            shown = _change(part, notation)
        elif isinstance(part, Response):
            shown = rf"\Bigl({_response(part, notation)}\Bigr)"
        else:
            atom = _atom(part, notation)
            if atom is None:
                return part
            shown = atom
        names["#" + shown] = shown
        return Symbol("#" + shown)

    return expression_latex(rebuild(quantity, leaf), names)


def perturbation_in(notation: Notation, perturbation: Perturbation) -> str:
    """Return what a response is a derivative by."""
    if perturbation in notation.own:
        return notation.symbols[notation.own[perturbation]]
    return _generic_perturbation(notation, perturbation)


def _generic_perturbation(notation: Notation, perturbation: Perturbation) -> str:
    match perturbation:
        case EnergyOf(state):
            return notation.indexed("energy", notation.states[state])
        case BarrierOf(e):
            return notation.indexed("barrier", notation.transitions[e])
        case BarriersOf(transitions):
            inside = ",".join(notation.transitions[e] for e in transitions)
            return notation.indexed("barrier", rf"\{{{inside}\}}")
        case DriveOf(e):
            return notation.indexed("drive", notation.transitions[e])
        case BySymbol(name, logarithmic):
            return (r"\ln " if logarithmic else "") + notation.symbols[name]


def _atom(node: Expression, notation: Notation) -> str | None:
    match node:
        case Probability((state,)):
            return notation.indexed("probability", notation.states[state])
        case Probability(states):
            inside = ",".join(notation.states[state] for state in states)
            return notation.indexed("probability", rf"\{{{inside}\}}")
        case Mean(place):
            return rf"\langle {notation.observables[place]} \rangle"
        case Current(e):
            return notation.indexed("current", notation.transitions[e])
        case Traffic(e):
            return notation.indexed("traffic", notation.transitions[e])
        case DirectedRate(e, backward):
            return notation.rate(e, backward)
        case EntropyProduction():
            return notation.letters["entropy"]
    return None


def _change(change: Change, notation: Notation) -> str:
    """Return a difference between two values of a barrier in the notation of integrals."""
    barrier = perturbation_in(notation, BarrierOf(change.transition))
    amount = quantity_in(notation, change.amount)
    plus = "" if amount.startswith("-") else "+ "
    inner = quantity_in(notation, change.quantity)
    return rf"\Bigl[{inner}\Bigr]_{{{barrier}}}^{{{barrier} {plus}{amount}}}"


def _response(response: Response, notation: Notation) -> str:
    """Return a derivative; one of a derivative as a second derivative, and so on."""
    quantity, by = response.quantity, [response.perturbation]
    while isinstance(quantity, Response):
        by.append(quantity.perturbation)
        quantity = quantity.quantity
    explicit = {name for part in walk_quantity(quantity) for name in symbols_of(part)}
    below = []
    for perturbation, times in Counter(by).items():
        own = notation.own.get(perturbation)
        show = _generic_perturbation if own in explicit else perturbation_in
        shown = show(notation, perturbation)
        if times > 1:
            shown = f"({shown})" if "^" in shown or shown.startswith(r"\ln") else shown
            shown = f"{shown}^{times}"
        below.append(rf"\partial {shown}")
    order = "" if len(by) == 1 else f"^{len(by)}"
    bottom = r" \, ".join(below)
    inner = quantity_in(notation, quantity)
    atomic = _atom(quantity, notation) is not None or inner.startswith(r"\ln ")
    if atomic:
        return rf"\frac{{\partial{order} {inner}}}{{{bottom}}}"
    lone = isinstance(quantity, Function)
    return rf"\frac{{\partial{order}}}{{{bottom}}} " + (inner if lone else rf"\Bigl({inner}\Bigr)")


# -- labels --------------------------------------------------------------------------------------


def _unique(preferred: list[str], otherwise: list[str]) -> tuple[str, ...]:
    distinct = len({same_latex(label) for label in preferred}) == len(preferred)
    return tuple(preferred if distinct else otherwise)


def _transition_labels(network: Network) -> tuple[str, ...]:
    """Return the label of each transition; one named after its states shows their labels."""
    labels = []
    for transition in network.transitions:
        ends = [network.states[place] for place in (transition.first, transition.second)]
        first, second = (state.latex or default_latex(state.name) for state in ends)
        if transition.name == f"{ends[0].name}_{ends[1].name}":
            short = all(len(label) == 1 for label in (first, second))
            labels.append(first + second if short else rf"{first}\text{{-}}{second}")
        else:
            labels.append(upright(transition.name))
    return _unique(labels, [upright(transition.name) for transition in network.transitions])


# -- letters -------------------------------------------------------------------------------------


def _own_symbols(network: Network) -> dict[Perturbation, str]:
    """Return the perturbations that are the derivative by one symbol used for nothing else."""
    uses = Counter(
        name for expression, _, _ in expressions_of(network) for name in symbols_of(expression)
    )
    energy_form = {
        end
        for t in network.transitions if t.barrier is not None
        for end in (t.first, t.second)
    }
    rate_form = {
        end
        for t in network.transitions if t.barrier is None
        for end in (t.first, t.second)
    }
    found: dict[Perturbation, str] = {}

    def note(perturbation: Perturbation, expression: Expression | None) -> None:
        if isinstance(expression, Symbol) and uses[expression.name] == 1:
            found[perturbation] = expression.name

    for place, state in enumerate(network.states):
        if place in energy_form - rate_form:
            note(EnergyOf(place), state.energy)
    for e, transition in enumerate(network.transitions):
        note(BarrierOf(e), transition.barrier)
        note(DriveOf(e), transition.drive)
    return found


def _choose_letters(
    symbols: Mapping[str, str], own: Mapping[Perturbation, str]
) -> dict[str, str]:
    """Return for each role the first of its letters that no symbol of the file has as its base."""
    exempt: dict[str, frozenset[str]] = {
        "energy": _owned(own, lambda p: isinstance(p, EnergyOf)),
        "barrier": _owned(own, lambda p: isinstance(p, BarrierOf)),
        "drive": _owned(own, lambda p: isinstance(p, DriveOf)),
    }
    chosen: dict[str, str] = {}
    for role, letters in LETTERS.items():
        spared = exempt.get(role, frozenset())
        taken = _bases(latex for name, latex in symbols.items() if name not in spared)
        taken |= {same_latex(letter) for letter in chosen.values()}
        free = [letter for letter in letters if same_latex(letter) not in taken]
        chosen[role] = free[0] if free else rf"\mathrm{{{role.split()[0]}}}"
    return chosen


def _owned(
    own: Mapping[Perturbation, str], kind: Callable[[Perturbation], bool]
) -> frozenset[str]:
    return frozenset(name for perturbation, name in own.items() if kind(perturbation))


def _bases(latex: Iterable[str]) -> set[str]:
    """Return what stands before the first subscript, superscript or prime of each symbol."""
    return {same_latex(re.split(r"[_^']", text)[0]) for text in latex}
