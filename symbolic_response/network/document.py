"""From a nested document, as a file or Python gives it, to a network: the shape of each entry.

A document is what TOML makes of a network file: tables (dicts), arrays (lists), texts, integers
and decimals. Python may also put :class:`Expression` and ``Fraction`` wherever the file has an
expression. What concerns the network as a whole is in :mod:`symbolic_response.network.checks`.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from fractions import Fraction

from symbolic_response.expressions.names import RESERVED
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    Number,
    Sum,
    add,
    divide,
    function,
    negate,
    number,
)
from symbolic_response.network.entries import (
    DocumentError,
    Place,
    Table,
    check_keys,
    check_name,
    kind_of,
    one_line,
    read_latex,
    read_value,
    shown,
    table_of,
)
from symbolic_response.network.model import (
    Network,
    Observable,
    State,
    SymbolEntry,
    Transition,
    nearest,
)

SECTIONS = (
    "title", "about", "symbols", "states", "transitions", "observables",
    "hand", "inequality", "control", "appendix", "notation",
)
DEFAULT_RANGES = {
    True: (Fraction(1, 1000), Fraction(1000)),
    False: (Fraction(-5), Fraction(5)),
}
"""Where samples of a positive (True) and of a real symbol are drawn by default."""


def read_document(document: Table, path: str | None = None) -> Network:
    """Return the network a document describes; each entry is checked by itself.

    Raises DocumentError at the first entry that breaks a rule.
    """
    check_keys(document, SECTIONS, "the network", ())
    if "title" not in document:
        raise DocumentError('title is missing; write title = "..." at the top')
    title = one_line(document["title"], "title", ("title",))
    symbols = [read_symbol(name, entry) for name, entry in _tables(document, "symbols")]
    states = [_state(name, entry) for name, entry in _tables(document, "states")]
    if len(states) < 2:
        raise DocumentError("a network has at least two states; add tables such as [states.A]",
                            "states")
    return Network(
        title=title,
        symbols=tuple(symbols),
        states=tuple(states),
        transitions=_transitions(document, states),
        observables=tuple(
            _observable(name, entry, states) for name, entry in _tables(document, "observables")
        ),
        about=_text(document.get("about", ""), "about", ("about",)),
        hand=_raw_array(document, "hand"),
        inequality=_raw_array(document, "inequality"),
        control=_raw_array(document, "control"),
        appendix=table_of(document.get("appendix", {}), "appendix", ("appendix",)),
        notation=table_of(document.get("notation", {}), "notation", ("notation",)),
        path=path,
    )


def energy_rates(
    first: Expression, second: Expression, barrier: Expression, drive: Expression | None
) -> tuple[Expression, Expression]:
    """Return exp(E_first - B + F/2) and exp(E_second - B - F/2); a drive of None is 0."""
    raised = _negated_terms(barrier)
    half = ZERO if drive is None else divide(drive, number(2))
    return (
        function("exp", add([first, *raised, half])),
        function("exp", add([second, *raised, *_negated_terms(half)])),
    )


def _negated_terms(node: Expression) -> list[Expression]:
    return [negate(term) for term in (node.terms if isinstance(node, Sum) else (node,))]


def _tables(document: Table, section: str) -> Iterable[tuple[str, object]]:
    hint = f"write tables such as [{section}.NAME]"
    return table_of(document.get(section, {}), section, (section,), hint).items()


def _raw_array(document: Table, section: str) -> tuple[Table, ...]:
    entries = document.get(section, [])
    if not isinstance(entries, list | tuple):
        raise DocumentError(f"{section} is {kind_of(entries)}; begin each entry with [[{section}]]",
                            section)
    return tuple(
        table_of(entry, f"entry {place + 1} of {section}", (section, place))
        for place, entry in enumerate(entries)
    )


def _text(value: object, what: str, place: Place) -> str:
    if type(value) is not str:
        raise DocumentError(f"{what} is {kind_of(value)}; write a text in quotes", *place)
    return value


def read_symbol(name: str, entry: object) -> SymbolEntry:
    """Return one entry of ``symbols``; DocumentError if it breaks a rule."""
    place = ("symbols", name)
    what = f"symbol {shown(name)}"
    check_name(name, "symbol", place)
    if name in RESERVED:
        raise DocumentError(f"{what}: this word is reserved; take another name", *place)
    table = table_of(entry, what, place, f"write [symbols.{name}] with sign, about, latex, range")
    check_keys(table, ("about", "sign", "latex", "range"), what, place)
    sign = table.get("sign", "positive")
    if sign not in ("positive", "real"):
        raise DocumentError(f'{what}: sign is {shown(sign)}; write "positive" or "real"',
                            *place, "sign")
    positive = sign == "positive"
    low, high = (
        _range(table["range"], positive, what, (*place, "range")) if "range" in table
        else DEFAULT_RANGES[positive]
    )
    about = _text(table.get("about", ""), f"{what}: about", (*place, "about"))
    return SymbolEntry(name, positive, low, high, about, read_latex(table, what, place))


def _range(value: object, positive: bool, what: str, place: Place) -> tuple[Fraction, Fraction]:
    form = 'write two exact numbers such as ["1/1000", "1000"]'
    if not isinstance(value, list | tuple) or len(value) != 2:
        raise DocumentError(f"{what}: range is not an array of two entries; {form}", *place)
    ends = []
    for index, entry in enumerate(value):
        end = read_value(entry, f"{what}: range", (*place, index))
        if not isinstance(end, Number):
            raise DocumentError(
                f"{what}: the end {shown(entry)} of range is not an exact number; {form}",
                *place, index,
            )
        ends.append(end.value)
    low, high = ends
    if low >= high:
        raise DocumentError(f"{what}: range runs from {shown(value[0])} up to {shown(value[1])}; "
                            "write the smaller number first", *place)
    if positive and low <= 0:
        raise DocumentError(f"{what}: range begins at {shown(value[0])}, but the symbol is "
                            'positive; begin above 0 or write sign = "real"', *place)
    return low, high


def _state(name: str, entry: object) -> State:
    place = ("states", name)
    what = f"state {shown(name)}"
    check_name(name, "state", place)
    table = table_of(entry, what, place, f"write a table [states.{name}]")
    check_keys(table, ("energy", "latex"), what, place)
    energy = (
        read_value(table["energy"], f"{what}: energy", (*place, "energy"))
        if "energy" in table else None
    )
    return State(name, energy, read_latex(table, what, place))


def _transitions(document: Table, states: list[State]) -> tuple[Transition, ...]:
    entries = document.get("transitions", [])
    hint = "begin each transition with [[transitions]]"
    if not isinstance(entries, list | tuple):
        raise DocumentError(f"transitions is {kind_of(entries)}; {hint}", "transitions")
    places = {state.name: place for place, state in enumerate(states)}
    made: dict[str, Transition] = {}
    for index, entry in enumerate(entries):
        place: Place = ("transitions", index)
        what = f"transition {index + 1}"
        table = table_of(entry, what, place, hint)
        transition = _transition(table, what, place, states, places)
        if transition.name in made:
            raise DocumentError(
                f"{what}: the name {shown(transition.name)} is taken by transition "
                f"{list(made).index(transition.name) + 1}; give it "
                + ("another name" if "name" in table else 'a name of its own, name = "..."'),
                *place, *(["name"] if "name" in table else []),
            )
        made[transition.name] = transition
    return tuple(made.values())


def _transition(
    table: Table, what: str, place: Place, states: list[State], places: dict[str, int]
) -> Transition:
    given = table.get("name")
    if "name" in table:
        what = f"transition {shown(check_name(given, 'transition', (*place, 'name')))}"
    check_keys(table, ("name", "between", "rates", "barrier", "drive"), what, place)
    first, second = _ends(table, what, place, places)
    name = str(given) if "name" in table else f"{states[first].name}_{states[second].name}"
    what = f"transition {shown(name)}"
    if "rates" in table:
        for key in ("barrier", "drive"):
            if key in table:
                raise DocumentError(f"{what} has both rates and {key}; keep rates, or write "
                                    "barrier (and drive) instead of rates", *place, key)
        forward, backward = _rates(table["rates"], what, (*place, "rates"))
        return Transition(name, first, second, forward, backward)
    if "barrier" not in table:
        raise DocumentError(f"{what} has no rates; write rates = [\"forward\", \"backward\"], "
                            "or barrier for the energy form", *place)
    barrier = read_value(table["barrier"], f"{what}: barrier", (*place, "barrier"))
    drive = (
        read_value(table["drive"], f"{what}: drive", (*place, "drive")) if "drive" in table
        else None
    )
    energies = [_energy(states[end], what, (*place, "barrier")) for end in (first, second)]
    forward, backward = energy_rates(energies[0], energies[1], barrier, drive)
    return Transition(name, first, second, forward, backward, barrier, drive)


def _energy(state: State, what: str, place: Place) -> Expression:
    if state.energy is None:
        raise DocumentError(f"{what} has a barrier, but state {shown(state.name)} has no energy; "
                            f"add energy to [states.{state.name}], or write rates", *place)
    return state.energy


def _ends(table: Table, what: str, place: Place, places: dict[str, int]) -> tuple[int, int]:
    form = 'write between = ["A", "B"]'
    if "between" not in table:
        raise DocumentError(f"{what} does not say which states it joins; {form}", *place)
    between, place = table["between"], (*place, "between")
    if not isinstance(between, list | tuple) or len(between) != 2:
        raise DocumentError(f"{what}: between is not an array of two states; {form}", *place)
    ends: list[int] = []
    for index, end in enumerate(between):
        if not isinstance(end, str) or end not in places:
            hint = nearest(end, places) if isinstance(end, str) else ""
            raise DocumentError(f"{what}: {shown(end)} is not a state"
                                + (hint or "; add a table [states.NAME]"), *place, index)
        ends.append(places[end])
    if ends[0] == ends[1]:
        raise DocumentError(f"{what} joins {shown(between[0])} to itself; name two states", *place)
    return ends[0], ends[1]


def _rates(value: object, what: str, place: Place) -> tuple[Expression, Expression | None]:
    if not isinstance(value, list | tuple) or len(value) not in (1, 2):
        raise DocumentError(
            f'{what}: rates is not an array of two rates; write ["forward", "backward"], '
            'or ["forward"] for one-way', *place,
        )
    read = [
        read_value(entry, f"{what}: {way} rate", (*place, index))
        for index, (way, entry) in enumerate(zip(("forward", "backward"), value, strict=False))
    ]
    return read[0], read[1] if len(read) == 2 else None


def _observable(name: str, entry: object, states: list[State]) -> Observable:
    place = ("observables", name)
    what = f"observable {shown(name)}"
    check_name(name, "observable", place)
    table: Mapping[str, object] = table_of(
        entry, what, place, f"write a table [observables.{name}] with a value per state"
    )
    check_keys(table, [state.name for state in states], what, place, "state")
    return Observable(
        name,
        tuple(
            read_value(table.get(state.name, ZERO), f"{what} in state {shown(state.name)}",
                       (*place, state.name))
            for state in states
        ),
    )
