"""Putting expressions in the place of symbols of a network."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from symbolic_response.errors import AssignmentError, EvaluationError, NetworkError, SizeLimitError
from symbolic_response.expressions.tree import Expression, substitute, symbols_of
from symbolic_response.network.checks import check_network, expressions_of, words_of
from symbolic_response.network.document import energy_rates
from symbolic_response.network.entries import DocumentError, shown
from symbolic_response.network.model import Network, State, Transition, nearest


def with_substitution(network: Network, values: Mapping[str, Expression]) -> Network:
    """Return the network with symbols replaced by expressions, all at once.

    Rates, energies, barriers, drives and observables change; hand results and the like do not. A
    symbol that no longer occurs is dropped. Raises AssignmentError for an unknown symbol or one
    that contradicts its sign, NetworkError if the result is no network.

    >>> from symbolic_response.expressions.reader import read_expression
    >>> from symbolic_response.network.build import build_network
    >>> pair = build_network("pair", states="A B", transitions=[("A", "B", "k*c", "k")])
    >>> with_substitution(pair, {"c": read_expression("2*k")}).positive_symbols
    frozenset({'k'})
    """
    _check_values(network, values)
    try:
        changed = _substituted(network, dict(values))
        used = frozenset().union(*(symbols_of(part) for part, _, _ in expressions_of(changed)))
        kept = used | (words_of(network) - frozenset(values))
        changed = replace(
            changed, symbols=tuple(entry for entry in network.symbols if entry.name in kept)
        )
        check_network(changed)
    except (DocumentError, EvaluationError, SizeLimitError) as error:
        raise NetworkError(f"after the substitution, {error}") from None
    return changed


def _check_values(network: Network, values: Mapping[str, Expression]) -> None:
    from symbolic_response.expressions.signs import certain_sign

    known = [symbol.name for symbol in network.symbols]
    positive = network.positive_symbols
    for name, value in values.items():
        for symbol in (name, *sorted(symbols_of(value))):
            if symbol not in known:
                hint = nearest(symbol, known) or "; use the symbols of the network"
                raise AssignmentError(f"the network has no symbol {shown(symbol)}{hint}")
        try:
            sign = certain_sign(value, positive)
        except EvaluationError as error:
            raise AssignmentError(f"the expression for {shown(name)}: {error}") from None
        if name in positive and sign is not None and sign <= 0:
            raise AssignmentError(
                f"the symbol {shown(name)} is positive, the expression for it is "
                f"{'negative' if sign else 'zero'}; give a positive one"
            )


def _substituted(network: Network, values: dict[str, Expression]) -> Network:
    def of(expression: Expression | None) -> Expression | None:
        return None if expression is None else substitute(expression, values)

    states = tuple(replace(state, energy=of(state.energy)) for state in network.states)
    return replace(
        network,
        states=states,
        transitions=tuple(
            _substituted_transition(transition, states, values)
            for transition in network.transitions
        ),
        observables=tuple(
            replace(entry, values=tuple(substitute(value, values) for value in entry.values))
            for entry in network.observables
        ),
    )


def _substituted_transition(
    transition: Transition, states: tuple[State, ...], values: dict[str, Expression]
) -> Transition:
    first, second = states[transition.first].energy, states[transition.second].energy
    if transition.barrier is None or first is None or second is None:
        back = transition.backward
        return replace(
            transition,
            forward=substitute(transition.forward, values),
            backward=None if back is None else substitute(back, values),
        )
    barrier = substitute(transition.barrier, values)
    drive = None if transition.drive is None else substitute(transition.drive, values)
    forward, backward = energy_rates(first, second, barrier, drive)
    return replace(
        transition, forward=forward, backward=backward, barrier=barrier, drive=drive
    )
