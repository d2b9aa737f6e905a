"""The hand results in a LaTeX file."""

from __future__ import annotations

from collections.abc import Sequence

from symbolic_response.hand.entries import HandResult, text_of
from symbolic_response.hand.latex.names import Names
from symbolic_response.hand.papers.document import PassedOver, read_equations_file
from symbolic_response.network.model import Network


def read_paper(
    path: str, network: Network, names: Names, given: Sequence[str] = ()
) -> tuple[list[HandResult], list[PassedOver]]:
    """Return the hand results that a LaTeX file displays, and the displays passed over.

    Raises InputError, in one line, where the file cannot be read.
    """
    found = read_equations_file(path, names)
    results = []
    for equation in found.equations:
        results.append(HandResult(
            quantity=equation.quantity,
            quantity_text=text_of(equation.quantity, network),
            expression=equation.expression,
            formula=equation.latex,
            latex=True,
            where=f"{path}:{equation.line}",
            label=equation.label,
            given=tuple(given),
        ))
    return results, list(found.passed_over)
