"""The two sides of a claim in the syntax of quantities."""

from __future__ import annotations

from symbolic_response.bounds.claim import Claim, CycleMaximum, EndPair, Force, OneCycle, Term
from symbolic_response.bounds.target import Absolute, Extreme, absolute, extreme
from symbolic_response.bounds.topological import cycles_through
from symbolic_response.expressions.ring import Polynomial
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    Number,
    Sum,
    Symbol,
    add,
    divide,
    function,
    multiply,
    number,
    rebuild,
)
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import (
    BarrierOf,
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
)
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.forces import force_of

MAX_CYCLES_SHOWN = 12


def left_text(claim: Claim, network: Network) -> str:
    """Return the left side of a claim."""
    return quantity_text(absolute(claim.left), network)


def right_text(claim: Claim, analysis: Analysis) -> str:
    """Return the right side, each force in the user's symbols.

    More than 12 competing cycles are written ``force_max[e]``.
    """
    return quantity_text(right_side(claim, analysis), analysis.network)


def right_side(claim: Claim, analysis: Analysis) -> Expression:
    """Return the right side as one expression."""
    return add([_term(term, analysis) for term in claim.right])


def _term(term: Term, analysis: Analysis) -> Expression:
    if term.force is None:
        return term.factor
    force = force_side(term.force, analysis)
    if force is None:
        return term.factor
    if force == ZERO:
        return ZERO
    part = quantity_text(divide(force, number(term.divisor)), analysis.network)
    return multiply([term.factor, Symbol(f"tanh({part})")])


def force_side(force: Force, analysis: Analysis) -> Expression | None:
    """Return a force as an expression of the user's symbols, None where it is infinite."""
    match force:
        case EndPair(e):
            return _end_pair(e, analysis)
        case OneCycle(cycle):
            found = force_of(cycle, analysis).force
            return None if found is None else absolute(found)
        case CycleMaximum():
            return _cycle_maximum(force, analysis)


def _cycle_maximum(force: CycleMaximum, analysis: Analysis) -> Expression | None:
    forces = [force_of(cycle, analysis).force
              for cycle in cycles_through(force.transition, analysis)]
    finite = [found for found in forces if found is not None]
    if len(finite) < len(forces):
        return None
    if not finite:
        return ZERO
    if len(finite) > MAX_CYCLES_SHOWN:
        name = analysis.network.transitions[force.transition].name
        return Symbol(f"force_max[{name}]")
    return extreme("max", tuple(absolute(found) for found in finite))


def _end_pair(e: int, analysis: Analysis) -> Expression | None:
    first, second = analysis.graph.ends[e]
    ring = analysis.rates.ring
    sides = [
        analysis.rates.generator(e, backward) * analysis.tree_sum_without(state, e)
        for state, backward in ((first, False), (second, True))
    ]
    if sides[0] == sides[1]:
        return ZERO
    if not len(sides[0]) or not len(sides[1]):
        return None
    ratio = divide(Polynomial(ring, sides[0]), Polynomial(ring, sides[1]))
    logarithm = analysis.simplified(function("ln", ratio)).expression()
    return ZERO if logarithm == ZERO else absolute(logarithm)


def quantity_text(node: Expression, network: Network) -> str:
    """Return a quantity in the syntax it is read in, maxima and absolute values included."""
    return expression_text(rebuild(node, lambda leaf: _leaf(leaf, network)))


def _leaf(leaf: Expression, network: Network) -> Expression:
    if isinstance(leaf, (Number, Symbol, Polynomial)):
        return leaf
    return Symbol(_leaf_text(leaf, network))


def _leaf_text(leaf: Expression, network: Network) -> str:
    states = [state.name for state in network.states]
    names = [transition.name for transition in network.transitions]
    match leaf:
        case Extreme(name, parts):
            return f"{name}({', '.join(quantity_text(part, network) for part in parts)})"
        case Absolute(inner):
            shown = quantity_text(inner, network)
            return f"abs{shown}" if isinstance(inner, Response) else f"abs({shown})"
        case Probability(chosen):
            return f"p[{', '.join(states[k] for k in chosen)}]"
        case Mean(place):
            return f"mean[{network.observables[place].name}]"
        case Current(e):
            return f"current[{names[e]}]"
        case Traffic(e):
            return f"traffic[{names[e]}]"
        case DirectedRate(e, backward):
            return f"{'backward' if backward else 'forward'}[{names[e]}]"
        case EntropyProduction():
            return "entropy_production"
        case Response(inner, perturbation):
            shown = quantity_text(inner, network)
            if isinstance(inner, Sum):
                shown = f"({shown})"
            return f"(d {shown} / d {perturbation_text(perturbation, network)})"
    raise TypeError(f"no text for {type(leaf).__name__}")


def perturbation_text(perturbation: Perturbation, network: Network) -> str:
    """Return a perturbation in the syntax it is read in."""
    match perturbation:
        case EnergyOf(state):
            return f"energy[{network.states[state].name}]"
        case BarrierOf(e):
            return f"barrier[{network.transitions[e].name}]"
        case DriveOf(e):
            return f"drive[{network.transitions[e].name}]"
    return f"ln {perturbation.name}" if perturbation.logarithmic else perturbation.name
