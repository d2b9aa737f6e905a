"""Several polynomials together: named common factors, and forms in terms of earlier sums."""

from __future__ import annotations

from collections import ChainMap
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field

from symbolic_response.algebra.compact.build import Builder, require_equal
from symbolic_response.algebra.compact.expansion import Quotient
from symbolic_response.algebra.compact.factor import Source, prepared, short_terms, source
from symbolic_response.algebra.compact.kernels import Search
from symbolic_response.algebra.compact.measure import (
    Width,
    characters,
    default_width,
    floored,
    literals,
)
from symbolic_response.algebra.compact.nested import (
    Bracket,
    Core,
    Term,
    brackets_in,
    size_of,
)
from symbolic_response.expressions.ring import Poly, Ring
from symbolic_response.expressions.tree import ZERO, Expression, Symbol, negate

LEAST_SAVING = 20
MAX_PASSES = 2
MAX_NAMED_TERMS = 4_000


@dataclass(frozen=True, slots=True)
class Target:
    """A sum to be written: its name, its polynomial, and forms in terms of earlier names.

    ``leaves``: what the leaves of the relations stand for, apart from names.
    """

    key: str
    poly: Poly
    relations: tuple[Expression, ...] = ()
    leaves: Mapping[Expression, Quotient] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Definition:
    """``key = form``; the form holds generators' symbols and names defined before.

    ``related``: the form is one in terms of other sums, not a form of its own.
    """

    key: str
    form: Expression
    related: bool = False

    @property
    def kind(self) -> str:
        """What is defined: ``tree``, ``total``, ``current``, ``forest``, ``factor`` ..."""
        return self.key[1:].split("[")[0]

    @property
    def place(self) -> tuple[int, ...]:
        """The numbers in the key: those of ``#forest[0, 2]`` are 0 and 2."""
        inner = self.key.split("[")[1].removesuffix("]")
        return tuple(int(number) for number in inner.split(",")) if inner else ()


@dataclass(frozen=True, slots=True)
class CompactSums:
    """Definitions in the order in which they can be read.

    ``proof``: ``"expansion"`` where every form was multiplied out and compared with its
    polynomial, ``"elimination"`` where every step of the elimination was checked so. ``leaves``:
    what the leaves of the forms (powers of generators) stand for, over ``ring``.
    """

    ring: Ring
    definitions: tuple[Definition, ...]
    proof: str = "expansion"
    leaves: Mapping[Expression, Quotient] = field(default_factory=dict, compare=False, repr=False)

    def form(self, key: str) -> Expression:
        """Return what a name stands for; KeyError if it is not defined."""
        return {d.key: d.form for d in self.definitions}[key]

    def characters(self, width: Width = default_width, *, left_sides: bool = False) -> int:
        """Return the length of all forms, and of the left sides too if asked.

        Left sides (``S_1=``) of named sums that were not asked for count in any case.
        """
        total = 0
        for d in self.definitions:
            total += characters(d.form, width)
            if left_sides or d.kind in HELPERS:
                total += width(d.key) + 1
        return total

    def literals(self) -> int:
        """Return the number of symbols and names on the right sides."""
        return sum(literals(d.form) for d in self.definitions)


HELPERS = ("factor", "exit", "rate", "source", "shift", "shifts")


def key_of(kind: str, *place: int) -> str:
    """Return the symbol that stands for a sum in expression trees.

    >>> key_of("forest", 0, 2)
    '#forest[0, 2]'
    """
    return f"#{kind}{list(place)}"


def compact_together(
    ring: Ring, targets: Sequence[Target], width: Width = default_width, *,
    name_factors: bool = True, given: Mapping[str, Poly] | None = None, first_factor: int = 1,
) -> CompactSums:
    """Return short forms of several sums, each allowed to use the names of earlier ones.

    Of a target's own form and its ``relations`` the shortest is taken; ``given`` has the sums that
    are defined elsewhere and that relations may name. Factors that occur often are named
    ``#factor[1]``, ``#factor[2]`` ... from ``first_factor`` on, if ``name_factors`` and the sums
    that have a form of their own hold up to 4,000 terms. Every form is multiplied out and compared
    with its polynomial. SizeLimitError: see ``factored``.
    """
    width = floored(width)
    writer = _Writer(ring, targets, width, given or {}, first_factor)
    best = writer.written({})
    if name_factors and writer.own_terms(best) <= MAX_NAMED_TERMS:
        names = _worth_naming(best.own, width)
        for _ in range(MAX_PASSES if names else 0):
            named = writer.written(names)
            kept = _kept(named, names, width)
            if named.size < best.size:
                best = named
            if len(kept) == len(names):
                break
            names = kept
    return writer.proved(best)


@dataclass(frozen=True, slots=True)
class _Draft:
    """One way to write everything: own forms, forms by relation, definitions of factors."""

    own: dict[str, tuple[Term, ...]]
    related: dict[str, Expression]
    factors: dict[Core, tuple[str, tuple[Term, ...]]]
    size: int


class _Writer:
    def __init__(
        self, ring: Ring, targets: Sequence[Target], width: Width, given: Mapping[str, Poly],
        first_factor: int,
    ) -> None:
        self.ring = ring
        self.given = given
        self.first_factor = first_factor
        self.targets = targets
        self.width = width
        self.packing, self.sizes = prepared([t.poly for t in targets], ring, width)
        self.builder = Builder(self.packing)
        self._packed = {t.key: self.packing.pack(t.poly) for t in targets}
        self._sources: dict[str, Source] = {}
        self._lowest = {t.key: self._least(t.poly) for t in targets}

    def _least(self, poly: Poly) -> int:
        """Return the length of a form in which every generator occurs once."""
        present = [place for place, degree in enumerate(poly.degrees()) if degree]
        return sum(self.sizes.widths[place] + 1 for place in present)

    def own_terms(self, draft: _Draft) -> int:
        """Return how many terms the sums have that are written by forms of their own."""
        return sum(len(self._packed[key]) for key in draft.own)

    def _source(self, target: Target) -> Source:
        if target.key not in self._sources:
            self._sources[target.key] = source(self.packing, target.poly)
        return self._sources[target.key]

    def written(self, names: Mapping[Core, int]) -> _Draft:
        """Return everything written with some factors named; ``names`` numbers them."""
        ordered = sorted(names, key=lambda core: (len(core), names[core]))
        keys = {
            core: key_of("factor", number)
            for number, core in enumerate(ordered, self.first_factor)
        }
        search = Search(self.packing, self.sizes,
                        {core: (key, self.width(key)) for core, key in keys.items()})
        factors = {core: (key, search.definition(core)) for core, key in keys.items()}
        size = sum(size_of(terms) + self.width(key) + 1 for key, terms in factors.values())
        own: dict[str, tuple[Term, ...]] = {}
        related: dict[str, Expression] = {}
        seen: dict[Core, str] = {}
        for target in self.targets:
            relation, length = self._shortest_relation(target, seen)
            if relation is None or length > self._lowest[target.key]:
                terms = short_terms(search, self._source(target))
                if relation is None or size_of(terms) <= length:
                    own[target.key] = terms
                    seen[frozenset(self._packed[target.key].items())] = target.key
                    size += size_of(terms)
                    continue
            related[target.key] = relation
            size += length
        return _Draft(own, related, factors, size)

    def _shortest_relation(
        self, target: Target, seen: Mapping[Core, str]
    ) -> tuple[Expression | None, int]:
        found = list(target.relations)
        packed = self._packed[target.key]
        same = seen.get(frozenset(packed.items()))
        opposite = seen.get(frozenset((m, -c) for m, c in packed.items()))
        if not packed:
            found = [ZERO]
        elif same is not None:
            found.append(Symbol(same))
        elif opposite is not None:
            found.append(negate(Symbol(opposite)))
        if not found:
            return None, 0
        measured = [(characters(relation, self.width), relation) for relation in found]
        length, relation = min(measured, key=lambda pair: pair[0])
        return relation, length

    def proved(self, draft: _Draft) -> CompactSums:
        """Return the definitions, each multiplied out and compared with its polynomial."""
        one = self.ring.constant(1)
        known: dict[Expression, Quotient] = {
            Symbol(key): (poly, one) for key, poly in self.given.items()
        }
        listed: list[Definition] = []
        for core, (key, terms) in draft.factors.items():
            poly = self.packing.unpack(dict(core))
            definition = Definition(key, self.builder.expression(terms))
            listed.append(self._checked(definition, poly, known, {}))
            known[Symbol(key)] = (poly, one)
        for target in self.targets:
            related = target.key in draft.related
            form = (draft.related[target.key] if related
                    else self.builder.expression(draft.own[target.key]))
            definition = Definition(target.key, form, related)
            listed.append(self._checked(definition, target.poly, known, target.leaves))
            known[Symbol(target.key)] = (target.poly, one)
        leaves = dict(self.builder.leaves)
        for target in self.targets:
            leaves |= target.leaves
        return CompactSums(self.ring, tuple(listed), leaves=leaves)

    def _checked(
        self, definition: Definition, poly: Poly, known: dict[Expression, Quotient],
        others: Mapping[Expression, Quotient],
    ) -> Definition:
        leaves = ChainMap(known, self.builder.leaves, dict(others))
        require_equal(definition.form, poly, leaves, self.ring, definition.key)
        return definition


# -- which factors are worth a name ------------------------------------------------------------


def _uses(
    sums: Iterator[tuple[Term, ...]], named: Mapping[Core, int]
) -> dict[Bracket, int]:
    """Count the brackets that are written, those inside a named one once."""
    counts: dict[Bracket, int] = {}
    inside: set[Core] = set()

    def visit(terms: tuple[Term, ...]) -> None:
        for term in terms:
            for bracket, _ in term.factors:
                counts[bracket] = counts.get(bracket, 0) + 1
                if bracket.core not in named:
                    visit(bracket.terms)
                elif bracket.core not in inside:
                    inside.add(bracket.core)
                    visit(bracket.terms)

    for terms in sums:
        visit(terms)
    return counts


def _worth_naming(own: Mapping[str, tuple[Term, ...]], width: Width) -> dict[Core, int]:
    """Return the factors that are worth a name, each chosen after the ones before."""
    chosen: dict[Core, int] = {}
    while True:
        name = width(key_of("factor", len(chosen) + 1))
        best, saved = None, LEAST_SAVING - 1
        for bracket, uses in _uses(iter(own.values()), chosen).items():
            if bracket.core in chosen or len(bracket.terms) < 2:
                continue
            saving = uses * (bracket.size_as_factor - name) - (bracket.size + name + 1)
            if saving > saved:
                best, saved = bracket, saving
        if best is None:
            return chosen
        chosen[best.core] = len(chosen)


def _kept(draft: _Draft, names: Mapping[Core, int], width: Width) -> dict[Core, int]:
    """Return the names that save something in a draft."""
    uses: dict[Core, int] = {}
    sums = [*draft.own.values(), *(terms for _, terms in draft.factors.values())]
    for terms in sums:
        for bracket in brackets_in(terms):
            if bracket.name is not None:
                uses[bracket.core] = uses.get(bracket.core, 0) + 1
    kept = {}
    for core, place in names.items():
        key, terms = draft.factors[core]
        size, name = size_of(terms), width(key)
        if uses.get(core, 0) * (size + 2 - name) > size + name + 1:
            kept[core] = place
    return kept
