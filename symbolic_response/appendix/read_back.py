"""Every closed form that was printed, read back from its LaTeX and compared with what was derived.

The reader is the one for hand results: it shares nothing with the printer.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from symbolic_response.appendix.paper import Paper, Printed
from symbolic_response.errors import OutputError, SymbolicResponseError
from symbolic_response.expressions.breaking import Equation
from symbolic_response.expressions.enclosure import nonzero_somewhere
from symbolic_response.expressions.ring import Domain, Polynomial, expression_of
from symbolic_response.expressions.tree import ZERO, Expression, Symbol, add, negate, rebuild
from symbolic_response.hand.judging.equality import equal
from symbolic_response.hand.latex.names import Names, names_of
from symbolic_response.hand.latex.reading import read_formula_tokens
from symbolic_response.hand.latex.tokens import Token
from symbolic_response.hand.papers.gathering import gathered
from symbolic_response.hand.papers.statements import Statement
from symbolic_response.network.quantities import Change, DirectedRate, walk_quantity


@dataclass(frozen=True, slots=True)
class Count:
    """How many right sides were read back: compared exactly, and to many digits at points."""

    exact: int = 0
    close: int = 0


def read_back(paper: Paper) -> Count:
    """Read what was printed, and compare it with what it stands for.

    Raises OutputError, naming the formula, at the first that cannot be read or means something
    else.
    """
    names, domain = _names(paper), _domain(paper)
    exact = close = 0
    for printed in paper.printed:
        for equation, statement, source in _statements(printed):
            for found, meaning in _sides(equation, statement, source, names):
                settled = _same(equation, _written_out(found, paper),
                                _written_out(meaning, paper), domain)
                exact += settled
                close += not settled
    return Count(exact, close)


def _names(paper: Paper) -> Names:
    """Return the names of the network, of its sums and of what else was given a name."""
    known = names_of(paper.network, paper.notation, variants=False)
    further = {named.latex: Symbol(key) for key, named in paper.sums.by_key.items()}
    further |= {latex: Symbol(key) for key, latex in paper.helpers.items()
                if key.startswith("#") and key not in paper.sums.by_key}
    return known.with_definitions(further)


def _domain(paper: Paper) -> Domain:
    domain, sums = paper.analysis.domain, paper.sums.by_key
    names = dict.fromkeys((*domain.names, *sums, *paper.helpers))
    positive = {key for key, named in sums.items() if named.generator().positive}
    return Domain(tuple(names), domain.positive | positive | paper.helpers.keys())


def _statements(printed: Printed) -> Iterator[tuple[Equation, Statement, str]]:
    found = gathered(printed.text).stated
    if len(found) != len(printed.equations):
        raise OutputError(f"{len(printed.equations)} printed equations read back as {len(found)},"
                          f" the first of them {printed.equations[0].left!r}")
    for equation, stated in zip(printed.equations, found, strict=True):
        if equation.meanings:
            yield equation, stated.statement, stated.source


def _sides(
    equation: Equation, statement: Statement, source: str, names: Names
) -> Iterator[tuple[Expression, Expression]]:
    """Yield each right side as it reads back, and what it stands for."""
    count = len(equation.meanings)
    if len(statement.parts) <= count or set(statement.relations) != {"="}:
        raise OutputError(f"the equation for {equation.left!r} reads back with"
                          f" {len(statement.parts)} sides")
    lefts, rights = statement.parts[:-count], statement.parts[-count:]
    for tokens, quantity in zip(lefts, equation.quantities, strict=False):
        if any(isinstance(part, Change) for part in walk_quantity(quantity)):
            continue  # written in the notation of integrals, which the reader does not have
        if _read(equation, tokens, source, names) != quantity:
            raise OutputError(f"the left side {equation.left!r} reads back as something else")
    for tokens, meaning in zip(rights, equation.meanings, strict=True):
        yield _read(equation, tokens, source, names), meaning


def _same(equation: Equation, found: Expression, meaning: Expression, domain: Domain) -> bool:
    """Return whether two expressions were compared exactly; OutputError where they differ."""
    same = equal(found, meaning, domain)
    if same is False or (same is None and nonzero_somewhere(add([found, negate(meaning)]))):
        raise OutputError(f"the printed formula for {equation.left!r} reads back as something"
                          " else than what was derived")
    return same is True


def _written_out(node: Expression, paper: Paper) -> Expression:
    """Return an expression without the names that were given to parts of it for want of room.

    Rates become their symbols.
    """

    def leaf(part: Expression) -> Expression:
        if isinstance(part, DirectedRate):
            rates = paper.analysis.rates
            place = rates.place(part.transition, part.backward)
            return ZERO if place is None else rates.ring.generators[place].base
        if isinstance(part, Polynomial) and any(g.kind == "rate" for g in part.ring.generators):
            return expression_of(part.ring, part.poly)
        named = paper.sums.by_key.get(part.name) if isinstance(part, Symbol) else None
        if named is None or named.kind != "remainder":
            return part
        return _written_out(named.form.expression(), paper)

    return rebuild(node, leaf)


def _read(equation: Equation, tokens: Sequence[Token], source: str, names: Names) -> Expression:
    try:
        return read_formula_tokens(tokens, names, source)
    except SymbolicResponseError as error:
        raise OutputError(f"the printed formula for {equation.left!r} cannot be read back:"
                          f" {error}") from None


def sentence(count: Count) -> str:
    """Return the line of the document that says so; empty where nothing was printed."""
    total = count.exact + count.close
    if not total:
        return ""
    formulas = "closed form above was" if total == 1 else f"{total} closed forms above were"
    text = (f"The {formulas} read back from the printed \\LaTeX{{}} and compared, exactly, with"
            " what was derived")
    if count.close:
        text += (f"; {count.close} of them, where no normal form decides, by enclosures of 256 bits"
                 " at three points")
    return text + "."
