"""The section on spanning trees, the normalisation and the stationary probabilities."""

from __future__ import annotations

from symbolic_response.appendix.elimination import elimination_text, serves
from symbolic_response.appendix.formulas import filled, is_one
from symbolic_response.appendix.paper import Paper
from symbolic_response.expressions.breaking import (
    Equation,
    continued,
    line_limit,
    sum_pieces,
)
from symbolic_response.expressions.latex import latex_terms
from symbolic_response.expressions.tree import Symbol, add
from symbolic_response.expressions.widths import formula_width
from symbolic_response.topology import count_undirected_trees


def trees_section(paper: Paper) -> str:
    """Return the tree sums N_k, D, and the stationary probabilities N_k/D."""
    text = [r"\section{Spanning trees and stationary probabilities}", _theorem(paper)]
    counts = _counts(paper)
    sums = [paper.sums.tree(k) for k in range(paper.analysis.graph.size)]
    terms = sum(s.terms for s in sums)
    if serves(paper):
        text.append(counts + filled(paper, f" The tree sums have {terms:,} terms in all. ")
                    + elimination_text(paper) + "\nTheir total is\n" + paper.align([_total(paper)]))
    elif paper.take(terms):
        equations = []
        for s in sums:
            limit = line_limit(s.latex, paper.width)
            pieces = tuple(paper.pieces(paper.terms(s.form), limit))
            equations.append(Equation(s.latex, pieces, quantities=(Symbol(s.key),),
                                      meanings=(s.form.expression(),)))
        text.append(counts + " The tree sums and their total are\n"
                    + paper.align([*equations, _total(paper)]))
    else:
        text.append(counts + filled(paper, _too_long(terms)) + "\n"
                    + paper.align([_total(paper)]))
    paper.defined.update(s.key for s in (*sums, paper.sums.total()))
    return "\n\n".join(part for part in text if part)


def _theorem(paper: Paper) -> str:
    return filled(paper, r"""A spanning tree directed towards its root $k$ holds exactly one
transition out of every other state, and following them from any state leads to $k$. Its weight is
the product of the rates of its transitions in these directions. With $@tree sum@_k$ the sum of the
weights of all spanning trees directed towards $k$, the tree
theorem~\cite{kirchhoff,hill,schnakenberg} gives the stationary probabilities as
\begin{equation}
@probability@_k = \frac{@tree sum@_k}{@normalisation@} , \qquad
@normalisation@ = \sum_k @tree sum@_k .
\end{equation}
A directed rate enters each $@tree sum@_k$ at most linearly. As it goes to zero, the trees that use
it drop out, and the probabilities keep this form as long as some state can be reached from all
others.""")


def _counts(paper: Paper) -> str:
    counts = paper.analysis.tree_counts
    undirected = count_undirected_trees(paper.analysis.graph)
    noun = "tree" if undirected == 1 else "trees"
    text = f"The graph has {undirected:,} spanning {noun}"
    if any(t.backward is None for t in paper.network.transitions):
        listed = ", ".join(
            f"{count:,} towards ${label}$"
            for count, label in zip(counts, paper.notation.states, strict=True)
        )
        text += f"; one-way transitions leave {listed}"
    text += "."
    if not is_one(paper):
        text += filled(paper, rf""" All tree sums share the factor{_factor(paper)} which cancels
from all stationary quantities; $@tree sum@_k$ and all sums below are given divided by it.""")
    return text


def _factor(paper: Paper) -> str:
    """Return the common factor within a sentence, displayed where it is wide."""
    node = paper.sums.common.expression()
    left, right = paper.letters["factor"], paper.latex(node)
    if formula_width(f"{left} = {right}") < 0.4 * paper.width:
        return f" ${left} = {right}$,"
    pieces = paper.pieces([node], line_limit(left, paper.width))
    return "\n" + paper.align([Equation(left, tuple(pieces), meanings=(node,))]) + "\n"


def _too_long(terms: int) -> str:
    return rf""" The tree sums have {terms:,} terms in all and are not printed; $@tree sum@_k$ is
the determinant of $-@generator@$ with row and column $k$ left out, where
$@generator@_{{jj}} = -\sum_{{i \neq j}} @generator@_{{ij}}$. Below they are used by name, and"""


def _total(paper: Paper) -> Equation:
    total = paper.sums.total()
    limit = line_limit(total.latex, paper.width)
    names = [
        Symbol(paper.sums.tree(k).key) for k in range(paper.analysis.graph.size)
    ]
    pieces = paper.pieces(names, limit)
    meanings = [add(names)]
    if total.form.is_constant():
        value = total.form.expression()
        pieces += continued(sum_pieces(latex_terms(value, {})))
        meanings.append(value)
    return Equation(total.latex, tuple(pieces), quantities=(Symbol(total.key),),
                    meanings=tuple(meanings))
