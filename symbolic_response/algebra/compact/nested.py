"""Nested sums and products over packed monomials, and how long they are when printed."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass

Core = frozenset[tuple[int, int]]
"""The terms of a polynomial without common factor whose largest monomial is positive."""


@dataclass(frozen=True, slots=True)
class Term:
    """``coefficient * monomial * Π bracket ** exponent``, ``size`` its characters without sign."""

    coefficient: int
    monomial: int
    factors: tuple[tuple[Bracket, int], ...]
    size: int


@dataclass(frozen=True, slots=True, eq=False)
class Bracket:
    """A sum of terms that stands for the polynomial ``core``, or its name.

    ``size``: characters without parentheses. A search makes one object for each polynomial.
    """

    core: Core
    terms: tuple[Term, ...]
    size: int
    name: str | None = None

    @property
    def size_as_factor(self) -> int:
        """The characters with the parentheses that a sum needs."""
        return self.size + 2 * (len(self.terms) > 1)


class Sizes:
    """Characters of monomials and terms; ``widths`` are those of the generators."""

    def __init__(self, widths: tuple[int, ...], bits: int) -> None:
        self.widths = widths
        self.bits = bits
        self._known: dict[int, int] = {0: 0}

    def monomial(self, monomial: int) -> int:
        """Return the characters of a monomial."""
        known = self._known.get(monomial)
        if known is None:
            known, rest = 0, monomial
            mask = (1 << self.bits) - 1
            while rest:
                place = ((rest & -rest).bit_length() - 1) // self.bits
                exponent = (rest >> (place * self.bits)) & mask
                known += self.widths[place] + exponent_size(exponent)
                rest &= ~(mask << (place * self.bits))
            self._known[monomial] = known
        return known

    def flat(self, monomials: Iterable[int]) -> int:
        """Return the characters of monomials one beside the other."""
        return sum(self.monomial(monomial) for monomial in monomials)

    def term(
        self, coefficient: int, monomial: int, factors: tuple[tuple[Bracket, int], ...]
    ) -> Term:
        """Return a term with its size."""
        size = self.monomial(monomial)
        for bracket, exponent in factors:
            size += bracket.size_as_factor + exponent_size(exponent)
        if abs(coefficient) != 1 or not size:
            size += len(str(abs(coefficient)))
        return Term(coefficient, monomial, factors, size)

    def times(self, left: Term, right: Term) -> Term:
        """Return the product of two terms, equal brackets gathered."""
        powers: dict[Bracket, int] = {}
        for bracket, exponent in (*left.factors, *right.factors):
            powers[bracket] = powers.get(bracket, 0) + exponent
        return self.term(left.coefficient * right.coefficient, left.monomial + right.monomial,
                         tuple(powers.items()))


def exponent_size(exponent: int) -> int:
    """Return the characters of an exponent with its ``^``, 0 for 1."""
    if exponent == 1:
        return 0
    return 2 if exponent < 10 else 3 + len(str(exponent))


def size_of(terms: tuple[Term, ...]) -> int:
    """Return the characters of a sum without parentheses."""
    return sum(t.size for t in terms) + len(terms) - 1 + (terms[0].coefficient < 0)


def positive_first(terms: Iterable[Term]) -> tuple[Term, ...]:
    """Return the terms with a positive one in front, if there is one."""
    listed = list(terms)
    place = next((i for i, term in enumerate(listed) if term.coefficient > 0), 0)
    return (listed[place], *listed[:place], *listed[place + 1:])


def brackets_in(terms: tuple[Term, ...]) -> Iterator[Bracket]:
    """Yield the brackets in terms, as often as they are written, outer ones first."""
    for term in terms:
        for bracket, _ in term.factors:
            yield bracket
            yield from brackets_in(bracket.terms)
