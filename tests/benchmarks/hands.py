"""The verdict on a correct steady state, written as a patient person would, against SymPy."""

from __future__ import annotations

from dataclasses import replace

import sympy

from symbolic_response.algebra.compact.factor import factored
from symbolic_response.expressions.latex import expression_latex
from symbolic_response.expressions.ring import plain
from symbolic_response.expressions.sympy_exchange import expression_to_sympy
from symbolic_response.expressions.tree import Expression, add, divide, rebuild
from symbolic_response.hand.compare import compare_entries
from symbolic_response.network import Network
from symbolic_response.network.notation_section import symbol_names
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_form import closed_form
from tests.benchmarks.networks import complete
from tests.benchmarks.timing import Row, compare


def by_hand(network: Network) -> list[Expression]:
    """Return the probabilities, each sum over trees with common rates taken out."""
    analysis = Analysis(network)

    def rate(leaf: Expression) -> Expression:
        places = {g.base: p for p, g in enumerate(analysis.rates.ring.generators)}
        if leaf not in places:
            return leaf
        return analysis.rate_expression(*analysis.rates.directions()[places[leaf]])

    sums = [
        rebuild(factored(analysis.tree_sum(k), analysis.rates.ring), rate)
        for k in range(len(network.states))
    ]
    return [divide(top, add(sums)) for top in sums]


def row() -> Row:
    """Time reading the four probabilities of K4 in LaTeX and judging them."""
    network = complete(4)
    forms, names = by_hand(network), symbol_names(network)
    quantities = [f"p[{state.name}]" for state in network.states]
    entries = tuple(
        {"quantity": quantity, "latex": expression_latex(form, names)}
        for quantity, form in zip(quantities, forms, strict=True)
    )
    filled = replace(network, hand=entries)

    def ours() -> None:
        assert all(found.verdict.kind == "equal" for found in compare_entries(filled))

    analysis = Analysis(network)
    differences = [
        expression_to_sympy(form)
        - expression_to_sympy(plain(closed_form(read_quantity(q, network), analysis).expression))
        for q, form in zip(quantities, forms, strict=True)
    ]

    def theirs() -> None:
        for difference in differences:
            assert sympy.simplify(difference) == 0

    return compare("K4: four probabilities read and found right", ours,
                   "SymPy simplify of the difference", theirs, 20)
