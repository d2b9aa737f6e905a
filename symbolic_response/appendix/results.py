"""The results of a document: each quantity in closed form, behind the definitions it needs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from math import lcm

from symbolic_response.algebra.factored import (
    Factored,
    FactoredSum,
    constant,
    integer_power,
    product,
    scaled,
)
from symbolic_response.appendix import formulas
from symbolic_response.appendix.named_sums import NamedSum
from symbolic_response.appendix.paper import Paper
from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.breaking import (
    Equation,
    continued,
    line_limit,
    sum_pieces,
)
from symbolic_response.expressions.latex import SignedTerm, fraction_latex
from symbolic_response.expressions.ring import Polynomial
from symbolic_response.expressions.tree import Expression, Number, number
from symbolic_response.expressions.widths import formula_width
from symbolic_response.network.quantities import (
    BarrierOf,
    BarriersOf,
    BySymbol,
    Current,
    DriveOf,
    EnergyOf,
    EntropyProduction,
    Mean,
    Probability,
    Response,
    Traffic,
    walk_quantity,
)
from symbolic_response.response.closed_trees import closed_tree, rate_changes
from symbolic_response.response.quantity_latex import quantity_in

MAX_FOREST_SUMS = 400
TERM_WIDTH = 25.0


@dataclass(frozen=True, slots=True)
class Result:
    """A quantity and its form in terms of named sums; ``value`` where it is a number."""

    quantity: Expression
    form: Factored
    value: Fraction | None = None


def results_section(paper: Paper, quantities: Sequence[Expression], note: str) -> str:
    """Return the sections that give the quantities in closed form."""
    parts = [r"\section{Closed forms}"] if quantities else []
    parts += [note] if note else []
    for kind, heading in HEADINGS.items():
        chosen = [q for q in quantities if kind_of(q) == kind]
        if chosen:
            parts.append(rf"\subsection*{{{heading}}}")
            parts.append(_group(paper, kind, chosen))
    return "\n\n".join(parts)


HEADINGS = {
    "probability": "Probabilities",
    "current": "Currents",
    "traffic": "Traffic",
    "mean": "Means",
    "entropy": "Entropy production",
    "energy": "Responses to energies",
    "barrier": "Responses to barriers",
    "barriers": "Responses to several barriers raised together",
    "drive": "Responses to drives",
    "symbol": "Responses to parameters",
    "other": "Further quantities",
}


def kind_of(quantity: Expression) -> str:
    """Return the group of results a quantity belongs to."""
    match quantity:
        case Probability():
            return "probability"
        case Current():
            return "current"
        case Traffic():
            return "traffic"
        case Mean():
            return "mean"
        case EntropyProduction():
            return "entropy"
        case Response(_, EnergyOf()):
            return "energy"
        case Response(_, BarrierOf()):
            return "barrier"
        case Response(_, BarriersOf()):
            return "barriers"
        case Response(_, DriveOf()):
            return "drive"
        case Response(_, BySymbol()):
            return "symbol"
    return "other"


def _group(paper: Paper, kind: str, quantities: Sequence[Expression]) -> str:
    results = [closed_result(paper, quantity) for quantity in quantities]
    equations: list[Equation] = []
    definitions: list[NamedSum] = []
    for result in results:
        equation, fresh = _equation(paper, result)
        collect(paper, [*paper.needed([result.form.expression()]), *fresh], definitions)
        equations.append(equation)
    texts = [formulas.introduction(paper, kind, definitions)]
    if definitions:
        texts.append(formulas.definitions_text(paper, definitions))
        texts.append("With these," if len(equations) > 1 else "Hence")
    texts.append(paper.align(_merged(equations, paper.width)))
    return "\n".join(text for text in texts if text)


def collect(paper: Paper, sums: Sequence[NamedSum], definitions: list[NamedSum]) -> None:
    """Add sums that are not defined yet, behind those that their own definitions need."""
    for named in sums:
        if named.key in paper.defined:
            continue
        paper.defined.add(named.key)
        if named.kind == "remainder":
            _, inner = paper.fitted(named.form, line_limit(named.latex, paper.width))
            collect(paper, [*paper.needed([named.form.expression()]), *inner], definitions)
        definitions.append(named)


def _merged(equations: Sequence[Equation], width: float) -> list[Equation]:
    """Return the equations, neighbours with the same right side put together."""
    merged: list[Equation] = []
    for equation in equations:
        alike = bool(merged) and merged[-1].pieces == equation.pieces
        if alike and r"\frac" not in equation.left:
            left = f"{merged[-1].left} = {equation.left}"
            if formula_width(left) < 0.4 * width:
                both = (*merged[-1].quantities, *equation.quantities)
                merged[-1] = replace(equation, left=left, quantities=both)
                continue
        merged.append(equation)
    return merged


# -- closed forms ----------------------------------------------------------------------------


def closed_result(paper: Paper, quantity: Expression) -> Result:
    """Return a quantity in the form that is shortest with the sums defined so far."""
    tree = closed_tree(quantity, paper.analysis)
    direct = _direct(paper, quantity)
    if direct is not None and paper.network.symbols:
        return Result(quantity, direct)
    plain = paper.sums.analysis.simplified(tree)
    if plain.is_constant():
        return Result(quantity, direct or plain, plain.coefficient)
    _note_sums(paper, quantity)
    forms = [paper.sums.recognised(plain, paper.defined)]
    try:
        by_names = paper.sums.by_names(tree)
    except SizeLimitError:
        by_names = None
    if by_names is not None:
        forms.append(paper.sums.recognised(by_names, paper.defined))
    return Result(quantity, min(forms, key=lambda form: _length(paper, form)))


def _equation(paper: Paper, result: Result) -> tuple[Equation, list[NamedSum]]:
    left = quantity_in(paper.notation, result.quantity)
    pieces, fresh = paper.fitted(result.form, line_limit(left, paper.width))
    meanings = [result.form.expression()]
    if result.value is not None and not result.form.is_constant():
        shown = SignedTerm(result.value < 0, fraction_latex(abs(result.value)))
        pieces = [*pieces, *continued(sum_pieces([shown]))]
        meanings.append(number(result.value))
    return Equation(left, tuple(pieces), quantities=(result.quantity,),
                    meanings=tuple(meanings)), fresh


def _direct(paper: Paper, quantity: Expression) -> Factored | None:
    """Return probabilities, and means with numbers as values, as sums of the N_k over D."""
    match quantity:
        case Probability(states):
            weights = {k: Fraction(1) for k in states}
        case Mean(place):
            values = paper.network.observables[place].values
            weights = {k: v.value for k, v in enumerate(values) if isinstance(v, Number)}
            if len(weights) < len(values):
                return None
        case _:
            return None
    scale = lcm(*(weight.denominator for weight in weights.values()))
    terms = [
        scaled(paper.sums.tree(k).symbol(), weight * scale)
        for k, weight in weights.items() if weight
    ]
    if not terms:
        return constant(0)
    top = terms[0] if len(terms) == 1 else Factored(
        Fraction(1), factors=((FactoredSum(tuple(terms)), Fraction(1)),)
    )
    below = integer_power(paper.sums.total().symbol(), -1)
    return product([top, below, constant(Fraction(1, scale))])


def _note_sums(paper: Paper, quantity: Expression) -> None:
    """Make the named sums that a quantity may contain."""
    sums = paper.sums
    for e in range(len(paper.network.transitions)):
        sums.current(e)
        if any(isinstance(p, Traffic | Response) for p in walk_quantity(quantity)):
            sums.traffic(e)
    for part in walk_quantity(quantity):
        if not isinstance(part, Response):
            continue
        places = rate_changes(part.perturbation, paper.analysis)
        if isinstance(part.perturbation, EnergyOf):
            continue
        changed = {paper.analysis.rates.directions()[place][0] for place in places}
        for inner in walk_quantity(part.quantity):
            for e in sorted(changed):
                if isinstance(inner, Mean):
                    sums.mean_forest(inner.observable, e)
                if isinstance(inner, Probability) and len(inner.states) == 1:
                    sums.forest(inner.states[0], e)


def _length(paper: Paper, form: Factored) -> float:
    """Return how much there is to print: the formula and the definitions it needs."""
    node = form.expression()
    new = sum(named.terms for named in paper.needed([node]))
    long = sum(len(base.poly) for base in _bases(form) if isinstance(base, Polynomial))
    return formula_width(paper.latex(node)) + TERM_WIDTH * new + long


def _bases(form: Factored) -> list[Polynomial]:
    return [base for base, _ in form.factors if isinstance(base, Polynomial)]
