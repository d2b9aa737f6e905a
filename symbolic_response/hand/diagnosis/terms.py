"""One part of the written form that is wrong: a coefficient, a sign, an exponent, a term.

Going down the form, the value is worked out that each part would need for the whole to be right,
all others kept; where needed and actual value differ by a monomial, that is the slip. Each
correction is then made in the form and confirmed exactly.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cache, partial
from itertools import islice

import flint

from symbolic_response.bounds.sides import quantity_text
from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    Number,
    Power,
    Product,
    Sum,
    add,
    children,
    multiply,
    number,
    power,
    symbols_of,
    walk,
)
from symbolic_response.hand.diagnosis.case import NO_ANSWER, Case
from symbolic_response.hand.diagnosis.finding import EDIT, FACTOR, PARTIAL, Finding, Ranked
from symbolic_response.hand.diagnosis.monomials import Column, Monomial, Probe, column_of
from symbolic_response.network.model import Network
from symbolic_response.response.jets import rational_root

MAX_PARTS = 3_000
MAX_EDITS, MAX_FOUND = 8, 3
MAX_SHOWN = 80
EXPONENTS = (-3, -2, -1, 1, 2, 3)

Path = tuple[int, ...]
"""Where a part stands: the places of children, from the root down."""

Leaf = Callable[[Expression], Column | None]
"""Gives the values of what is not taken apart."""


@dataclass(frozen=True, slots=True)
class Part:
    """A part of the written form with the values it has and those it would need; ``within`` is
    the sum that holds it."""

    path: Path
    node: Expression
    actual: Column
    needed: Column
    within: Expression | None = None


@dataclass(frozen=True, slots=True)
class Edit:
    """A correction: what stands at a path is replaced. ``what``: how to say it."""

    path: Path
    replacement: Expression
    what: str
    rank: int
    small: bool


def term_findings(case: Case, probe: Probe) -> list[Ranked]:
    """Return corrections of one part of the written form that make it right."""
    found: list[Ranked] = []
    rank = PARTIAL
    for edit in islice(sorted(edits(case, probe), key=lambda edit: edit.rank), MAX_EDITS):
        if edit.rank > rank:
            break
        corrected = replaced(case.hand, edit.path, edit.replacement)
        if corrected is not None and case.is_derived(corrected):
            kind, rank = "factor" if not edit.path else "term", edit.rank
            found.append(Ranked(edit.rank, Finding(kind, edit.what), edit.small))
        if len(found) == MAX_FOUND:
            break
    return found


def replaced(node: Expression, path: Path, by: Expression) -> Expression | None:
    """Return a tree with one part replaced, None where it then has no value."""
    if not path:
        return by
    parts = list(children(node))
    inner = replaced(parts[path[0]], path[1:], by)
    if inner is None:
        return None
    parts[path[0]] = inner
    try:
        match node:
            case Sum():
                return add(parts)
            case Product():
                return multiply(parts)
            case Power(_, exponent):
                return power(inner, exponent)
    except NO_ANSWER:
        pass
    return None


def edits(case: Case, probe: Probe) -> Iterator[Edit]:
    """Yield corrections that the points allow, those of larger parts first."""
    if not probe.points or sum(1 for _ in walk(case.hand)) > MAX_PARTS:
        return
    needed = column_of(case.quantity, probe)
    if needed is None:
        return
    values: dict[Path, Column | None] = {}
    _evaluate(case.hand, (), cache(partial(column_of, probe=probe)), values)
    stack = [Part((), case.hand, values[()], needed)] if values[()] else []
    while stack:
        part = stack.pop()
        edit = _edit(part, probe, case)
        if edit is not None:
            yield edit
            continue
        below = _below(part, values)
        stack.extend(reversed(below))
        if isinstance(part.node, Power):
            for inner in below:
                if not isinstance(inner.node, Sum):
                    yield from _missing(inner, probe, case.network)
        if isinstance(part.node, Sum) and not any(_edit(inner, probe, case) for inner in below):
            yield from _missing(part, probe, case.network)


def _evaluate(
    node: Expression, path: Path, leaf: Leaf, values: dict[Path, Column | None]
) -> Column | None:
    parts = children(node) if isinstance(node, Sum | Product | Power) else ()
    inner = [_evaluate(part, (*path, place), leaf, values) for place, part in enumerate(parts)]
    known = [column for column in inner if column is not None]
    values[path] = _combined(node, known, leaf) if len(known) == len(inner) else None
    return values[path]


def _combined(node: Expression, inner: Sequence[Column], leaf: Leaf) -> Column | None:
    match node:
        case Sum():
            return [sum(column, flint.fmpq(0)) for column in zip(*inner, strict=True)]
        case Product():
            found = list(inner[0])
            for column in inner[1:]:
                found = [a * b for a, b in zip(found, column, strict=True)]
            return found
        case Power(_, exponent):
            return _raised(inner[0], exponent)
    return leaf(node)


def _raised(column: Column, exponent: Fraction) -> Column | None:
    found = []
    for value in column:
        if value == 0 or (value < 0 and exponent.denominator % 2 == 0):
            return None
        root = rational_root(abs(value), exponent)
        if root is None:
            return None
        odd = exponent.numerator % 2 and value < 0
        found.append(-root if odd else root)
    return found


def _below(part: Part, values: dict[Path, Column | None]) -> list[Part]:
    """Return the parts directly below, each with the values it would need."""
    found = []
    within = part.node if isinstance(part.node, Sum) else part.within
    for place, inner in enumerate(children(part.node)):
        path = (*part.path, place)
        actual = values.get(path)
        wanted = None if actual is None else _wanted(part, actual)
        if actual is not None and wanted is not None:
            found.append(Part(path, inner, actual, wanted, within))
    return found


def _wanted(part: Part, actual: Column) -> Column | None:
    triples = list(zip(part.needed, part.actual, actual, strict=True))
    match part.node:
        case Sum():
            return [needed - (whole - own) for needed, whole, own in triples]
        case Product():
            if any(own == 0 or whole == 0 for _, whole, own in triples):
                return None
            return [needed * own / whole for needed, whole, own in triples]
        case Power(_, exponent):
            found = _raised(part.needed, 1 / exponent)
            if found is not None and exponent.numerator % 2 == 0:
                found = [-v if own < 0 else v for v, own in zip(found, actual, strict=True)]
            return found
    return None


# -- what a correction is --------------------------------------------------------------------------


def _edit(part: Part, probe: Probe, case: Case) -> Edit | None:
    """Return the correction of a whole part by a monomial factor, or by leaving it out."""
    network = case.network
    if part.path and all(value == 0 for value in part.needed):
        said = f"{_called(part.node, network)} should not be there{_place(part, network)}"
        return Edit(part.path, ZERO, said, EDIT, True)
    if any(value == 0 for value in part.actual):
        return None
    ratio = probe.recognised([a / b for a, b in zip(part.needed, part.actual, strict=True)])
    if ratio is not None:
        if not part.path:
            return _overall(part, ratio, case)
        corrected = multiply([ratio.expression(), part.node])
        said = _said(part.node, ratio, case) + _place(part, network)
        rank = EDIT if ratio.is_simple() else FACTOR
        return Edit(part.path, corrected, said, rank, ratio.is_number())
    return _other_exponent(part, network)


def _overall(part: Part, ratio: Monomial, case: Case) -> Edit:
    shown = Monomial(1 / ratio.coefficient,
                     tuple((axis, -exponent) for axis, exponent in ratio.powers))
    corrected = multiply([ratio.expression(), part.node])
    factor = expression_text(shown.expression())
    return Edit((), corrected, f"an overall factor: the hand form is {factor} times the derived"
                " one", FACTOR, False)


def _said(node: Expression, ratio: Monomial, case: Case) -> str:
    coefficient, core = _split(node)
    called = _called(core, case.network)
    if ratio.is_number():
        if ratio.coefficient == -1:
            return f"the sign of {called} is wrong"
        right = coefficient * ratio.coefficient
        return (f"{called} should have coefficient {fraction_text(right)}, not"
                f" {fraction_text(coefficient)}")
    corrected = case.analysis.tidy(multiply([ratio.expression(), node])) if _is_term(node) else None
    if corrected is None:
        return (f"{_called(node, case.network)} should be multiplied by"
                f" {_text(ratio.expression())}")
    said = f"{_called(node, case.network)} should be {_text(corrected)}"
    if len(ratio.powers) == 1 and abs(ratio.coefficient) == 1:
        axis = ratio.powers[0][0]
        if axis.name in symbols_of(node):
            said += f" (the exponent of {axis.name} is wrong)"
    if ratio.is_simple() and len(ratio.powers) == 2:
        (one, exponent), (other, _) = ratio.powers
        meant, given = (one, other) if exponent > 0 else (other, one)
        if given.name in symbols_of(node):
            said += f" ({given.name} is written for {meant.name})"
    return said


def _other_exponent(part: Part, network: Network) -> Edit | None:
    """Return a correction of the exponent of a power of a sum."""
    if not isinstance(part.node, Power) or part.node.exponent.denominator != 1:
        return None
    base = _raised(part.actual, 1 / part.node.exponent)
    if base is None:
        return None
    for exponent in EXPONENTS:
        raised = _raised(base, Fraction(exponent))
        if raised is not None and raised == list(part.needed):
            said = (f"the exponent of {_called(part.node.base, network)} should be {exponent}, not"
                    f" {fraction_text(part.node.exponent)}")
            return Edit(part.path, power(part.node.base, exponent), said, EDIT, False)
    return None


def _missing(part: Part, probe: Probe, network: Network) -> Iterator[Edit]:
    """Yield the term that a sum lacks."""
    term = probe.recognised([a - b for a, b in zip(part.needed, part.actual, strict=True)])
    if term is not None:
        said = f"the term {_text(term.expression())} is missing in {_called(part.node, network)}"
        plain = all(exponent > 0 for _, exponent in term.powers)
        rank = EDIT if isinstance(part.node, Sum) or plain else FACTOR
        yield Edit(part.path, add([part.node, term.expression()]), said, rank, True)


def _split(node: Expression) -> tuple[Fraction, Expression]:
    match node:
        case Number(value):
            return value, number(1)
        case Product((Number(value), *rest)):
            return value, multiply(rest)
    return Fraction(1), node


def _is_term(node: Expression) -> bool:
    return not any(isinstance(part, Sum) for part in walk(node)) and all(
        children(part) or type(part).__name__ in ("Number", "Symbol") for part in walk(node))


def _called(node: Expression, network: Network) -> str:
    shown = quantity_text(node, network)
    kind = "sum" if isinstance(node, Sum) else "term"
    if len(shown) > MAX_SHOWN:
        shown = shown[:MAX_SHOWN] + " ..."
    return f"the {kind} {shown}"


def _place(part: Part, network: Network) -> str:
    """Return where a part stands, in words."""
    return "" if part.within is None else f", in {_called(part.within, network)}"


def _text(node: Expression) -> str:
    return expression_text(node)
