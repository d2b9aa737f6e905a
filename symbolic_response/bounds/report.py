"""What ``bound`` says: the inequalities that apply, their data and, at a point, verdicts."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.bounds.claim import Claim, CycleMaximum
from symbolic_response.bounds.decide import Weighted
from symbolic_response.bounds.evaluate import ClaimPoint, Evaluated
from symbolic_response.bounds.registry import claims_for
from symbolic_response.bounds.sides import left_text, right_text
from symbolic_response.errors import AssignmentError
from symbolic_response.expressions.enclosure import decimal_enclosure
from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.expressions.tree import (
    Expression,
    add,
    divide,
    multiply,
    number,
    power,
)
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.deriving import check_values
from symbolic_response.response.survey import cycle_path
from symbolic_response.response.values import Point


@dataclass(frozen=True, slots=True)
class BoundRow:
    """One inequality; ``evaluated`` and ``in_force`` are None without a point.

    ``in_force``: for each transition whose largest cycle force occurs, the cycle that gives it.
    """

    claim: Claim
    left: str
    right: str
    evaluated: Evaluated | None
    in_force: dict[str, str | None] | None


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
    analysis: Analysis, text: str, at: Mapping[str, Expression] | None = None
) -> BoundReport:
    """Return every inequality of the catalogue that applies to a response.

    ``at`` gives every symbol an exact value at which all rates are rational, or is left out.
    Raises QuantityError, AssignmentError, EvaluationError, SizeLimitError.
    """
    network = analysis.network
    quantity = read_quantity(text, network)
    claims = claims_for(quantity, analysis)
    place = None
    if at:
        check_values(at, network)
        missing = [entry.name for entry in network.symbols if entry.name not in at]
        if missing:
            raise AssignmentError(f"a bound at a point needs every symbol; {missing[0]} has no"
                                  " value")
        place = ClaimPoint(analysis, Point(network, at))
    elif not network.symbols:
        place = ClaimPoint(analysis, Point(network, {}))
    rows = tuple(_row(claim, analysis, place) for claim in claims)
    value = None if place is None else place.point.value(quantity)
    return BoundReport(network.title, text, value, rows)


def _row(claim: Claim, analysis: Analysis, place: ClaimPoint | None) -> BoundRow:
    left, right = left_text(claim, analysis.network), right_text(claim, analysis)
    if place is None:
        return BoundRow(claim, left, right, None, None)
    in_force: dict[str, str | None] = {}
    for term in claim.right:
        if isinstance(term.force, CycleMaximum):
            e = term.force.transition
            cycle = place.cycle_in_force(e)
            name = analysis.network.transitions[e].name
            in_force[name] = None if cycle is None else cycle_path(cycle, analysis.network)
    return BoundRow(claim, left, right, place.evaluate(claim), in_force)


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
    found: dict[str, object] = {
        "name": row.claim.name, "left": row.left, "right": row.right,
        "left_value": None, "right_value": None, "holds": None,
        "data": data, "hypotheses": row.claim.hypotheses, "source": row.claim.source,
    }
    if row.evaluated is not None:
        found["left_value"] = fraction_text(row.evaluated.left)
        found["right_value"], enclosure = _right_value(row.evaluated)
        if enclosure is not None:
            found["right_enclosure"] = list(enclosure)
        found["holds"] = row.evaluated.holds
        if row.in_force:
            data["in_force"] = row.in_force
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
             else f"{report.response} = {fraction_text(report.value)}"]
    for row in report.rows:
        sign = "=" if row.claim.equality else "<="
        lines.append(f"{row.claim.name}: {row.left} {sign} {row.right}")
        if row.evaluated is not None:
            right, enclosure = _right_value(row.evaluated)
            shown = right if enclosure is None else f"{enclosure[0][:14]}..."
            verdict = {True: "holds", False: "FAILS", None: "undecided"}[row.evaluated.holds]
            lines.append(f"  {verdict}: {fraction_text(row.evaluated.left)} {sign} {shown}")
            for name, cycle in (row.in_force or {}).items():
                lines.append(f"  cycle in force for {name}: {cycle or 'none (a bridge)'}")
        lines.append(f"  source: {row.claim.source}")
    return "\n".join(lines)
