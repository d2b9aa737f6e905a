"""Right for another quantity: other states, transitions or responses, the other orientation."""

from __future__ import annotations

from itertools import islice

from symbolic_response.bounds.sides import quantity_text
from symbolic_response.expressions.tree import (
    negate,
)
from symbolic_response.hand.diagnosis.alternatives import Alternative, alternatives
from symbolic_response.hand.diagnosis.case import Case
from symbolic_response.hand.diagnosis.finding import EDIT, QUANTITY, Finding, Ranked
from symbolic_response.network.quantities import Current, DriveOf, Response

MAX_ALTERNATIVES = 600
MAX_FOUND = 3


def quantity_findings(case: Case) -> list[Ranked]:
    """Return other quantities of the network that the hand result is right for."""
    found: list[Ranked] = []
    minus = _opposite(case)
    if minus is not None:
        return [minus]
    for other in islice(alternatives(case.quantity, case.network), MAX_ALTERNATIVES):
        for sign in (1, -1):
            quantity = other.quantity if sign == 1 else negate(other.quantity)
            if case.is_hand(quantity):
                found.append(Ranked(QUANTITY, Finding("quantity", _text(other, sign, case))))
        if len(found) >= MAX_FOUND:
            break
    return found


def _opposite(case: Case) -> Ranked | None:
    if not case.is_hand(negate(case.quantity)):
        return None
    match case.quantity:
        case Current(e):
            entry = case.network.transitions[e]
            first, second = (case.network.states[k].name for k in (entry.first, entry.second))
            text = (f"right for the current in the opposite direction, {second} to {first}: the"
                    f" current of {entry.name} is counted from {first} to {second}")
        case Response(_, DriveOf(e)):
            entry = case.network.transitions[e]
            text = ("the sign is opposite: right for the drive in the opposite direction, the"
                    f" drive of {entry.name} raises its forward rate")
        case Response():
            text = ("the sign is opposite: right for minus the response; a higher energy raises"
                    " the rates out of a state, a higher barrier lowers both rates of a transition")
        case _:
            text = "the sign is opposite: right for minus the quantity"
    return Ranked(EDIT, Finding("quantity", text))


def _text(other: Alternative, sign: int, case: Case) -> str:
    asked = quantity_text(case.quantity, case.network)
    minus = "minus " if sign == -1 else ""
    return f"right for {minus}{other.what}, not for {asked}"
