"""What an observable does as all other symbols have values: function, steepest places, ends."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.appendix.control_decimals import value_latex, value_words, values_text
from symbolic_response.appendix.control_ends import ends_text
from symbolic_response.appendix.control_entries import ControlEntry
from symbolic_response.appendix.control_functions import FunctionPrinter
from symbolic_response.appendix.escape import escaped
from symbolic_response.appendix.paper import Paper
from symbolic_response.control.asked import Asked, observable_values, rescaled
from symbolic_response.control.at_points import Place
from symbolic_response.control.curve_data import CurveData
from symbolic_response.control.decomposition import LinearForm
from symbolic_response.control.extrema import Extremum, Maximum, maximum
from symbolic_response.control.function import function_of
from symbolic_response.control.rational import (
    EXPONENTIAL,
    POWER,
    RationalFunction,
    fraction_enclosure,
)
from symbolic_response.control.response_curve import response_curve
from symbolic_response.expressions.tree import Expression, Number
from symbolic_response.expressions.widths import formula_width
from symbolic_response.figures.panels import panels_of
from symbolic_response.figures.pgfplots import curve_pgfplots
from symbolic_response.network.quantities import Response
from symbolic_response.response.quantity_latex import quantity_in

MOST_PLACES = 3
LABELS, COLUMN = 80.0, 300.0
"""What the labels of a figure take beside its axes, and the least width that its legend fits."""
AXES, HEIGHT = 0.8, 0.36
"""How wide and how high the axes are, as parts of the line; labels stand along the height."""


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
    names = paper.notation.symbols
    parts = [r"\paragraph{Exact curves.} " + _functions(paper, entry, followed, values)]
    for number, each in enumerate(followed, start=1):
        label = f"fig:control-{int(entry.place[1]) + 1}-{number}"
        parts.append(_steepest(paper, entry, each, forms, label))
        parts.append(ends_text(each.latex, each.function, names))
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
    given = f"For {values_text(paper, values)}" if values else "With these rates"
    return printer.text(given, functions)


# -- the steepest places ---------------------------------------------------------------------------


def _steepest(
    paper: Paper, entry: ControlEntry, each: Followed, forms: Sequence[LinearForm], label: str
) -> str:
    x = paper.notation.symbols[entry.by.name]
    if each.function.as_constant() is not None:
        return f"With these values ${each.latex}$ does not depend on ${x}$."
    slope, exponent = each.function.sensitivity(), each.scaled.exponent()
    steepest = maximum(slope, entry.low, entry.high, absolute=True)
    largest = maximum(exponent, entry.low, entry.high, absolute=True)
    by = r"\ln " + x if entry.by.logarithmic else x
    text = (rf"{_range(paper, entry)} the largest $|\partial {each.latex} / \partial {by}|$ is"
            f" {_maximum(paper, entry, steepest, slope)}; the largest size of the local exponent is"
            f" {_maximum(paper, entry, largest, exponent)}")
    limit = _limit_there(paper, each, forms, largest)
    figure = rf" (Fig.~\ref{{{label}}})" if entry.low is not None else ""
    return f"{text}{limit}{figure}."


def _range(paper: Paper, entry: ControlEntry) -> str:
    x = paper.notation.symbols[entry.by.name]
    if entry.low is not None and entry.high is not None:
        return rf"For ${paper.latex(entry.low)} \le {x} \le {paper.latex(entry.high)}$"
    return f"For all positive ${x}$" if entry.by.logarithmic else f"For all real ${x}$"


def _maximum(paper: Paper, entry: ControlEntry, found: Maximum, f: RationalFunction) -> str:
    """Return a largest value and where it is."""
    shown = value_words(found.value, found.exact_value)
    if found.constant:
        return f"{shown} everywhere"
    x = paper.notation.symbols[entry.by.name]
    open_ends = (("low", "0" if f.kind == POWER else r"-\infty"), ("high", r"\infty"))
    limits = iter([rf"for ${x} \to {goal}$" for side, goal in open_ends
                   if abs(f.limit(side) or 0) == found.exact_value])
    places = [next(limits) if place.x is None else
              f"at ${x} {value_latex(place.x, _exact_place(entry, place, f))}$"
              for place in found.places[:MOST_PLACES]]
    more = len(found.places) - len(places)
    text = " and ".join(places) + (f" and {more} more places" if more else "")
    return f"{shown}, {text}" if found.attained else f"{shown}, approached {text}"


def _exact_place(entry: ControlEntry, place: Extremum, f: RationalFunction) -> Fraction | None:
    """Return the parameter at a place where it is rational and known."""
    if place.kind == "end" and place.x is not None:
        low, high = map(Fraction, place.x)
        for end in (entry.low, entry.high):
            if isinstance(end, Number) and low <= end.value <= high:
                return end.value
    if place.exact_y is None or f.kind == EXPONENTIAL:
        return None
    return place.exact_y**f.root


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
    low, high = at.least(forms)
    enclosure = fraction_enclosure(low)[0], fraction_enclosure(high)[1]
    value = value_latex(enclosure, low if low == high else None)
    return f", where ${paper.letters['steepness']} {value}$"


# -- figures ---------------------------------------------------------------------------------------


def _figure(
    paper: Paper, entry: ControlEntry, each: Followed, values: Mapping[str, Expression], label: str
) -> str:
    """Return the figure of a response curve, with a caption that says what is drawn."""
    assert entry.low is not None and entry.high is not None
    data = response_curve(paper.analysis, each.asked.text, entry.by.name, values,
                          low=entry.low, high=entry.high, count=entry.points)
    return "\n".join([r"\begin{figure}[htbp]", r"\centering", _fitted(paper, data),
                      rf"\caption{{{_caption(paper, data, each, values)}}}",
                      rf"\label{{{label}}}", r"\end{figure}"])


def _fitted(paper: Paper, data: CurveData) -> str:
    """Return the picture of a curve, made smaller where its labels or legend need more room."""
    panels = panels_of(data)
    room = (paper.width - LABELS) / AXES
    label = max(formula_width(panel.latex) for panel in (panels.upper, panels.lower))
    across = max(room, label / HEIGHT)
    drawn = (rf"{{\setlength{{\linewidth}}{{{across:.0f}pt}}%"
             + f"\n{curve_pgfplots(data, escaped).rstrip()}}}")
    smaller = across > room or paper.width < COLUMN
    return rf"\resizebox{{\linewidth}}{{!}}{drawn}" if smaller else drawn


def _caption(
    paper: Paper, data: CurveData, each: Followed, values: Mapping[str, Expression]
) -> str:
    letter, x = paper.letters["steepness"], data.parameter_latex
    scaled = ", brought to the range from 0 to 1" if data.rescaled is not None else ""
    given = f" for {values_text(paper, values)}" if values else ""
    driven = any(point.steepness != data.h0 for point in data.points)
    other = "; dotted, the same without forces" if driven and data.h0 is not None else ""
    return (rf"Response of ${each.latex}${scaled} to ${x}${given}. Above: solid, the exact curve;"
            f" dashed, the curve that is as steep as ${letter}$ allows at each ${x}$, through the"
            f" open circle{other}. Below, for the exact curve: solid, the size of its sensitivity;"
            r" dashed, the limit of Eq.~\eqref{eq:control}; dash-dotted, a finer limit with"
            rf" covariances in place of the range~\cite{{martins}}. Lines join {len(data.points)}"
            " exact points.")
