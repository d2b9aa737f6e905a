"""What the verbs about control parameters say, for people and as data."""

from __future__ import annotations

from fractions import Fraction

from symbolic_response.bounds.sides import perturbation_text
from symbolic_response.control.cloud import Cloud
from symbolic_response.control.curve_data import (
    CurveData,
    Exact,
    decimal_text,
    exact_text,
    rescaled_text,
    sensitivity_text,
)
from symbolic_response.control.decomposition import Decomposition
from symbolic_response.control.extrema import Maximum
from symbolic_response.control.limits import Leading
from symbolic_response.control.rational import EXPONENTIAL, RationalFunction
from symbolic_response.control.result import Steepness
from symbolic_response.control.steepness import Reading
from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.expressions.tree import Symbol, add, function, multiply, number, power
from symbolic_response.network.model import Network

MOST_CYCLES = 6


def steepness_text(result: Steepness) -> str:
    """Return the result for people to read."""
    network, asked = result.network, result.asked
    by = f"ln {asked.symbol}" if asked.by.logarithmic else asked.symbol
    lines = [f"q = {scaled_text(result)}: abs(d q / d {by}) <= H*q*(1 - q) for all rates",
             "H is at most each of"]
    lines += [f"  {form.text(network, result.same)}" for form in result.forms]
    for part, cycles in result.bundles.items():
        names = ", ".join(network.transitions[e].name for e in part)
        lines.append(f"t[{names}] = tanh(F/4), F the largest abs(force) of {len(cycles)} cycles:")
        lines += [f"    {path}   {force}" for path, force in cycles[:MOST_CYCLES]]
        if len(cycles) > MOST_CYCLES:
            lines.append(f"    and {len(cycles) - MOST_CYCLES} more")
    ends = result.at_equal(Fraction(0)), result.at_equal(Fraction(1))
    if None not in ends:
        lines.append(f"without forces H = {ends[0]}; however strong the driving H <= {ends[1]}")
    lines.append(f"family: {result.family.words()}")
    lines.append(f"d/d {by} in few pieces: {pieces_text(result.simplest, network)}")
    lines += [f"that of the file, checked: d/d {perturbation_text(parameter, network)}:"
              f" {pieces_text(own, network)}" for parameter, own in result.own]
    lines += _reading_lines(result.reading)
    return "\n".join(lines + _actual_lines(result, by))


def scaled_text(result: Steepness) -> str:
    """Return the observable brought to 0 .. 1."""
    asked = result.asked
    if result.range is None:
        return f"({asked.term} - low)/(high - low), low and high its extremes over the states"
    low, high = result.range
    if low == 0:
        inner = asked.text if high == 1 else asked.term
    else:
        inner = f"({asked.text} {'+' if low < 0 else '-'} {abs(low)})"
    width = high - low
    if width == 1:
        return inner
    return f"{inner}/{width}" if width.denominator == 1 else f"{inner}/({width})"


def _reading_lines(reading: Reading | None) -> list[str]:
    if reading is None:
        return []
    if reading.t is None:
        return [f"the measured steepness: {reading.verdict}"]
    if reading.force is None:
        return ["the measured steepness: some t would have to be 1; no finite force suffices"]
    return [f"the measured steepness: some t at least {reading.t}, so a cycle force of"
            f" {reading.force[0]} or more"]


def _actual_lines(result: Steepness, by: str) -> list[str]:
    if result.actual is None:
        lines = [f"{result.asked.text} ~ {leading_text(end)}   as {end.symbol} -> {end.end}"
                 for end in result.tends]
        return [*lines, f"with values for {', '.join(result.missing)} the actual steepness is found"
                        " too"]
    actual = result.actual
    low = "0" if result.asked.by.logarithmic else "-inf"
    return [f"q = {actual.function.text()}",
            *(f"q ~ {_term(actual.function, end)}   as {result.asked.symbol} -> {goal}"
              for end, goal in (("low", low), ("high", "inf"))),
            f"d q / d {by} = {actual.sensitivity.text()}",
            f"largest abs(d q / d {by}): {maximum_text(actual.steepest)}",
            f"largest abs(d logit q / d {by}): {maximum_text(actual.largest)}"]


def leading_text(found: Leading) -> str:
    """Return a leading term in the syntax of the file."""
    x = Symbol(found.symbol)
    grows = function("exp", multiply([number(found.power), x])) if found.exponential else (
        power(x, found.power))
    size = found.coefficient.expression
    if found.logarithm is not None:
        ln = x if found.exponential else function("ln", x)
        size = add([size, multiply([found.logarithm.expression, ln])])
    return expression_text(multiply([size, grows]))


def _term(f: RationalFunction, end: str) -> str:
    """Return the leading term of a function at an end."""
    size, exponent = f.leading_term(end)
    x = Symbol(f.symbol)
    grows = function("exp", multiply([number(exponent), x])) if f.kind == EXPONENTIAL else (
        power(x, exponent))
    return expression_text(multiply([number(size), grows]))


def maximum_text(found: Maximum) -> str:
    """Return a maximum and where it is."""
    value = str(found.exact_value) if found.exact_value is not None else (
        f"about {float(found.value[0]):.12g}")
    if found.constant:
        return f"{value}, constant"
    places = [f"{float(place.x[0]):.12g}" if place.x else "a limit" for place in found.places]
    return f"{value} at {', '.join(places)}"


def pieces_text(pieces: Decomposition, network: Network) -> str:
    """Return the pieces of a change of the rates in one line."""
    data = pieces.data(network)
    found: list[str] = []
    for kind, name in (("energies", "energy"), ("drives", "drive")):
        listed = data[kind]
        assert isinstance(listed, dict)
        found += [f"{amount} {name}[{key}]" for key, amount in listed.items()]
    for kind, key in (("bundles", "transitions"), ("directed", "rates")):
        listed = data[kind]
        assert isinstance(listed, list)
        found += [f"{each['amount']} of all rates of {', '.join(each[key])}" if kind == "bundles"
                  else f"{each['amount']} of {', '.join(each[key])}" for each in listed]
    return " + ".join(found) or "nothing"


def steepness_data(result: Steepness) -> dict[str, object]:
    """Return the result as plain data for JSON."""
    network = result.network
    ends = [result.at_equal(Fraction(t)) for t in (0, 1)]
    reading, actual = result.reading, result.actual
    return {
        "network": network.title,
        "observable": result.asked.text,
        "parameter": result.asked.symbol,
        "logarithmic": result.asked.by.logarithmic,
        "range": None if result.range is None else [str(end) for end in result.range],
        "family": result.family.data(),
        "forms": [{"text": form.text(network, result.same),
                   "pieces": form.decomposition.data(network)} for form in result.forms],
        "bundles": [
            {"transitions": [network.transitions[e].name for e in part],
             "cycles": [{"cycle": path, "force": force} for path, force in cycles]}
            for part, cycles in result.bundles.items()
        ],
        "without_forces": None if ends[0] is None else str(ends[0]),
        "with_any_forces": None if ends[1] is None else str(ends[1]),
        "simplest": result.simplest.data(network),
        "own": [{"parameter": perturbation_text(parameter, network), **own.data(network)}
                for parameter, own in result.own],
        "reading": None if reading is None else {
            "verdict": reading.verdict, "t": None if reading.t is None else str(reading.t),
            "force": None if reading.force is None else list(reading.force)},
        "missing": list(result.missing),
        "tends": [{"end": end.end, "leading": leading_text(end)} for end in result.tends],
        "function": None if actual is None else actual.function.text(),
        "sensitivity": None if actual is None else actual.sensitivity.text(),
        "exponent": None if actual is None else actual.exponent.text(),
        "steepest": None if actual is None else _maximum_data(actual.steepest),
        "largest_exponent": None if actual is None else _maximum_data(actual.largest),
    }


def curve_data_json(data: CurveData) -> dict[str, object]:
    """Return a response curve as plain data for JSON; each number exactly and as a decimal."""
    h0 = data.h0 if isinstance(data.h0, tuple) else (data.h0,) * len(data.points)
    return {
        "logarithmic": data.logarithmic,
        "range": [str(end) for end in data.rescaled or (0, 1)],
        "q": rescaled_text(data, data.observable),
        "sensitivity": sensitivity_text(data),
        "points": [
            {"x": _both(point.x), "q": _both(point.q), "sensitivity": _both(point.sensitivity),
             "steepness": _both(point.steepness), "bound": _both(point.bound),
             "covariance_bound": _both(point.covariance), "steepness_without_forces": _both(h)}
            for point, h in zip(data.points, h0, strict=True)
        ],
    }


def cloud_json(data: Cloud) -> dict[str, object]:
    """Return a cloud as plain data for JSON."""
    return {
        "value": data.value_text,
        "transition": data.transition,
        "seed": data.seed,
        "sampled": data.count,
        "not_constructed": data.skipped,
        "points": [
            {"exp_force": fraction_text(point.g), "force": f"{point.force:.12g}",
             "value": _both(point.value), "exp_end_pair_force": fraction_text(point.end_pair),
             "end_pair_force": f"{point.end_pair_force:.12g}", "constructed": point.made}
            for point in data.points
        ],
    }


def _both(value: Exact | None) -> dict[str, str] | None:
    """Return a number exactly and to 12 digits."""
    if value is None:
        return None
    return {"exact": exact_text(value), "decimal": decimal_text(value)}


def _maximum_data(found: Maximum) -> dict[str, object]:
    return {
        "value": None if found.exact_value is None else str(found.exact_value),
        "enclosure": list(found.value),
        "attained": found.attained,
        "places": [{"kind": place.kind, "x": None if place.x is None else list(place.x)}
                   for place in found.places],
    }
