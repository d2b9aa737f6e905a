"""The record: its entries read into plain data, whatever is not of the format refused."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from .expressions import FUNCTIONS, Expression, read
from .reading import (
    choice,
    fraction,
    items,
    malformed,
    members,
    name,
    pair,
    place,
    places,
    text,
    whole,
)

MAX_STATES, MAX_TRANSITIONS, MAX_SYMBOLS, MAX_POINTS = 32, 128, 1_000, 200_000
RESERVED = {*FUNCTIONS, "d", "p", "mean", "variance", "cov", "current", "traffic", "forward",
            "backward", "force", "energy", "barrier", "drive", "entropy_production", "force_max",
            "max_cov", "log", "tanh", "abs", "max", "min"}


@dataclass(frozen=True)
class Network:
    positive: dict[str, bool]  # of each symbol
    states: list[str]
    transitions: list[str]
    ends: list[tuple[int, int]]
    rates: list[tuple[Expression, Expression | None]]


@dataclass(frozen=True)
class Target:
    kind: str
    above: list[Expression]
    below: list[Expression] | None
    place: int = -1  # of the transition whose current it is


@dataclass(frozen=True)
class Perturbation:
    kind: str
    place: int  # of the state or transition
    symbol: str
    logarithmic: bool
    transitions: tuple[int, ...] = ()
    amount: Expression | None = None  # of a finite change


@dataclass(frozen=True)
class Claim:
    name: str
    parts: tuple[dict[int, Expression], ...] | None  # energies, barriers, singles


@dataclass(frozen=True)
class Worst(Claim):
    """A claim at points."""

    holds: int
    point: int
    left: Fraction
    right: list[tuple[Fraction, Fraction | None]]
    ratio: Fraction


@dataclass(frozen=True)
class Asked:
    """What claims are about."""

    network: Network
    target: Target | None
    perturbation: Perturbation | None
    path: tuple[int, int] | None


@dataclass(frozen=True)
class Record(Asked):
    count: int
    points: list[Any]
    claims: list[Worst]


@dataclass(frozen=True)
class Proof(Asked):
    trees: object
    proofs: list[Any]
    claims: list[Claim]


HEAD = ("format", "version", "kind")
BODY = ("network", "response", "domain", "target", "perturbation", "path")
POINTS = ("energy-covariance", "energy-range", "barrier", "end-pair", "splitting-barrier",
          "splitting-end-pair", "drive", "splitting-drive", "parameter", "support", "path",
          "current-exact", "current-range", "bundle", "directed-bundle")
PROVEN = (*POINTS, "local-change", "local-end-pair", "second-order", "finite-change",
          "finite-end-pair")
KINDS = ("points", "proof", "several")
SMOOTH = ("energy", "barrier", "drive", "bundle", "symbol")
MAX_PROOFS = 2 * MAX_TRANSITIONS + 3


def check_head(form: object, version: object, kind: object) -> None:
    """Check the first entries of a record of any kind."""
    choice(form, "format", "symbolic-response-certificate")
    if whole(version, "version") != 1:
        raise malformed("version", "1", version)
    choice(kind, "kind", *KINDS)


def read_record(data: object) -> Record:
    """Read a whole record of points; these are read one by one later."""
    top = members(data, "", *HEAD, *BODY, "sampling", "points", "claims")
    check_head(*top[:3])
    asked = _asked(top[3:9], "all admissible values of the symbols", SMOOTH)
    rule, seed, count = members(top[9], "sampling", "rule", "seed", "count")
    choice(rule, "sampling.rule", "dyadic-strata-1")
    text(seed, "sampling.seed")
    claims: list[Worst] = []
    for i, value in enumerate(items(top[11], "claims", len(POINTS))):
        claims.append(_worst(value, f"claims[{i}]", asked.network, {c.name for c in claims}))
    return Record(**vars(asked), count=whole(count, "sampling.count"),
                  points=items(top[10], "points", MAX_POINTS), claims=claims)


def read_proof(data: object) -> Proof:
    """Read a record of proofs; trees and proofs are read one by one later."""
    top = members(data, "", *HEAD, *BODY, "trees", "proofs", "claims")
    check_head(*top[:3])
    asked = _asked(top[3:9], "all positive rates", (*SMOOTH, "second-barrier", "finite-barrier"))
    claims: list[Claim] = []
    for i, value in enumerate(items(top[11], "claims", len(PROVEN))):
        called, parts = members(value, f"claims[{i}]", "name", "parts")
        claims.append(_claim(called, parts, f"claims[{i}]", asked.network, PROVEN,
                             {c.name for c in claims}))
    return Proof(**vars(asked), trees=top[9], proofs=items(top[10], "proofs", MAX_PROOFS),
                 claims=claims)


def _asked(values: list[object], domain: str, kinds: tuple[str, ...]) -> Asked:
    network = _network(values[0])
    text(values[1], "response")
    choice(values[2], "domain", domain)
    _, _, _, target, moved, path = values
    for entry, value in (("target", target), ("perturbation", moved)):
        if (value is None) != (path is not None):
            raise malformed(entry, "null exactly where path is not", value)
    if path is not None:
        return Asked(network, None, None, _path(path, network))
    return Asked(network, _target(target, network), _perturbation(moved, network, kinds), None)


def _network(value: object) -> Network:
    title, symbols, states, transitions = members(
        value, "network", "title", "symbols", "states", "transitions")
    text(title, "network.title")
    positive: dict[str, bool] = {}
    for i, symbol in enumerate(items(symbols, "network.symbols", MAX_SYMBOLS, 0)):
        _symbol(symbol, f"network.symbols[{i}]", positive)
    names: list[str] = []
    for i, state in enumerate(items(states, "network.states", MAX_STATES, 2)):
        names.append(name(state, f"network.states[{i}]", names))
    made = Network(positive, names, [], [], [])
    for i, step in enumerate(items(transitions, "network.transitions", MAX_TRANSITIONS)):
        _transition(step, f"network.transitions[{i}]", made)
    return made


def _symbol(value: object, entry: str, positive: dict[str, bool]) -> None:
    called, sign, limits = members(value, entry, "name", "sign", "range")
    key = name(called, f"{entry}.name", positive)
    if key in RESERVED:
        raise malformed(f"{entry}.name", "a name that is not reserved", key)
    positive[key] = choice(sign, f"{entry}.sign", "positive", "real") == "positive"
    low, high = (fraction(limit, f"{entry}.range[{j}]")
                 for j, limit in enumerate(pair(limits, f"{entry}.range")))
    if low > high:
        raise malformed(f"{entry}.range", "the lower limit first", f"{low} and {high}")


def _transition(value: object, entry: str, network: Network) -> None:
    called, between, forward, backward = members(
        value, entry, "name", "between", "forward", "backward")
    network.transitions.append(name(called, f"{entry}.name", network.transitions))
    first, second = (place(end, f"{entry}.between[{j}]", network.states)
                     for j, end in enumerate(pair(between, f"{entry}.between")))
    if first == second:
        raise malformed(f"{entry}.between", "two different states", network.states[first])
    network.ends.append((first, second))
    back = None if backward is None else read(backward, f"{entry}.backward", network.positive)
    network.rates.append((read(forward, f"{entry}.forward", network.positive), back))


def _target(value: object, network: Network) -> Target:
    if type(value) is dict and value.get("kind") == "current":
        _, where = members(value, "target", "kind", "transition")
        return Target("current", [], None, place(where, "target.transition", network.transitions))
    kind, above, below = members(value, "target", "kind", "above", "below")
    kind = choice(kind, "target.kind", "mean", "ratio", "log-ratio", "current")
    if (kind == "mean") != (below is None):
        raise malformed("target.below", "null for mean only", below)
    return Target(kind, _observable(above, "target.above", network),
                  None if below is None else _observable(below, "target.below", network))


def _observable(value: object, entry: str, network: Network) -> list[Expression]:
    values = members(value, entry, *network.states)
    return [read(one, f"{entry}.{state}", network.positive)
            for one, state in zip(values, network.states, strict=True)]


def _perturbation(value: object, network: Network, kinds: tuple[str, ...]) -> Perturbation:
    entry = "perturbation"
    if type(value) is not dict:
        raise malformed(entry, "an object", value)
    kind = choice(value.get("kind"), f"{entry}.kind", *kinds)
    if kind == "symbol":
        _, symbol, logarithmic = members(value, entry, "kind", "symbol", "logarithmic")
        symbol = choice(symbol, f"{entry}.symbol", *network.positive)
        if type(logarithmic) is not bool or (logarithmic and not network.positive[symbol]):
            raise malformed(f"{entry}.logarithmic", "true (of a positive symbol) or false",
                            logarithmic)
        return Perturbation(kind, -1, symbol, logarithmic)
    if kind == "energy":
        _, where = members(value, entry, "kind", "state")
        return Perturbation(kind, place(where, f"{entry}.state", network.states), "", False)
    if kind == "bundle":
        _, where = members(value, entry, "kind", "transitions")
        return Perturbation(kind, -1, "", False,
                            places(where, f"{entry}.transitions", network.transitions, 2))
    finite = ("amount",) * (kind == "finite-barrier")
    _, where, *amount = members(value, entry, "kind", "transition", *finite)
    e = place(where, f"{entry}.transition", network.transitions)
    return Perturbation(kind, e, "", False, (e,), read(amount[0], f"{entry}.amount",
                                                       network.positive) if finite else None)


def _path(value: object, network: Network) -> tuple[int, int]:
    start, goal = members(value, "path", "from", "to")
    return read_ends(start, goal, "path", network)


def read_ends(start: object, goal: object, entry: str, network: Network) -> tuple[int, int]:
    """Return the ends of a path, which differ."""
    first = place(start, f"{entry}.from", network.states)
    last = place(goal, f"{entry}.to", network.states)
    if first == last:
        raise malformed(f"{entry}.to", f"another state than {entry}.from", network.states[last])
    return first, last


def _claim(called: object, parts: object, entry: str, network: Network, known: tuple[str, ...],
           taken: set[str]) -> Claim:
    called = choice(called, f"{entry}.name", *known)
    if called in taken:
        raise malformed(f"{entry}.name", "each claim once", called)
    if (called == "parameter") != (parts is not None):
        raise malformed(f"{entry}.parts", "null except for parameter", parts)
    return Claim(called, None if parts is None else _parts(parts, f"{entry}.parts", network))


def _worst(value: object, entry: str, network: Network, taken: set[str]) -> Worst:
    called, parts, holds, worst = members(value, entry, "name", "parts", "holds", "worst")
    claim = _claim(called, parts, entry, network, POINTS, taken)
    at, left, right, ratio = members(worst, f"{entry}.worst", "point", "left", "right", "ratio")
    terms: list[tuple[Fraction, Fraction | None]] = []
    for i, term in enumerate(items(right, f"{entry}.worst.right", MAX_TRANSITIONS + 1)):
        factor, g = members(term, f"{entry}.worst.right[{i}]", "factor", "g")
        terms.append((fraction(factor, f"{entry}.worst.right[{i}].factor"),
                      None if g is None else fraction(g, f"{entry}.worst.right[{i}].g")))
    return Worst(claim.name, claim.parts, whole(holds, f"{entry}.holds"),
                 whole(at, f"{entry}.worst.point"), fraction(left, f"{entry}.worst.left"), terms,
                 fraction(ratio, f"{entry}.worst.ratio"))


def _parts(value: object, entry: str, network: Network) -> tuple[dict[int, Expression], ...]:
    keys = ("energies", "barriers", "singles")
    found = []
    for key, given in zip(keys, members(value, entry, *keys), strict=True):
        known = network.states if key == "energies" else network.transitions
        if type(given) is not dict:
            raise malformed(f"{entry}.{key}", "an object", given)
        found.append({place(one, f"{entry}.{key}", known):
                      read(what, f"{entry}.{key}.{one}", network.positive)
                      for one, what in given.items()})
    return tuple(found)
