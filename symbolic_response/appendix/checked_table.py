r"""A LaTeX table of the formulas that were checked, for a supplement.

The file is to be read in with ``\input``; the packages it needs stand in its first line.
"""

from __future__ import annotations

import os
from collections.abc import Sequence
from pathlib import Path

from symbolic_response.appendix.escape import escaped
from symbolic_response.appendix.page import Page
from symbolic_response.appendix.tables import Column, table
from symbolic_response.expressions.latex import expression_latex, fraction_latex
from symbolic_response.expressions.widths import formula_width
from symbolic_response.files import write_files
from symbolic_response.hand.compare import Comparison
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.deriving import Value
from symbolic_response.response.notation import Notation, notation_of
from symbolic_response.response.quantity_latex import quantity_in

WIDEST, LONG = 150.0, 24
PACKAGES = r"\usepackage{amsmath,amssymb,array,booktabs,longtable}"


def write_checked(
    analysis: Analysis, found: Sequence[Comparison], path: str | os.PathLike[str]
) -> None:
    """Write the table of :func:`checked_table`; OutputError where that cannot be done."""
    write_files({Path(path): checked_table(analysis, found)})


def checked_table(analysis: Analysis, found: Sequence[Comparison]) -> str:
    """Return a table: each quantity, the formula as it was read, and the verdict on it."""
    notation = notation_of(analysis.network)
    columns = [Column("Quantity", "wrap"), Column("Formula", "wrap"), Column("Verdict", "wrap")]
    rows = [[_quantity(one, notation), _formula(one, notation), _verdict(one, notation)]
            for one in found]
    return (
        f"% Formulas checked against exact results; needs {PACKAGES}\n"
        "\\paragraph{Formulas checked.} Each formula was compared, exactly, with the result derived"
        f" from the spanning trees of the network ``{escaped(analysis.network.title)}''.\n"
        f"{table(Page(), columns, rows)}\n"
    )


def _quantity(one: Comparison, notation: Notation) -> str:
    quantity = quantity_in(notation, one.hand.quantity)
    style = r"\displaystyle " if r"\frac" in quantity else ""
    return f"${style}{quantity}$" if formula_width(quantity) <= WIDEST / 2 else (
        escaped(one.hand.quantity_text))


def _formula(one: Comparison, notation: Notation) -> str:
    latex = quantity_in(notation, one.hand.expression)
    place = escaped(one.hand.label or one.hand.where)
    if formula_width(latex) > WIDEST:
        return f"long; see {place}"
    shown = rf"$\displaystyle {latex}$" if r"\frac" in latex else f"${latex}$"
    return shown + (f" ({place})" if one.hand.label else "")


def _verdict(one: Comparison, notation: Notation) -> str:
    verdict = one.verdict
    match verdict.kind:
        case "equal":
            return "equal, exactly"
        case "conditional":
            return f"equal only under a condition: {escaped(verdict.condition or '')}"
        case "undecided":
            return f"undecided: {escaped(verdict.reason)}"
    witness = verdict.witness or {}
    at = ", ".join(
        f"${notation.symbols[name]}={expression_latex(value, {})}$"
        for name, value in witness.items()
    )
    values = f"{_value(verdict.hand_value)} instead of {_value(verdict.derived_value)}"
    findings = "".join(f"; {escaped(finding.text)}" for finding in one.diagnosis[:1])
    return f"different: {values}" + (f" at {at}" if at else "") + findings


def _value(value: Value | None) -> str:
    if value is None:
        return "no value"
    if value.exact is not None and len(str(value)) <= LONG:
        return f"${fraction_latex(value.exact)}$"
    if value.enclosure is not None:
        return f"${value.enclosure[0][:12]}\\ldots$"
    return "a long fraction"
