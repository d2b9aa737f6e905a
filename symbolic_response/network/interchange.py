"""Exchange of networks with NetworkX graphs and with generators as SymPy matrices."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from symbolic_response.errors import NetworkError
from symbolic_response.expressions.tree import ZERO, Expression
from symbolic_response.network.build import Barrier, Rates, build_network
from symbolic_response.network.entries import shown
from symbolic_response.network.model import Network, SymbolEntry, Transition

_SECTIONS = ("hand", "inequality", "control", "appendix", "notation")


def to_networkx(network: Network) -> Any:
    """Return the network as a ``networkx.MultiDiGraph``, an edge for each directed rate.

    Nodes are the names of states, with ``energy`` and ``latex`` where given; the key of an edge is
    the name of its transition. Edges carry ``rate``, ``direction`` (``"forward"`` or
    ``"backward"``), ``place`` (of the transition, from 0), and ``barrier`` and ``drive`` where
    given. The graph carries ``title``, ``about``, ``symbols``, ``observables`` and the sections
    that are kept as they stand. Expressions are texts in the syntax of the file.
    :func:`from_networkx` gives the network back.
    """
    import networkx

    from symbolic_response.expressions.text import expression_text

    graph = networkx.MultiDiGraph(
        title=network.title,
        about=network.about,
        symbols={symbol.name: _symbol_table(symbol) for symbol in network.symbols},
        observables={
            observable.name: {
                state.name: expression_text(value)
                for state, value in zip(network.states, observable.values, strict=True)
                if value != ZERO
            }
            for observable in network.observables
        },
        **{section: getattr(network, section) for section in _SECTIONS},
    )
    for state in network.states:
        energy = None if state.energy is None else expression_text(state.energy)
        graph.add_node(state.name, **_given(energy=energy, latex=state.latex))
    for place, transition in enumerate(network.transitions):
        ends = (network.states[transition.first].name, network.states[transition.second].name)
        form = _given(barrier=_text(transition.barrier), drive=_text(transition.drive))
        for direction, start, end, rate in (
            ("forward", *ends, transition.forward), ("backward", *ends[::-1], transition.backward)
        ):
            if rate is not None:
                graph.add_edge(start, end, key=transition.name, rate=expression_text(rate),
                               direction=direction, place=place, **form)
    return graph


def _symbol_table(symbol: SymbolEntry) -> dict[str, object]:
    return {
        "sign": "positive" if symbol.positive else "real",
        "range": [str(symbol.low), str(symbol.high)],
        **({"about": symbol.about} if symbol.about else {}),
        **_given(latex=symbol.latex),
    }


def _text(expression: Expression | None) -> str | None:
    from symbolic_response.expressions.text import expression_text

    return None if expression is None else expression_text(expression)


def _given(**entries: str | None) -> dict[str, str]:
    return {key: value for key, value in entries.items() if value is not None}


def from_networkx(graph: Any, title: str | None = None) -> Network:
    """Return the network that a directed NetworkX graph describes.

    Each edge needs ``rate`` (or ``barrier``, and then its rate is not read). Two edges of opposite
    direction and the same key are one transition; the forward one is marked ``direction =
    "forward"`` or comes first. Other attributes as in :func:`to_networkx`, all optional. Raises
    NetworkError.
    """
    if not graph.is_directed():
        raise NetworkError("the graph is undirected; write one directed edge for each rate")
    attributes = graph.graph
    return build_network(
        title or attributes.get("title") or attributes.get("name") or "network",
        about=attributes.get("about", ""),
        states={
            name: {key: entries[key] for key in ("energy", "latex") if key in entries}
            for name, entries in graph.nodes(data=True)
        },
        transitions=_transitions_of(graph),
        symbols=attributes.get("symbols"),
        observables=attributes.get("observables"),
        sections={name: attributes[name] for name in _SECTIONS if name in attributes},
    )


def _transitions_of(graph: Any) -> list[Rates | Barrier]:
    edges = (
        graph.edges(keys=True, data=True) if graph.is_multigraph()
        else ((start, end, None, entries) for start, end, entries in graph.edges(data=True))
    )
    pairs: dict[tuple[frozenset[str], object], list[tuple[str, str, Mapping[str, Any]]]] = {}
    for start, end, key, entries in edges:
        if "rate" not in entries and "barrier" not in entries:
            raise NetworkError(f"the edge from {shown(start)} to {shown(end)} has no rate; "
                               "give it an attribute rate")
        pairs.setdefault((frozenset((start, end)), key), []).append((start, end, entries))
    found = []
    for number, ((_, key), pair) in enumerate(pairs.items()):
        pair.sort(key=lambda edge: edge[2].get("direction") == "backward")
        start, end, entries = pair[0]
        name = key if isinstance(key, str) else None
        place = entries.get("place")
        made = _transition_of(start, end, name, [edge[2] for edge in pair])
        found.append((place if isinstance(place, int) else number, made))
    return [transition for _, transition in sorted(found, key=lambda entry: entry[0])]


def _transition_of(
    start: str, end: str, name: str | None, pair: list[Mapping[str, Any]]
) -> Rates | Barrier:
    for entries in pair:
        if "barrier" in entries:
            return Barrier(start, end, entries["barrier"], entries.get("drive"), name)
    return Rates(start, end, pair[0]["rate"], pair[1]["rate"] if len(pair) == 2 else None, name)


def generator_matrix(network: Network) -> Any:
    """Return the generator W as a SymPy matrix: W_ij is the rate from j to i, in 1/time.

    Parallel transitions add up and each column sums to zero. Symbols are positive or real as in
    the network.
    """
    import sympy

    from symbolic_response.expressions.sympy_exchange import expression_to_sympy

    size = len(network.states)
    matrix = sympy.zeros(size, size)
    for transition in network.transitions:
        for start, end, rate in _directed(transition):
            if rate is not None:
                value = expression_to_sympy(rate, network.positive_symbols)
                matrix[end, start] += value
                matrix[start, start] -= value
    return matrix


def _directed(transition: Transition) -> tuple[tuple[int, int, Expression | None], ...]:
    return (
        (transition.first, transition.second, transition.forward),
        (transition.second, transition.first, transition.backward),
    )


def from_generator_matrix(
    matrix: Any, names: Sequence[str] | None = None, title: str = "network"
) -> Network:
    """Return the network of a generator: a square SymPy matrix, W_ij the rate from j to i.

    States are called S1, S2, ... unless named. A pair of states with two rates is one transition,
    forward from the earlier one; with one rate it is one-way. Symbols that SymPy knows to be real,
    but not to be positive, are real; all others positive. Raises NetworkError, also where a column
    does not sum to zero.
    """
    import sympy

    matrix = sympy.Matrix(matrix)
    size = matrix.rows
    if matrix.cols != size:
        raise NetworkError(f"the matrix has {size} rows and {matrix.cols} columns; "
                           "write a square matrix")
    names = [f"S{place + 1}" for place in range(size)] if names is None else list(names)
    if len(names) != size:
        raise NetworkError(f"{len(names)} names for {size} states; write one for each state")
    for column in range(size):
        if sympy.simplify(sympy.expand(sum(matrix[:, column]))) != 0:
            raise NetworkError(f"column {column + 1} of the matrix does not sum to zero; "
                               "W_ij is the rate from j to i, and W_jj minus their sum")
    transitions = []
    for first in range(size):
        for second in range(first + 1, size):
            forward, backward = matrix[second, first], matrix[first, second]
            if forward != 0:
                transitions.append(Rates(names[first], names[second], forward,
                                         None if backward == 0 else backward))
            elif backward != 0:
                transitions.append(Rates(names[second], names[first], backward))
    return build_network(title, states=names, transitions=transitions, symbols=_signs(matrix))


def _signs(matrix: Any) -> dict[str, str]:
    signs: dict[str, str] = {}
    for symbol in sorted(matrix.free_symbols, key=str):
        real = symbol.is_real and not symbol.is_positive
        sign = "real" if real else "positive"
        if signs.setdefault(symbol.name, sign) != sign:
            raise NetworkError(f"two symbols are called {shown(symbol.name)}, one positive and one "
                               "real; rename one")
    return signs
