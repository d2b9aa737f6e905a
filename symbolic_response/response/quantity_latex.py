"""Quantities and responses as LaTeX: the left sides of formulas."""

from __future__ import annotations

from collections import Counter

from symbolic_response.expressions.latex import expression_latex
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Symbol,
    rebuild,
    symbols_of,
)
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
from symbolic_response.response.notation import Notation


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
        shown = notation.symbols[notation.own[perturbation]]
        return f"({shown})" if notation.beta else shown
    return _generic_perturbation(notation, perturbation)


def _generic_perturbation(notation: Notation, perturbation: Perturbation) -> str:
    match perturbation:
        case EnergyOf(state):
            return notation.energy(notation.indexed("energy", notation.states[state]))
        case BarrierOf(e):
            return notation.energy(notation.indexed("barrier", notation.transitions[e]))
        case BarriersOf(transitions):
            inside = ",".join(notation.transitions[e] for e in transitions)
            return notation.energy(notation.indexed("barrier", rf"\{{{inside}\}}"))
        case DriveOf(e):
            return notation.energy(notation.indexed("drive", notation.transitions[e]))
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
            opened = "^" in shown or shown.startswith(r"\ln")
            shown = f"({shown})" if opened and not shown.startswith("(") else shown
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
