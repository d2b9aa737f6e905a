"""The network as data: symbols, states, transitions and observables, all in file order.

Nothing is checked here: networks are made by :mod:`symbolic_response.network.document`, which
checks what the file and Python give.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from fractions import Fraction

from symbolic_response.errors import QuantityError
from symbolic_response.expressions.names import nearest as nearest
from symbolic_response.expressions.tree import Expression


@dataclass(frozen=True, slots=True)
class SymbolEntry:
    """A symbol and the exact range its samples are drawn from."""

    name: str
    positive: bool
    low: Fraction
    high: Fraction
    about: str = ""
    latex: str | None = None


@dataclass(frozen=True, slots=True)
class State:
    """A state; ``energy`` in units of k_B T, None where the network gives none."""

    name: str
    energy: Expression | None = None
    latex: str | None = None


@dataclass(frozen=True, slots=True)
class Transition:
    """A transition between states ``first`` and ``second`` (places in the network's order).

    ``forward`` is the rate from first to second, ``backward`` the rate from second to first, in
    1/time; None for one-way. ``barrier`` and ``drive`` are set, in units of k_B T, where the
    transition was given in energy form; the rates then are exp(E_first - B + F/2) and
    exp(E_second - B - F/2).
    """

    name: str
    first: int
    second: int
    forward: Expression
    backward: Expression | None
    barrier: Expression | None = None
    drive: Expression | None = None


@dataclass(frozen=True, slots=True)
class Observable:
    """A function of the state: one value per state, 0 for those left out."""

    name: str
    values: tuple[Expression, ...]


@dataclass(frozen=True, slots=True)
class Network:
    """A strongly connected network of at least two states.

    ``hand``, ``inequality``, ``control``, ``appendix`` and ``notation`` hold these sections of
    the file as they stand (a decimal as its text); the verbs that use them check them. Two
    networks are equal wherever they were read from.
    """

    title: str
    symbols: tuple[SymbolEntry, ...]
    states: tuple[State, ...]
    transitions: tuple[Transition, ...]
    observables: tuple[Observable, ...] = ()
    about: str = ""
    hand: tuple[Mapping[str, object], ...] = field(default=(), hash=False)
    inequality: tuple[Mapping[str, object], ...] = field(default=(), hash=False)
    control: tuple[Mapping[str, object], ...] = field(default=(), hash=False)
    appendix: Mapping[str, object] = field(default_factory=dict, hash=False)
    notation: Mapping[str, object] = field(default_factory=dict, hash=False)
    path: str | None = field(default=None, compare=False)

    @property
    def positive_symbols(self) -> frozenset[str]:
        """The names of the symbols that are positive."""
        return frozenset(symbol.name for symbol in self.symbols if symbol.positive)

    def state_index(self, name: str) -> int:
        """Return the place of a state; QuantityError for an unknown name."""
        return _place("state", name, self.states)

    def transition_index(self, name: str) -> int:
        """Return the place of a transition; QuantityError for an unknown name."""
        return _place("transition", name, self.transitions)

    def observable(self, name: str) -> Observable:
        """Return the observable of that name; QuantityError for an unknown name."""
        return self.observables[_place("observable", name, self.observables)]

    def symbol(self, name: str) -> SymbolEntry:
        """Return the symbol of that name; QuantityError for an unknown name."""
        return self.symbols[_place("symbol", name, self.symbols)]


def _place(
    kind: str,
    name: str,
    entries: Sequence[State] | Sequence[Transition] | Sequence[Observable] | Sequence[SymbolEntry],
) -> int:
    names = [entry.name for entry in entries]
    if name in names:
        return names.index(name)
    hint = nearest(name, names) or (
        f"; known: {', '.join(names[:8])}" + (", ..." if len(names) > 8 else "") if names
        else "; the network has none"
    )
    raise QuantityError(f"there is no {kind} {name!r}{hint}")
