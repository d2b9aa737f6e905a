"""The rules that concern a network as a whole: symbols, signs of rates, connection, LaTeX."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence

from symbolic_response.errors import EvaluationError
from symbolic_response.expressions.names import RESERVED, default_latex, same_latex
from symbolic_response.expressions.tree import Expression, symbols_of
from symbolic_response.network.entries import DocumentError, Place, shown
from symbolic_response.network.model import Network, State, SymbolEntry, nearest


def check_network(network: Network) -> None:
    """Raise DocumentError at the first rule that the network as a whole breaks."""
    _check_symbols(network)
    _check_values(network)
    _check_connection(network)
    _check_latex("symbols", network.symbols)
    _check_latex("states", network.states)


def expressions_of(network: Network) -> Iterator[tuple[Expression, str, Place]]:
    """Yield every expression a user wrote, what it is, and its place in the document."""
    for state in network.states:
        if state.energy is not None:
            yield state.energy, f"state {shown(state.name)}: energy", (
                "states", state.name, "energy")
    for index, transition in enumerate(network.transitions):
        what, place = f"transition {shown(transition.name)}", ("transitions", index)
        if transition.barrier is None:
            yield transition.forward, f"{what}: forward rate", (*place, "rates", 0)
            if transition.backward is not None:
                yield transition.backward, f"{what}: backward rate", (*place, "rates", 1)
            continue
        yield transition.barrier, f"{what}: barrier", (*place, "barrier")
        if transition.drive is not None:
            yield transition.drive, f"{what}: drive", (*place, "drive")
    for observable in network.observables:
        for state, value in zip(network.states, observable.values, strict=True):
            what = f"observable {shown(observable.name)} in state {shown(state.name)}"
            yield value, what, ("observables", observable.name, state.name)


def words_of(network: Network) -> frozenset[str]:
    """Return all words in the sections that are kept as they stand, keys included."""
    found: set[str] = set()
    pending: list[object] = [
        network.hand, network.inequality, network.control, network.appendix, network.notation
    ]
    while pending:
        part = pending.pop()
        if isinstance(part, str):
            found.update(re.findall(r"[A-Za-z0-9_]+", part))
        elif isinstance(part, Mapping):
            pending.extend(part.keys())
            pending.extend(part.values())
        elif isinstance(part, list | tuple):
            pending.extend(part)
    return frozenset(found)


def _check_symbols(network: Network) -> None:
    declared = [symbol.name for symbol in network.symbols]
    known = frozenset(declared)
    used: set[str] = set()
    for expression, what, place in expressions_of(network):
        names = symbols_of(expression)
        for name in sorted(names - known):
            hint = (
                "; this word is reserved, take another name" if name in RESERVED
                else nearest(name, declared) or f"; add [symbols.{name}]"
            )
            raise DocumentError(f"{what}: the symbol {shown(name)} is not declared{hint}", *place)
        used |= names
    words = words_of(network)
    for name in declared:
        if name not in used and name not in words:
            raise DocumentError(
                f"the symbol {shown(name)} is declared but not used; use or remove it",
                "symbols", name,
            )


def _check_values(network: Network) -> None:
    """Refuse a division by zero anywhere, and a rate that is zero or negative throughout."""
    from symbolic_response.expressions.signs import certain_sign

    positive = network.positive_symbols
    for expression, what, place in expressions_of(network):
        try:
            sign = certain_sign(expression, positive)
        except EvaluationError as error:
            raise DocumentError(f"{what}: {error}; write an expression that has a value",
                                *place) from None
        if "rates" in place and sign is not None and sign <= 0:
            hint = (
                "leave it out for one-way" if sign == 0 and place[-1] == 1 else "a rate is positive"
            )
            raise DocumentError(
                f"{what} is {'negative' if sign else 'zero'} for all values of the symbols; {hint}",
                *place,
            )


def _check_connection(network: Network) -> None:
    size = len(network.states)
    leaving: list[list[int]] = [[] for _ in range(size)]
    entering: list[list[int]] = [[] for _ in range(size)]
    for transition in network.transitions:
        ends = [(transition.first, transition.second)]
        if transition.backward is not None:
            ends.append((transition.second, transition.first))
        for start, end in ends:
            leaving[start].append(end)
            entering[end].append(start)
    rule = "; each state must be reachable from each other one"
    for state, exits, entries in zip(network.states, leaving, entering, strict=True):
        name = shown(state.name)
        if exits and entries:
            continue
        problem = (
            f"state {name} is absorbing: no rate leaves it" if entries
            else f"state {name} cannot be reached: no rate leads to it" if exits
            else f"state {name} takes part in no transition"
        )
        raise DocumentError(problem + rule, "states", state.name)
    origin = shown(network.states[0].name)
    for arrows, problem in (
        (leaving, "cannot be reached from"), (entering, "can be reached from but cannot return to")
    ):
        missed = _missed(arrows)
        if missed:
            names = [shown(network.states[place].name) for place in missed]
            listed = ", ".join(names[:10]) + (", ..." if len(names) > 10 else "")
            noun = "state" if len(names) == 1 else "states"
            raise DocumentError(f"{noun} {listed} {problem} {origin}{rule}",
                                "states", network.states[missed[0]].name)


def _missed(arrows: Sequence[Sequence[int]]) -> list[int]:
    """Return the states that walks along the arrows from state 0 do not reach."""
    seen, pending = {0}, [0]
    while pending:
        fresh = [end for end in arrows[pending.pop()] if end not in seen]
        seen.update(fresh)
        pending.extend(fresh)
    return [place for place in range(len(arrows)) if place not in seen]


def _check_latex(section: str, entries: Sequence[SymbolEntry] | Sequence[State]) -> None:
    made: dict[str, str] = {}
    for entry in entries:
        latex = entry.latex if entry.latex is not None else default_latex(entry.name)
        other = made.setdefault(same_latex(latex), entry.name)
        if other != entry.name:
            raise DocumentError(
                f"{section} {shown(other)} and {shown(entry.name)} look the same in LaTeX, "
                f"{shown(latex)}; give one of them another latex", section, entry.name,
            )
