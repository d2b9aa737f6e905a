"""Networks from plain Python, under the rules that hold for the file."""

from __future__ import annotations

import sys
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any, TypeAlias

from symbolic_response.errors import ExpressionError, NetworkError
from symbolic_response.expressions.tree import Symbol, walk
from symbolic_response.network.checks import check_network, expressions_of
from symbolic_response.network.document import read_document, read_symbol
from symbolic_response.network.entries import shown
from symbolic_response.network.model import Network, SymbolEntry

Value: TypeAlias = Any
"""A text in the syntax of the file, an int, a Fraction, an Expression or a SymPy expression."""


@dataclass(frozen=True, slots=True)
class Rates:
    """A transition by its rates, first to second and back; without ``backward`` one-way."""

    first: str
    second: str
    forward: Value
    backward: Value | None = None
    name: str | None = None


@dataclass(frozen=True, slots=True)
class Barrier:
    """A transition in energy form: its barrier and drive in units of k_B T."""

    first: str
    second: str
    barrier: Value
    drive: Value | None = None
    name: str | None = None


def build_network(
    title: str,
    *,
    states: str | Iterable[str] | Mapping[str, Value | None],
    transitions: Iterable[Rates | Barrier | Sequence[Value]],
    symbols: Mapping[str, str | Mapping[str, Value]] | Iterable[SymbolEntry] | None = None,
    observables: Mapping[str, Mapping[str, Value]] | None = None,
    about: str = "",
    sections: Mapping[str, Any] | None = None,
) -> Network:
    """Return a network described in Python; NetworkError if it breaks a rule.

    ``states``: names, or names with energies in units of k_B T (None for none), or with the table
    of the file. ``transitions``: :class:`Rates`, :class:`Barrier`, or tuples ``(first, second,
    forward, backward, name)``, the last two optional. ``observables``: values per state, 0 where
    left out. ``symbols``: signs (``"positive"``, ``"real"``), or tables as in the file; if left
    out, every symbol that occurs in an energy, a barrier or a drive is real, and every other one
    positive. ``sections``: ``hand`` and the others that are kept as they stand.

    >>> ring = build_network("ring", states="A B C", transitions=[
    ...     Rates("A", "B", "k_on*c", "k_off", name="bind"),
    ...     Rates("B", "C", "k1", "k2"),
    ...     Rates("C", "A", "k3", "k4"),
    ... ], observables={"occupancy": {"B": 1}})
    >>> [transition.name for transition in ring.transitions]
    ['bind', 'B_C', 'C_A']
    """
    document: dict[str, object] = {
        **(sections or {}),
        "title": title,
        "about": about,
        "states": _states(states),
        "transitions": [_transition(entry) for entry in transitions],
        "observables": {
            name: _exchanged(entries) for name, entries in (observables or {}).items()
        },
    }
    if symbols is not None:
        document["symbols"] = _symbols(symbols)
    network = read_document(document)
    if symbols is None:
        network = replace(network, symbols=_found_symbols(network))
    check_network(network)
    return network


def _states(states: str | Iterable[str] | Mapping[str, Value | None]) -> dict[str, object]:
    if isinstance(states, str):
        states = states.split()
    if not isinstance(states, Mapping):
        return _by_name("state", ((name, {}) for name in states))
    return {
        name: _exchanged(entry) if isinstance(entry, Mapping)
        else {} if entry is None else {"energy": _exchange(entry)}
        for name, entry in states.items()
    }


def _transition(entry: Rates | Barrier | Sequence[Value]) -> dict[str, object]:
    if not isinstance(entry, Rates | Barrier):
        if isinstance(entry, str) or not 3 <= len(entry) <= 5:
            raise NetworkError(f"the transition {shown(entry)} cannot be read; write "
                               "(first, second, forward, backward, name), the last two optional")
        entry = Rates(*entry)
    table: dict[str, object] = {"between": [entry.first, entry.second]}
    if entry.name is not None:
        table["name"] = entry.name
    if isinstance(entry, Rates):
        backward = [] if entry.backward is None else [_exchange(entry.backward)]
        table["rates"] = [_exchange(entry.forward), *backward]
    else:
        table["barrier"] = _exchange(entry.barrier)
        if entry.drive is not None:
            table["drive"] = _exchange(entry.drive)
    return table


def _symbols(
    symbols: Mapping[str, str | Mapping[str, Value]] | Iterable[SymbolEntry],
) -> dict[str, object]:
    if isinstance(symbols, Mapping):
        return {
            name: {"sign": entry} if isinstance(entry, str) else entry
            for name, entry in symbols.items()
        }
    return _by_name("symbol", (
        (entry.name, {
            "sign": "positive" if entry.positive else "real",
            "range": [entry.low, entry.high],
            "about": entry.about,
            **({} if entry.latex is None else {"latex": entry.latex}),
        })
        for entry in symbols
    ))


def _by_name(kind: str, entries: Iterable[tuple[str, object]]) -> dict[str, object]:
    made: dict[str, object] = {}
    for name, entry in entries:
        if name in made:
            raise NetworkError(f"{kind} {shown(name)} is given twice; keep one of them")
        made[name] = entry
    return made


def _found_symbols(network: Network) -> tuple[SymbolEntry, ...]:
    """Return an entry for every symbol that occurs, in the order of first occurrence."""
    signs: dict[str, str] = {}
    for expression, _, place in expressions_of(network):
        for part in walk(expression):
            if isinstance(part, Symbol):
                signs.setdefault(part.name, "positive")
                if place[-1] in ("energy", "barrier", "drive"):
                    signs[part.name] = "real"
    return tuple(read_symbol(name, {"sign": sign}) for name, sign in signs.items())


def _exchanged(entries: Mapping[str, Value]) -> dict[str, object]:
    return {key: _exchange(value) for key, value in entries.items()}


def _exchange(value: Value) -> object:
    """Return a SymPy expression as ours, anything else as it is."""
    sympy = sys.modules.get("sympy")
    if sympy is None or not isinstance(value, sympy.Basic):
        return value
    from symbolic_response.expressions.sympy_exchange import expression_from_sympy

    try:
        return expression_from_sympy(value)
    except ExpressionError as error:
        raise NetworkError(str(error)) from None
