"""Polynomials with packed exponents: what kernel division needs, quick in plain Python.

A monomial is one integer with a field of bits for each generator, the top bit of each field free:
products are sums, and one subtraction tells whether a monomial divides another.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from symbolic_response.expressions.ring import Poly, Ring

Terms = dict[int, int]
"""Packed monomial to coefficient, none of them 0."""


class Packing:
    """How the monomials of a ring are packed; ``degree`` is the largest exponent that occurs."""

    def __init__(self, ring: Ring, degree: int) -> None:
        self.ring = ring
        self.bits = degree.bit_length() + 1
        self.size = len(ring.generators)
        self.multilinear = degree <= 1
        top = 1 << (self.bits - 1)
        self.guard = sum(top << (self.bits * place) for place in range(self.size))
        self.fields = [(top - 1) << (self.bits * place) for place in range(self.size)]
        self._places: dict[int, tuple[int, ...]] = {}

    def pack(self, poly: Poly) -> Terms:
        """Return the terms of a polynomial."""
        terms = {}
        for exponents, coefficient in poly.terms():
            packed = 0
            for place, exponent in enumerate(exponents):
                if exponent:
                    packed |= int(exponent) << (self.bits * place)
            terms[packed] = int(coefficient)
        return terms

    def exponents(self, monomial: int) -> tuple[int, ...]:
        """Return the exponents of a packed monomial."""
        mask = (1 << self.bits) - 1
        return tuple((monomial >> (self.bits * place)) & mask for place in range(self.size))

    def unit(self, place: int) -> int:
        """Return a generator as a monomial."""
        return 1 << (self.bits * place)

    def places(self, monomial: int) -> tuple[int, ...]:
        """Return the places of the generators in a monomial."""
        known = self._places.get(monomial)
        if known is None:
            found, rest = [], monomial
            while rest:
                place = ((rest & -rest).bit_length() - 1) // self.bits
                found.append(place)
                rest &= ~self.fields[place]
            known = self._places[monomial] = tuple(found)
        return known

    def support(self, monomial: int) -> int:
        """Return the bits of the fields of all generators in a monomial."""
        return monomial if self.multilinear else sum(self.fields[p] for p in self.places(monomial))

    def occurrences(self, terms: Iterable[int]) -> dict[int, int]:
        """Return in how many monomials each generator occurs, in order of their places."""
        counts: dict[int, int] = {}
        for monomial in terms:
            for place in self.places(monomial):
                counts[place] = counts.get(place, 0) + 1
        return dict(sorted(counts.items()))

    def common(self, monomials: Sequence[int]) -> int:
        """Return the largest monomial that divides all the given ones."""
        shared = monomials[0]
        for monomial in monomials:
            if not shared:
                break
            if monomial & shared != shared:
                shared = sum(
                    min(shared & self.fields[p], monomial & self.fields[p])
                    for p in self.places(shared)
                )
        return shared

    def reduced(self, terms: Terms) -> tuple[int, Terms]:
        """Return the common monomial and the terms without it."""
        shared = self.common(list(terms))
        if not shared:
            return 0, terms
        return shared, {monomial - shared: c for monomial, c in terms.items()}

    def quotient(self, terms: Terms, place: int) -> Terms:
        """Return the terms that hold a generator, divided by it."""
        unit, field = self.unit(place), self.fields[place]
        return {monomial - unit: c for monomial, c in terms.items() if monomial & field}

    def divide(self, terms: Terms, divisor: Terms) -> tuple[Terms, Terms]:
        """Return quotient and remainder of weak division: terms = quotient * divisor + remainder.

        A product of a term of the quotient with the divisor is taken off only where all its terms
        are there with their coefficients, so the remainder holds no new term.
        """
        (lead, scale), *others = divisor.items()
        guard, rest = self.guard, dict(terms)
        quotient: Terms = {}
        for monomial, coefficient in terms.items():
            if ((monomial | guard) - lead) & guard != guard or coefficient % scale:
                continue
            if rest.get(monomial) != coefficient:
                continue
            step, factor = monomial - lead, coefficient // scale
            # a term of the divisor that makes a field overflow finds no term of ``rest``
            if all(rest.get(step + other) == factor * c for other, c in others):
                quotient[step] = factor
                del rest[monomial]
                for other, _ in others:
                    del rest[step + other]
        return quotient, rest

    def unpack(self, terms: Terms) -> Poly:
        """Return packed terms as a polynomial."""
        return self.ring.context.from_dict(
            {self.exponents(monomial): c for monomial, c in terms.items()}
        )
