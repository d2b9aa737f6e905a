"""What ``bound`` says: the inequalities that apply, their data and, at a point, verdicts."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from decimal import Context, Decimal
from fractions import Fraction

import flint

from symbolic_response.bounds.balls import BallPoint
from symbolic_response.bounds.claim import Claim, CycleMaximum, LargestForce, MixedCycles
from symbolic_response.bounds.curves import FiniteChange
from symbolic_response.bounds.decide import Weighted
from symbolic_response.bounds.enclose import PRECISIONS, Enclosed, enclose
from symbolic_response.bounds.evaluate import ClaimPoint, Evaluated, IrrationalError
from symbolic_response.bounds.registry import claims_for
from symbolic_response.bounds.sides import left_text, right_text
from symbolic_response.bounds.topological import Competing, competing_cycles, force_label
from symbolic_response.errors import AssignmentError, SizeLimitError, UndecidedError
from symbolic_response.expressions.enclosure import decimal_enclosure
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    add,
    divide,
    multiply,
    negate,
    number,
    power,
    substitute,
)
from symbolic_response.network.model import Network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis, as_analysis
from symbolic_response.response.deriving import (
    Given,
    check_values,
    derive_quantity,
    gathered_logarithm,
    given,
)
from symbolic_response.response.forces import force_of
from symbolic_response.response.survey import cycle_path, force_text
from symbolic_response.response.values import NO_SYMBOLS, Point
from symbolic_response.topology import Cycle

MOST_TREES = 20_000  # beyond, no closed form is made for an irrational left side
MOST_CYCLES = 6
LONG = 40


@dataclass(frozen=True, slots=True)
class BoundRow:
    """One inequality; ``evaluated`` and ``in_force`` are None without a point.

    ``in_force``: for each transition whose largest cycle force occurs, the cycle that gives it and
    its force there. ``left_value``: the left side at a point where it is irrational, if known.
    ``cycles``: those that compete for each force, by what they run through.
    """

    claim: Claim
    left: str
    right: str
    evaluated: Evaluated | Enclosed | None
    in_force: dict[str, tuple[str, str] | None] | None
    cycles: dict[str, Competing]
    left_value: Expression | None = None


@dataclass(frozen=True, slots=True)
class BoundReport:
    """All inequalities for one response; ``value`` is that of the response at the point."""

    network: str
    response: str
    value: Fraction | None
    rows: tuple[BoundRow, ...]

    def refuted(self) -> bool:
        """Return whether an inequality fails at the point."""
        return any(row.evaluated is not None and row.evaluated.holds is False for row in self.rows)

    def undecided(self) -> bool:
        """Return whether a verdict could not be reached."""
        return any(row.evaluated is not None and row.evaluated.holds is None for row in self.rows)


def bound(
    subject: Network | Analysis,
    text: str,
    at: Mapping[str, Given] | None = None,
    only: str | None = None,
) -> BoundReport:
    """Return every inequality of the catalogue that applies to a response.

    ``at`` gives every symbol an exact value, or is left out; ``only`` names one inequality.
    Raises QuantityError, AssignmentError, EvaluationError, SizeLimitError.
    """
    analysis = as_analysis(subject)
    network = analysis.network
    quantity = read_quantity(text, network)
    claims = claims_for(quantity, analysis, only)
    values = given(at)
    if values:
        check_values(values, network)
        missing = [entry.name for entry in network.symbols if entry.name not in values]
        if missing:
            raise AssignmentError(f"a bound at a point needs every symbol; {missing[0]} has no"
                                  " value")
    elif network.symbols:
        rows = tuple(_row(claim, analysis) for claim in claims)
        return BoundReport(network.title, text, None, rows)
    place = ClaimPoint(analysis, Point(network, values))
    rows = tuple(_row_at(claim, analysis, place) for claim in claims)
    return BoundReport(network.title, text, place.point.value(quantity), rows)


def _row(claim: Claim, analysis: Analysis) -> BoundRow:
    return BoundRow(
        claim, left_text(claim, analysis.network), right_text(claim, analysis), None, None,
        competing_cycles(claim, analysis),
    )


def _row_at(claim: Claim, analysis: Analysis, place: ClaimPoint) -> BoundRow:
    row, values = _row(claim, analysis), place.point.values
    try:
        return replace(
            row, evaluated=place.evaluate(claim),
            in_force=_in_force(claim, place.cycle_in_force, analysis,
                               lambda cycle: _rational_force(cycle, place)),
        )
    except IrrationalError:
        pass
    left = _left_value(claim, analysis, values)
    found = enclose(claim, analysis, values)
    if left == ZERO and not claim.equality:
        found = replace(found, left=("0", "0"), holds=True)  # a right side is not negative
    if isinstance(claim.right[0].curve, FiniteChange):
        exact = place.change_verdict(claim)
        found = replace(found, holds=found.holds if exact is None else exact)
    with flint.ctx.workprec(PRECISIONS[0]):
        in_force = _in_force(claim, BallPoint(analysis, values).cycle_in_force, analysis,
                             lambda cycle: _force_at(cycle, analysis, values))
    return replace(row, evaluated=found, in_force=in_force, left_value=left)


def _in_force(
    claim: Claim,
    winner: Callable[[LargestForce], Cycle | None],
    analysis: Analysis,
    force: Callable[[Cycle], str],
) -> dict[str, tuple[str, str] | None]:
    found: dict[str, tuple[str, str] | None] = {}
    for term in claim.right:
        if isinstance(term.force, CycleMaximum | MixedCycles):
            cycle = winner(term.force)
            found[force_label(term.force, analysis)] = None if cycle is None else (
                cycle_path(cycle, analysis.network), force(cycle)
            )
    return found


def _rational_force(cycle: Cycle, place: ClaimPoint) -> str:
    ratio = place.cycle_ratio(cycle)
    if ratio is None:
        return force_text(force_of(cycle, place.analysis))
    return "0" if ratio == 1 else f"ln({fraction_text(ratio)})"


def _force_at(cycle: Cycle, analysis: Analysis, values: Mapping[str, Expression]) -> str:
    force = force_of(cycle, analysis)
    if force.force is None:
        return force_text(force)
    here = normal_form(substitute(force.force, dict(values)), NO_SYMBOLS)
    return expression_text(gathered_logarithm(here) or here.expression())


def _left_value(
    claim: Claim, analysis: Analysis, values: Mapping[str, Expression]
) -> Expression | None:
    """Return the exact size of a left side from its closed form, None where that is too large."""
    if sum(analysis.tree_counts) > MOST_TREES:
        return None
    try:
        found = derive_quantity(analysis, claim.left, claim.name, values).value
    except (SizeLimitError, UndecidedError):
        return None
    if found is None or found.exact is not None:
        return None if found is None else number(abs(found.exact or Fraction(0)))
    negative = found.enclosure is not None and found.enclosure[0].startswith("-")
    return negate(found.expression) if negative else found.expression


def right_expression(right: tuple[Weighted, ...]) -> Expression:
    """Return the value of a right side as an expression: tanh(F/n) by the root of e^(2F)."""
    parts = []
    for term in right:
        factor: list[Expression] = [number(term.factor)]
        if term.g is not None:
            root = power(number(term.g), Fraction(2, term.divisor))
            factor.append(divide(add([root, number(-1)]), add([root, number(1)])))
        parts.append(multiply(factor))
    return add(parts)


def report_data(report: BoundReport) -> dict[str, object]:
    """Return the report as plain data for JSON."""
    return {
        "network": report.network,
        "response": report.response,
        "value": None if report.value is None else fraction_text(report.value),
        "bounds": [_row_data(row) for row in report.rows],
    }


def _row_data(row: BoundRow) -> dict[str, object]:
    data = dict(row.claim.data)
    if row.cycles:
        data["cycles"] = {name: cycles.shown for name, cycles in row.cycles.items()}
        data["numbers_of_cycles"] = {name: cycles.number for name, cycles in row.cycles.items()}
    found: dict[str, object] = {
        "name": row.claim.name, "left": row.left, "right": row.right,
        "left_value": None, "right_value": None, "holds": None,
        "data": data, "hypotheses": row.claim.hypotheses, "source": row.claim.source,
    }
    if isinstance(row.evaluated, Enclosed):
        if row.left_value is not None:
            found["left_value"] = expression_text(row.left_value)
        for side, enclosure in (("left", row.evaluated.left), ("right", row.evaluated.right)):
            found[f"{side}_enclosure"] = None if enclosure is None else list(enclosure)
    elif row.evaluated is not None:
        found["left_value"] = fraction_text(row.evaluated.left)
        found["right_value"], enclosure = _right_value(row.evaluated)
        if enclosure is not None:
            found["right_enclosure"] = list(enclosure)
    if row.evaluated is not None:
        found["holds"] = row.evaluated.holds
        if row.in_force:
            data["in_force"] = {
                name: None if cycle is None else cycle[0] for name, cycle in row.in_force.items()
            }
    return found


def _right_value(evaluated: Evaluated) -> tuple[str, tuple[str, str] | None]:
    exact = evaluated.right_value()
    if exact is not None:
        return fraction_text(exact), None
    expression = right_expression(evaluated.right)
    return expression_text(expression), decimal_enclosure(expression)


def report_text(report: BoundReport) -> str:
    """Return the report for people to read."""
    lines = [report.response if report.value is None
             else f"{report.response} = {value_text(report.value)}"]
    for row in report.rows:
        sign = "=" if row.claim.equality else "<="
        lines.append(f"{row.claim.name}: {row.left} {sign} {row.right}")
        if row.evaluated is not None:
            verdict = {True: "holds", False: "FAILS", None: "undecided"}[row.evaluated.holds]
            left, right = _sides_text(row)
            lines.append(f"  {verdict}: {left} {sign} {right}")
        lines += _cycle_lines(row)
        lines.append(f"  source: {row.claim.source}")
    return "\n".join(lines)


def value_text(value: Fraction) -> str:
    """Return a fraction, with a decimal beside a long one."""
    text = fraction_text(value)
    if len(text) <= LONG:
        return text
    return f"{text} (about {about(decimal_enclosure(number(value)))})"


def about(enclosure: tuple[str, str] | None) -> str:
    """Return a short decimal for people; what is exact stands elsewhere."""
    if enclosure is None:
        return "beyond all decimals"
    low, high = map(Decimal, enclosure)
    if low <= 0 <= high and low != high:
        return f"0 to within {max(-low, high):.0e}"
    middle = Context(prec=12).divide(low + high, Decimal(2))
    return str(middle.normalize(Context(prec=12))).replace("E", "e")


def _sides_text(row: BoundRow) -> tuple[str, str]:
    if isinstance(row.evaluated, Enclosed):
        return about(row.evaluated.left), about(row.evaluated.right)
    assert row.evaluated is not None
    exact = row.evaluated.right_value()
    right = about(_right_value(row.evaluated)[1]) if exact is None else value_text(exact)
    return value_text(row.evaluated.left), right


def _cycle_lines(row: BoundRow) -> list[str]:
    lines = []
    for name, cycles in row.cycles.items():
        lines.append(f"  cycles through {name} ({cycles.number}), each with its force:")
        lines += [f"    {one['cycle']}   {one['force']}" for one in cycles.shown[:MOST_CYCLES]]
        if cycles.number > MOST_CYCLES:
            lines.append(f"    and {cycles.number - MOST_CYCLES} more")
    for name, winner in (row.in_force or {}).items():
        if winner is None:
            lines.append(f"  limiting cycle for {name}: none (a bridge)")
        else:
            lines.append(f"  limiting cycle for {name}: {winner[0]}, force {winner[1]}")
    return lines
