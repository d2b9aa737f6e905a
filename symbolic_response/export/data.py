"""A network's results as JSON (version 1), for programs of any language.

One object, UTF-8. Exact fractions are texts (``"12/35"``, ``"3"``), expressions are texts in the
syntax of the network file; names are those of the file. Keys in this order:

========================  =====================================================================
``format``, ``version``   ``"symbolic-response-results"``, ``1``
``network``               object: ``title``, ``about`` (texts); ``symbols``, list of ``{name,
                          about, sign, range: [low, high], latex}``, ``sign`` is ``"positive"`` or
                          ``"real"``; ``states``, list of ``{name, latex, energy}``, ``energy`` an
                          expression or null; ``transitions``, list of ``{name, between: [first,
                          second], forward, backward, barrier, drive}``: the rates as expressions
                          (1/time), ``backward`` null for one-way, ``barrier`` and ``drive`` null
                          unless in energy form (k_B T); ``observables``, list of ``{name, values:
                          {state: expression}}``, every state in it
``trees``                 object: ``rooted``, state -> number of spanning trees towards it (those
                          whose rates all exist); ``undirected``, number of spanning trees
``cycles``                null past the limit, else list of ``{states, transitions, along, force}``:
                          names in order, the transition after each state, whether it is run
                          from its first to its second state; ``force`` an expression in k_B T,
                          ``"infinite"`` or ``"-infinite"``
``independent_forces``    number of independent finite cycle forces, null past the limit
``detailed_balance``      true where every cycle force vanishes identically
``steady_state``          list of results, one for each state, ``quantity`` being ``"p[state]"``
``quantities``            list of results
``beyond_limits``         list of texts: what exceeded a limit and is null here
========================  =====================================================================

A result is ``{quantity, quantity_latex, unit, expression, latex, point, value, enclosure}``: the
quantity as asked for; ``expression`` and ``latex`` the closed form, null past a limit; ``point`` an
object symbol -> value, a fraction or ``"2*ln(fraction)"``; ``value`` the exact value there as an
expression without symbols (a fraction where it is rational), from the linear system of the steady
state, not from the closed form; ``enclosure`` null for fractions, else two decimals as texts. Both
``point`` and ``value`` are null where no simple point with positive rates and a value was found.
"""

from __future__ import annotations

import json
from collections.abc import Sequence

from symbolic_response.errors import SizeLimitError
from symbolic_response.export.asked import Asked
from symbolic_response.export.points import Values, check_points, value_at
from symbolic_response.export.units import unit_of
from symbolic_response.expressions.names import default_latex
from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.expressions.tree import Expression
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import Probability
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.deriving import derive_quantity
from symbolic_response.response.notation import notation_of
from symbolic_response.response.quantity_latex import quantity_in
from symbolic_response.response.survey import force_text, survey

FORMAT, VERSION = "symbolic-response-results", 1

Data = dict[str, object]


def json_text_of(analysis: Analysis, asked: Sequence[Asked]) -> str:
    """Return the results as JSON text; the same text for the same network and quantities."""
    return json.dumps(results_data(analysis, asked), indent=1, ensure_ascii=False) + "\n"


def results_data(analysis: Analysis, asked: Sequence[Asked]) -> Data:
    """Return the results as plain data, as the docstring of this module describes."""
    network, found = analysis.network, survey(analysis)
    beyond = [text for text in found.beyond if not text.startswith("splittings")]
    points = check_points(network, asked)
    states = [Asked(f"p[{state.name}]", Probability((k,)))
              for k, state in enumerate(network.states)]
    names = [state.name for state in network.states]
    cycles = None if found.cycles is None else [
        {
            "states": [names[k] for k in c.cycle.states],
            "transitions": [network.transitions[e].name for e in c.cycle.transitions],
            "along": list(c.cycle.along),
            "force": force_text(c),
        }
        for c in found.cycles
    ]
    return {
        "format": FORMAT,
        "version": VERSION,
        "network": network_data(network),
        "trees": {"rooted": dict(zip(names, found.rooted_trees, strict=True)),
                  "undirected": found.undirected_trees},
        "cycles": cycles,
        "independent_forces": None if found.independent is None else len(found.independent),
        "detailed_balance": found.detailed_balance,
        "steady_state": [_result(analysis, one, points, beyond) for one in states],
        "quantities": [_result(analysis, one, points, beyond) for one in asked],
        "beyond_limits": beyond,
    }


def network_data(network: Network) -> Data:
    """Return the network as plain data."""
    names = [state.name for state in network.states]
    return {
        "title": network.title,
        "about": network.about,
        "symbols": [
            {
                "name": s.name,
                "about": s.about,
                "sign": "positive" if s.positive else "real",
                "range": [fraction_text(s.low), fraction_text(s.high)],
                "latex": s.latex or default_latex(s.name),
            }
            for s in network.symbols
        ],
        "states": [{"name": s.name, "latex": s.latex or default_latex(s.name),
                    "energy": _text(s.energy)} for s in network.states],
        "transitions": [
            {
                "name": t.name,
                "between": [names[t.first], names[t.second]],
                "forward": expression_text(t.forward),
                "backward": _text(t.backward),
                "barrier": _text(t.barrier),
                "drive": _text(t.drive),
            }
            for t in network.transitions
        ],
        "observables": [
            {"name": o.name,
             "values": dict(zip(names, map(expression_text, o.values), strict=True))}
            for o in network.observables
        ],
    }


def _text(expression: Expression | None) -> str | None:
    return None if expression is None else expression_text(expression)


def _result(
    analysis: Analysis, asked: Asked, points: Sequence[Values], beyond: list[str]
) -> Data:
    network = analysis.network
    expression = latex = None
    try:
        derived = derive_quantity(analysis, asked.quantity, asked.text, {})
        expression, latex = derived.expression, derived.latex
    except SizeLimitError as error:
        beyond.append(f"{asked.text}: {error}")
    at = value_at(analysis, asked, points)
    enclosure = None if at is None else at.value.enclosure
    return {
        "quantity": asked.text,
        "quantity_latex": quantity_in(notation_of(network), asked.quantity),
        "unit": unit_of(asked.quantity, network),
        "expression": expression,
        "latex": latex,
        "point": None if at is None else {
            name: expression_text(value) for name, value in at.point.items()},
        "value": None if at is None else str(at.value),
        "enclosure": None if enclosure is None else list(enclosure),
    }
