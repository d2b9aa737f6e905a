"""The shortest program of a quantity: sums over trees while they are few, else elimination."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.algebra.factored import Factored
from symbolic_response.errors import SizeLimitError
from symbolic_response.export.elimination import Elimination
from symbolic_response.export.program import (
    Constant,
    Named,
    Node,
    Program,
    Rate,
    operations,
    rebuilt,
    translated,
)
from symbolic_response.expressions.ring import Generator, Polynomial
from symbolic_response.expressions.tree import Expression
from symbolic_response.network.quantities import Probability
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_trees import closed_tree
from symbolic_response.response.existence import require_existence, require_inner_existence

MAX_TREES = 300  # more rooted trees are never shorter than an elimination
MAX_OPERATIONS = 150  # a longer sum over trees gives way to a shorter elimination


@dataclass(frozen=True, slots=True)
class Formulas:
    """Parts of a program, one for each quantity; ``hints`` are names that parts would like."""

    program: Program
    roots: tuple[int, ...]
    hints: dict[int, str]
    by_trees: bool


def formulas_of(analysis: Analysis, quantities: Sequence[Expression]) -> Formulas:
    """Return the shortest formulas of some quantities together.

    Raises EvaluationError where one does not exist, SizeLimitError past 200,000 steps.
    """
    by_trees = _by_trees(analysis, quantities)
    if by_trees is not None and _length(by_trees) <= MAX_OPERATIONS:
        return by_trees
    eliminated = _by_elimination(analysis, quantities)
    if by_trees is not None and _length(by_trees) <= _length(eliminated):
        return by_trees
    return eliminated


def _length(formulas: Formulas) -> int:
    return operations(formulas.program, formulas.roots)


def _by_trees(analysis: Analysis, quantities: Sequence[Expression]) -> Formulas | None:
    """Return the shorter of the forms over symbols and over rates, None where trees are many."""
    if sum(analysis.tree_counts) > MAX_TREES:
        return None
    try:
        trees = [closed_tree(quantity, analysis) for quantity in quantities]
        simplified = [analysis.simplified(tree) for tree in trees]
        for quantity, form in zip(quantities, simplified, strict=True):
            require_inner_existence(quantity, analysis)
            require_existence(form.expression(), analysis.domain.positive)
    except SizeLimitError:
        return None
    forms = [_over_symbols(analysis, simplified), _over_rates(analysis, trees, False)]
    if len(quantities) > 1 and all(isinstance(q, Probability) for q in quantities):
        forms.append(_over_rates(analysis, trees, True))
    return min(forms, key=_length)


def _over_symbols(analysis: Analysis, forms: Sequence[Factored]) -> Formulas:
    program, writer = Program(), _Writer(analysis)
    roots = tuple(writer.part(program, form.expression()) for form in forms)
    hints: dict[int, str] = {}
    for poly, name in _sums(analysis):
        form = analysis.simplified(poly)
        if len(form.factors) == 1 and isinstance(form.factors[0][0], Polynomial):
            hints.setdefault(writer.part(program, form.factors[0][0]), name)
    return Formulas(program, roots, hints, True)


def _over_rates(analysis: Analysis, trees: Sequence[Expression], summed: bool) -> Formulas:
    """Return forms over the rates; ``summed``: the normalisation as the sum of the tree sums."""
    program, writer = Program(), _Writer(analysis)
    sums = {poly: writer.part(program, poly) for poly, _ in _sums(analysis)}
    total = Polynomial(analysis.rates.ring, analysis.normalisation)
    if summed:
        writer.known[total] = program.add(
            [(1, program.keep(part)) for poly, part in sums.items() if poly != total])
        sums[total] = writer.known[total]
    roots = [writer.part(program, tree) for tree in trees]
    made = with_rates(analysis, program, [*roots, *sums.values()])
    named = made.roots[len(roots):]
    hints = dict(made.hints)
    for (_, name), part in zip(_sums(analysis), named, strict=True):
        hints.setdefault(part, name)
    return Formulas(made.program, made.roots[: len(roots)], hints, True)


def _by_elimination(analysis: Analysis, quantities: Sequence[Expression]) -> Formulas:
    program = Program()
    solver = Elimination(analysis, program)
    for quantity in quantities:
        require_existence(quantity, analysis.domain.positive)
    return with_rates(analysis, program, [solver.part(quantity) for quantity in quantities])


def with_rates(analysis: Analysis, program: Program, roots: Sequence[int]) -> Formulas:
    """Return a program with the rates written in the symbols of the file."""
    target, hints, network = Program(), dict[int, str](), analysis.network
    writer = _Writer(analysis)

    def leaf(node: Node) -> int:
        if isinstance(node, Constant):
            return target.number(node.value)
        if isinstance(node, Named):
            return target.symbol(node.name)
        assert isinstance(node, Rate)
        part = target.keep(writer.part(
            target, analysis.rate_expression(node.transition, node.backward)))
        name = network.transitions[node.transition].name
        hints.setdefault(part, f"w_{name}" + ("_back" if node.backward else ""))
        return part

    made = rebuilt(target, program, roots, leaf)
    return Formulas(target, tuple(made), hints, False)


def _sums(analysis: Analysis) -> list[tuple[Polynomial, str]]:
    """Return the tree sums and the normalisation with their names."""
    ring, states = analysis.rates.ring, analysis.network.states
    named = [(Polynomial(ring, analysis.tree_sum(k)), f"N_{state.name}")
             for k, state in enumerate(states)]
    return [*named, (Polynomial(ring, analysis.normalisation), "D")]


class _Writer:
    """Expressions with polynomial leaves as parts of a program."""

    def __init__(self, analysis: Analysis) -> None:
        self.directions = analysis.rates.directions()
        self.known: dict[Polynomial, int] = {}

    def part(self, program: Program, node: Expression) -> int:
        """Return an expression as a part."""

        def leaf(part: Expression) -> int:
            assert isinstance(part, Polynomial)
            return self.known[part] if part in self.known else self._polynomial(program, part)

        return translated(program, node, leaf)

    def _polynomial(self, program: Program, leaf: Polynomial) -> int:
        terms = {tuple(int(e) for e in exponents): int(coefficient)
                 for exponents, coefficient in leaf.poly.to_dict().items()}
        columns = list(zip(leaf.ring.generators, leaf.ring.roots, strict=True))
        return self._nested(program, columns, terms)

    def _nested(self, program: Program, columns: list[tuple[Generator, int]],
                terms: dict[tuple[int, ...], int]) -> int:
        """Return a polynomial with what most of its terms share taken out, again and again."""
        pieces: list[int] = []
        while terms:
            counts = [sum(1 for key in terms if key[i]) for i in range(len(columns))]
            most = max(counts, default=0)
            if most <= 1:
                pieces += [self._monomial(program, columns, key, c) for key, c in terms.items()]
                break
            chosen = counts.index(most)
            inside = {key: c for key, c in terms.items() if key[chosen]}
            low = tuple(map(min, zip(*inside, strict=True)))
            rest = {tuple(a - b for a, b in zip(key, low, strict=True)): c
                    for key, c in inside.items()}
            pieces.append(program.multiply([
                (self._monomial(program, columns, low, 1), 1),
                (self._nested(program, columns, rest), 1)]))
            terms = {key: c for key, c in terms.items() if not key[chosen]}
        return program.add([(1, piece) for piece in pieces])

    def _monomial(self, program: Program, columns: list[tuple[Generator, int]],
                  key: tuple[int, ...], coefficient: int) -> int:
        factors = []
        for (generator, root), exponent in zip(columns, key, strict=True):
            if not exponent:
                continue
            if generator.kind == "rate":
                e, backward = self.directions[generator.rank]
                factors.append((program.rate(e, backward), exponent))
            elif generator.kind == "exp":
                step = self.part(program, generator.expression(Fraction(1, root)))
                factors.append((step, exponent))
            else:
                whole = generator.expression(Fraction(exponent, root))
                factors.append((self.part(program, whole), 1))
        return program.multiply(factors, coefficient)
