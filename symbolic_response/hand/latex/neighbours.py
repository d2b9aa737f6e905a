"""What may stand next to what: operators, operands and brackets of one level of a formula."""

from __future__ import annotations

from symbolic_response.errors import FormulaError
from symbolic_response.hand.latex import refusals
from symbolic_response.hand.latex.items import CLOSING, OPENING, Item, Items
from symbolic_response.hand.latex.names import Names
from symbolic_response.hand.latex.pieces import DOTS, numeric_fraction
from symbolic_response.hand.latex.refusals import Unit
from symbolic_response.hand.latex.tokens import formula_error


def closes(item: Item, closer: str | None, source: str) -> bool:
    """Return whether an item closes this level; FormulaError for one that does not fit."""
    if item.head == "|" and closer == "|":
        return item.side not in ("l", "left")
    if item.head in CLOSING:
        if closer is None:
            raise _error(source, item, f"{item.head!r} closes nothing; write the bracket before it"
                                   " or leave it out")
        if item.head != closer:
            raise _error(source, item, f"{item.head!r} closes another kind of bracket; write"
                                   f" {closer!r}")
        return True
    return False


def refuse_empty(
    items: Items, place: int, begin: int, opening: Item | None, source: str
) -> None:
    if place > begin:
        raise _error(source, items[place - 1], f"nothing follows {items[place - 1].head!r}; write"
                                           " what it is applied to")
    if opening is not None:
        raise _error(source, opening, f"nothing stands in {opening.head}; write a value there")
    raise formula_error(source, 0, "the formula is empty; write an expression")


def check_before_operator(
    items: Items, left: Unit, item: Item, slash: Unit | None, source: str
) -> None:
    if left.kind == "bare":
        raise _error(source, item, refusals.after_bare(items, left, left.after))
    if slash is not None:
        what = refusals.divided_twice if item.head == "/" else refusals.after_slash
        raise _error(source, item, what(items, slash))


def check_side_by_side(
    items: Items, left: Unit, place: int, slash: Unit | None, names: Names, source: str
) -> None:
    """Refuse operands next to each other that can be read in two ways."""
    item = items[place]
    if (left.kind == "bare" or slash is not None) and refusals.is_unread(items, place, names):
        raise _error(source, item, refusals.unknown(items, place, names))
    if left.kind == "bare":
        raise _error(source, item, refusals.after_bare(items, left, place))
    if slash is not None:
        raise _error(source, item, refusals.after_slash(items, slash))
    if item.head == "," or item.head == ".":
        raise _error(source, item, refusals.comma(items, left, place))
    if item.head.isdigit():
        message = refusals.number_behind(items, left, place, names)
        raise _error(source, items[left.first], message)
    if item.head in OPENING and names.match(items, place) is None:
        called = not (_operator_inside(items, place) or _power_of_a_name(items, place, names))
        if left.kind == "name" and called:
            raise _error(source, items[left.first], refusals.call(items, left, place))
        if left.kind == "call":
            raise _error(source, item, refusals.after_call(items, left))
    if left.kind == "number" and numeric_fraction(item):
        raise _error(source, item, refusals.mixed_number(items, left, place))


def _operator_inside(items: Items, place: int) -> bool:
    """Return whether a binary operator, or a derivative, stands directly inside brackets."""
    depth = 0
    for at in range(place, len(items)):
        head = items[at].head
        depth += (head in OPENING) - (head in CLOSING)
        if depth == 0:
            return False
        if depth == 1 and _differential(items[at]):
            return True
        if depth == 1 and at > place + 1 and head in ("+", "-", "/", *DOTS):
            return True
    return False


def _power_of_a_name(items: Items, place: int, names: Names) -> bool:
    """Return whether brackets hold one name and carry a power: no function is written so."""
    inside = names.match(items, place + 1) if place + 1 < len(items) else None
    if inside is None or inside.power is not None:
        return False
    end = place + 1 + inside.count
    return end < len(items) and items[end].head in CLOSING and items[end].above is not None


def _differential(item: Item) -> bool:
    top = item.arguments[0] if item.head == r"\frac" else (item,)
    return bool(top) and top[0].head == r"\partial"


def _error(source: str, item: Item, message: str) -> FormulaError:
    return formula_error(source, item.start, message)
