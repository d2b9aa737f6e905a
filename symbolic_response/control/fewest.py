"""A change of the rates in the fewest pieces of a family, where three or less suffice."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from itertools import combinations
from math import comb

import flint

from symbolic_response.control.changes import Vector
from symbolic_response.control.family import Family
from symbolic_response.control.program import Amounts, sparse_amounts, total

MOST_PIECES = 3
MOST_CHOICES = 30_000
MOST_RATES = 4
"""Out of a state with more rates only single ones are tried."""


@dataclass(frozen=True, slots=True)
class _Candidate:
    """One piece: which of the amounts it sets, and what amount 1 of it adds to each rate."""

    kind: str
    places: tuple[int, ...]
    column: Vector


def fewest_amounts(family: Family, change: Vector) -> Amounts:
    """Return the fewest pieces that add up to a change, of these the least sum of sizes.

    Found by trying all choices of one, two and three pieces (30,000 choices at the most); beyond,
    the pieces with the least sum of sizes, which are few.
    """
    pool = [one for one in _candidates(family) if any(one.column)]
    for count in range(MOST_PIECES + 1):
        if comb(len(pool), count) > MOST_CHOICES:
            break
        found = [(sum(map(abs, sizes)), number, chosen, sizes)
                 for number, chosen in enumerate(combinations(pool, count))
                 if (sizes := _solved(chosen, change)) is not None]
        if found:
            _, _, chosen, sizes = min(found, key=lambda one: one[:2])
            return _amounts(family, chosen, sizes)
    return sparse_amounts(family, change)


def _none(family: Family) -> Amounts:
    zero = Fraction(0)
    return Amounts((zero,) * family.size, (zero,) * len(family.bundles),
                   (zero,) * len(family.blocks), (zero,) * len(family.drives),
                   (zero,) * len(family.rates))


def _amounts(
    family: Family, chosen: Sequence[_Candidate], sizes: Sequence[Fraction]
) -> Amounts:
    made = _none(family)
    for one, size in zip(chosen, sizes, strict=True):
        values = list(getattr(made, one.kind))
        for place in one.places:
            values[place] += size
        made = replace(made, **{one.kind: tuple(values)})
    return made


def _candidates(family: Family) -> Iterator[_Candidate]:
    counts = (("energies", family.size), ("bundles", len(family.bundles)),
              ("blocks", len(family.blocks)), ("drives", len(family.drives)))
    sets: list[tuple[str, tuple[int, ...]]] = [
        (kind, (place,)) for kind, count in counts for place in range(count)]
    if family.directed:
        for state in range(family.size):
            own = [r for r, source in enumerate(family.sources) if source == state]
            sizes = range(1, len(own)) if len(own) <= MOST_RATES else range(1, 2)
            sets += [("directed", chosen) for size in sizes for chosen in combinations(own, size)]
    for kind, places in sets:
        one = _Candidate(kind, places, ())
        yield replace(one, column=total(family, _amounts(family, [one], [Fraction(1)])))


def _solved(chosen: Sequence[_Candidate], change: Vector) -> list[Fraction] | None:
    """Return amounts, none of them 0, with which pieces add up to a change; None if there are none
    or they are not unique (then fewer suffice)."""
    covered = [any(one.column[r] for one in chosen) for r in range(len(change))]
    if any(value and not known for value, known in zip(change, covered, strict=True)):
        return None
    rows = [[flint.fmpq(x.numerator, x.denominator)
             for x in (*(one.column[r] for one in chosen), value)]
            for r, value in enumerate(change)]
    reduced, rank = flint.fmpq_mat(rows).rref()
    width = len(chosen)
    if rank != width or any(reduced[k, k] != 1 for k in range(width)):
        return None
    sizes = [Fraction(int(reduced[k, width].p), int(reduced[k, width].q)) for k in range(width)]
    return sizes if all(sizes) else None
