"""Verdicts on hand results as text and as data."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from typing import Any

from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.hand.compare import Comparison
from symbolic_response.hand.papers.document import PassedOver
from symbolic_response.response.deriving import Value

LONG = 60
WORDS = {
    "equal": "equal: the same function, exactly",
    "conditional": "equal only under a condition",
    "different": "different",
    "undecided": "undecided",
}


def comparison_text(found: Comparison) -> str:
    """Return the verdict on one hand result as lines of text."""
    hand, verdict = found.hand, found.verdict
    label = f", {hand.label}" if hand.label else ""
    lines = [f"{hand.quantity_text}   ({hand.where}{label})", f"  {WORDS[verdict.kind]}"]
    if verdict.condition is not None:
        lines.append(f"  condition: {verdict.condition}")
    if verdict.kind == "undecided":
        lines.append(f"  {verdict.reason}")
    if verdict.witness is not None:
        lines.append(f"  at {point_text(found)}:")
        lines.append(f"    by hand {value_text(verdict.hand_value)}, derived"
                     f" {value_text(verdict.derived_value)}")
    if verdict.kind == "different" and not found.diagnosis:
        lines.append("  no single slip was found that explains it")
    lines += [f"  - {finding.text}" for finding in found.diagnosis]
    return "\n".join(lines)


def point_text(found: Comparison) -> str:
    """Return the witness as ``c = 1, k = 2``."""
    witness = found.verdict.witness or {}
    return ", ".join(f"{name} = {expression_text(value)}" for name, value in witness.items()) \
        or "every value (there are no symbols)"


def value_text(value: Value | None) -> str:
    """Return a value: exact, or as a decimal where it is long or irrational."""
    if value is None:
        return "no value"
    text = str(value)
    if value.enclosure is None:
        return text
    low, _ = value.enclosure
    return f"{low}..." if len(text) > LONG else f"{text} = {low}..."


def report_text(found: Sequence[Comparison], passed_over: Sequence[PassedOver] = ()) -> str:
    """Return all verdicts, what was passed over, and a count."""
    blocks = [comparison_text(one) for one in found]
    if passed_over:
        lines = ["passed over:"]
        lines += [f"  line {one.line}: {one.excerpt}: {one.reason}" for one in passed_over]
        blocks.append("\n".join(lines))
    counts = Counter(one.verdict.kind for one in found)
    listed = ", ".join(f"{counts[kind]} {kind}" for kind in WORDS if counts[kind])
    formulas = "formula" if len(found) == 1 else "formulas"
    blocks.append(f"{len(found)} {formulas}: {listed}" if found else "no formula was compared")
    return "\n".join(blocks)


def report_data(
    title: str, found: Sequence[Comparison], passed_over: Sequence[PassedOver] = ()
) -> dict[str, Any]:
    """Return the same as data for JSON."""
    return {
        "network": title,
        "results": [_data(one) for one in found],
        "passed_over": [
            {"line": one.line, "excerpt": one.excerpt, "reason": one.reason} for one in passed_over
        ],
    }


def _data(found: Comparison) -> dict[str, Any]:
    hand, verdict = found.hand, found.verdict
    witness = None
    if verdict.witness is not None:
        witness = {name: expression_text(value) for name, value in verdict.witness.items()}
    return {
        "quantity": hand.quantity_text,
        "formula": hand.formula,
        "where": hand.where,
        "label": hand.label,
        "verdict": verdict.kind,
        "condition": verdict.condition,
        "reason": verdict.reason,
        "witness": witness,
        "hand_value": _value_data(verdict.hand_value),
        "derived_value": _value_data(verdict.derived_value),
        "diagnosis": [finding.text for finding in found.diagnosis],
    }


def _value_data(value: Value | None) -> str | None:
    if value is None:
        return None
    return str(value) if value.exact is None else fraction_text(value.exact)
