"""A network's results as one Python module that needs nothing but Python.

The module holds ``rates``, ``steady_state``, one function for each quantity, ``FUNCTIONS`` (texts
of the quantities to functions) and ``SYMBOLS`` (symbols of the file to names of arguments). Every
function takes all symbols of the file as keyword-only arguments; ``rates`` returns a dict
transition -> (forward, backward), ``steady_state`` a dict state -> probability.
"""

from __future__ import annotations

import textwrap
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from symbolic_response.export.asked import Asked
from symbolic_response.export.code import Source, wrapped
from symbolic_response.export.doctests import dict_tests, literal, quantity_tests
from symbolic_response.export.formulas import Formulas, formulas_of
from symbolic_response.export.helpers import HELPERS
from symbolic_response.export.names import argument_names, function_names
from symbolic_response.export.points import Values, check_points, value_at
from symbolic_response.export.units import unit_of
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import DirectedRate, Probability
from symbolic_response.response.analysis import Analysis


@dataclass(frozen=True, slots=True)
class Setting:
    """What the functions of one module share."""

    analysis: Analysis
    arguments: Mapping[str, str]
    points: Sequence[Values]

    @property
    def network(self) -> Network:
        """The network."""
        return self.analysis.network


def module_text(analysis: Analysis, asked: Sequence[Asked]) -> str:
    """Return the source of the module; the same text for the same network and quantities.

    Raises EvaluationError where a quantity does not exist, SizeLimitError past 200,000 steps.
    """
    network = analysis.network
    arguments = argument_names(entry.name for entry in network.symbols)
    setting = Setting(analysis, arguments, check_points(network, asked))
    names = function_names(one.text for one in asked)
    functions = [_rates(setting), _steady_state(setting)]
    functions += [_quantity(setting, names[one.text], one) for one in asked]
    helpers = [text for call, text in HELPERS.items() if any(call in f for f in functions)]
    imports = ["from fractions import Fraction"]
    if any("math." in text for text in (*helpers, *functions)):
        imports.insert(0, "import math")
    tables = [
        _table("FUNCTIONS", [(one.text, names[one.text]) for one in asked]),
        _table("SYMBOLS", [(name, literal(safe)) for name, safe in arguments.items()]),
    ]
    top = "\n".join([*_head(network), "", *imports])
    return "\n\n\n".join([top, *helpers, *functions, "\n".join(tables)]) + "\n"


def _head(network: Network) -> list[str]:
    title = textwrap.wrap(_line(f"Exact steady state and responses of: {network.title}"), 96)
    return [
        f'"""{_escaped(title[0])}', *map(_escaped, title[1:]), "",
        "Every function takes all symbols of the network as keyword-only arguments: fractions and",
        "integers (exact results where the quantity is rational in them), floats, or NumPy arrays",
        "of shapes that broadcast (what depends on none of them stays a single number). Rates",
        "are in 1/time, energies, barriers and drives in k_B T.",
        "Checked by `python -m doctest` against values from the linear system of the steady state.",
        '"""']


def _table(name: str, entries: Sequence[tuple[str, str]]) -> str:
    return "\n".join([f"{name} = {{", *(f"    {literal(k)}: {v}," for k, v in entries), "}"])


def _rates(setting: Setting) -> str:
    transitions = setting.network.transitions
    asked = [Asked("", DirectedRate(e, backward)) for e in range(len(transitions))
             for backward in (False, True)]
    source = _source(setting, formulas_of(setting.analysis, [one.quantity for one in asked]))
    pairs = list(zip(source.results[::2], source.results[1::2], strict=True))
    entries = [f"    {literal(t.name)}: ({ahead}, {back}),"
               for t, (ahead, back) in zip(transitions, pairs, strict=True)]
    about = ["Return the rates (forward, backward) of every transition, in 1/time.", "",
             *_transitions(setting.network), ""]
    keys = [f"[{literal(t.name)}][{place}]" for t in transitions for place in (0, 1)]
    return _function(setting, "rates", about, _dict_tests(setting, "rates", keys, asked, source),
                     source, ["return {", *entries, "}"])


def _steady_state(setting: Setting) -> str:
    names = [state.name for state in setting.network.states]
    asked = [Asked("", Probability((k,))) for k in range(len(names))]
    made = formulas_of(setting.analysis, [one.quantity for one in asked])
    source = _source(setting, made)
    about = ["Return the stationary probability of every state, by name.", "",
             f"Found by {_way(made)}.", ""]
    entries: list[str] = []
    for name, result in zip(names, source.results, strict=True):
        entries += wrapped(f"    {literal(name)}: ", result, ",")
    keys = [f"[{literal(name)}]" for name in names]
    return _function(setting, "steady_state", about,
                     _dict_tests(setting, "steady_state", keys, asked, source), source,
                     ["return {", *entries, "}"])


def _dict_tests(setting: Setting, name: str, keys: Sequence[str], asked: Sequence[Asked],
                source: Source) -> list[str]:
    points = setting.points[:1]
    values = [value_at(setting.analysis, one, points) for one in asked]
    point = points[0] if points else None
    return dict_tests(name, setting.arguments, point, list(zip(keys, values, strict=True)),
                      source.rational)


def _quantity(setting: Setting, name: str, asked: Asked) -> str:
    made = formulas_of(setting.analysis, [asked.quantity])
    source = _source(setting, made)
    unit = unit_of(asked.quantity, setting.network)
    about = [f"Return {asked.text}.", "", f"Unit: {unit}. Found by {_way(made)}.", ""]
    at = value_at(setting.analysis, asked, setting.points)
    tests = quantity_tests(name, setting.arguments, at, source.rational)
    return _function(setting, name, about, tests, source,
                     wrapped("return ", source.results[0]))


def _way(made: Formulas) -> str:
    return "sums over spanning trees" if made.by_trees else "elimination of states"


def _source(setting: Setting, made: Formulas) -> Source:
    return Source(made.program, made.roots, made.hints, setting.arguments)


def _function(setting: Setting, name: str, about: Sequence[str], tests: Sequence[str],
              source: Source, end: Sequence[str]) -> str:
    arguments = list(setting.arguments.values())
    lines = _list(f"def {name}(", ["*", *arguments] if arguments else [], "):")
    doc: list[str] = []
    for line in (*about, *_symbols(setting)):
        doc += textwrap.wrap(_line(line), 92, subsequent_indent="  ") or [""]
    doc = [*map(_escaped, doc), "", *tests]
    inside = [f'"""{doc[0]}', *doc[1:], '"""']
    used = [safe for symbol, safe in setting.arguments.items() if symbol in source.symbols]
    if used:
        left = _list("[", used, "]") if len(used) == 1 or len(", ".join(used)) > 40 else [
            ", ".join(used)]
        inside += [*left[:-1], *_list(f"{left[-1]} = _given(", used, ")")]
    inside += [*source.lines, *end]
    return "\n".join([*lines, *(f"    {line}".rstrip() for line in inside)])


def _list(start: str, pieces: Sequence[str], close: str) -> list[str]:
    """Return a bracketed list, on several lines where it is long."""
    text = ", ".join(pieces)
    if len(start) + len(text) + len(close) <= 94:
        return [start + text + close]
    return [start, *(f"    {line}" for line in textwrap.wrap(text, 88)), close]


def _symbols(setting: Setting) -> list[str]:
    lines = []
    for entry in setting.network.symbols:
        safe = setting.arguments[entry.name]
        renamed = "" if safe == entry.name else f" (in the network: {entry.name})"
        about = f"; {entry.about}" if entry.about else ""
        lines.append(f"{safe}: {'positive' if entry.positive else 'real'}{renamed}{about}")
    return lines


def _transitions(network: Network) -> list[str]:
    names = [state.name for state in network.states]
    return [f"{t.name}: {names[t.first]} {'->' if t.backward is None else '<->'} {names[t.second]}"
            for t in network.transitions]


def _line(text: str) -> str:
    """Return a text on one line that cannot begin a doctest."""
    shown = "".join(c if c.isprintable() else " " for c in text)
    return " ".join(shown.split()).replace(">>>", "> > >")


def _escaped(line: str) -> str:
    """Return a line that cannot end a docstring."""
    return line.replace("\\", "\\\\").replace('"', '\\"')
