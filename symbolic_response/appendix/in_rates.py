"""Whether the sums of a document are written in the symbols of the file or in rates."""

from __future__ import annotations

from symbolic_response.algebra.compact.short_forms import ShortForms
from symbolic_response.appendix.named_sums import NamedSums
from symbolic_response.expressions.latex import expression_latex
from symbolic_response.expressions.tree import Symbol
from symbolic_response.response.analysis import Analysis, AnalysisInRates
from symbolic_response.response.notation import Notation


def named_sums_of(analysis: Analysis, notation: Notation) -> NamedSums:
    """Return the named sums, in symbols or in rates as the notation asks."""
    if notation.in_rates == "never":
        return NamedSums(analysis, notation)
    in_rates = NamedSums(AnalysisInRates(analysis), notation)
    if notation.in_rates == "always":
        return in_rates
    return min(NamedSums(analysis, notation), in_rates, key=_characters)


def rate_letters(analysis: Analysis, notation: Notation) -> dict[str, str]:
    """Return the LaTeX of the symbol of each rate."""
    found = {}
    for place, (e, backward) in enumerate(analysis.rates.directions()):
        base = analysis.rates.ring.generators[place].base
        assert isinstance(base, Symbol)
        found[base.name] = notation.rate(e, backward)
    return found


def _characters(sums: NamedSums) -> int:
    """Return how long the tree sums are as they are printed."""
    names = sums.names() | rate_letters(sums.analysis, sums.notation)
    short = ShortForms(names)
    forms = [sums.tree(k).form.expression() for k in range(sums.analysis.graph.size)]
    return sum(len(expression_latex(short.of(form), names)) for form in forms)
