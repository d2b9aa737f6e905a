"""Names by their LaTeX: compared as canonical items, exactly first, then without fonts."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field, replace
from functools import lru_cache

from symbolic_response.errors import FormulaError
from symbolic_response.hand.latex.items import Item, Items, items_of, key_of, without_fonts
from symbolic_response.hand.latex.pieces import numeric
from symbolic_response.hand.latex.tokens import tokenize

SYMBOL, CHOSEN = 0, 1
"""Levels of names: symbols, then what the notation chose; labels and letters it did not choose come
later. Of two meanings of one name that of the lower level counts, of equal ones neither."""


@dataclass(frozen=True, slots=True)
class Entry:
    """The meanings of one name at the lowest level that has any; more than one are ambiguous."""

    level: int
    meanings: tuple[object, ...]
    shown: str


@dataclass(frozen=True, slots=True)
class Match:
    """A name found: ``count`` items, its meanings, and the superscript left over as a power."""

    count: int
    meanings: tuple[object, ...]
    shown: str
    power: Items | None
    others: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Table:
    """Names as they are written, and without fonts; ``widths``: the most items of a name by the
    head of its first item."""

    exact: Mapping[str, Entry] = field(default_factory=dict)
    loose: Mapping[str, Entry] = field(default_factory=dict)
    widths: Mapping[str, int] = field(default_factory=dict)

    def match(self, items: Items, place: int = 0) -> Match | None:
        """Return the longest name that begins at a place.

        More than one meaning, or ``others``, where the text can be read in two ways.
        """
        first = items[place]
        width = self.widths.get(first.head, 0)
        exact = _longest(self.exact, items[place : place + width]) if width else None
        plain = without_fonts((first,))
        width = self.widths.get(plain[0].head, 0) if plain else 0
        if exact is not None and exact.count >= width:
            return exact
        loose = _longest(self.loose, items[place : place + width], without_fonts)
        if exact is None or loose is None or loose.count <= exact.count:
            return exact or loose
        return replace(exact, others=(exact.shown, loose.shown))


def _longest(
    table: Mapping[str, Entry], items: Items, seen: Callable[[Items], Items] = tuple
) -> Match | None:
    for count in range(len(items), 0, -1):
        whole = items[:count]
        last = whole[-1]
        found = table.get(key_of(seen(whole)))
        bare = None
        if last.above is not None:
            bare = table.get(key_of(seen((*whole[:-1], replace(last, above=None)))))
        if found is not None:
            others: tuple[str, ...] = ()
            above = last.above or ()
            if bare is not None and numeric(above) and above[0].head != "(":
                others = (found.shown, f"{bare.shown} to a power")
            return Match(count, found.meanings, found.shown, None, others)
        if bare is not None:
            return Match(count, bare.meanings, bare.shown, last.above)
    return None


@dataclass(frozen=True, slots=True)
class _Key:
    """What a name is found by: its canonical text, the head of its first item, its length."""

    text: str
    head: str
    count: int


@lru_cache(maxsize=20_000)
def _keys(latex: str) -> tuple[_Key, _Key]:
    """Return the keys of a name as it is written, and without fonts."""
    items = items_of(tokenize(latex), latex)
    exact, loose = (
        _Key(key_of(seen), seen[0].head if seen else "", len(seen))
        for seen in (items, without_fonts(items))
    )
    return exact, loose


@dataclass(slots=True)
class Builder:
    exact: dict[str, Entry] = field(default_factory=dict)
    loose: dict[str, Entry] = field(default_factory=dict)
    widths: dict[str, int] = field(default_factory=dict)

    def take(self, table: Table) -> None:
        self.exact, self.loose = dict(table.exact), dict(table.loose)
        self.widths = dict(table.widths)

    def add(self, latex: str, value: object, level: int) -> None:
        entry = Entry(level, (value,), latex)
        for table, key in zip((self.exact, self.loose), _keys(latex), strict=True):
            if key.count:
                _note(table, key.text, entry)
                self.widths[key.head] = max(self.widths.get(key.head, 1), key.count)

    def try_add(self, latex: str, value: object, level: int) -> None:
        """Add a name put together from a letter and a label; pass over what is not LaTeX."""
        try:
            self.add(latex, value, level)
        except FormulaError:
            return

    def table(self) -> Table:
        return Table(self.exact, self.loose, self.widths)


def _note(table: dict[str, Entry], key: str, entry: Entry) -> None:
    old = table.get(key)
    if old is None or entry.level < old.level:
        table[key] = entry
    elif entry.level == old.level and entry.meanings[0] not in old.meanings:
        table[key] = replace(old, meanings=old.meanings + entry.meanings)


def split_at(items: Items, head: str) -> Iterator[Items]:
    """Yield the runs of items between those of a head."""
    run: list[Item] = []
    for item in items:
        if item.head == head:
            yield tuple(run)
            run = []
        else:
            run.append(item)
    yield tuple(run)


def loose_key(latex: str) -> str:
    """Return LaTeX without fonts, as names are compared."""
    return key_of(without_fonts(items_of(tokenize(latex), latex)))
