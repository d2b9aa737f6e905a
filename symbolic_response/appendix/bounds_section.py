"""The section on inequalities: statement, what sets the limit, hypotheses, source."""

from __future__ import annotations

from collections.abc import Sequence

from symbolic_response.appendix.formulas import filled
from symbolic_response.appendix.paper import Paper
from symbolic_response.bounds.claim import Claim, CycleMaximum, EndPair, OneCycle, Term
from symbolic_response.bounds.registry import applicable
from symbolic_response.bounds.target import Absolute, Extreme
from symbolic_response.bounds.topological import cycles_through
from symbolic_response.expressions.breaking import Equation, Piece, align
from symbolic_response.expressions.latex import expression_latex
from symbolic_response.expressions.tree import (
    Expression,
    Number,
    Product,
    Sum,
    Symbol,
    multiply,
    rebuild,
)
from symbolic_response.network.quantities import Probability
from symbolic_response.response.quantity_latex import quantity_in

MAX_LISTED_CYCLES = 6
MAX_LISTED_SPLITTINGS = 8

NAMES = {
    "energy-covariance": "the response to an energy is a covariance",
    "energy-range": "range of the response to an energy",
    "barrier": "cycle force",
    "end-pair": "ends of the transition",
    "splitting-barrier": "cycle force and splittings",
    "splitting-end-pair": "ends of the transition and splittings",
    "drive": "response to a drive",
    "splitting-drive": "response to a drive, with splittings",
    "parameter": "energies, barriers and single rates",
    "support": "states that the parameter touches",
    "path": "paths between two states",
}
SOURCE_KEYS = {
    "energy-covariance": "owen", "energy-range": "owen", "barrier": "owen", "drive": "owen",
    "splitting-barrier": "martins", "splitting-drive": "martins", "parameter": "owen",
    "support": "support", "path": "maes,liang",
}


def bounds_section(paper: Paper, quantities: Sequence[Expression]) -> str:
    """Return the inequalities that limit the responses among the quantities; empty if none do."""
    found = [(q, applicable(q, paper.analysis)) for q in quantities]
    found = [(quantity, claims) for quantity, claims in found if claims]
    if not found:
        return ""
    every = [claim for _, claims in found for claim in claims]
    parts = [r"\section{Bounds on the responses}", _definitions(paper, every)]
    for quantity, claims in found:
        parts.append(_group(paper, quantity, claims))
    return "\n\n".join(part for part in parts if part)


def _definitions(paper: Paper, claims: Sequence[Claim]) -> str:
    """Return the notions that the inequalities use, and only those."""
    forces = [term.force for claim in claims for term in claim.right]
    text = ["The inequalities below hold for all admissible values of the symbols."]
    if any(isinstance(force, CycleMaximum) for force in forces):
        text.append(r"$@force@_{\max}(e)$ is the largest $|@force@_c|$ of the cycles $c$ that "
                    r"contain the transition $e$: zero if there are none, infinite if one of them "
                    r"has a one-way step, $\tanh$ then being one.")
    if any(isinstance(force, EndPair) for force in forces):
        text.append(r"$r_e = @rate@^+_e a_m / (@rate@^-_e a_n)$, for $e$ from $m$ to $n$, with "
                    r"$a_k$ the part of $@tree sum@_k$ from trees that do not use $e$; it is a "
                    r"weighted mean of the ratios of the products of rates along and against the "
                    r"cycles through $e$, so that $|\ln r_e| \le @force@_{\max}(e)$.")
    if any("splitting" in claim.name for claim in claims):
        text.append(r"A splitting $S$ of a transition is a set of states that contains its first "
                    r"state and not its second, $S$ and the other states each being connected; "
                    r"$\mathrm{Cov}(q, 1_S) = \langle q 1_S \rangle - \langle q \rangle "
                    r"@probability@_S$.")
    if any(claim.name in ("parameter", "support") for claim in claims):
        text.append("A parameter is resolved into energies, which change all rates out of a state "
                    "alike, barriers, and single rates.")
    return filled(paper, "\n".join(text))


def _group(paper: Paper, quantity: Expression, claims: Sequence[Claim]) -> str:
    equations, notes = [], []
    for claim in claims:
        left = f"|{quantity_in(paper.notation, claim.left)}|"
        relation = "=" if claim.equality else r"\le"
        equations.append(Equation(left, tuple(_right(paper, claim)), relation=relation))
        notes.append(_cited(claim))
    shown = f"${quantity_in(paper.notation, quantity)}$"
    return "\n".join([
        rf"For {shown}: {'; '.join(dict.fromkeys(notes))}.",
        align(equations, paper.width),
        _data(paper, claims),
    ])


def _cited(claim: Claim) -> str:
    key = SOURCE_KEYS.get(claim.name)
    cite = f"~\\cite{{{key}}}" if key else " (shown here: the responses of all $\\ln$ " \
        "probabilities lie between those of the two ends)"
    return NAMES[claim.name] + cite


def _right(paper: Paper, claim: Claim) -> list[Piece]:
    pieces: list[Piece] = []
    for term in claim.right:
        body = _term(paper, term)
        if body and not (body == "0" and len(claim.right) > 1):
            pieces.append(Piece("+" if pieces else "", body))
    return pieces or [Piece("", "0")]


def _term(paper: Paper, term: Term) -> str:
    factor = side_latex(paper, term.factor)
    if term.force is None or factor == "0":
        return factor
    force = _force(paper, term.force)
    tanh = rf"\tanh \frac{{{force}}}{{{term.divisor}}}"
    if factor == "1":
        return tanh
    composite = isinstance(term.factor, Sum)
    return f"({factor}) {tanh}" if composite else f"{factor} \\, {tanh}"


def _force(paper: Paper, force: CycleMaximum | EndPair | OneCycle) -> str:
    notation = paper.notation
    match force:
        case CycleMaximum(e):
            return rf"{notation.letters['force']}_{{\max}}({notation.transitions[e]})"
        case EndPair(e):
            return rf"|\ln r_{{{notation.transitions[e]}}}|"
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
            inner = side_latex(paper, observable).replace(r"\langle ", "").replace(
                r" \rangle", "")
            return rf"\max_{{S}} |\mathrm{{Cov}}({inner}, 1_S)|"
        case Extreme(name, parts):
            shown = ", ".join(side_latex(paper, inner) for inner in parts)
            return rf"\{name}\{{{shown}\}}"
        case Absolute(inner):
            return f"|{side_latex(paper, inner)}|"
        case Symbol():
            return None
    return quantity_in(paper.notation, part)


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
            if isinstance(term.force, CycleMaximum):
                sentences.append(_cycles(paper, term.force.transition))
        cuts = claim.data.get("splittings")
        if isinstance(cuts, list):
            sentences.append(_splittings(paper, cuts))
    return " ".join(dict.fromkeys(sentences))


def _cycles(paper: Paper, e: int) -> str:
    notation, analysis = paper.notation, paper.analysis
    name = notation.transitions[e]
    letter = notation.letters["force"]
    through = cycles_through(e, analysis)
    if not through:
        return f"The transition ${name}$ is in no cycle: its force is zero."
    if any(analysis.graph.one_way[step] for cycle in through for step in cycle.transitions):
        return rf"$@force@_{{\max}}({name}) = \infty$.".replace("@force@", letter)
    if len(through) > MAX_LISTED_CYCLES:
        return rf"$@force@_{{\max}}({name})$ is the largest over {len(through)} cycles.".replace(
            "@force@", letter)
    numbers = [analysis.cycles.index(cycle) + 1 for cycle in through]
    shown = ", ".join(f"|{notation.indexed('force', str(n))}|" for n in numbers)
    value = shown if len(numbers) == 1 else rf"\max\{{{shown}\}}"
    return rf"${letter}_{{\max}}({name}) = {value}$."


def _splittings(paper: Paper, cuts: Sequence[Sequence[str]]) -> str:
    places = {state.name: paper.notation.states[k] for k, state in enumerate(paper.network.states)}
    if len(cuts) > MAX_LISTED_SPLITTINGS:
        return f"The maximum runs over {len(cuts)} splittings."
    shown = ", ".join(r"\{" + ", ".join(places[name] for name in cut) + r"\}" for cut in cuts)
    return f"Splittings: ${shown}$."
