"""Spanning trees missing from or extra in the written quotient, and single terms of it.

The hand numerator and denominator are compared with the tree sums up to one common factor, a
monomial; nothing else is adjusted, so a difference that is named makes both sides equal exactly.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Sequence
from fractions import Fraction
from itertools import islice
from operator import sub

from symbolic_response.expressions.tree import add, divide
from symbolic_response.hand.diagnosis.case import LARGE, NO_ANSWER, Case
from symbolic_response.hand.diagnosis.finding import PARTIAL, SEVERAL, SINGLE, Finding, Ranked
from symbolic_response.hand.diagnosis.notes import Comparison, Factor, Note, notes
from symbolic_response.hand.diagnosis.references import (
    Reference,
    Slot,
    over_common_ring,
    reference,
)
from symbolic_response.hand.diagnosis.written import (
    Monomial,
    Terms,
    Written,
    scaled,
    sum_of_terms,
    term_expression,
    written,
)

SAMPLED, CANDIDATES = 12, 4
MAX_NAMED, MAX_DESCRIBED = 4, 60
MAX_TERMS = 6_000


def tree_findings(case: Case) -> list[Ranked]:
    """Return what differs between the written quotient and the sums over trees."""
    if case.trees > LARGE or case.plain_hand is None or case.derived_form is None:
        return []
    try:
        form = written(case.plain_hand, case.domain)
        derived = written(case.derived_form, case.domain)
        sides = (form.top, form.bottom, derived.top, derived.bottom)
        if sum(len(side.poly) for side in sides) > MAX_TERMS:
            return []
        found = min(_comparisons(case, form, derived), key=_order, default=None)
        if found is None or not found.changes() or not _is_derived(found.reference, case):
            return []
    except NO_ANSWER:
        return []
    return _described(found, case)


def _comparisons(case: Case, form: Written, derived: Written) -> Iterator[Comparison]:
    """Yield comparisons with the sums over trees, and with the derived form in lowest terms."""
    forms = [form]
    reduced = form.reduced()
    if reduced is not form:
        forms.append(reduced)
    for one in forms:
        over_trees = reference(case.quantity, case.analysis, one.ring)
        if over_trees is not None:
            lifted = one.over(over_trees.ring)
            yield from _compared(lifted.top.terms(), lifted.bottom.terms(), over_trees)
        lifted, other = over_common_ring(one, derived.reduced())
        slots = (Slot("numerator", frozenset(), (), other.top.terms()),
                 Slot("denominator", frozenset(), (), other.bottom.terms()))
        yield from _compared(lifted.top.terms(), lifted.bottom.terms(),
                             Reference(lifted.ring, *slots, {}))


def _order(found: Comparison) -> tuple[int, bool, int]:
    """Return a sort key: few terms that differ, then over trees, then a plain common factor."""
    return found.changes(), not found.reference.rates, sum(map(abs, found.factor.shift))


def _compared(top: Terms, bottom: Terms, to: Reference) -> Iterator[Comparison]:
    for factor in _common_factors(top, bottom, to):
        back = tuple(-e for e in factor.shift)
        yield Comparison(to, factor, *(
            sum_of_terms([scaled(hand, back, 1 / factor.coefficient),
                          scaled(slot.terms, (0,) * len(back), Fraction(-1))])
            for hand, slot in ((top, to.top), (bottom, to.bottom))))


def _common_factors(top: Terms, bottom: Terms, to: Reference) -> list[Factor]:
    """Return the factors that most terms have in common with terms of the reference."""
    votes: Counter[tuple[Monomial, Fraction]] = Counter()
    for hand, slot in ((top, to.top), (bottom, to.bottom)):
        for exponents, coefficient in islice(hand.items(), SAMPLED):
            votes.update(
                (tuple(map(sub, exponents, other)),
                 coefficient if value == 1 else coefficient / value)
                for other, value in slot.terms.items())
    return [Factor(*factor) for factor, _ in votes.most_common(CANDIDATES)]


def _is_derived(to: Reference, case: Case) -> bool:
    """Return whether the sums over trees are proved to be the derived form."""
    if not to.rates:
        return True
    above, below = (add([term_expression(to.ring, *term) for term in slot.terms.items()])
                    for slot in (to.top, to.bottom))
    assert case.derived_form is not None
    return case.proved(divide(above, below), case.derived_form)


def _described(found: Comparison, case: Case) -> list[Ranked]:
    to = found.reference
    if found.changes() > MAX_DESCRIBED:
        return _partial(found)
    slots = [(to.top, found.top), (to.bottom, found.bottom)]
    noted = [notes(slot, differences, found, case) for slot, differences in slots]
    merged = _merged(noted, (to.top.name, to.bottom.name))
    if len(merged) > MAX_NAMED:
        return _partial(found)
    replaced = any(_is_replaced(slot, differences) for slot, differences in slots)
    alone = len(merged) == 1 or _is_pair(noted)
    rank = SINGLE if alone and not replaced else SEVERAL
    kind = "tree" if to.rates else "term"
    small = alone and all(note.small for notes_ in noted for note in notes_)
    return [Ranked(rank, Finding(kind, "; ".join(merged)), small)]


def _merged(noted: Sequence[Sequence[Note]], names: tuple[str, str]) -> list[str]:
    """Return the notes as sentences, those on both sums at once."""
    both = [note for note in noted[0] if note in noted[1]]
    found = [f"the {names[0]} and the {names[1]} {note.plural}" for note in both]
    for notes_, name in zip(noted, names, strict=True):
        found += [f"the {name} {note.singular}" for note in notes_ if note not in both]
    return found


def _is_pair(noted: Sequence[Sequence[Note]]) -> bool:
    """Whether one term stands in the place of another."""
    for notes_ in noted:
        kinds = sorted(note.kind for note in notes_)
        if len(notes_) > 2 or (len(notes_) == 2 and kinds != ["extra", "lacks"]):
            return False
    filled = [set(notes_) for notes_ in noted if notes_]
    return len(filled) == 1 or filled[0] <= filled[1] or filled[1] <= filled[0]


def _is_replaced(slot: Slot, differences: Terms) -> bool:
    """Whether no term of a sum of the reference is left."""
    return bool(slot.terms) and all(
        differences.get(key) == -coefficient for key, coefficient in slot.terms.items())


def _partial(found: Comparison) -> list[Ranked]:
    """Return that one of the two sums is right, where that is so."""
    to = found.reference
    for slot, same, differences in ((to.bottom, to.top, found.bottom),
                                    (to.top, to.bottom, found.top)):
        if not differences:
            continue
        right = found.top if slot is to.bottom else found.bottom
        if not right:
            text = (f"up to a common factor the {same.name} is right; the {slot.name} differs in"
                    f" {len(differences)} terms")
            return [Ranked(PARTIAL, Finding("term", text))]
    return []
