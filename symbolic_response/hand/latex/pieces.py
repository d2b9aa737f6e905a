"""Pieces, which the grammar reads, and what items are: functions, powers of e, exponents."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from symbolic_response.hand.latex.items import CLOSING, OPENING, Item, Items, key_of

FUNCTIONS = {"exp": "exp", "ln": "ln", "log": "ln", "tanh": "tanh", "sinh": "sinh",
             "cosh": "cosh", "coth": "coth"}
SIGNS = {"+": "PLUS", "-": "MINUS"}
DOTS = (r"\cdot", r"\times")


@dataclass(frozen=True, slots=True)
class Piece:
    """A terminal of the grammar with its value and its place in the source."""

    kind: str
    value: object
    start: int


def function_of(item: Item) -> str | None:
    r"""Return the function an item is: ``\ln``, ``\mathrm{ln}``, ``\operatorname{tanh}``."""
    if item.head[0] == "\\" and item.head[1:] in FUNCTIONS:
        return FUNCTIONS[item.head[1:]]
    if item.head in (r"\mathrm", r"\operatorname", r"\text"):
        return FUNCTIONS.get(key_of(item.arguments[0]))
    return None


def is_e(item: Item) -> bool:
    """Return whether an item is e to some power."""
    named = item.head == "e" or (
        item.head in (r"\mathrm", r"\text") and key_of(item.arguments[0]) == "e"
    )
    return named and item.above is not None and item.below is None and not item.primes


def scripted(item: Item) -> bool:
    return item.above is not None or item.below is not None or bool(item.primes)


def numeric(items: Items) -> bool:
    """Return whether items are made of digits and the operators of exact exponents."""
    return any(part.head.isdigit() for part in _flat(items)) and all(
        part.head.isdigit() or part.head in ("+", "-", "/", ".", "(", ")", r"\frac", r"\cdot")
        for part in _flat(items)
    )


def _flat(items: Items) -> Iterator[Item]:
    for item in items:
        yield item
        for argument in item.arguments:
            yield from _flat(argument)


def numeric_fraction(item: Item) -> bool:
    return item.head == r"\frac" and all(
        all(part.head.isdigit() for part in side) for side in item.arguments
    )


def end_of_term(items: Items, place: int, in_bars: bool) -> int:
    depth = 0
    while place < len(items):
        head, side = items[place].head, items[place].side
        if head == "|" and (side in ("r", "right") or (in_bars and not side)):
            break
        depth += (head in OPENING) - (head in CLOSING)
        if depth < 0 or (depth == 0 and head in SIGNS):
            break
        place += 1
    return place
