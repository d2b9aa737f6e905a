"""The record: its entries read into plain data, whatever is not of the format refused."""

from __future__ import annotations

from dataclasses import dataclass

from .expressions import FUNCTIONS, Expression, read
from .reading import (
    choice,
    fraction,
    invalid,
    items,
    malformed,
    members,
    name,
    place,
    places,
    text,
    whole,
)

MAX_STATES, MAX_TRANSITIONS, MAX_SYMBOLS, MAX_POINTS = 32, 128, 1_000, 200_000
MAX_CLAIMS = 20
RESERVED = {*FUNCTIONS, "d", "p", "mean", "variance", "cov", "current", "traffic", "forward",
            "backward", "force", "energy", "barrier", "drive", "entropy_production", "force_max",
            "max_cov", "log", "tanh", "abs", "max", "min"}


@dataclass(frozen=True)
class Network:
    """Symbols, states and transitions; of a one-way transition the second rate is None."""

    positive: dict[str, bool]  # of each symbol
    states: list[str]
    transitions: list[str]
    ends: list[tuple[int, int]]
    rates: list[tuple[Expression, Expression | None]]

    def names(self, key: str) -> list[str]:
        """Return what the parts of a claim are named after."""
        return self.states if key == "energies" else self.transitions

    def entry(self, i: int) -> str:
        """Return the entry of rate i."""
        return f"network.transitions[{i >> 1}].{'backward' if i & 1 else 'forward'}"


@dataclass(frozen=True)
class Target:
    """Observables by state, or the place of the transition whose current it is."""

    kind: str
    above: list[Expression]
    below: list[Expression]
    place: int = -1

    def sides(self) -> list[tuple[str, list[Expression]]]:
        """Return the observables there are, with their entries."""
        sides = [("target.above", self.above), ("target.below", self.below)]
        return [(entry, side) for entry, side in sides if side]


@dataclass(frozen=True)
class Perturbation:
    """What is changed: a state or transition by its place, several transitions, or a symbol."""

    kind: str
    place: int = -1
    transitions: tuple[int, ...] = ()
    symbol: str = ""
    logarithmic: bool = False
    amount: Expression | None = None  # of a finite change


@dataclass(frozen=True)
class Claim:
    """A claim; what one about points says of them is compared when they were checked."""

    entry: str
    name: str
    parts: dict[str, dict[int, Expression]]  # energies, barriers, singles of "parameter"
    holds: object = None
    worst: object = None


@dataclass(frozen=True)
class Record:
    """A record of points or of proofs, which are read one by one later."""

    network: Network
    target: Target | None
    perturbation: Perturbation | None
    path: tuple[int, int] | None
    claims: list[Claim]
    points: list[object]
    trees: object
    proofs: list[object]


HEAD = ("format", "version", "kind")
BODY = ("network", "response", "domain", "target", "perturbation", "path")
KINDS = ("points", "proof", "several")
APPLIES = {  # the claims there can be, by kind of perturbation
    "path": ("path",),
    "energy": ("energy-covariance", "energy-range"),
    "barrier": ("barrier", "end-pair", "splitting-barrier", "splitting-end-pair"),
    "drive": ("drive", "splitting-drive"),
    "bundle": ("parameter", "bundle", "directed-bundle"),
    "symbol": ("parameter", "support", "bundle", "directed-bundle", "local-change",
               "local-end-pair"),
    "second-barrier": ("second-order",),
    "finite-barrier": ("finite-change", "finite-end-pair"),
}
CURRENT = ("current-exact", "current-range")
HIGHER = ("second-barrier", "finite-barrier")  # in proofs only
PROVEN = ("local-change", "local-end-pair", "second-order", "finite-change", "finite-end-pair")
PARTS = ("energies", "barriers", "singles")
MAX_PROOFS = 2 * MAX_TRANSITIONS + 3


def check_head(form: object, version: object, kind: object) -> None:
    """Check the first entries of a record of any kind."""
    choice(form, "format", "symbolic-response-certificate")
    if whole(version, "version") != 1:
        raise malformed("version", "1", version)
    choice(kind, "kind", *KINDS)


def read_record(data: object, proof: bool) -> Record:
    """Read a record of points or of proofs."""
    rest = ("trees", "proofs") if proof else ("sampling", "points")
    *head, network, response, domain, target, moved, path, first, second, claims = members(
        data, "", *HEAD, *BODY, *rest, "claims")
    check_head(*head)
    net = _network(network)
    text(response, "response")
    choice(domain, "domain", "all positive rates" if proof else
           "all admissible values of the symbols")
    for entry, value in (("target", target), ("perturbation", moved)):
        if (value is None) != (path is not None):
            raise malformed(entry, "null exactly where path is not", value)
    if proof:
        points, proofs = [], items(second, "proofs", MAX_PROOFS, 0)
    else:
        points, proofs = items(second, "points", MAX_POINTS), []
        rule, seed, count = members(first, "sampling", "rule", "seed", "count")
        choice(rule, "sampling.rule", "dyadic-strata-1")
        text(seed, "sampling.seed")
        if whole(count, "sampling.count") > len(points):
            raise invalid("sampling.count", f"at most {len(points)}", count)
    record = Record(
        net, None if target is None else _target(target, net),
        None if moved is None else _perturbation(moved, net, proof),
        None if path is None else read_ends(members(path, "path", "from", "to"), "path", net),
        [], points, first if proof else None, proofs)
    for i, value in enumerate(items(claims, "claims", MAX_CLAIMS)):
        record.claims.append(_claim(value, f"claims[{i}]", record, proof))
    _check_applies(record)
    return record


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
                 for j, limit in enumerate(items(limits, f"{entry}.range", 2, 2)))
    if low > high:
        raise malformed(f"{entry}.range", "the lower limit first", f"{low} and {high}")


def _transition(value: object, entry: str, network: Network) -> None:
    called, between, forward, backward = members(
        value, entry, "name", "between", "forward", "backward")
    network.transitions.append(name(called, f"{entry}.name", network.transitions))
    first, second = (place(end, f"{entry}.between[{j}]", network.states)
                     for j, end in enumerate(items(between, f"{entry}.between", 2, 2)))
    if first == second:
        raise malformed(f"{entry}.between", "two different states", network.states[first])
    network.ends.append((first, second))
    back = None if backward is None else read(backward, f"{entry}.backward", network.positive)
    network.rates.append((read(forward, f"{entry}.forward", network.positive), back))


def _target(value: object, network: Network) -> Target:
    if type(value) is dict and value.get("kind") == "current":
        _, where = members(value, "target", "kind", "transition")
        return Target("current", [], [], place(where, "target.transition", network.transitions))
    kind, above, below = members(value, "target", "kind", "above", "below")
    kind = choice(kind, "target.kind", "mean", "ratio", "log-ratio", "current")
    if (kind == "mean") != (below is None):
        raise malformed("target.below", "null for mean only", below)
    return Target(kind, _observable(above, "target.above", network),
                  [] if below is None else _observable(below, "target.below", network))


def _observable(value: object, entry: str, network: Network) -> list[Expression]:
    values = members(value, entry, *network.states)
    return [read(one, f"{entry}.{state}", network.positive)
            for one, state in zip(values, network.states, strict=True)]


def _perturbation(value: object, network: Network, proof: bool) -> Perturbation:
    entry = "perturbation"
    if type(value) is not dict:
        raise malformed(entry, "an object", value)
    kind = choice(value.get("kind"), f"{entry}.kind",
                  *(one for one in list(APPLIES)[1:] if proof or one not in HIGHER))
    keys = {"symbol": ("symbol", "logarithmic"), "energy": ("state",), "bundle": ("transitions",),
            "finite-barrier": ("transition", "amount")}.get(kind, ("transition",))
    _, where, *more = members(value, entry, "kind", *keys)
    entry = f"{entry}.{keys[0]}"
    if kind == "symbol":
        symbol, (logarithmic,) = choice(where, entry, *network.positive), more
        if type(logarithmic) is not bool or (logarithmic and not network.positive[symbol]):
            raise malformed("perturbation.logarithmic", "true (of a positive symbol) or false",
                            logarithmic)
        return Perturbation(kind, symbol=symbol, logarithmic=logarithmic)
    if kind == "energy":
        return Perturbation(kind, place(where, entry, network.states))
    if kind == "bundle":
        return Perturbation(kind, -1, places(where, entry, network.transitions, 2))
    e = place(where, entry, network.transitions)
    amount = read(more[0], "perturbation.amount", network.positive) if more else None
    return Perturbation(kind, e, (e,), amount=amount)


def read_ends(ends: list[object], entry: str, network: Network) -> tuple[int, int]:
    """Return the ends of a path, which differ."""
    first, last = (place(end, f"{entry}.{key}", network.states)
                   for end, key in zip(ends, ("from", "to"), strict=True))
    if first == last:
        raise malformed(f"{entry}.to", f"another state than {entry}.from", network.states[last])
    return first, last


def _claim(value: object, entry: str, record: Record, proof: bool) -> Claim:
    called, parts, *more = members(value, entry, "name", "parts",
                                   *(() if proof else ("holds", "worst")))
    known = {*CURRENT, *(one for names in APPLIES.values() for one in names)}
    title = choice(called, f"{entry}.name", *(known if proof else known - {*PROVEN}))
    if title in [claim.name for claim in record.claims]:
        raise malformed(f"{entry}.name", "each claim once", title)
    if (title == "parameter") != (parts is not None):
        raise malformed(f"{entry}.parts", "null except for parameter", parts)
    return Claim(entry, title, {} if parts is None else
                 _parts(parts, f"{entry}.parts", record.network), *more)


def _parts(value: object, entry: str, network: Network) -> dict[str, dict[int, Expression]]:
    found = {}
    for key, given in zip(PARTS, members(value, entry, *PARTS), strict=True):
        if type(given) is not dict:
            raise malformed(f"{entry}.{key}", "an object", given)
        found[key] = {place(one, f"{entry}.{key}", network.names(key)):
                      read(what, f"{entry}.{key}.{one}", network.positive)
                      for one, what in given.items()}
    return found


def _check_applies(record: Record) -> None:
    """Check that the claims are about this target and perturbation, and observables unchanged."""
    moved, target = record.perturbation, record.target
    known = APPLIES[moved.kind if moved else "path"]
    if target and moved:
        if target.kind == "current":
            known = CURRENT
            if moved.kind not in ("barrier", "drive") or moved.place != target.place:
                raise invalid("perturbation", "a barrier or drive of the transition of the current",
                              moved.kind)
        if moved.kind in HIGHER and target.kind != "log-ratio":
            raise invalid("target.kind", f"log-ratio for {moved.kind}", target.kind)
        for entry, side in target.sides():
            for state, one in zip(record.network.states, side, strict=True):
                if moved.symbol in one.symbols:
                    raise invalid(f"{entry}.{state}", "no symbol that is the perturbation",
                                  one.text[:80])
    for claim in record.claims:
        if claim.name not in known:
            raise invalid(f"{claim.entry}.name", "one of " + ", ".join(known), claim.name)
        if target and claim.name.startswith(("energy-covariance", "splitting")) and not (
                target.kind == "mean" or constant(target.above) or constant(target.below)):
            raise invalid(f"{claim.entry}.name", "above or below the same for every state",
                          claim.name)


def constant(side: list[Expression]) -> bool:
    """Has an observable the same text for every state?"""
    return len({one.text for one in side}) == 1
