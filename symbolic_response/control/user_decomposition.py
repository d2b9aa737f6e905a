"""Decompositions that a network file gives: entries of ``[[control]]``."""

from __future__ import annotations

from collections.abc import Callable, Iterable

from symbolic_response.bounds.bundle import uses
from symbolic_response.control.decomposition import Decomposition, Piece, check_sum
from symbolic_response.control.separations import Part
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.names import nearest
from symbolic_response.expressions.tree import ZERO, Expression, symbols_of
from symbolic_response.network.entries import (
    DocumentError,
    Place,
    Table,
    check_keys,
    kind_of,
    one_line,
    read_value,
    shown,
    table_of,
)
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import BySymbol, DirectedRate, Perturbation
from symbolic_response.network.quantity_reader import read_perturbation, read_quantity
from symbolic_response.response.analysis import Analysis

PIECES = ("energies", "bundles", "drives", "directed")
"""The keys of an entry that give pieces."""


def parameter_of(entry: Table, network: Network, place: Place = ("control",)) -> BySymbol:
    """Return the parameter of an entry: a symbol or its logarithm; DocumentError otherwise."""
    where = (*place, "parameter")
    if "parameter" not in entry:
        raise DocumentError('a control entry has no parameter; write parameter = "ln c"', *place)
    text = one_line(entry["parameter"], "parameter", where)
    try:
        by = read_perturbation(text, network)
    except QuantityError as error:
        raise DocumentError(f"parameter: {error}", *where) from None
    if not isinstance(by, BySymbol):
        raise DocumentError(f"parameter {shown(text)}: write a symbol, or ln of one", *where)
    return by


def user_decomposition(
    analysis: Analysis, by: Perturbation, entry: Table, place: Place = ("control",),
    also: Iterable[str] = (),
) -> Decomposition:
    """Return the decomposition that an entry of the file gives, its sum checked symbolically.

    ``energies`` and ``drives``: tables of amounts; ``bundles``: {transitions, amount};
    ``directed``: {rates, amount}. ``also``: further keys that the entry may have. Raises
    DocumentError for what cannot be used, for transitions that are no bundle, and where the pieces
    have another sum.
    """
    check_keys(entry, ("parameter", *PIECES, *also), "a control entry", place)
    reader = _Reader(analysis, place)
    energies = dict(reader.amounts(entry, "energies", analysis.network.state_index))
    bundles: list[Piece] = []
    blocks: list[Piece] = []
    for piece, where in reader.pieces(entry, "bundles", "transitions", reader.transition):
        (bundles if reader.is_bundle(piece.members, where) else blocks).append(piece)
    drives = reader.amounts(entry, "drives", analysis.network.transition_index)
    directed = reader.pieces(entry, "directed", "rates", reader.rate)
    made = Decomposition(
        tuple(energies.get(j, ZERO) for j in range(analysis.graph.size)),
        tuple(bundles), tuple(blocks), tuple(Piece((e,), amount) for e, amount in drives),
        tuple(piece for piece, _ in directed))
    try:
        check_sum(made, analysis, by)
    except QuantityError as error:
        raise DocumentError(str(error), *place) from None
    return made


class _Reader:
    """Reads the pieces of one entry."""

    def __init__(self, analysis: Analysis, place: Place) -> None:
        self.analysis = analysis
        self.network = analysis.network
        self.place = place

    def amounts(
        self, entry: Table, key: str, find: Callable[[str], int]
    ) -> list[tuple[int, Expression]]:
        """Return the amounts of a table of names."""
        where = (*self.place, key)
        table = table_of(entry.get(key, {}), key, where, f'write {key} = {{name = "amount"}}')
        return [(self._named(find, name, (*where, name)),
                 self._amount(value, f"{key} of {shown(name)}", (*where, name)))
                for name, value in table.items()]

    def pieces(
        self, entry: Table, key: str, member: str, find: Callable[[str], int]
    ) -> list[tuple[Piece, Place]]:
        """Return the pieces of an array of tables, each with its place."""
        found = []
        hint = f'write {key} = [{{{member} = ["name"], amount = "1"}}]'
        entries = _array(entry.get(key, []), key, (*self.place, key), hint)
        for ordinal, value in enumerate(entries):
            where = (*self.place, key, ordinal)
            what = f"entry {ordinal + 1} of {key}"
            table = table_of(value, what, where, hint)
            check_keys(table, (member, "amount"), what, where)
            if member not in table or "amount" not in table:
                missing = member if member not in table else "amount"
                raise DocumentError(f"{what} has no {missing}; {hint}", *where)
            names = _array(table[member], f"{member} of {what}", (*where, member), hint)
            members = [self._named(find, name, (*where, member)) for name in names]
            if not members or len(set(members)) < len(members):
                raise DocumentError(f"{what} names {'one twice' if members else 'none'} of its"
                                    f" {member}; name each once", *where, member)
            amount = self._amount(table["amount"], f"amount of {what}", (*where, "amount"))
            found.append((Piece(tuple(sorted(members)), amount), where))
        return found

    def transition(self, name: str) -> int:
        """Return the place of a transition."""
        return self.network.transition_index(name)

    def rate(self, name: str) -> int:
        """Return the place of a directed rate, written ``forward[bind]``."""
        read = read_quantity(name, self.network) if "[" in name else None
        if not isinstance(read, DirectedRate):
            raise QuantityError(f"{shown(name)} is not a rate; write forward[...] or backward[...]")
        place = self.analysis.rates.place(read.transition, read.backward)
        if place is None:
            raise QuantityError(f"{shown(name)} does not exist: the transition is one-way")
        return place

    def is_bundle(self, transitions: Part, place: Place) -> bool:
        """Return whether trees use r or r + 1 of them, not always r; DocumentError for more."""
        least, most = uses(transitions, self.analysis.graph)
        if most > least + 1:
            raise DocumentError(
                f"the transitions of a bundle: a spanning tree uses between {least} and {most} of"
                " them, which may differ by 1 at most; give smaller bundles", *place)
        return most > least

    def _named(self, find: Callable[[str], int], name: object, place: Place) -> int:
        if not isinstance(name, str):
            raise DocumentError(f"{shown(name)} is {kind_of(name)}; write a name in quotes", *place)
        try:
            return find(name)
        except QuantityError as error:
            raise DocumentError(str(error), *place) from None

    def _amount(self, value: object, what: str, place: Place) -> Expression:
        amount = read_value(value, what, place)
        declared = [symbol.name for symbol in self.network.symbols]
        for name in sorted(symbols_of(amount)):
            if name not in declared:
                raise DocumentError(f"{what}: the symbol {shown(name)} is not declared"
                                    f"{nearest(name, declared)}", *place)
        return amount


def _array(value: object, what: str, place: Place, hint: str) -> list[object]:
    if not isinstance(value, list | tuple):
        raise DocumentError(f"{what} is {kind_of(value)}; {hint}", *place)
    return list(value)
