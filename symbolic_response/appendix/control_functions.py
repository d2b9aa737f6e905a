"""Functions of one parameter as equations that fit the lines; long ones by their degrees."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from symbolic_response.appendix.paper import Paper
from symbolic_response.control.rational import EXPONENTIAL, RationalFunction
from symbolic_response.expressions.breaking import Equation, Piece, align, fits, line_limit
from symbolic_response.expressions.latex import expression_latex, latex_terms
from symbolic_response.expressions.ring import Polynomial
from symbolic_response.expressions.tree import Expression, Symbol, rebuild

MOST_TERMS = 24


@dataclass(slots=True)
class FunctionPrinter:
    """Prints functions of one parameter; long polynomials in them get names, shared by all."""

    paper: Paper
    symbol: str
    named: dict[Polynomial, str] = field(default_factory=dict)
    fresh: list[Polynomial] = field(default_factory=list)

    def text(self, given: str, functions: Sequence[tuple[str, RationalFunction]]) -> str:
        """Return equations for functions, each with its left side; ``given``: under which values.
        """
        self.fresh.clear()
        equations, degrees = [], []
        limit = min(line_limit(left, self.paper.width) for left, _ in functions)
        for left, f in functions:
            equation = self._equation(left, f, limit)
            if equation is None:
                degrees.append(f"${left}$ is {self._degrees(f)}, too long to be printed.")
            else:
                equations.append(equation)
        definitions = [Equation(self.named[p], tuple(self._sum(p, self.named[p])))
                       for p in self.fresh]
        parts = [given]
        if equations:
            x = self.paper.notation.symbols[self.symbol]
            what = "functions of ${}$ are" if len(equations) > 1 else "function of ${}$ is"
            parts += ["the exact " + what.format(x), align(equations, self.paper.width)]
        if definitions:
            parts += ["with", align(definitions, self.paper.width)]
        return "\n".join([*parts, *degrees])

    def _names(self) -> dict[str, str]:
        return {**self.paper.notation.symbols,
                **{"#" + name: name for name in self.named.values()}}

    def _equation(self, left: str, f: RationalFunction, limit: float) -> Equation | None:
        """Return an equation, None for what does not fit."""
        whole = expression_latex(f.expression(), self._names())
        if fits(whole, limit):
            negative = whole.startswith("-")
            return Equation(left, (Piece("-" if negative else "", whole.removeprefix("-")),))
        known = len(self.fresh), dict(self.named)
        shown = rebuild(f.expression(), lambda leaf: self._short(leaf, limit))
        latex = expression_latex(shown, self._names())
        new = self.fresh[known[0]:]
        if fits(latex, limit) and all(self._printable(p) for p in new):
            negative = latex.startswith("-")
            return Equation(left, (Piece("-" if negative else "", latex.removeprefix("-")),))
        del self.fresh[known[0]:]
        self.named = known[1]
        return None

    def _short(self, leaf: Expression, limit: float) -> Expression:
        """Return a leaf, or a symbol for a polynomial that is wide."""
        if not isinstance(leaf, Polynomial) or len(leaf.poly) < 3:
            return leaf
        if leaf not in self.named and fits(expression_latex(leaf, self._names()), limit / 3):
            return leaf
        if leaf not in self.named:
            letter = self.paper.letters["polynomial"]
            self.named[leaf] = f"{letter}_{{{len(self.named) + 1}}}"
            self.fresh.append(leaf)
        return Symbol("#" + self.named[leaf])

    def _sum(self, polynomial: Polynomial, left: str) -> list[Piece]:
        return self.paper.pieces([polynomial], line_limit(left, self.paper.width))

    def _printable(self, polynomial: Polynomial) -> bool:
        limit = line_limit(self.named[polynomial], self.paper.width)
        terms = latex_terms(polynomial, self._names())
        return len(terms) <= MOST_TERMS and all(fits(term.body, limit) for term in terms)

    def _degrees(self, f: RationalFunction) -> str:
        x = self.paper.notation.symbols[self.symbol]
        if f.kind == EXPONENTIAL:
            variable = f"e^{{{x}}}" if f.root == 1 else f"e^{{{x}/{f.root}}}"
        else:
            base = f"({x})" if "^" in x else x
            variable = x if f.root == 1 else f"{base}^{{1/{f.root}}}"
        return (f"a quotient of polynomials of degrees {int(f.numerator.degree())} and"
                f" {int(f.denominator.degree())} in ${variable}$")
