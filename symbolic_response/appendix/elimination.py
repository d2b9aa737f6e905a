"""Tree sums of larger networks: states taken out one after the other, with named sums."""

from __future__ import annotations

from collections.abc import Mapping

from symbolic_response.algebra.compact.states import eliminated
from symbolic_response.algebra.compact.together import CompactSums, Definition
from symbolic_response.appendix.formulas import filled, is_one
from symbolic_response.appendix.paper import Paper
from symbolic_response.expressions.breaking import Equation, line_limit
from symbolic_response.expressions.tree import (
    Expression,
    Sum,
    Symbol,
    divide,
    substitute,
    symbols_of,
)

LEAST_TREES = 100
"""Tree sums of up to so many trees are written out."""
MOST_STATES = 30


def serves(paper: Paper) -> bool:
    """Return whether the tree sums are better given by elimination."""
    counts = paper.analysis.tree_counts
    return max(counts) > LEAST_TREES and len(counts) <= MOST_STATES


def elimination_text(paper: Paper) -> str:
    """Return the definitions of the named sums and of all tree sums in terms of them.

    Each is proved equal to the tree sum where it is made (``algebra.compact.states``).
    """
    rates = _rate_symbols(paper)
    found = _found(paper, rates)
    for definition in found.definitions:
        paper.helpers[definition.key] = _latex(paper, definition)
    equations = [_equation(paper, definition, rates) for definition in found.definitions
                 if definition.kind != "total"]
    named = _words(paper, found)
    return filled(paper, named) + "\n" + paper.align(equations)


def _rate_symbols(paper: Paper) -> dict[str, Expression]:
    """Return what stands for each rate: its own symbol where it is one, else its letter."""
    analysis, found = paper.sums.analysis, dict[str, Expression]()
    for place, (e, backward) in enumerate(analysis.rates.directions()):
        base = analysis.rates.ring.generators[place].base
        rate = analysis.rate_expression(e, backward)
        assert isinstance(base, Symbol)
        found[base.name] = rate if isinstance(rate, Symbol) else base
    return found


def _found(paper: Paper, symbols: Mapping[str, Expression]) -> CompactSums:
    graph, rates = paper.analysis.graph, paper.analysis.rates
    pairs = [
        (rates.generator(e), None if graph.one_way[e] else rates.generator(e, True))
        for e in range(len(graph.ends))
    ]
    names = paper.names()

    def width(name: str) -> int:
        shown = symbols.get(name)
        return len(names[shown.name]) if isinstance(shown, Symbol) else 3

    return eliminated(graph, rates.ring, pairs, width)


def _words(paper: Paper, found: CompactSums) -> str:
    gone = [d.place[0] for d in found.definitions if d.kind == "exit"]
    listed = ", ".join(f"${paper.notation.states[k]}$" for k in gone)
    text = rf"""They are given by elimination: the states {listed} are taken out one after the
other, in this order. A step into a state $a$ that is taken out goes on from there to one of the
remaining states with probabilities in the ratio of the rates out of $a$, whose sum is $@exit@_a$;
so $@effective@_{{i,j}}$ is the effective rate from $j$ to $i$ when one of the two is taken out, as
given here"""
    if not is_one(paper):
        text += r""" (as for all rates here, with the factor $@factor@$ still in them)"""
    if any(d.kind == "factor" for d in found.definitions):
        text += "; further sums that occur several times have names of their own"
    return text + "."


def _latex(paper: Paper, definition: Definition) -> str:
    states, letters = paper.notation.states, paper.letters
    match definition.kind:
        case "tree":
            return paper.sums.tree(definition.place[0]).latex
        case "total":
            return paper.sums.total().latex
        case "exit":
            return f"{letters['exit']}_{{{states[definition.place[0]]}}}"
        case "rate":
            first, second = (states[k] for k in definition.place)
            return f"{letters['effective']}_{{{first},{second}}}"
    return f"{letters['shared']}_{{{definition.place[0]}}}"


def _equation(
    paper: Paper, definition: Definition, rates: Mapping[str, Expression]
) -> Equation:
    """Return a definition; the tree sums that rest on no other are divided by the factor."""
    left, form = paper.helpers[definition.key], substitute(definition.form, dict(rates))
    if definition.kind == "tree" and not is_one(paper) and not _rests_on_trees(form):
        form = divide(form, Symbol("#scale[]"))
        paper.helpers["#scale[]"] = paper.letters["factor"]
    terms = list(form.terms) if isinstance(form, Sum) else [form]
    pieces = tuple(paper.pieces(terms, line_limit(left, paper.width)))
    return Equation(left, pieces, quantities=(Symbol(definition.key),), meanings=(form,))


def _rests_on_trees(form: Expression) -> bool:
    return any(name.startswith("#tree[") for name in symbols_of(form))
