"""Which quantities a document prints: those asked for, those of the file, or a bounded default."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from symbolic_response.appendix import page
from symbolic_response.errors import NetworkError, QuantityError
from symbolic_response.expressions.tree import Expression, symbols_of
from symbolic_response.network.checks import expressions_of
from symbolic_response.network.model import Network, nearest
from symbolic_response.network.quantities import (
    BarrierOf,
    BySymbol,
    Current,
    EnergyOf,
    EntropyProduction,
    Mean,
    Probability,
    Response,
)
from symbolic_response.network.quantity_reader import read_quantity

KEYS = ("quantities", "bounds", "proofs", "certificates", "digests", "diagrams", *page.KEYS)
MAX_CERTIFICATE_POINTS = 100_000
DEFAULT_RESULTS = 24
MAX_FURTHER = 12
MAX_CURRENTS = 8
MAX_MEANS = 6
MAX_QUANTITIES = 500


@dataclass(frozen=True, slots=True)
class Request:
    """The quantities to print; ``note`` says what a default left out, empty for nothing."""

    quantities: tuple[Expression, ...]
    note: str = ""


@dataclass(frozen=True, slots=True)
class Extras:
    """What else is printed: bounds, proofs, certificates of so many points, digests, diagrams."""

    bounds: bool = True
    proofs: bool = True
    certificates: int = 0
    digests: bool = False
    diagrams: bool = True


def extras(network: Network) -> Extras:
    """Return what else the file's [appendix] asks for; NetworkError for values of other types.

    Bounds that are not stated are not proved either.
    """
    section = network.appendix
    for key in ("bounds", "proofs", "digests", "diagrams"):
        if type(section.get(key, False)) is not bool:
            raise NetworkError(f"[appendix] {key} is not true or false")
    count = section.get("certificates", 0)
    if type(count) is not int or not 0 <= count <= MAX_CERTIFICATE_POINTS:
        raise NetworkError("[appendix] certificates is not a number of points from 0 to"
                           f" {MAX_CERTIFICATE_POINTS}; write certificates = 1000")
    bounds = bool(section.get("bounds", True))
    proofs = bool(section.get("proofs", bounds))
    if proofs and not bounds:
        raise NetworkError("[appendix] proofs is true but bounds is false: what is not stated is"
                           " not proved; write bounds = true, or leave proofs out")
    return Extras(bounds, proofs, count, bool(section.get("digests", False)),
                  bool(section.get("diagrams", True)))


def requested(network: Network, quantities: Sequence[str | Expression] | None) -> Request:
    """Return the quantities given, else those of the file's [appendix], else the default ones.

    Raises QuantityError for a quantity the network does not have, NetworkError for a section of
    another shape; both name the entry.
    """
    section = network.appendix
    for key in section:
        if key not in KEYS:
            hint = nearest(str(key), KEYS) or f"; known: {', '.join(KEYS)}"
            raise NetworkError(f"[appendix] has no key {str(key)!r}{hint}")
    if quantities is not None:
        return Request(tuple(_read(network, list(quantities), "quantities")))
    if "quantities" not in section:
        return default_request(network)
    entries = section["quantities"]
    if not isinstance(entries, list | tuple):
        raise NetworkError("[appendix] quantities is not an array; write "
                           'quantities = ["p[A]", ...]')
    return Request(tuple(_read(network, list(entries), "[appendix] quantities")))


def _read(network: Network, entries: list[object], where: str) -> list[Expression]:
    if len(entries) > MAX_QUANTITIES:
        raise NetworkError(f"{where} has {len(entries)} entries, more than {MAX_QUANTITIES}")
    found = []
    for place, entry in enumerate(entries, start=1):
        if isinstance(entry, Expression):
            found.append(entry)
            continue
        if type(entry) is not str:
            raise NetworkError(f"{where}, entry {place}: write the quantity as text in quotes")
        try:
            found.append(read_quantity(entry, network))
        except QuantityError as error:
            raise QuantityError(f"{where}, entry {place}: {error}") from None
    return list(dict.fromkeys(found))


def default_request(network: Network) -> Request:
    """Return currents, means, entropy production and responses, about 24 in all at the most.

    Responses are those of means to ln of each positive parameter, and those of probabilities to
    barriers; without cycles the latter vanish, and those to energies take their place.
    """
    currents = [Current(e) for e in range(len(network.transitions))]
    means = [Mean(place) for place in range(len(network.observables))]
    steady: list[Expression] = [*currents[:MAX_CURRENTS], *means[:MAX_MEANS]]
    left_out = len(currents) + len(means) - len(steady)
    without_cycles = len(network.transitions) == len(network.states) - 1
    if not without_cycles and all(t.backward is not None for t in network.transitions):
        steady.append(EntropyProduction())
    responses = list(_observable_responses(network))
    further = list(_energy_responses(network) if without_cycles else _barrier_responses(network))
    if not responses or len(further) <= MAX_FURTHER:
        responses += further
    room = DEFAULT_RESULTS - len(steady)
    left_out += max(0, len(responses) - room)
    note = (
        f"Of the currents, the means and the responses, {left_out} that have the same form as "
        "those below are not listed."
    )
    return Request((*steady, *responses[:room]), note if left_out else "")


def _observable_responses(network: Network) -> list[Response]:
    varied = {
        name for expression, _, place in expressions_of(network) if place[0] != "observables"
        for name in symbols_of(expression)
    }
    return [
        Response(Mean(place), BySymbol(entry.name, True))
        for place in range(len(network.observables))
        for entry in network.symbols if entry.positive and entry.name in varied
    ]


def _energy_responses(network: Network) -> list[Response]:
    return [
        Response(Probability((k,)), EnergyOf(j))
        for j in range(len(network.states)) for k in range(len(network.states))
    ]


def _barrier_responses(network: Network) -> list[Response]:
    return [
        Response(Probability((k,)), BarrierOf(e))
        for e in range(len(network.transitions)) for k in range(len(network.states))
    ]
