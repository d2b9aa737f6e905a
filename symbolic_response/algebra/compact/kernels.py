"""Kernel division: the search for a short nested form of a polynomial.

A kernel is a quotient of the polynomial without common factor. Division by a kernel K gives
P = Q K + R, and each of the three is treated alike. Common practice in the synthesis of logic
circuits ("algebraic division", "kernels and co-kernels"), here with coefficients and exponents.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import islice
from math import gcd

from symbolic_response.algebra.compact.nested import (
    Bracket,
    Core,
    Sizes,
    Term,
    positive_first,
    size_of,
)
from symbolic_response.algebra.compact.packed import Packing, Terms
from symbolic_response.expressions.ring import factors_of

MAX_FLINT_TERMS = 60
BEAMS = ((8, 6), (16, 3), (40, 2))
"""How many divisions are followed to the end: up to 8 terms six of them ..."""
DEEP_TERMS = (41, 1000)
"""From how many to how many terms kernels of kernels are tried too, and that one alone kept."""


def _beam(terms: int) -> int:
    return next((width for limit, width in BEAMS if terms <= limit), 1)


class Search:
    """Short forms of polynomials over one packing, each found once.

    ``names``: polynomials that have a name, with the name and its width.
    """

    def __init__(
        self, packing: Packing, sizes: Sizes, names: Mapping[Core, tuple[str, int]] | None = None
    ) -> None:
        self.packing = packing
        self.sizes = sizes
        self.names = dict(names or {})
        self._named_terms = {core: dict(core) for core in self.names}
        self._known: dict[Core, Bracket] = {}
        self._stand_ins = {
            core: Bracket(core, (), width, name) for core, (name, width) in self.names.items()
        }

    def terms(self, poly: Terms) -> tuple[Term, ...]:
        """Return a non-zero polynomial as the terms of a short nested sum."""
        lead, core = self._split(poly)
        if core is None:
            return (lead,)
        return self.shorter(self._multiplied(lead, self.bracket(core)), poly)

    def shorter(self, terms: tuple[Term, ...], poly: Terms) -> tuple[Term, ...]:
        """Return terms, or the polynomial as it is where that is shorter: a^2 + a."""
        if len(terms) > 1:
            return terms
        flat = self._listed(poly)
        return flat if size_of(flat) < size_of(terms) else terms

    def definition(self, core: Core) -> tuple[Term, ...]:
        """Return a named polynomial as a sum in which its own name does not occur."""
        return self._searched(core, dict(sorted(core)))

    def product(self, content: int, factors: Sequence[tuple[Terms, int]]) -> tuple[Term] | None:
        """Return a product of polynomials as one term; None with fewer than two sums in it."""
        if sum(exponent for piece, exponent in factors if len(piece) > 1) < 2:
            return None
        product = self.sizes.term(content, 0, ())
        for piece, exponent in factors:
            factor = self.as_factor(piece)
            for _ in range(exponent):
                product = self.sizes.times(product, factor)
        return (product,)

    def bracket(self, core: Core) -> Bracket:
        """Return the short form of a polynomial without common factor."""
        if core in self._stand_ins:
            return self._stand_ins[core]
        known = self._known.get(core)
        if known is None:
            terms = self._searched(core, dict(sorted(core)))
            known = self._known[core] = Bracket(core, terms, size_of(terms))
        return known

    def _split(self, poly: Terms) -> tuple[Term, Core | None]:
        """Return the common factor and what remains, None where that is 1."""
        monomial, content, rest = self._primitive(poly)
        lead = self.sizes.term(content, monomial, ())
        return lead, frozenset(rest.items()) if len(rest) > 1 else None

    def _primitive(self, poly: Terms) -> tuple[int, int, Terms]:
        """Return common monomial, content (with the sign of the largest monomial) and the rest."""
        monomial, rest = self.packing.reduced(poly)
        content = gcd(*rest.values())
        if rest[max(rest)] < 0:
            content = -content
        if content != 1:
            rest = {m: c // content for m, c in rest.items()}
        return monomial, content, rest

    def _multiplied(self, lead: Term, bracket: Bracket) -> tuple[Term, ...]:
        """Return a factor times a bracket as terms; a sign alone goes into the sum."""
        if len(bracket.terms) == 1:
            return (self.sizes.times(lead, bracket.terms[0]),)
        if bracket.name is None and not lead.monomial and abs(lead.coefficient) == 1:
            if lead.coefficient == 1:
                return bracket.terms
            return positive_first(
                Term(-t.coefficient, t.monomial, t.factors, t.size) for t in bracket.terms
            )
        return (self.sizes.term(lead.coefficient, lead.monomial, ((bracket, 1),)),)

    def _searched(self, core: Core, poly: Terms) -> tuple[Term, ...]:
        counts = self.packing.occurrences(poly)
        if all(count == 1 for count in counts.values()):
            return self._listed(poly)
        parts = self._apart(poly)
        if len(parts) > 1:
            return positive_first(term for part in parts for term in self.terms(part))
        factors = self._by_factors(poly)
        if factors is not None:
            return factors
        if _beam(len(poly)) == 1:
            return self._in_turn(core, poly)
        best, least = self._listed(poly), self.sizes.flat(poly) + len(poly) - 1
        for quotient, kernel, rest in self._divisions(core, poly, counts):
            product = self._product(quotient, kernel)
            if product.size + 2 * len(rest) >= least:
                continue
            terms = positive_first([product, *self.terms(rest)]) if rest else (product,)
            if (size := size_of(terms)) < least:
                best, least = terms, size
        return best

    def _in_turn(self, core: Core, poly: Terms) -> tuple[Term, ...]:
        """Return a long polynomial by one division after the other, each time the best one."""
        found: list[Term] = []
        while _beam(len(poly)) == 1 and not self.packing.common(list(poly)):
            divisions = self._divisions(core, poly, self.packing.occurrences(poly))
            if not divisions:
                return positive_first([*found, *self._listed(poly)])
            quotient, kernel, poly = divisions[0]
            found.append(self._product(quotient, kernel))
            core = frozenset(poly.items())
        return positive_first([*found, *(self.terms(poly) if poly else ())])

    def _listed(self, poly: Terms) -> tuple[Term, ...]:
        return positive_first(
            self.sizes.term(poly[monomial], monomial, ()) for monomial in sorted(poly)
        )

    def _product(self, quotient: Terms, kernel: Terms) -> Term:
        return self.sizes.times(self.as_factor(quotient), self.as_factor(kernel))

    def as_factor(self, poly: Terms) -> Term:
        """Return a non-zero polynomial as one term."""
        lead, core = self._split(poly)
        if core is None:
            return lead
        bracket = self.bracket(core)
        if len(bracket.terms) == 1:
            return self.sizes.times(lead, bracket.terms[0])
        return self.sizes.term(lead.coefficient, lead.monomial, ((bracket, 1),))

    def _apart(self, poly: Terms) -> list[Terms]:
        """Return the parts of a sum that have no generator in common."""
        groups: list[tuple[int, Terms]] = []
        for monomial, coefficient in poly.items():
            mask, terms = self.packing.support(monomial), {monomial: coefficient}
            separate = []
            for other, members in groups:
                if other & mask:
                    mask |= other
                    terms = {**members, **terms}
                else:
                    separate.append((other, members))
            groups = [*separate, (mask, terms)]
        return [terms for _, terms in groups]

    def _by_factors(self, poly: Terms) -> tuple[Term] | None:
        """Return a product of two or more exact factors, None if there are none.

        Only where a generator has a higher power: otherwise kernel division finds factors, which
        then have no generator in common.
        """
        if self.packing.multilinear or len(poly) > MAX_FLINT_TERMS:
            return None
        content, factors = factors_of(self.packing.unpack(poly))
        return self.product(content, [(self.packing.pack(piece), e) for piece, e in factors])

    def _divisions(
        self, core: Core, poly: Terms, counts: Mapping[int, int]
    ) -> list[tuple[Terms, Terms, Terms]]:
        """Return the most promising divisions P = Q K + R, best first."""
        found: list[tuple[int, int, int, tuple[Terms, Terms, Terms]]] = []
        seen: set[frozenset[Core]] = set()
        for kernel in self._kernels(core, poly, counts):
            quotient, rest = self.packing.divide(poly, kernel)
            if not quotient:
                continue
            if quotient.keys() != {0}:
                kernel, rest = self.packing.divide(poly, quotient)
            elif frozenset(kernel.items()) not in self.names:
                continue
            pair = frozenset((frozenset(quotient.items()), frozenset(kernel.items())))
            if pair in seen:
                continue
            seen.add(pair)
            length = sum(self.sizes.flat(part) for part in (quotient, kernel, rest))
            found.append((length, len(rest), len(found), (quotient, kernel, rest)))
        found.sort(key=lambda entry: entry[:3])
        return [division for *_, division in islice(found, _beam(len(poly)))]

    def _kernels(self, core: Core, poly: Terms, counts: Mapping[int, int]) -> list[Terms]:
        kernels: dict[Core, Terms] = {}
        for named, terms in self._named_terms.items():
            if named != core and len(terms) <= len(poly):
                kernels[named] = terms
        deep = DEEP_TERMS[0] <= len(poly) <= DEEP_TERMS[1]
        for place, count in counts.items():
            if count < 2:
                continue
            kernel = self._kernel(poly, place)
            kernels.setdefault(frozenset(kernel.items()), kernel)
            if deep:
                for inner, times in self.packing.occurrences(kernel).items():
                    if times > 1:
                        below = self._kernel(kernel, inner)
                        kernels.setdefault(frozenset(below.items()), below)
        return list(kernels.values())

    def _kernel(self, poly: Terms, place: int) -> Terms:
        return self._primitive(self.packing.quotient(poly, place))[2]

