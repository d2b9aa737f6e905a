"""What all sections of one document share: the network, its analysis, the notation, the width."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from fractions import Fraction

from symbolic_response.algebra.compact.short_forms import ShortForms
from symbolic_response.algebra.factored import (
    Base,
    Factored,
    FactoredFunction,
    FactoredSum,
    monomial_of,
    product,
)
from symbolic_response.appendix.in_rates import rate_letters
from symbolic_response.appendix.letters import letters_of
from symbolic_response.appendix.named_sums import NamedSum, NamedSums
from symbolic_response.appendix.page import Page
from symbolic_response.expressions.breaking import (
    Equation,
    Piece,
    align,
    fits,
    product_pieces,
    sum_pieces,
)
from symbolic_response.expressions.latex import expression_latex, latex_terms
from symbolic_response.expressions.layout import fraction_layout, without_sign
from symbolic_response.expressions.ring import Polynomial, all_symbols
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Product,
    Sum,
    add,
    function,
    negate,
    power,
)
from symbolic_response.expressions.widths import formula_width
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.notation import Notation

MAX_PRINTED_TERMS = 2000


@dataclass(frozen=True, slots=True)
class Printed:
    """Equations, and the LaTeX they were set in."""

    text: str
    equations: tuple[Equation, ...]


@dataclass(slots=True)
class Paper:
    """One document in the making; ``defined`` holds the keys of sums defined so far.

    ``explained`` holds the general notions a section has explained; ``printed`` the equations set
    so far; ``helpers`` the LaTeX of further symbols; ``letters`` those of the notation and of the
    proofs, by role.
    """

    network: Network
    analysis: Analysis
    notation: Notation
    sums: NamedSums
    page: Page
    room: int = MAX_PRINTED_TERMS
    defined: set[str] = field(default_factory=set)
    explained: set[str] = field(default_factory=set)
    printed: list[Printed] = field(default_factory=list)
    helpers: dict[str, str] = field(default_factory=dict)
    letters: Mapping[str, str] = field(init=False)
    short: ShortForms = field(init=False)

    def __post_init__(self) -> None:
        self.letters = letters_of(self.notation)
        self.helpers |= rate_letters(self.analysis, self.notation)
        self.short = ShortForms(self.names())

    @property
    def width(self) -> float:
        """The width of a line, as formulas are measured."""
        return self.page.width

    def names(self) -> dict[str, str]:
        """Return the LaTeX of all symbols: of the file, of sums, and further ones."""
        return self.sums.names() | self.helpers

    def latex(self, node: Expression) -> str:
        """Return an expression in the user's symbols and named sums."""
        return expression_latex(self.short.of(node), self.names())

    def terms(self, form: Factored) -> list[Expression]:
        """Return a form, its sums as short as can be, as the terms of a sum."""
        node = self.short.of(form.expression())
        match node:
            case Sum(terms):
                return list(terms)
            case Product((Number(value), Sum(terms))) if value == -1:
                return [negate(term) for term in terms]
        return [node]

    def align(self, equations: Sequence[Equation]) -> str:
        """Return equations set in lines of the page, and note them for reading back."""
        text = align(equations, self.width)
        self.printed.append(Printed(text, tuple(equations)))
        return text

    def take(self, terms: int) -> bool:
        """Return whether so many terms may still be printed, and count them if so."""
        if terms > self.room:
            return False
        self.room -= terms
        return True

    def pieces(self, terms: Sequence[Expression], limit: float) -> list[Piece]:
        """Return the terms of a sum as pieces that fit the limit."""
        names = self.names()
        pieces: list[Piece] = []
        for node in map(self.short.of, terms):
            for term in latex_terms(node, names):
                whole = sum_pieces([term]) if not pieces else [
                    Piece("-" if term.negative else "+", term.body)
                ]
                if fits(term.body, limit):
                    pieces += whole
                else:
                    factors = self._factors(without_sign(node)[1], limit)
                    first, *rest = product_pieces(factors, limit, whole[0].sign)
                    pieces += [first, *rest]
        return pieces or [Piece("", "0")]

    def _factors(self, node: Expression, limit: float) -> list[str]:
        """Return a product in printed factors, a long exponential in several."""
        if isinstance(node, Sum):
            return [f"({self.latex(node)})"]
        layout = fraction_layout(node)
        above = [
            piece for base, exponent in layout.above
            for piece in _split_exponential(power(base, exponent), limit, self)
        ]
        printed = []
        for piece in above:
            shown = self.latex(piece)
            printed.append(f"({shown})" if len(latex_terms(piece, self.names())) > 1
                           else shown)
        if layout.top != 1 or layout.bottom != 1:
            size = f"{layout.top}"
            printed.insert(0, size if layout.bottom == 1 else
                           rf"\frac{{{layout.top}}}{{{layout.bottom}}}")
        for base, exponent in layout.below:
            printed.append(_inverse(self.latex(base), f"{exponent}"))
        return printed

    def fitted(self, form: Factored, limit: float) -> tuple[list[Piece], list[NamedSum]]:
        """Return a form as pieces that fit, and the sums that were given a name for that."""
        fresh: list[NamedSum] = []
        while True:
            terms = self.terms(form)
            if all(fits(t.body, limit) for node in terms
                   for t in latex_terms(node, self.names())):
                break
            base = _widest(form, self)
            if base is None:
                break
            named = self.sums.remainder(base)
            fresh.append(named)
            form = _with_name(form, base, named)
        return self.pieces(terms, limit), fresh

    def needed(self, nodes: Sequence[Expression]) -> list[NamedSum]:
        """Return the named sums that occur in expressions and are not yet defined."""
        found = frozenset().union(*(all_symbols(node) for node in nodes)) if nodes else frozenset()
        return [s for s in self.sums.used_in(found) if s.key not in self.defined]


def _inverse(base: str, exponent: str) -> str:
    simple = "+" not in base and "-" not in base and "^" not in base and "(" not in base
    return (base if simple else f"({base})") + f"^{{-{exponent}}}"


def _split_exponential(node: Expression, limit: float, paper: Paper) -> list[Expression]:
    if not (isinstance(node, Function) and node.name == "exp" and isinstance(node.argument, Sum)):
        return [node]
    pieces: list[Expression] = []
    group: list[Expression] = []
    for term in node.argument.terms:
        wider = function("exp", add([*group, term]))
        if group and formula_width(paper.latex(wider)) > limit / 2:
            pieces.append(function("exp", add(group)))
            group = []
        group.append(term)
    return [*pieces, function("exp", add(group))]


def _widest(form: Factored, paper: Paper) -> Base | None:
    """Return the widest sum inside a form that has no name yet and is not the whole of it."""
    found: list[tuple[float, Base]] = []

    def visit(part: Factored, top: bool) -> None:
        lone = top and len(part.factors) == 1 and not any(part.monomial)
        for base, exponent in part.factors:
            whole = lone and exponent == 1
            match base:
                case Polynomial():
                    if not whole and len(base.poly) > 1:
                        found.append((_weight(base), base))
                case FactoredSum(terms):
                    if not whole:
                        found.append((_weight(base), base))
                    for term in terms:
                        visit(term, False)
                case FactoredFunction(_, argument):
                    visit(argument, False)

    visit(form, True)
    if not found:
        return None
    polynomials = [pair for pair in found if isinstance(pair[1], Polynomial)]
    return max(polynomials or found, key=lambda pair: pair[0])[1]


def _weight(base: Base) -> float:
    return float(Factored(Fraction(1), factors=((base, Fraction(1)),)).literals())


def _with_name(form: Factored, base: Base, named: NamedSum) -> Factored:
    parts = [Factored(form.coefficient, form.ring, form.monomial)]
    for other, exponent in form.factors:
        if other == base:
            parts.append(monomial_of(named.generator(), exponent))
            continue
        inner: Base = other
        match other:
            case FactoredSum(terms):
                inner = FactoredSum(tuple(_with_name(term, base, named) for term in terms))
            case FactoredFunction(name, argument):
                inner = FactoredFunction(name, _with_name(argument, base, named))
        parts.append(Factored(Fraction(1), factors=((inner, exponent),)))
    return product(parts)
