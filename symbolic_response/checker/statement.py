"""What a record claims, from the entries that are checked; its title and response are not used."""

from __future__ import annotations

import re

from .expressions import ONE, ZERO, Expression
from .record import Claim, Network, Perturbation, Record, Target

_BARE = re.compile(r"-?[0-9.]+(/[0-9]+)?|[A-Za-z][A-Za-z0-9_]*", re.ASCII)


def statement(record: Record) -> str:
    """Return the quantity that is bounded and the names of the claims about it."""
    network, names = record.network, ", ".join(_claim(one, record.network) for one in record.claims)
    if record.path is not None:
        start, goal = (network.states[place] for place in record.path)
        return f"p[{goal}]/p[{start}]: {names}"
    assert record.target is not None and record.perturbation is not None
    target, moved = _target(record.target, network), record.perturbation
    where = _perturbation(network, moved)
    if moved.amount is not None:
        return f"change of {target} where {where} rises by {_line(moved.amount)}: {names}"
    if moved.kind == "second-barrier":
        return f"d^2 {target} / d {where}^2: {names}"
    return f"d {target} / d {where}: {names}"


def _line(value: Expression) -> str:
    return " ".join(value.text.split())


def _claim(claim: Claim, network: Network) -> str:
    """Return the name of a claim, with the parts that its right side is made of."""
    parts = [f"{key} " + ", ".join(f"{network.names(key)[k]} {_line(one)}"
                                   for k, one in given.items())
             for key, given in claim.parts.items() if given]
    return f"{claim.name} ({'; '.join(parts)})" if parts else claim.name


def _perturbation(network: Network, moved: Perturbation) -> str:
    if moved.kind == "symbol":
        return "ln " * moved.logarithmic + moved.symbol
    if moved.kind == "energy":
        return f"energy[{network.states[moved.place]}]"
    word = "drive" if moved.kind == "drive" else "barrier"
    return f"{word}[{', '.join(network.transitions[e] for e in moved.transitions)}]"


def _target(target: Target, network: Network) -> str:
    if target.kind == "current":
        return f"current[{network.transitions[target.place]}]"
    logarithm = target.kind == "log-ratio"
    if not target.below or _mean(target.below, network.states) == "1":
        ratio = _mean(target.above, network.states, "" if logarithm else "factor")
    else:
        ratio = "/".join(_mean(side, network.states, use) for side, use in (
            (target.above, "factor"), (target.below, "divisor")))
    return f"ln({ratio})" if logarithm else ratio


def _mean(values: list[Expression], states: list[str], use: str = "") -> str:
    """Return the mean of an observable: p[A, B] for 0 and 1, else multiples of such."""
    groups: dict[str, list[str]] = {}
    for value, state in zip(values, states, strict=True):
        groups.setdefault(_coefficient(value), []).append(state)
    groups.pop("0", None)
    if groups.get("1") == states:
        return "1"
    terms = [("" if factor == "1" else f"{factor}*") + f"p[{', '.join(members)}]"
             for factor, members in groups.items()]
    text = " + ".join(terms).replace("+ -", "- ") or "0"
    return f"({text})" if use and (terms[1:] or (use == "divisor" and "*" in text)) else text


def _coefficient(value: Expression) -> str:
    if value.program in ((("number", ZERO),), (("number", ONE),)):
        return str(value.program[0][1])
    text = _line(value)
    return text if _BARE.fullmatch(text) else f"({text})"
