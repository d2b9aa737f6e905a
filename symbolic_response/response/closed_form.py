"""Closed forms of quantities and responses, in the user's symbols."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from symbolic_response.algebra.compact.short_forms import ShortForms
from symbolic_response.algebra.factored import Factored
from symbolic_response.expressions.latex import expression_latex
from symbolic_response.expressions.ring import all_symbols, plain
from symbolic_response.expressions.sympy_exchange import expression_to_sympy
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import Expression
from symbolic_response.network.notation_section import symbol_names as symbol_names
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_trees import closed_tree


@dataclass(frozen=True, slots=True)
class ClosedForm:
    """A quantity of a network in closed form: factored, exact, in the user's symbols."""

    form: Factored
    names: Mapping[str, str]
    positive: frozenset[str] = frozenset()

    @property
    def expression(self) -> Expression:
        """The tree; its polynomials are leaves."""
        return self.form.expression()

    def text(self) -> str:
        """Return the form in the syntax of the network file, its sums as short as found."""
        return expression_text(ShortForms({}).of(self.expression))

    def latex(self) -> str:
        """Return the form as LaTeX, without math delimiters, its sums as short as found."""
        return expression_latex(ShortForms(self.names).of(self.expression), self.names)

    def to_sympy(self) -> Any:
        """Return the form as a SymPy expression, its symbols positive or real as in the file."""
        return expression_to_sympy(plain(self.expression), self.positive)

    def symbols(self) -> frozenset[str]:
        """Return the symbols that occur."""
        return all_symbols(self.expression)

    def __str__(self) -> str:
        return self.text()

    def _repr_latex_(self) -> str:
        return f"$\\displaystyle {self.latex()}$"


def closed_form(quantity: Expression, analysis: Analysis) -> ClosedForm:
    """Return a quantity or response of a network in closed form.

    Raises QuantityError where the quantity does not exist for the network, EvaluationError for a
    division by zero, SizeLimitError past a limit.
    """
    form = analysis.simplified(closed_tree(quantity, analysis))
    return ClosedForm(form, symbol_names(analysis.network), analysis.domain.positive)
