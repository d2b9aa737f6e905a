"""The record: its entries read into plain data, whatever is not of the format refused."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from .expressions import FUNCTIONS, Expression, read
from .reading import choice, fraction, items, malformed, members, name, place, sized, text, whole

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


@dataclass(frozen=True)
class Perturbation:
    kind: str
    place: int  # of the state or transition
    symbol: str
    logarithmic: bool


@dataclass(frozen=True)
class Claim:
    name: str
    parts: tuple[dict[int, Expression], ...] | None  # energies, barriers, singles
    holds: int
    point: int
    left: Fraction
    right: list[tuple[Fraction, Fraction | None]]
    ratio: Fraction


@dataclass(frozen=True)
class Record:
    network: Network
    target: Target | None
    perturbation: Perturbation | None
    path: tuple[int, int] | None
    count: int
    points: list[Any]
    claims: list[Claim]


CLAIMS = ("energy-covariance", "energy-range", "barrier", "end-pair", "splitting-barrier",
          "splitting-end-pair", "drive", "splitting-drive", "parameter", "support", "path")


def read_record(data: object) -> Record:
    """Read a whole record; points are read one by one later."""
    top = members(data, "", "format", "version", "kind", "network", "response", "domain", "target",
                  "perturbation", "path", "sampling", "points", "claims")
    choice(top[0], "format", "symbolic-response-certificate")
    if whole(top[1], "version") != 1:
        raise malformed("version", "1", top[1])
    choice(top[2], "kind", "points")
    network = _network(top[3])
    text(top[4], "response")
    choice(top[5], "domain", "all admissible values of the symbols")
    about_path = top[8] is not None
    for entry, value in (("target", top[6]), ("perturbation", top[7])):
        if (value is None) != about_path:
            raise malformed(entry, "null exactly where path is not", value)
    rule, seed, count = members(top[9], "sampling", "rule", "seed", "count")
    choice(rule, "sampling.rule", "dyadic-strata-1")
    text(seed, "sampling.seed")
    claims: list[Claim] = []
    for i, value in enumerate(items(top[11], "claims", len(CLAIMS))):
        claims.append(_claim(value, f"claims[{i}]", network, {claim.name for claim in claims}))
    return Record(network, None if about_path else _target(top[6], network),
                  None if about_path else _perturbation(top[7], network),
                  _path(top[8], network) if about_path else None,
                  whole(count, "sampling.count"), items(top[10], "points", MAX_POINTS), claims)


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
                 for j, limit in enumerate(_pair(limits, f"{entry}.range")))
    if low > high:
        raise malformed(f"{entry}.range", "the lower limit first", f"{low} and {high}")


def _pair(value: object, entry: str) -> list[object]:
    if type(value) is not list or len(value) != 2:
        raise malformed(entry, "a list of two", sized(value))
    return value


def _transition(value: object, entry: str, network: Network) -> None:
    called, between, forward, backward = members(
        value, entry, "name", "between", "forward", "backward")
    network.transitions.append(name(called, f"{entry}.name", network.transitions))
    first, second = (place(end, f"{entry}.between[{j}]", network.states)
                     for j, end in enumerate(_pair(between, f"{entry}.between")))
    if first == second:
        raise malformed(f"{entry}.between", "two different states", network.states[first])
    network.ends.append((first, second))
    back = None if backward is None else read(backward, f"{entry}.backward", network.positive)
    network.rates.append((read(forward, f"{entry}.forward", network.positive), back))


def _target(value: object, network: Network) -> Target:
    kind, above, below = members(value, "target", "kind", "above", "below")
    kind = choice(kind, "target.kind", "mean", "ratio", "log-ratio")
    if (kind == "mean") != (below is None):
        raise malformed("target.below", "null for mean only", below)
    return Target(kind, _observable(above, "target.above", network),
                  None if below is None else _observable(below, "target.below", network))


def _observable(value: object, entry: str, network: Network) -> list[Expression]:
    values = members(value, entry, *network.states)
    return [read(one, f"{entry}.{state}", network.positive)
            for one, state in zip(values, network.states, strict=True)]


def _perturbation(value: object, network: Network) -> Perturbation:
    entry = "perturbation"
    if type(value) is not dict:
        raise malformed(entry, "an object", value)
    kind = choice(value.get("kind"), f"{entry}.kind", "energy", "barrier", "drive", "symbol")
    if kind == "symbol":
        _, symbol, logarithmic = members(value, entry, "kind", "symbol", "logarithmic")
        symbol = choice(symbol, f"{entry}.symbol", *network.positive)
        if type(logarithmic) is not bool or (logarithmic and not network.positive[symbol]):
            raise malformed(f"{entry}.logarithmic", "true (of a positive symbol) or false",
                            logarithmic)
        return Perturbation(kind, -1, symbol, logarithmic)
    key = "state" if kind == "energy" else "transition"
    known = network.states if kind == "energy" else network.transitions
    _, where = members(value, entry, "kind", key)
    return Perturbation(kind, place(where, f"{entry}.{key}", known), "", False)


def _path(value: object, network: Network) -> tuple[int, int]:
    start, goal = (place(end, f"path.{key}", network.states) for key, end in
                   zip(("from", "to"), members(value, "path", "from", "to"), strict=True))
    if start == goal:
        raise malformed("path.to", "another state than path.from", network.states[goal])
    return start, goal


def _claim(value: object, entry: str, network: Network, taken: set[str]) -> Claim:
    called, parts, holds, worst = members(value, entry, "name", "parts", "holds", "worst")
    called = choice(called, f"{entry}.name", *CLAIMS)
    if called in taken:
        raise malformed(f"{entry}.name", "each claim once", called)
    if (called == "parameter") != (parts is not None):
        raise malformed(f"{entry}.parts", "null except for parameter", parts)
    at, left, right, ratio = members(worst, f"{entry}.worst", "point", "left", "right", "ratio")
    terms: list[tuple[Fraction, Fraction | None]] = []
    for i, term in enumerate(items(right, f"{entry}.worst.right", MAX_TRANSITIONS + 1)):
        factor, g = members(term, f"{entry}.worst.right[{i}]", "factor", "g")
        terms.append((fraction(factor, f"{entry}.worst.right[{i}].factor"),
                      None if g is None else fraction(g, f"{entry}.worst.right[{i}].g")))
    return Claim(called, None if parts is None else _parts(parts, f"{entry}.parts", network),
                 whole(holds, f"{entry}.holds"), whole(at, f"{entry}.worst.point"),
                 fraction(left, f"{entry}.worst.left"), terms,
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
