"""What a record claims, from the entries that are checked; its title and response are not used."""

from __future__ import annotations

import re

from .expressions import ONE, ZERO, Expression
from .record import Perturbation, Record, Target

_BARE = re.compile(r"-?[0-9.]+(/[0-9]+)?|[A-Za-z][A-Za-z0-9_]*", re.ASCII)


def statement(record: Record) -> str:
    """Return the quantity that is bounded and the names of the claims about it."""
    names, states = ", ".join(claim.name for claim in record.claims), record.network.states
    if record.path is not None:
        start, goal = (states[place] for place in record.path)
        return f"p[{goal}]/p[{start}]: {names}"
    assert record.target is not None and record.perturbation is not None
    moved = _perturbation(record, record.perturbation)
    return f"d {_target(record.target, states)} / d {moved}: {names}"


def _perturbation(record: Record, perturbation: Perturbation) -> str:
    if perturbation.kind == "symbol":
        return "ln " * perturbation.logarithmic + perturbation.symbol
    network = record.network
    known = network.states if perturbation.kind == "energy" else network.transitions
    return f"{perturbation.kind}[{known[perturbation.place]}]"


def _target(target: Target, states: list[str]) -> str:
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
