"""The two sides of a claim in the syntax of quantities."""

from __future__ import annotations

from symbolic_response.bounds.claim import (
    Claim,
    CycleMaximum,
    EndPair,
    Force,
    LargestForce,
    MixedCycles,
    OneCycle,
    Term,
)
from symbolic_response.bounds.curves import FiniteChange, LocalChange, Tanh
from symbolic_response.bounds.target import Absolute, Extreme, ShareWithout, absolute, extreme
from symbolic_response.bounds.topological import competing, force_names
from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.ring import Polynomial
from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.expressions.tree import (
    ONE,
    ZERO,
    Expression,
    Number,
    Sum,
    Symbol,
    add,
    divide,
    function,
    multiply,
    negate,
    number,
    rebuild,
)
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import (
    BarrierOf,
    BarriersOf,
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
    factor = with_shares(term.factor, analysis)
    if term.force is None:
        return factor
    return multiply([factor, _curve(term, force_side(term.force, analysis), analysis.network)])


def _curve(term: Term, force: Expression | None, network: Network) -> Expression:
    """Return the curve of a term at a force, None standing for an infinite one."""
    match term.curve:
        case Tanh(divisor):
            if force is None or force == ZERO:
                return ONE if force is None else ZERO
            return Symbol(f"tanh({quantity_text(divide(force, number(divisor)), network)})")
        case LocalChange(u, v):
            if force is None or force == ZERO:
                return number(u if force is None else u - v)
            sizes = ", ".join(fraction_text(x) for x in (u, v))
            return Symbol(f"psi({sizes}, {quantity_text(force, network)})")
        case FiniteChange(size):
            if force is None or force == ZERO:
                return size if force is None else ZERO
            rise, fall = (
                quantity_text(divide(add([force, part]), number(4)), network)
                for part in (size, negate(size))
            )
            return Symbol(f"2*ln(cosh({rise})/cosh({fall}))")


def with_shares(factor: Expression, analysis: Analysis) -> Expression:
    """Return a factor with S_a/D written out over the rates."""

    def leaf(part: Expression) -> Expression:
        if not isinstance(part, ShareWithout):
            return part
        ring, roots = analysis.rates.ring, range(analysis.graph.size)
        free = sum((analysis.tree_sum_without(root, part.transition) for root in roots),
                   ring.constant(0))
        if not len(free):
            return ZERO  # a bridge
        share = divide(Polynomial(ring, free), Polynomial(ring, analysis.normalisation))
        return analysis.simplified(share).expression()

    return rebuild(factor, leaf)


def force_side(force: Force, analysis: Analysis) -> Expression | None:
    """Return a force as an expression of the user's symbols, None where it is infinite."""
    match force:
        case EndPair(e):
            return _end_pair(e, analysis)
        case OneCycle(cycle):
            found = force_of(cycle, analysis).force
            return None if found is None else absolute(found)
        case CycleMaximum() | MixedCycles():
            return _largest(force, analysis)


def _largest(force: LargestForce, analysis: Analysis) -> Expression | None:
    forces = [force_of(cycle, analysis).force for cycle in competing(force, analysis)]
    finite = [found for found in forces if found is not None]
    if len(finite) < len(forces):
        return None
    if not finite:
        return ZERO
    if len(finite) > MAX_CYCLES_SHOWN:
        return Symbol(f"force_max[{force_names(force, analysis)}]")
    return extreme("max", tuple(absolute(found) for found in finite))


def _end_pair(e: int, analysis: Analysis) -> Expression | None:
    """Return |ln r|, by name where the sums over trees in it are beyond a limit."""
    first, second = analysis.graph.ends[e]
    ring = analysis.rates.ring
    try:
        sides = [
            analysis.rates.generator(e, backward) * analysis.tree_sum_without(state, e)
            for state, backward in ((first, False), (second, True))
        ]
    except SizeLimitError:
        return Symbol(f"abs(ln(r[{analysis.network.transitions[e].name}]))")
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
        case Change(inner, e, amount):
            entries = quantity_text(inner, network), quantity_text(amount, network)
            return f"change({entries[0]}, barrier[{names[e]}], {entries[1]})"
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
        case BarriersOf(transitions):
            names = [network.transitions[e].name for e in transitions]
            return f"barrier[{', '.join(names)}]"
        case DriveOf(e):
            return f"drive[{network.transitions[e].name}]"
    return f"ln {perturbation.name}" if perturbation.logarithmic else perturbation.name
