"""Where an observable goes at the ends of a parameter: in numbers, or in the other symbols."""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction

from symbolic_response.appendix.control_decimals import exact_latex
from symbolic_response.appendix.control_entries import ControlEntry
from symbolic_response.appendix.escape import escaped
from symbolic_response.appendix.formulas import definitions_text
from symbolic_response.appendix.named_sums import NamedSum
from symbolic_response.appendix.paper import Paper
from symbolic_response.appendix.results import collect
from symbolic_response.control.asked import Asked
from symbolic_response.control.limits import leading
from symbolic_response.control.rational import EXPONENTIAL, POWER, RationalFunction
from symbolic_response.errors import EvaluationError, SizeLimitError, UndecidedError
from symbolic_response.expressions.breaking import Equation, align, line_limit
from symbolic_response.expressions.latex import expression_latex
from symbolic_response.expressions.tree import Expression, Symbol, function, multiply, number, power
from symbolic_response.response.quantity_latex import quantity_in


def ends_text(left: str, f: RationalFunction, names: Mapping[str, str]) -> str:
    """Return the limits of a function with the leading terms beside them; nothing if constant."""
    if f.as_constant() is not None:
        return ""
    x = names[f.symbol]
    low = "0" if f.kind == POWER else r"-\infty"
    texts = [rf"${left} = {_expansion(f, end, names)}$ for ${x} \to {goal}$"
             for end, goal in (("low", low), ("high", r"\infty"))]
    return f"At the ends {texts[0]}, and {texts[1]}."


def _expansion(f: RationalFunction, end: str, names: Mapping[str, str]) -> str:
    """Return the limit and the leading term beside it, or the leading term of what grows."""
    limit = f.limit(end)
    coefficient, exponent = (f - (limit or Fraction(0))).leading_term(end)
    factor = expression_latex(_power(f.symbol, exponent, f.kind == EXPONENTIAL), names)
    size = exact_latex(coefficient)
    term = size.removesuffix("1") + factor if size in ("1", "-1") else rf"{size} \, {factor}"
    if limit:
        term = f"- {term.removeprefix('-')}" if term.startswith("-") else f"+ {term}"
        term = f"{exact_latex(limit)} {term}"
    return term + r" + \ldots"


def _power(symbol: str, exponent: Fraction, exponential: bool) -> Expression:
    """Return x^r or exp(r x)."""
    x = Symbol(symbol)
    return function("exp", multiply([number(exponent), x])) if exponential else power(x, exponent)


# -- without values --------------------------------------------------------------------------------


def ends_section(paper: Paper, entry: ControlEntry) -> str:
    """Return the leading terms at the ends of the parameter, in the other symbols."""
    x = paper.notation.symbols[entry.by.name]
    ends = [("0", "0")] if entry.by.logarithmic else [("-inf", r"-\infty")]
    texts = [_leading(paper, asked, end, rf"{x} \to {goal}")
             for asked in entry.asked for end, goal in [*ends, ("inf", r"\infty")]]
    return "\\paragraph{Ends.} " + "\n".join(texts)


def _leading(paper: Paper, asked: Asked, end: str, goal: str) -> str:
    """Return the leading term at one end, or why there is none to print."""
    latex = quantity_in(paper.notation, asked.quantity)
    try:
        found = leading(paper.analysis, asked.quantity, asked.symbol, end)
    except (EvaluationError, UndecidedError, SizeLimitError) as error:
        return f"For ${goal}$ no leading term of ${latex}$ is given: {escaped(str(error))}."
    assert found.logarithm is None  # means are rational in the rates
    factor = _power(asked.symbol, -found.power, found.exponential)
    left = latex if found.power == 0 else rf"{paper.latex(factor)} \, {latex}"
    form = found.coefficient.form
    pieces, fresh = paper.fitted(form, line_limit(left, paper.width))
    definitions: list[NamedSum] = []
    collect(paper, [*paper.needed([form.expression()]), *fresh], definitions)
    text = f"For ${goal}$\n" + align([Equation(left, tuple(pieces), relation=r"\to")], paper.width)
    return text + ("\nwith\n" + definitions_text(paper, definitions) if definitions else "")
