r"""``\sum_{k=1}^{n}`` and ``\prod``: their range, and items with a number for the index."""

from __future__ import annotations

from dataclasses import dataclass, replace

from symbolic_response.errors import FormulaError
from symbolic_response.hand.latex.items import FONTS, Item, Items, key_of
from symbolic_response.hand.latex.names import Names
from symbolic_response.hand.latex.table import split_at
from symbolic_response.hand.latex.tokens import formula_error

MAX_VALUES = 1_000


@dataclass(frozen=True, slots=True)
class Range:
    """An index, by the head of its item, and the whole numbers it takes."""

    index: Item
    values: range

    def check_index(self, body: Items, names: Names, source: str) -> None:
        """Raise FormulaError where the index is also a symbol and stands outside of scripts."""
        if names.match((self.index,)) is None:
            return
        for item in body:
            if item.head == self.index.head and item.below is None and not item.primes:
                raise formula_error(
                    source, item.start,
                    f"{item.head} is the index of the sum and a symbol of the network; take another"
                    " letter for the index",
                )
            if item.head not in FONTS:
                for argument in item.arguments:
                    self.check_index(argument, names, source)


def read_range(item: Item, source: str) -> Range:
    r"""Return the index and the values of ``\sum_{k=1}^{n}``; FormulaError for anything else."""

    def refused() -> FormulaError:
        return formula_error(
            source, item.start,
            f"{item.head} needs an index and two whole numbers; write {item.head}_{{k=1}}^{{3}}",
        )

    below, above = item.below, item.above
    if below is None or above is None or len(below) < 3 or below[1].head != "=":
        raise refused()
    index, first, last = below[0], key_of(below[2:]), key_of(above)
    if not all(t.isdigit() and t.isascii() and len(t) <= 6 for t in (first, last)):
        raise refused()
    scripted = index.below is not None or index.above is not None or index.primes
    if scripted or index.arguments or not (index.head.isalpha() or index.head[0] == "\\"):
        raise refused()
    values = range(int(first), int(last) + 1)
    if not values:
        raise formula_error(source, item.start,
                            f"{item.head} from {first} to {last} has no terms; write a range that"
                            " begins at the smaller number")
    if len(values) > MAX_VALUES:
        raise formula_error(source, item.start,
                            f"{item.head} has {len(values)} terms; at most {MAX_VALUES} are"
                            " written out")
    return Range(index, values)


def indexed(body: Items, index: Item, value: int) -> Items:
    r"""Return items with a number for the index: digits in scripts, in parentheses elsewhere.

    A subscript such as ``k+1`` is added up.
    """
    found: list[Item] = []
    for item in body:
        if _is_index(item, index) and item.below is None:
            digits = _digits(value, item)
            found += [Item("(", item.start, item.end, item.space), *digits,
                      replace(item, head=")", below=None, above=_above(item, index, value))]
        else:
            arguments = item.arguments
            if item.head not in FONTS:
                arguments = tuple(indexed(argument, index, value) for argument in arguments)
            below = None if item.below is None else _script(item.below, index, value)
            found.append(replace(item, arguments=arguments, below=below,
                                 above=_above(item, index, value)))
    return tuple(found)


def _is_index(item: Item, index: Item) -> bool:
    return item.head == index.head and not item.arguments and not item.primes


def _digits(value: int, item: Item) -> list[Item]:
    return [Item(digit, item.start, item.end) for digit in str(value)]


def _above(item: Item, index: Item, value: int) -> Items | None:
    above = item.above
    if above is None:
        return None
    alone = above[1:-1] if len(above) == 3 and above[0].head == "(" else above
    if len(alone) == 1 and _is_index(alone[0], index):
        return _script(above, index, value)
    return indexed(above, index, value)


def _script(items: Items, index: Item, value: int) -> Items:
    found: list[Item] = []
    for place, segment in enumerate(split_at(items, ",")):
        if place:
            found.append(Item(",", segment[0].start if segment else 0, 0))
        total = _added_up(segment, index, value)
        if total is not None:
            found += _digits(total, segment[0])
            continue
        for item in segment:
            if _is_index(item, index) and item.below is None and item.above is None:
                found += _digits(value, item)
            else:
                below = None if item.below is None else _script(item.below, index, value)
                above = None if item.above is None else _script(item.above, index, value)
                found.append(replace(item, below=below, above=above))
    return tuple(found)


def _added_up(segment: Items, index: Item, value: int) -> int | None:
    """Return ``k + 1 - 2`` as a number; None for anything else or less than zero."""
    total, sign, term = 0, 1, ""
    seen = False
    for item in (*segment, Item("+", 0, 0)):
        if item.below is not None or item.above is not None:
            return None
        if item.head in ("+", "-"):
            if not term:
                return None
            total += sign * int(term)
            sign, term = (1 if item.head == "+" else -1), ""
        elif _is_index(item, index) and not term:
            seen, term = True, str(value)
        elif item.head.isdigit() and item.head.isascii() and not (term and seen):
            term += item.head
        else:
            return None
    return total if seen and total >= 0 else None
