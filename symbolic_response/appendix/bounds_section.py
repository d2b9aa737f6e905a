"""The section on inequalities: statement, what sets the limit, hypotheses, source."""

from __future__ import annotations

import re
from collections.abc import Sequence

from symbolic_response.appendix.bound_definitions import definitions
from symbolic_response.appendix.paper import Paper
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
from symbolic_response.bounds.curves import Curve, FiniteChange, LocalChange, Tanh
from symbolic_response.bounds.registry import PATH, applicable
from symbolic_response.bounds.sides import force_side
from symbolic_response.bounds.target import Absolute, Extreme, ShareWithout
from symbolic_response.bounds.topological import competing
from symbolic_response.expressions.breaking import (
    Equation,
    Piece,
    align,
    fits,
    line_limit,
    product_pieces,
)
from symbolic_response.expressions.latex import expression_latex, fraction_latex
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    Number,
    Product,
    Sum,
    Symbol,
    multiply,
    rebuild,
)
from symbolic_response.expressions.widths import formula_width
from symbolic_response.network.quantities import (
    BarrierOf,
    BarriersOf,
    BySymbol,
    Change,
    DriveOf,
    EnergyOf,
    Probability,
    Response,
)
from symbolic_response.response.quantity_latex import quantity_in

MAX_LISTED_CYCLES = 6
MAX_LISTED_SPLITTINGS = 8
MAX_LISTED_PATHS = 6

_QUOTIENT = re.compile(r"\\left\(\\frac\{((?:[^{}+-]|\{[^{}]*\})*)\}\{((?:[^{}+ -]|\{[^{}]*\})*)\}"
                       r"\\right\)")
WORDS = {
    "energy-covariance": "exactly, as a covariance",
    "energy-range": "by the range of the quantity",
    "barrier": "by the largest cycle force",
    "end-pair": "by the ends of the transition",
    "splitting-barrier": "by splittings and the largest cycle force",
    "splitting-end-pair": "by splittings and the ends of the transition",
    "drive": "by the range of the quantity",
    "splitting-drive": "by splittings",
    "parameter": "by energies, barriers and single rates",
    "support": "by the number of states whose rates the parameter multiplies",
    "path": "by the paths between the states",
    "local-change": "by the largest cycle force, both rates changing by powers of their own",
    "local-end-pair": "by the ends of the transition, both rates changing by powers of their own",
    "bundle": "by the cycles that leave the set of transitions",
    "directed-bundle": "by how many of the rates spanning trees use",
    "finite-change": "by the largest cycle force, for a finite change of the barrier",
    "finite-end-pair": "by the ends of the transition, for a finite change of the barrier",
    "second-order": "since the ratio is linear in $e^{-b}$, $b$ the barrier, above and below",
    "current-exact": "exactly, by the trees that do not use the transition",
    "current-range": "by the current or the traffic itself",
}
SOURCE_KEYS = {
    "energy-covariance": "owen", "energy-range": "owen", "barrier": "owen", "drive": "owen",
    "splitting-barrier": "martins", "splitting-drive": "martins", "parameter": "owen",
    "support": "support", "path": "maes,liang", "current-range": "aslyamov",
}


def bounds_section(paper: Paper, quantities: Sequence[Expression]) -> str:
    """Return the inequalities that limit the responses among the quantities; empty if none do."""
    found = [(q, applicable(q, paper.analysis)) for q in quantities]
    found = [(quantity, claims) for quantity, claims in found if claims]
    if not found:
        return ""
    every = [claim for _, claims in found for claim in claims]
    parts = [r"\section{Bounds on the responses}", definitions(paper, every)]
    for quantity, claims in found:
        parts.append(_group(paper, quantity, claims))
    return "\n\n".join(part for part in parts if part)


def _group(paper: Paper, quantity: Expression, claims: Sequence[Claim]) -> str:
    equations: list[Equation] = []
    words: list[str] = []
    for claim in claims:
        equation = _equation(paper, claim)
        alike = [place for place, other in enumerate(equations) if _same(equation, other)]
        if alike:
            words[alike[0]] += f", or {_cited(claim)}"
            continue
        equations.append(equation)
        words.append(_cited(claim))
    listed = "; ".join(dict.fromkeys(words))
    return "\n".join([
        rf"\paragraph{{{_heading(paper, quantity)}.}} Limited {listed}:",
        align(equations, paper.width),
        _data(paper, claims),
    ])


def _same(one: Equation, other: Equation) -> bool:
    """Return whether two inequalities are the same up to the order of their factors."""
    parts = [sorted(" ".join(piece.body for piece in e.pieces).split()) for e in (one, other)]
    return parts[0] == parts[1] and one.relation == other.relation


def _equation(paper: Paper, claim: Claim) -> Equation:
    inner = quantity_in(paper.notation, claim.left)
    left = rf"\Bigl|{inner}\Bigr|" if isinstance(claim.left, Response | Change) else inner
    relation = "=" if claim.equality else r"\le"
    pieces = _right(paper, claim, line_limit(left, paper.width))
    return Equation(left, tuple(pieces), relation=relation)


def _heading(paper: Paper, quantity: Expression) -> str:
    """Return what responds, and to what, in words."""
    notation = paper.notation
    if isinstance(quantity, Change):
        inner = quantity_in(notation, quantity.quantity)
        transition = notation.transitions[quantity.transition]
        return f"The change of ${inner}$ with the barrier of ${transition}$"
    if not isinstance(quantity, Response):
        return f"${quantity_in(notation, quantity)}$"
    inner = quantity_in(notation, quantity.quantity)
    inner = _QUOTIENT.sub(r"(\1/\2)", inner)
    if formula_width(inner) + 120 > paper.width:
        return "A response"
    match quantity.perturbation:
        case EnergyOf(state):
            what = f"the energy of ${notation.states[state]}$"
        case BarrierOf(e):
            what = f"the barrier of ${notation.transitions[e]}$"
        case BarriersOf(transitions):
            listed = ", ".join(f"${notation.transitions[e]}$" for e in transitions)
            what = f"the barriers of {listed} together"
        case DriveOf(e):
            what = f"the drive of ${notation.transitions[e]}$"
        case BySymbol(name, logarithmic):
            what = ("the logarithm of " if logarithmic else "") + f"${notation.symbols[name]}$"
    return f"${inner}$ and {what}"


def _cited(claim: Claim) -> str:
    key = SOURCE_KEYS.get(claim.name)
    return WORDS[claim.name] + (f"~\\cite{{{key}}}" if key else "")


def _right(paper: Paper, claim: Claim, limit: float) -> list[Piece]:
    if _many_paths(paper, claim):
        rate = paper.letters["rate"]
        return [Piece("", rf"\max_P \frac{{{rate}_P^+}}{{{rate}_P^-}}")]
    pieces: list[Piece] = []
    for term in claim.right:
        factors = _factors(paper, term)
        if not factors and len(claim.right) > 1:
            continue
        body = " \\, ".join(factors) or "0"
        sign = "+" if pieces else ""
        if fits(body, limit):
            pieces.append(Piece(sign, body))
        else:
            pieces += product_pieces(factors, limit, sign)
    return pieces or [Piece("", "0")]


def _many_paths(paper: Paper, claim: Claim) -> bool:
    """Return whether the paths of a path bound are too many, or too long, to be written out."""
    if claim.name != PATH:
        return False
    if len(_paths(claim)) > MAX_LISTED_PATHS:
        return True
    left = quantity_in(paper.notation, claim.left)
    return not fits(side_latex(paper, claim.right[0].factor), line_limit(left, paper.width))


def _paths(claim: Claim) -> list[object]:
    listed = claim.data["paths"]
    assert isinstance(listed, list)
    return listed


def _factors(paper: Paper, term: Term) -> list[str]:
    """Return the factors of a term as they are printed, none for zero."""
    if term.factor == ZERO:
        return []
    parts = term.factor.factors if isinstance(term.factor, Product) else (term.factor,)
    plain = side_latex(paper, term.factor)
    printed = [plain]
    shares = [part for part in parts if isinstance(part, ShareWithout)]
    if shares:
        rest = multiply([part for part in parts if part not in shares])
        printed = [side_latex(paper, rest), *(side_latex(paper, part) for part in shares)]
    elif formula_width(plain) > paper.width / 3 and len(parts) > 1:
        printed = [side_latex(paper, multiply([part])) for part in parts]
        printed = [f"({text})" if isinstance(part, Sum) else text
                   for part, text in zip(parts, printed, strict=True)]
    if term.force is None:
        return printed
    finite = force_side(term.force, paper.analysis) is not None
    curve = _curve(paper, term.curve, _force(paper, term.force) if finite else None)
    if curve == "1":
        return printed
    if plain == "1":
        return [curve]
    return [*([f"({plain})"] if isinstance(term.factor, Sum) else printed), curve]


def _curve(paper: Paper, curve: Curve, force: str | None) -> str:
    """Return a curve of a force, None standing for an infinite one."""
    match curve:
        case Tanh(divisor):
            return "1" if force is None else rf"\tanh \frac{{{force}}}{{{divisor}}}"
        case LocalChange(u, v):
            if force is None:
                return fraction_latex(u)
            return rf"\psi_{{{fraction_latex(u)},{fraction_latex(v)}}}({force})"
        case FiniteChange(amount):
            size = side_latex(paper, amount)
            if force is None:
                return size
            return (rf"2 \ln \frac{{\cosh(({force} + {size})/4)}}"
                    rf"{{\cosh(({force} - {size})/4)}}")


def _force(paper: Paper, force: Force) -> str:
    notation = paper.notation
    match force:
        case CycleMaximum(e):
            return rf"{notation.letters['force']}_{{\max}}({notation.transitions[e]})"
        case EndPair(e):
            return rf"|\ln {paper.letters['cross ratio']}_{{{notation.transitions[e]}}}|"
        case MixedCycles(transitions):
            names = ",".join(notation.transitions[e] for e in transitions)
            return rf"{notation.letters['force']}_{{\max}}(\{{{names}\}})"
        case OneCycle(cycle):
            number = paper.analysis.cycles.index(cycle) + 1
            return f"|{notation.indexed('force', str(number))}|"


def side_latex(paper: Paper, node: Expression) -> str:
    """Return a factor of a right side; maxima over splittings are written as such."""
    names = dict(paper.notation.symbols)

    def leaf(part: Expression) -> Expression:
        shown = _leaf(paper, part)
        if shown is None:
            return part
        names["#" + shown] = shown
        return Symbol("#" + shown)

    return expression_latex(rebuild(node, leaf), names)


def _leaf(paper: Paper, part: Expression) -> str | None:
    match part:
        case Extreme("max", parts) if _covariance_of(parts) is not None:
            observable = _covariance_of(parts)
            assert observable is not None
            return rf"\max_{{S}} |\mathrm{{Cov}}({_function(paper, observable)}, 1_S)|"
        case Extreme(name, parts):
            shown = ", ".join(side_latex(paper, inner) for inner in parts)
            return rf"\{name}\{{{shown}\}}"
        case Absolute(inner):
            return f"|{side_latex(paper, inner)}|"
        case ShareWithout():
            return rf"\frac{{\sum_k {paper.letters['free']}_k}}{{{paper.letters['normalisation']}}}"
        case Symbol() | Number():
            return None
    return quantity_in(paper.notation, part)


def _function(paper: Paper, mean: Expression) -> str:
    """Return the function of the state whose mean is given: 1_A for a probability."""
    if isinstance(mean, Probability):
        inside = ",".join(paper.notation.states[k] for k in mean.states)
        return f"1_{{{inside}}}" if len(mean.states) == 1 else rf"1_{{\{{{inside}\}}}}"
    return side_latex(paper, mean).replace(r"\langle ", "").replace(r" \rangle", "")


def _covariance_of(parts: Sequence[Expression]) -> Expression | None:
    """Return <Q> if the parts are |<Q 1_S> - <Q> p(S)| for several sets S."""
    found: set[Expression] = set()
    for part in parts:
        inner = part.inner if isinstance(part, Absolute) else part
        last = inner.terms[-1] if isinstance(inner, Sum) else inner
        if not isinstance(last, Product) or not isinstance(last.factors[-1], Probability):
            return None
        found.add(multiply([f for f in last.factors[:-1] if not isinstance(f, Number)]))
    return found.pop() if len(found) == 1 else None


def _data(paper: Paper, claims: Sequence[Claim]) -> str:
    """Return which cycles and splittings compete, once for each transition."""
    sentences: list[str] = []
    for claim in claims:
        for term in claim.right:
            if isinstance(term.force, CycleMaximum | MixedCycles):
                sentences.append(_cycles(paper, term.force))
        if _many_paths(paper, claim):
            sentences.append(_path_words(paper, claim))
        cuts = claim.data.get("splittings")
        if isinstance(cuts, list):
            sentences.append(_splittings(paper, cuts))
    return " ".join(dict.fromkeys(sentences))


def _path_words(paper: Paper, claim: Claim) -> str:
    places = {state.name: paper.notation.states[k] for k, state in enumerate(paper.network.states)}
    start, goal = (places[str(claim.data[key])] for key in ("from", "to"))
    rate = paper.letters["rate"]
    return (f"$P$ runs over the {len(_paths(claim)):,} simple paths from ${start}$ to ${goal}$;"
            f" ${rate}_P^+$ and ${rate}_P^-$ are the products of the rates along and against it.")


def _cycles(paper: Paper, force: LargestForce) -> str:
    notation, analysis = paper.notation, paper.analysis
    name = _force(paper, force)
    through = competing(force, analysis)
    if not through and isinstance(force, CycleMaximum):
        transition = notation.transitions[force.transition]
        return f"The transition ${transition}$ is in no cycle: its force is zero."
    if any(analysis.graph.one_way[step] for cycle in through for step in cycle.transitions):
        return rf"${name} = \infty$."
    if len(through) > MAX_LISTED_CYCLES:
        return f"${name}$ is the largest over {len(through)} cycles."
    numbers = [analysis.cycles.index(cycle) + 1 for cycle in through]
    shown = [f"$|{notation.indexed('force', str(n))}|$" for n in numbers]
    value = shown[0] if len(shown) == 1 else f"the largest of {', '.join(shown)}"
    return f"${name}$ is {value}."


def _splittings(paper: Paper, cuts: Sequence[Sequence[str]]) -> str:
    places = {state.name: paper.notation.states[k] for k, state in enumerate(paper.network.states)}
    if len(cuts) > MAX_LISTED_SPLITTINGS:
        return f"The maximum runs over {len(cuts)} splittings."
    sets = [r"$\{" + ",$ $".join(places[name] for name in cut) + r"\}$" for cut in cuts]
    return f"Splittings: {', '.join(sets)}."
