"""What an observable does as all other symbols have values: function, steepest places, ends."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.appendix.control_decimals import exact_latex, value_latex, values_text
from symbolic_response.appendix.control_entries import ControlEntry
from symbolic_response.appendix.control_functions import FunctionPrinter
from symbolic_response.appendix.escape import escaped
from symbolic_response.appendix.paper import Paper
from symbolic_response.control.asked import Asked, observable_values, rescaled
from symbolic_response.control.at_points import Place
from symbolic_response.control.decomposition import LinearForm
from symbolic_response.control.extrema import Extremum, Maximum, maximum
from symbolic_response.control.function import function_of
from symbolic_response.control.rational import (
    EXPONENTIAL,
    PLAIN,
    RationalFunction,
    fraction_enclosure,
)
from symbolic_response.control.response_curve import response_curve
from symbolic_response.expressions.tree import Expression
from symbolic_response.figures.pgfplots import curve_pgfplots
from symbolic_response.network.quantities import Response
from symbolic_response.response.quantity_latex import quantity_in

MOST_PLACES = 3


@dataclass(frozen=True, slots=True)
class Followed:
    """An observable as a function of the parameter; ``scaled``: brought to 0 .. 1."""

    asked: Asked
    latex: str
    function: RationalFunction
    scaled: RationalFunction


def values_section(
    paper: Paper, entry: ControlEntry, forms: Sequence[LinearForm],
    values: Mapping[str, Expression],
) -> str:
    """Return functions, steepest places, limits and figures of the observables of an entry."""
    followed = [_followed(paper, asked) for asked in entry.asked]
    parts = [r"\paragraph{With values.} " + _functions(paper, entry, followed, values)]
    for number, each in enumerate(followed, start=1):
        label = f"fig:control-{int(entry.place[1]) + 1}-{number}"
        parts.append(_steepest(paper, entry, each, forms, label))
        parts.append(_ends(paper, each))
        if entry.low is not None and entry.high is not None:
            parts.append(_figure(paper, entry, each, values, label))
    return "\n\n".join(parts)


def _followed(paper: Paper, asked: Asked) -> Followed:
    quantity, changed = rescaled(asked, observable_values(asked))
    function = function_of(paper.analysis, asked.quantity, asked.symbol, asked.values)
    scaled = function if not changed else function_of(
        paper.analysis, quantity, asked.symbol, asked.values)
    return Followed(asked, quantity_in(paper.notation, asked.quantity), function, scaled)


def _functions(
    paper: Paper, entry: ControlEntry, followed: Sequence[Followed],
    values: Mapping[str, Expression],
) -> str:
    printer = FunctionPrinter(paper, entry.by.name)
    functions = []
    for each in followed:
        derivative = quantity_in(paper.notation, Response(each.asked.quantity, entry.by))
        functions += [(each.latex, each.function), (derivative, each.function.sensitivity())]
    opening = f"For {values_text(paper, values)}, exactly," if values else "Exactly,"
    return opening + "\n" + printer.text(functions)


# -- the steepest places ---------------------------------------------------------------------------


def _steepest(
    paper: Paper, entry: ControlEntry, each: Followed, forms: Sequence[LinearForm], label: str
) -> str:
    x = paper.notation.symbols[entry.by.name]
    if each.function.as_constant() is not None:
        return f"With these values ${each.latex}$ does not depend on ${x}$."
    steepest = maximum(each.function.sensitivity(), entry.low, entry.high, absolute=True)
    largest = maximum(each.scaled.exponent(), entry.low, entry.high, absolute=True)
    by = r"\ln " + x if entry.by.logarithmic else x
    text = (rf"{_range(paper, entry)} the largest $|\partial {each.latex} / \partial {by}|$ is"
            f" {_maximum(steepest, x, each.function)}; the largest size of the local exponent is"
            f" {_maximum(largest, x, each.function)}")
    limit = _limit_there(paper, each, forms, largest)
    figure = rf" (Fig.~\ref{{{label}}})" if entry.low is not None else ""
    return f"{text}{limit}{figure}."


def _range(paper: Paper, entry: ControlEntry) -> str:
    x = paper.notation.symbols[entry.by.name]
    if entry.low is not None and entry.high is not None:
        return rf"For ${paper.latex(entry.low)} \le {x} \le {paper.latex(entry.high)}$"
    return f"For all positive ${x}$" if entry.by.logarithmic else f"For all real ${x}$"


def _maximum(found: Maximum, x: str, f: RationalFunction) -> str:
    """Return a largest value and where it is."""
    value = value_latex(found.value, found.exact_value)
    shown = f"${value.removeprefix('= ')}$"
    if found.constant:
        return f"{shown} everywhere"
    places = [_place(place, x, f) for place in found.places[:MOST_PLACES]]
    more = len(found.places) - len(places)
    text = " and ".join(places) + (f" and {more} more places" if more else "")
    return f"{shown}, {text}" if found.attained else f"{shown}, not reached but approached {text}"


def _place(place: Extremum, x: str, f: RationalFunction) -> str:
    if place.x is None:
        return "at an open end"
    exact = None
    if place.exact_y is not None and f.kind != EXPONENTIAL:
        exact = place.exact_y**f.root
    return f"at ${x} {value_latex(place.x, exact)}$"


def _limit_there(
    paper: Paper, each: Followed, forms: Sequence[LinearForm], largest: Maximum
) -> str:
    """Return H at the first place of the largest exponent, nothing for a limit or a constant."""
    ends = next((place.y for place in largest.places if place.y is not None), None)
    if ends is None:
        return ""
    asked = each.asked
    at = Place(paper.analysis, {**asked.values,
                                asked.symbol: each.scaled.symbol_at(sum(ends, Fraction(0)) / 2)})
    bounds = [at.form(form) for form in forms]
    low, high = (min(pair[side] for pair in bounds) for side in (0, 1))
    enclosure = fraction_enclosure(low)[0], fraction_enclosure(high)[1]
    value = value_latex(enclosure, low if low == high else None)
    return f", where ${paper.letters['steepness']} {value}$"


# -- the ends of the parameter ---------------------------------------------------------------------


def _ends(paper: Paper, each: Followed) -> str:
    f = each.function
    if f.as_constant() is not None:
        return ""
    x = paper.notation.symbols[each.asked.symbol]
    low = "0" if f.kind not in (EXPONENTIAL, PLAIN) else r"-\infty"
    texts = [f"${each.latex} = {_expansion(f, end, x)}$ for ${x} \\to {goal}$"
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
        power = "" if abs(exponent) == 1 else f"{exponent} "
        return f"{size}e^{{{'-' if exponent == -1 else ''}{power.strip()} {x}}}"
    base = f"({x})" if "^" in x else x
    return size + (base if exponent == 1 else f"{base}^{{{exponent}}}")


# -- figures ---------------------------------------------------------------------------------------


def _figure(
    paper: Paper, entry: ControlEntry, each: Followed, values: Mapping[str, Expression], label: str
) -> str:
    assert entry.low is not None and entry.high is not None
    data = response_curve(paper.analysis, each.asked.text, entry.by.name, values,
                          low=entry.low, high=entry.high, count=entry.points)
    picture = curve_pgfplots(data, escaped)
    return "\n".join([r"\begin{figure}[htbp]", r"\centering", picture.rstrip(),
                      rf"\caption{{{_caption(paper, entry, each, values)}}}",
                      rf"\label{{{label}}}", r"\end{figure}"])


def _caption(
    paper: Paper, entry: ControlEntry, each: Followed, values: Mapping[str, Expression]
) -> str:
    letter = paper.letters["steepness"]
    x = paper.notation.symbols[entry.by.name]
    scaled = ", brought to the range from 0 to 1" if each.scaled != each.function else ""
    given = f" for {values_text(paper, values)}" if values else ""
    return (rf"Response of ${each.latex}${scaled} to ${x}${given}. Above: the exact curve, and the"
            f" curve that is as steep as ${letter}$ allows at each ${x}$ through the open circle,"
            " with the forces there and without forces. Below: the size of the sensitivity, its"
            r" limit by Eq.~\eqref{eq:control}, and a finer limit with covariances in place of the"
            rf" range~\cite{{martins}}. Drawn through {entry.points} exact points.")
