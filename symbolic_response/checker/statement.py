"""What a record claims, from the entries that are checked; its title and response are not used."""

from __future__ import annotations

import re

from .expressions import ONE, ZERO, Expression
from .record import Claim, Network, Perturbation, Proof, Record, Target, Worst

_BARE = re.compile(r"-?[0-9.]+(/[0-9]+)?|[A-Za-z][A-Za-z0-9_]*", re.ASCII)


def statement(record: Record | Proof) -> str:
    """Return the quantity that is bounded and the names of the claims about it."""
    names = ", ".join(_claim(claim, record.network) for claim in record.claims)
    states = record.network.states
    if record.path is not None:
        start, goal = (states[place] for place in record.path)
        return f"p[{goal}]/p[{start}]: {names}"
    assert record.target is not None and record.perturbation is not None
    target, moved = _target(record.target, record.network), record.perturbation
    where = _perturbation(record.network, moved)
    if moved.amount is not None:
        amount = " ".join(moved.amount.text.split())
        return f"change of {target} where {where} rises by {amount}: {names}"
    if moved.kind == "second-barrier":
        return f"d^2 {target} / d {where}^2: {names}"
    return f"d {target} / d {where}: {names}"


def _claim(claim: Claim, network: Network) -> str:
    """Return the name of a claim, of proofs with the parts that its right side is made of."""
    if claim.parts is None or isinstance(claim, Worst):
        return claim.name
    known = (network.states, network.transitions, network.transitions)
    parts = [f"{word} " + ", ".join(f"{names[k]} {' '.join(one.text.split())}"
                                    for k, one in given.items())
             for word, names, given in zip(("energies", "barriers", "singles"), known, claim.parts,
                                           strict=True) if given]
    return f"{claim.name} ({'; '.join(parts)})"


def _perturbation(network: Network, moved: Perturbation) -> str:
    if moved.kind == "symbol":
        return "ln " * moved.logarithmic + moved.symbol
    if moved.kind == "energy":
        return f"energy[{network.states[moved.place]}]"
    word = "drive" if moved.kind == "drive" else "barrier"
    return f"{word}[{', '.join(network.transitions[e] for e in moved.transitions)}]"


def _target(target: Target, network: Network) -> str:
    states = network.states
    if target.kind == "current":
        return f"current[{network.transitions[target.place]}]"
    above = _mean(target.above, states)
    below = "1" if target.below is None else _mean(target.below, states)
    if below == "1":
        ratio = above if target.kind == "log-ratio" or " " not in _outside(above) else f"({above})"
    else:
        ratio = f"{_factor(above)}/{_factor(below, below=True)}"
    return f"ln({ratio})" if target.kind == "log-ratio" else ratio


def _outside(text: str) -> str:
    """Return a text without what is in brackets or parentheses."""
    depth, found = 0, []
    for letter in text:
        depth -= letter in ")]"
        if not depth:
            found.append(letter)
        depth += letter in "(["
    return "".join(found)


def _factor(text: str, below: bool = False) -> str:
    marks = _outside(text)
    return f"({text})" if " " in marks or (below and set("*/") & set(marks)) else text


def _mean(values: list[Expression], states: list[str]) -> str:
    """Return the mean of an observable: p[A, B] for 0 and 1, else multiples of such."""
    groups: dict[str, list[str]] = {}
    for value, state in zip(values, states, strict=True):
        groups.setdefault(_coefficient(value), []).append(state)
    groups.pop("0", None)
    if groups.get("1") == states:
        return "1"
    terms = [("" if factor == "1" else f"{factor}*") + f"p[{', '.join(members)}]"
             for factor, members in groups.items()]
    return " + ".join(terms).replace("+ -", "- ") or "0"


def _coefficient(value: Expression) -> str:
    if value.program in ((("number", ZERO),), (("number", ONE),)):
        return str(value.program[0][1])
    text = " ".join(value.text.split())
    return text if _BARE.fullmatch(text) else f"({text})"
