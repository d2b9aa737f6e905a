"""Conditions under which a hand result may hold: relations stated by the user, forces that vanish.

Each is imposed exactly: it is solved for a symbol, which is then replaced everywhere.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from functools import partial
from itertools import combinations, islice

from symbolic_response.errors import (
    EvaluationError,
    ExpressionError,
    QuantityError,
    SizeLimitError,
)
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.ring import Domain, Polynomial
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Symbol,
    add,
    divide,
    function,
    multiply,
    negate,
    number,
    power,
    rebuild,
    walk,
)
from symbolic_response.hand.judging.solving import (
    ContradictionError,
    Solved,
    UnsolvableError,
    impose,
)
from symbolic_response.network.quantities import DirectedRate
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.survey import cycle_path
from symbolic_response.topology import Cycle, cycles

MAX_CYCLES, MAX_EQUAL_FORCES = 100, 60
MAX_SHOWN = 160


@dataclass(frozen=True, slots=True)
class Condition:
    """A condition, and the symbols it was solved for; ``describe`` gives it in words."""

    solved: Solved
    describe: Callable[[], str]


# -- relations stated by the user ------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Relation:
    """A relation as the user wrote it, and left side minus right side in the file's symbols."""

    text: str
    difference: Expression


def read_relations(given: Sequence[str], analysis: Analysis) -> tuple[Relation, ...]:
    """Return the relations that the network does not imply; each ``EXPRESSION = EXPRESSION``.

    Raises QuantityError, in one line, for one that cannot be read or solved for a symbol, and
    where no positive rates satisfy one of them or all together.
    """
    found, together = [], dict[str, Expression]()
    for text in given:
        relation = _read_relation(text, analysis)
        shown = f"given {_short(text)!r}"
        if _imposed(relation, {}, analysis, shown) is None:
            continue
        found.append(relation)
        beside = f"{shown}, with the relations before it," if together else shown
        together = dict(_imposed(relation, together, analysis, beside) or together)
    return tuple(found)


def _imposed(
    relation: Relation, solved: Solved, analysis: Analysis, shown: str
) -> Solved | None:
    try:
        return impose(relation.difference, solved, analysis)
    except ContradictionError:
        raise QuantityError(f"{shown} contradicts the network: no positive rates satisfy it; give a"
                            " relation that some values of the symbols satisfy") from None
    except UnsolvableError as error:
        raise QuantityError(f"{shown} cannot be solved for a symbol: {error}; write it so that one"
                            " symbol stands in a single power, such as k1*k2 = k3*k4") from None


def _read_relation(text: str, analysis: Analysis) -> Relation:
    shown = f"given {_short(text)!r}"
    sides = text.split("=")
    if len(sides) != 2:
        raise QuantityError(f"{shown}: write EXPRESSION = EXPRESSION, with one =")
    try:
        read = [read_quantity(side.strip(), analysis.network) for side in sides]
    except (ExpressionError, QuantityError, EvaluationError, SizeLimitError) as error:
        raise QuantityError(f"{shown}: {error}") from None
    left, right = (_in_symbols(side, analysis, shown) for side in read)
    return Relation(" ".join(text.split()), add([left, negate(right)]))


def _in_symbols(expression: Expression, analysis: Analysis, shown: str) -> Expression:
    def leaf(part: Expression) -> Expression:
        if isinstance(part, DirectedRate):
            transition = analysis.network.transitions[part.transition]
            rate = transition.backward if part.backward else transition.forward
            return number(0) if rate is None else rate
        if not isinstance(part, Symbol | Number):
            raise QuantityError(f"{shown}: a relation is between symbols and rates; write it"
                                " without p, current and the like")
        return part

    return rebuild(expression, leaf)


def _short(text: str) -> str:
    text = " ".join(text.split())
    return text if len(text) <= 60 else text[:57] + "..."


def condition_of(relations: Sequence[Relation], analysis: Analysis) -> Condition:
    """Return several stated relations as one condition."""
    solved: Solved = {}
    for relation in relations:
        solved = impose(relation.difference, solved, analysis) or solved
    return Condition(solved, partial(_given, relations))


def _given(relations: Sequence[Relation]) -> str:
    return "given " + " and ".join(relation.text for relation in relations)


# -- forces that vanish ----------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Force:
    """A finite force that does not vanish identically: the ratio of rates along and against."""

    cycle: Cycle
    ratio: Expression


@dataclass(frozen=True, slots=True)
class Forces:
    """The finite cycle forces of a network that do not vanish identically.

    ``all_zero``: what makes all of them vanish; None where that was not found. It lies within
    every other condition about them, so a difference there refutes all at once.
    """

    forces: tuple[_Force, ...]
    all_zero: Solved | None


def forces_of(analysis: Analysis) -> Forces:
    """Return the forces a condition can be about.

    Cycles with one-way transitions have none. In a network of many cycles only the fundamental
    ones are taken.
    """
    forces = _open_forces(analysis)
    return Forces(forces, _solved_or_none([_less_one(f.ratio) for f in forces], analysis))


def force_conditions(found: Forces, analysis: Analysis) -> Iterator[Condition]:
    """Yield the conditions of single cycles, of two equal forces, and detailed balance."""
    yield from _conditions_of_cycles(found.forces, analysis)
    yield from _equal_forces(found.forces, analysis)
    if not any(analysis.graph.one_way) and found.all_zero is not None and len(found.all_zero) > 1:
        yield Condition(found.all_zero, partial(_all_zero, found, analysis))


def _open_forces(analysis: Analysis) -> tuple[_Force, ...]:
    try:
        known: Sequence[Cycle] = cycles(analysis.graph, limit=MAX_CYCLES)
    except SizeLimitError:
        known = analysis.fundamental_cycles
    finite = (c for c in known if not any(analysis.graph.one_way[e] for e in c.transitions))
    forces = (_force(cycle, analysis) for cycle in finite)
    return tuple(force for force in forces if force is not None)


def _force(cycle: Cycle, analysis: Analysis) -> _Force | None:
    along, against = [], []
    for e, ahead in zip(cycle.transitions, cycle.along, strict=True):
        along.append(analysis.rate_expression(e, not ahead))
        against.append(analysis.rate_expression(e, ahead))
    ratio = divide(multiply(along), multiply(against))
    form = normal_form(ratio, analysis.domain)
    return None if form.as_fraction() == 1 else _Force(cycle, form.expression())


def _balance(ratio: Expression, domain: Domain) -> str:
    """Return ``ratio = 1`` as an equation: a sum of energies, or a product equal to another."""
    force = normal_form(function("ln", ratio), domain).expression()
    if not any(isinstance(part, Function) for part in walk(force)):
        return f"{expression_text(force)} = 0"
    form = normal_form(ratio, domain)
    left, right = (expression_text(Polynomial(form.ring, side))
                   for side in (form.numerator, form.denominator))
    if len(left) + len(right) > MAX_SHOWN:
        return "the product of rates along equals that against"
    return f"{left} = {right}"


def _solved_or_none(relations: Sequence[Expression], analysis: Analysis) -> Solved | None:
    """Return what relations are solved for; None where they contradict, or are all implied."""
    solved: Solved = {}
    for relation in relations:
        try:
            solved = impose(relation, solved, analysis) or solved
        except (ContradictionError, UnsolvableError):
            return None
    return solved or None


def _conditions_of_cycles(forces: Sequence[_Force], analysis: Analysis) -> Iterator[Condition]:
    for force in forces:
        solved = _solved_or_none([_less_one(force.ratio)], analysis)
        if solved is not None:
            yield Condition(solved, partial(_one_zero, force, analysis))


def _one_zero(force: _Force, analysis: Analysis) -> str:
    return (f"the force of the cycle {cycle_path(force.cycle, analysis.network)} is zero:"
            f" {_balance(force.ratio, analysis.domain)}")


def _equal_forces(forces: Sequence[_Force], analysis: Analysis) -> Iterator[Condition]:
    pairs = ((one, other, sign) for one, other in combinations(forces, 2) for sign in (1, -1))
    for one, other, sign in islice(pairs, MAX_EQUAL_FORCES):
        ratio = multiply([one.ratio, power(other.ratio, -sign)])
        solved = _solved_or_none([_less_one(ratio)], analysis)
        if solved is not None:
            yield Condition(solved, partial(_two_equal, one, other, sign, analysis))


def _two_equal(one: _Force, other: _Force, sign: int, analysis: Analysis) -> str:
    ratio = multiply([one.ratio, power(other.ratio, -sign)])
    paths = [cycle_path(force.cycle, analysis.network) for force in (one, other)]
    return (f"the force of the cycle {paths[0]} equals {'' if sign == 1 else 'minus '}that of"
            f" {paths[1]}: {_balance(ratio, analysis.domain)}")


def _all_zero(found: Forces, analysis: Analysis) -> str:
    """Return detailed balance with the equations of independent cycles, where they are short."""
    chosen: list[str] = []
    solved: Solved = {}
    for force in found.forces:
        larger = impose(_less_one(force.ratio), solved, analysis)
        if larger is not None:
            chosen.append(_balance(force.ratio, analysis.domain))
            solved = larger
    shown = " and ".join(chosen)
    if len(shown) > 2 * MAX_SHOWN:
        shown = f"{len(chosen)} equations, one for each independent cycle"
    return f"detailed balance, every cycle force is zero: {shown}"


def _less_one(ratio: Expression) -> Expression:
    return add([ratio, number(-1)])
