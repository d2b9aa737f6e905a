"""Which quantities are exported: those asked for, those of the file, or a bounded default."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from symbolic_response.bounds.sides import quantity_text
from symbolic_response.errors import NetworkError, QuantityError
from symbolic_response.expressions.tree import Expression, symbols_of
from symbolic_response.network.checks import expressions_of
from symbolic_response.network.model import Network
from symbolic_response.network.quantity_reader import read_quantity

MAX_DEFAULT = 24
MAX_QUANTITIES = 500


@dataclass(frozen=True, slots=True)
class Asked:
    """A quantity as it was asked for, and as it was read."""

    text: str
    quantity: Expression


def asked_of(network: Network, quantities: Sequence[str | Expression] | None) -> tuple[Asked, ...]:
    """Return the quantities given, else those of [appendix], else the default choice.

    The default: all currents and means, the entropy production where it exists, and the responses
    of means to ln of each positive symbol of the rates, 24 at the most. Raises QuantityError,
    NetworkError.
    """
    where = "quantities"
    given: object = quantities
    if quantities is None and "quantities" in network.appendix:
        where, given = "[appendix] quantities", network.appendix["quantities"]
    if given is None:
        given = _default(network)
    if not isinstance(given, list | tuple):
        raise NetworkError(f'{where} is not an array; write quantities = ["p[A]", ...]')
    if len(given) > MAX_QUANTITIES:
        raise NetworkError(f"{where} has {len(given)} entries, more than {MAX_QUANTITIES}")
    found = [_read(network, entry, where, place) for place, entry in enumerate(given, start=1)]
    return tuple({one.text: one for one in found}.values())


def _read(network: Network, entry: object, where: str, place: int) -> Asked:
    if isinstance(entry, Expression):
        return Asked(quantity_text(entry, network), entry)
    if not isinstance(entry, str):
        raise NetworkError(f"{where}, entry {place}: write the quantity as text in quotes")
    try:
        return Asked(" ".join(entry.split()), read_quantity(entry, network))
    except QuantityError as error:
        raise QuantityError(f"{where}, entry {place}: {error}") from None


def _default(network: Network) -> list[str]:
    means = [f"mean[{observable.name}]" for observable in network.observables]
    found = [f"current[{transition.name}]" for transition in network.transitions] + means
    with_cycles = len(network.transitions) >= len(network.states)
    if with_cycles and all(t.backward is not None for t in network.transitions):
        found.append("entropy_production")
    varied = {name for expression, _, place in expressions_of(network)
              if place[0] != "observables" for name in symbols_of(expression)}
    found += [f"d {mean} / d ln {entry.name}" for mean in means for entry in network.symbols
              if entry.positive and entry.name in varied]
    return found[:MAX_DEFAULT]
