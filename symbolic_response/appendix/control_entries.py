"""Entries of ``[[control]]``: the parameter, what is followed in it, and where."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass

from symbolic_response.control.asked import Asked, asked_of
from symbolic_response.control.decomposition import Decomposition, Piece, check_sum
from symbolic_response.control.result import ALSO
from symbolic_response.control.user_decomposition import PIECES, parameter_of, user_decomposition
from symbolic_response.errors import InputError
from symbolic_response.expressions.tree import Expression, Symbol, multiply, symbols_of
from symbolic_response.network.entries import (
    DocumentError,
    Place,
    Table,
    check_keys,
    kind_of,
    one_line,
    read_value,
    table_of,
)
from symbolic_response.network.quantities import BySymbol
from symbolic_response.response.analysis import Analysis

POINTS = 60
MOST_POINTS = 1000


@dataclass(frozen=True, slots=True)
class ControlEntry:
    """One entry, read and checked.

    ``asked``: what is followed, by ln of the parameter where that is positive. ``own``: the pieces
    of the file for that, None where it gives none. ``values``: those of all other symbols, None
    where they are not given. ``low`` and ``high``: the ends of the figure, None for no figure.
    """

    place: Place
    asked: tuple[Asked, ...]
    own: Decomposition | None
    values: Mapping[str, Expression] | None
    low: Expression | None
    high: Expression | None
    points: int

    @property
    def by(self) -> BySymbol:
        """The parameter or its logarithm."""
        return self.asked[0].by


def control_entries(analysis: Analysis) -> list[ControlEntry]:
    """Return the entries of a network; DocumentError, with the entry in words, for faulty ones."""
    found = []
    for ordinal, table in enumerate(analysis.network.control):
        place = ("control", ordinal)
        with located(place):
            found.append(_entry(analysis, table, place))
    return found


@contextmanager
def located(place: Place) -> Iterator[None]:
    """Name the entry, and the key in it, in errors about what it asks for."""
    entry = f"[[control]], entry {int(place[1]) + 1}"
    try:
        yield
    except DocumentError as error:
        raise DocumentError(f"{entry}: {error}", *(error.place or place)) from None
    except InputError as error:
        where = "".join(f", {key}" for key in place[2:] if isinstance(key, str))
        raise DocumentError(f"{entry}{where}: {error}", *place) from None


def _entry(analysis: Analysis, table: Table, place: Place) -> ControlEntry:
    check_keys(table, ("parameter", *PIECES, *ALSO), "a control entry", place)
    by = parameter_of(table, analysis.network, place)
    values = _values(analysis, table, by.name, place)
    texts = _observables(analysis, table, place)
    parameter = f"ln {by.name}" if by.logarithmic else by.name
    asked = []
    for text in texts:
        try:
            asked.append(asked_of(analysis, text, parameter, values))
        except InputError as error:
            raise DocumentError(f"{text}: {error}", *place) from None
    low, high = (_end(table, key, place) for key in ("from", "to"))
    if (low is None) != (high is None):
        raise DocumentError("give both from and to, or neither", *place)
    if low is not None and values is None:
        raise DocumentError("a figure from ... to ... needs a value for every other symbol; write"
                            ' at = {symbol = "value", ...}', *place)
    return ControlEntry(place, tuple(asked), _own(analysis, table, by, asked[0].by, place), values,
                        low, high, _points(table, place))


def _observables(analysis: Analysis, table: Table, place: Place) -> list[str]:
    network = analysis.network
    if "observables" not in table:
        return [f"mean[{o.name}]" for o in network.observables] or [f"p[{network.states[0].name}]"]
    listed, where = table["observables"], (*place, "observables")
    if not isinstance(listed, list | tuple) or not listed:
        raise DocumentError('observables is not a list of quantities; write observables = ["p[A]"]',
                            *where)
    texts = [one_line(value, "an entry of observables", where) for value in listed]
    return list(dict.fromkeys(texts))


def _values(
    analysis: Analysis, table: Table, parameter: str, place: Place
) -> dict[str, Expression] | None:
    """Return the values of the other symbols, None where they are needed and not given."""
    others = [s.name for s in analysis.network.symbols if s.name != parameter]
    if "at" not in table:
        return None if others else {}
    where = (*place, "at")
    given = table_of(table["at"], "at", where, 'write at = {symbol = "value", ...}')
    check_keys(given, others, "at", where, "symbol")
    missing = [name for name in others if name not in given]
    if missing:
        raise DocumentError(f"at has no value for {missing[0]}; give every symbol but {parameter}"
                            " one", *where)
    return {name: _constant(value, f"at of {name}", (*where, name))
            for name, value in given.items()}


def _end(table: Table, key: str, place: Place) -> Expression | None:
    return _constant(table[key], key, (*place, key)) if key in table else None


def _constant(value: object, what: str, place: Place) -> Expression:
    read = read_value(value, what, place)
    for name in sorted(symbols_of(read)):
        raise DocumentError(f"{what} contains the symbol {name}; write a number", *place)
    return read


def _points(table: Table, place: Place) -> int:
    points = table.get("points", POINTS)
    if type(points) is not int or not 2 <= points <= MOST_POINTS:
        what = str(points) if type(points) is int else kind_of(points)
        raise DocumentError(f"points is {what}; write a whole number from 2 to {MOST_POINTS}",
                            *place, "points")
    return points


def _own(
    analysis: Analysis, table: Table, by: BySymbol, wanted: BySymbol, place: Place
) -> Decomposition | None:
    """Return the pieces of the file; those for a positive parameter turned into those for its ln.

    The sum is checked as the file gives the pieces, and as they are used.
    """
    if not any(key in table for key in PIECES):
        return None
    made = user_decomposition(analysis, by, table, place, ALSO)
    if by == wanted:
        return made

    def scaled(amount: Expression) -> Expression:
        return analysis.tidy(multiply([Symbol(by.name), amount]))

    def all_scaled(pieces: tuple[Piece, ...]) -> tuple[Piece, ...]:
        return tuple(Piece(piece.members, scaled(piece.amount)) for piece in pieces)

    turned = Decomposition(
        tuple(map(scaled, made.energies)), all_scaled(made.bundles), all_scaled(made.blocks),
        all_scaled(made.drives), all_scaled(made.directed))
    check_sum(turned, analysis, wanted)
    return turned
