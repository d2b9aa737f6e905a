"""Comparing hand results with the derived ones: a verdict each, and what went wrong."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from symbolic_response.errors import QuantityError
from symbolic_response.hand.diagnosis import Finding, diagnose
from symbolic_response.hand.entries import HandResult, from_python, read_entries
from symbolic_response.hand.judging.verdict import Verdict, judge
from symbolic_response.hand.latex.names import names_of
from symbolic_response.network.model import Network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis, as_analysis


@dataclass(frozen=True, slots=True)
class Comparison:
    """One hand result, the verdict on it, and the findings on what went wrong."""

    hand: HandResult
    verdict: Verdict
    diagnosis: tuple[Finding, ...] = ()

    def __str__(self) -> str:
        from symbolic_response.hand.report import comparison_text

        return comparison_text(self)


def compare(
    subject: Network | Analysis,
    quantity: str,
    formula: Any,
    *,
    given: str | Sequence[str] = (),
) -> Comparison:
    r"""Return the verdict on a formula for a quantity or response of a network.

    ``formula``: LaTeX in the notation of the network (a text with a backslash, a brace or ``^``),
    plain syntax, a SymPy expression in symbols of the same names, or a number. ``given``: a
    relation between symbols that may be used, such as ``"k1*k2 = k3*k4"``, or several. Raises
    FormulaError, QuantityError, ExpressionError for what cannot be read, SizeLimitError past a
    limit.

    >>> from symbolic_response.network.build import build_network
    >>> pair = build_network("pair", states="A B", transitions=[("A", "B", "k*c", "r")])
    >>> compare(pair, "p[B]", r"\frac{k c}{r + k c}").verdict.kind
    'equal'
    >>> compare(pair, "p[B]", "k/(r + k*c)").verdict.kind
    'different'
    """
    if not isinstance(subject, Network | Analysis):
        raise QuantityError(f"compare takes a network or an analysis, not a Python"
                            f" {type(subject).__name__}; read the file with read_network")
    if not isinstance(quantity, str):
        raise QuantityError(f"the quantity is a Python {type(quantity).__name__}; write it as a"
                            ' text such as "p[A]"')
    relations = (given,) if isinstance(given, str) else given
    if not isinstance(relations, Sequence) or not all(isinstance(r, str) for r in relations):
        raise QuantityError('given takes relations as texts, such as ["a*b = c*d"]')
    analysis = as_analysis(subject)
    network = analysis.network
    expression, text, latex = from_python(formula, network, names_of(network))
    hand = HandResult(read_quantity(quantity, network), quantity, expression, text, latex,
                      "Python", given=tuple(relations))
    return compared(analysis, hand)


def compare_entries(subject: Network | Analysis) -> tuple[Comparison, ...]:
    """Return the verdicts on the ``[[hand]]`` entries of a network, in their order."""
    analysis = as_analysis(subject)
    entries = read_entries(analysis.network, names_of(analysis.network))
    return tuple(compared(analysis, entry) for entry in entries)


def compared(analysis: Analysis, hand: HandResult) -> Comparison:
    """Return the verdict on a hand result that has been read, with a diagnosis where it differs."""
    verdict = judge(analysis, hand.quantity, hand.expression, hand.given)
    if verdict.kind not in ("different", "conditional"):
        return Comparison(hand, verdict)
    findings = diagnose(analysis, hand.quantity, hand.expression)
    if verdict.kind == "conditional":  # what is needed is said by the condition
        findings = tuple(f for f in findings if f.kind not in ("limit", "term"))
    return Comparison(hand, verdict, findings)
