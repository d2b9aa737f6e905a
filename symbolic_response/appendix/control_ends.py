"""Where an observable goes at the ends of a parameter: in numbers, or in the other symbols."""

from __future__ import annotations

from fractions import Fraction

from symbolic_response.appendix.control_decimals import exact_latex
from symbolic_response.appendix.control_entries import ControlEntry
from symbolic_response.appendix.escape import escaped
from symbolic_response.appendix.paper import Paper
from symbolic_response.control.asked import Asked
from symbolic_response.control.limits import leading
from symbolic_response.control.rational import EXPONENTIAL, POWER, RationalFunction
from symbolic_response.errors import EvaluationError, SizeLimitError, UndecidedError
from symbolic_response.expressions.breaking import Equation, align, fits, line_limit
from symbolic_response.expressions.tree import Symbol, function, multiply, number, power
from symbolic_response.response.quantity_latex import quantity_in


def ends_text(left: str, f: RationalFunction, x: str) -> str:
    """Return the limits of a function with the leading terms beside them; nothing if constant."""
    if f.as_constant() is not None:
        return ""
    low = "0" if f.kind == POWER else r"-\infty"
    texts = [rf"${left} = {_expansion(f, end, x)}$ for ${x} \to {goal}$"
             for end, goal in (("low", low), ("high", r"\infty"))]
    return f"At the ends {texts[0]}, and {texts[1]}."


def _expansion(f: RationalFunction, end: str, x: str) -> str:
    r"""Return the limit and the leading term beside it, or the leading term of what grows."""
    limit = f.limit(end)
    constant = limit if limit is not None else Fraction(0)
    coefficient, exponent = (f - constant).leading_term(end)
    term = _term(coefficient, exponent, x, f.kind == EXPONENTIAL)
    if limit:
        term = f"- {term.removeprefix('-')}" if term.startswith("-") else f"+ {term}"
        term = f"{exact_latex(limit)} {term}"
    return term + r" + \ldots"


def _term(coefficient: Fraction, exponent: Fraction, x: str, exponential: bool) -> str:
    size = exact_latex(coefficient)
    size = size.removesuffix("1") if size in ("1", "-1") else size + r" \, "
    if exponential:
        rate = str(exponent).removesuffix("1") if abs(exponent) == 1 else rf"{exponent} \, "
        return f"{size}e^{{{rate}{x}}}"
    base = f"({x})" if "^" in x else x
    return size + (base if exponent == 1 else f"{base}^{{{exponent}}}")


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
    x = Symbol(asked.symbol)
    factor = (function("exp", multiply([number(found.power), x])) if found.exponential
              else power(x, found.power))
    limit = line_limit(latex, paper.width)
    node = multiply([found.coefficient.expression, factor])
    if not fits(paper.latex(node), limit):
        return (rf"For ${goal}$ ${latex}$ follows ${paper.latex(factor)}$, times a factor too long"
                " to be printed.")
    pieces = tuple(paper.pieces([node], limit))
    return f"For ${goal}$\n" + align([Equation(latex, pieces, relation=r"\sim")], paper.width)
